"""Jobs: the clips of a job are those of its hookups rendered one by one, and the catalogue is what it says it is."""

import csv
import io
import pathlib
import shutil
import subprocess
import sys
import tempfile
import tomllib
import unittest

import numpy as np

HERE = pathlib.Path(__file__).resolve().parent
sys.path[:0] = [str(HERE), str(HERE.parent / "reference")]
import bad_inputs
import program

DEMO = program.ROOT / "assets/demo"
JOB = """unsoldered_job = 1
[take]
file = "sub/riff.wav"
[settings]
one_knob = false
[[candidate]]
hookup_file = "sub/dark.hookup.toml"
dial = 7
[[candidate]]
name = "two words"
hookup = { source = "single coil", volume = "250k linear", cable = "instrument cable, 9 m", load = "effect input" }
dial = 4.5
"""
DARK = """source = "humbucker"
volume = "500k audio"
tone = { catalogue = "500k audio, 22 nF", dial = 6 }
cable = "coiled cable"
load = "valve amplifier input"
"""
# The same two hookups without the catalogue; values looked up by hand.
DARK_WRITTEN = """[source]
kind = "pickup"
inductance = "4.5 H"
resistance = "8k"
capacitance = "100 pF"
loss_resistance = "300k"
[volume]
resistance = "500k"
taper = "audio 15%"
dead_travel = 15
end_resistance = "50"
[tone]
resistance = "500k"
taper = "audio 15%"
dead_travel = 15
end_resistance = "50"
capacitor = "22n"
dial = 6
[cable]
capacitance = "1.5n"
[load]
resistance = "1M"
capacitance = "120 pF"
"""
WORDS_WRITTEN = """[source]
kind = "pickup"
inductance = "2.5 H"
resistance = "6k"
capacitance = "110 pF"
loss_resistance = "400k"
[volume]
resistance = "250k"
taper = "linear"
dead_travel = 15
end_resistance = "25"
[cable]
length = "9 m"
capacitance_per_metre = "100 pF"
[load]
resistance = "470k"
capacitance = "50 pF"
"""


def rows(text):
    return list(csv.DictReader(io.StringIO(text)))


def samples(path):
    """The data chunk of one of our WAV files, as bytes."""
    content = path.read_bytes()
    return content[content.index(b"data") + 8:]


class Jobs(unittest.TestCase):
    def setUp(self):
        self.folder = pathlib.Path(tempfile.mkdtemp(prefix="unsoldered-job-"))
        self.addCleanup(shutil.rmtree, self.folder)
        self.write("bench/x.job.toml", JOB)
        self.write("bench/sub/dark.hookup.toml", DARK)
        self.write("dark.hookup.toml", DARK_WRITTEN)
        self.write("words.hookup.toml", WORDS_WRITTEN)
        noise = np.random.default_rng(5).uniform(-0.5, 0.5, (9600, 1))
        (self.folder / "bench/sub/riff.wav").write_bytes(bad_inputs.wav(noise, code=3))
        (self.folder / "other.wav").write_bytes(bad_inputs.wav(0.5 * noise, code=3))

    def write(self, name, text):
        path = self.folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, encoding="utf-8")

    def job(self, *more, job=None, out="job"):
        if job is not None:
            self.write("bench/x.job.toml", job)
        return rows(program.call("render", "--job", "bench/x.job.toml", "--out", out, "--depth", "float", *more,
                                 cwd=self.folder))

    def alone(self, hookup, *more, take="bench/sub/riff.wav", out="alone"):
        return rows(program.call("render", take, "--hookup", hookup, "--out", out, "--depth", "float", *more,
                                 cwd=self.folder))

    def same(self, one, other):
        self.assertEqual(samples(self.folder / one), samples(self.folder / other), f"{one} and {other}")

    def test_each_candidate_sounds_at_its_own_dial_as_its_hookup_alone(self):
        clips = self.job()
        self.assertEqual([clip["file"] for clip in clips],
                         ["riff_A-dark_dial-07.00.wav", "riff_B-two-words_dial-04.50.wav"])
        self.assertEqual([clip["hookup"] for clip in clips], ["A-dark", "B-two words"])
        self.assertEqual([clip["dial"] for clip in clips], ["7", "4.5"])
        self.alone("dark.hookup.toml", "--dial", "7")
        self.alone("words.hookup.toml", "--dial", "4.5", out="words")
        self.same("job/riff_A-dark_dial-07.00.wav", "alone/riff_dark_dial-07.00.wav")
        self.same("job/riff_B-two-words_dial-04.50.wav", "words/riff_words_dial-04.50.wav")

    def test_dials_of_the_call_take_the_place_of_the_candidates_own(self):
        clips = self.job("--dial", "10,2")
        self.assertEqual([(clip["hookup"], clip["dial"]) for clip in clips],
                         [("A-dark", "10"), ("A-dark", "2"), ("B-two words", "10"), ("B-two words", "2")])
        self.alone("dark.hookup.toml", "--dial", "2")
        self.same("job/riff_A-dark_dial-02.00.wav", "alone/riff_dark_dial-02.00.wav")

    def test_a_turn_of_the_call_turns_every_candidate(self):
        self.assertEqual([clip["file"] for clip in self.job("--turn", "0:10,0.1:0")],
                         ["riff_A-dark_turn.wav", "riff_B-two-words_turn.wav"])
        self.alone("dark.hookup.toml", "--turn", "0:10,0.1:0")
        self.same("job/riff_A-dark_turn.wav", "alone/riff_dark_turn.wav")

    def test_while_another_knob_turns_the_volume_stays_at_the_candidates_dial(self):
        one = JOB[:JOB.index("[[candidate]]\nname")]
        self.job("--turn", "tone=0:6,1:6", job=one)
        self.job("--dial", "7", job=one, out="held")
        turned, held = (np.frombuffer(samples(self.folder / name), "<f4").astype(float)
                        for name in ("job/riff_A-dark_turn.wav", "held/riff_A-dark_dial-07.00.wav"))
        error = np.sqrt(np.mean((turned - held)**2) / np.mean(held**2))
        self.assertLess(error, 1e-5)  # -100 dB: held and turning paths agree

    def test_a_take_of_the_call_takes_the_place_of_the_jobs(self):
        clips = rows(program.call("render", "other.wav", "--job", "bench/x.job.toml", "--out", "job", cwd=self.folder))
        self.assertEqual(clips[0]["file"], "other_A-dark_dial-07.00.wav")
        live = JOB.replace('file = "sub/riff.wav"', "live = true")
        self.write("bench/x.job.toml", live)
        clips = rows(program.call("render", "built-in", "--job", "bench/x.job.toml", "--out", "live", cwd=self.folder))
        self.assertEqual(clips[0]["file"], "built-in_A-dark_dial-07.00.wav")

    def test_settings_of_the_call_go_to_every_candidate(self):
        self.job("--set", "load=line input")
        self.alone("dark.hookup.toml", "--dial", "7", "--set", "load.resistance=47k", "--set", "load.capacitance=100 pF")
        self.same("job/riff_A-dark_dial-07.00.wav", "alone/riff_dark_dial-07.00.wav")

    def test_what_the_job_says_of_recording_and_listening_is_what_the_options_say(self):
        told = JOB.replace("[settings]", "recorded_through = { hookup = \"sub/dark.hookup.toml\", dial = 8, "
                           "boost_limit_db = 12 }\nheard_through = \"guitar loudspeaker\"\n[settings]")
        self.job(job=told)
        options = ["--recorded-through", "dark.hookup.toml@8", "--boost-limit", "12", "--heard-through",
                   "guitar-loudspeaker"]
        self.alone("words.hookup.toml", "--dial", "4.5", *options)
        self.same("job/riff_B-two-words_dial-04.50.wav", "alone/riff_words_dial-04.50.wav")
        # The call has the last word.
        self.job("--recorded-through", "nothing", "--heard-through", "nothing", out="plain")
        self.alone("words.hookup.toml", "--dial", "4.5", out="plain-alone")
        self.same("plain/riff_B-two-words_dial-04.50.wav", "plain-alone/riff_words_dial-04.50.wav")

    def test_a_job_that_says_nothing_of_its_recording_is_told_so(self):
        said = {}
        for name, job in (("silent", JOB), ("said", JOB.replace("[settings]", 'recorded_through = "nothing"\n[settings]'))):
            self.write("bench/x.job.toml", job)
            done = subprocess.run([program.path(), "render", "--job", "bench/x.job.toml", "--out", name], cwd=self.folder,
                                  capture_output=True, text=True, check=True)
            said[name] = done.stderr
        self.assertIn("counts as the signal inside the source", said["silent"])
        self.assertEqual(said["said"], "")

    def test_a_take_that_is_not_there_is_named_as_it_was_given(self):
        for words, name in ((["no.wav", "--job", "bench/x.job.toml"], "'no.wav'"), (["--job", "bench/y.job.toml"], "gone.wav")):
            self.write("bench/y.job.toml", JOB.replace("sub/riff.wav", "gone.wav"))
            done = subprocess.run([program.path(), "render", *words, "--out", "job"], cwd=self.folder, capture_output=True,
                                  text=True, check=False)
            self.assertEqual(done.returncode, 2)
            self.assertIn(name, done.stderr)
            self.assertFalse((self.folder / "job").exists())

    def test_a_job_that_matches_loudness_brings_all_its_candidates_to_one(self):
        clips = self.job(job=JOB.replace("one_knob = false", "match_loudness = true"))
        loudness = [float(clip["loudness_lufs"]) for clip in clips]
        self.assertLess(abs(loudness[0] - loudness[1]), 0.1)  # though their dials differ
        peaks = [float(clip["peak_dbtp"]) for clip in clips]
        self.assertAlmostEqual(max(peaks), -1, delta=0.01)

    def test_a_job_that_was_refused_leaves_nothing_behind(self):
        self.write("bench/x.job.toml", JOB.replace('taper = "linear"', "").replace("dial = 4.5", "dial = 45"))
        done = subprocess.run([program.path(), "render", "--job", "bench/x.job.toml", "--out", "job"], cwd=self.folder,
                              capture_output=True, check=False)
        self.assertEqual(done.returncode, 2)
        self.assertFalse((self.folder / "job").exists())


class Catalogue(unittest.TestCase):
    def test_the_verb_lists_what_the_file_holds(self):
        listed = rows(program.call("catalogue"))
        held = tomllib.loads((program.ROOT / "assets/catalogue.toml").read_text(encoding="utf-8"))["entry"]
        self.assertEqual([(row["kind"], row["name"], row["source"]) for row in listed],
                         [(entry["kind"], entry["name"], entry["source"]) for entry in held])
        for row, entry in zip(listed, held):
            self.assertEqual(tomllib.loads(f"values = {{ {row['values']} }}")["values"], entry["values"], row["name"])

    def test_one_kind_is_listed_alone(self):
        kinds = {row["kind"] for row in rows(program.call("catalogue", "cable"))}
        self.assertEqual(kinds, {"cable"})


class Demo(unittest.TestCase):
    def test_every_demo_job_renders(self):
        jobs = sorted(DEMO.glob("*.job.toml"))
        self.assertGreaterEqual(len(jobs), 3)
        for job in jobs:
            with self.subTest(job.name), tempfile.TemporaryDirectory() as out:
                data = tomllib.loads(job.read_text(encoding="utf-8"))
                clips = rows(program.call("render", "--job", job, "--out", out, "--force"))
                self.assertEqual(len(clips), len(data["candidate"]))


if __name__ == "__main__":
    unittest.main()
