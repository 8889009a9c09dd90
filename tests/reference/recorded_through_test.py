"""What a take was recorded through is taken out: the round trip, alignment, the limiter and its reported start.

Takes are sums of sines that repeat; a recording is made of them by the circuit's own response (nodal analysis, not the
program), so what comes back is compared bin by bin in a stretch far from both ends.
"""

import pathlib
import re
import subprocess
import tempfile
import unittest

import numpy as np
import scipy.optimize

import align_test
import nodal
import program
import sound
import turn_cases
from hookup_model import Hookup

BOUND_DB = 0.05
LOW, HIGH = 20.0, 18e3
RATES = (44100, 48000, 96000, 192000)
PERIOD_S = 0.5
REPEATS = 9
HOOKUPS = {name: turn_cases.text_of(name) for name in (
    "coil, audio, end 20, tone", "double coil, audio, bleed 1n with 150k", "line 100 ohm, 10k audio", "piezo",
    "coil, coupling 22n into 220k", "line through 1 uF, ideal reverse, bleed")}
DARK = turn_cases.FILE.format(title="dark") + turn_cases.COIL + turn_cases.volume("500k", "audio 15%") + turn_cases.ending("1.2 nF")
BRIGHT = turn_cases.FILE.format(title="bright") + turn_cases.LINE + turn_cases.volume("10k", "linear") + turn_cases.ending("100 pF")
COUPLED = turn_cases.FILE.format(title="coupled") + turn_cases.LINE + turn_cases.volume("10k", "linear") + turn_cases.ending(
    "100 pF", "100k", 'coupling = "10n"')


class Sines:
    """One period of a sum of sines; `period(h)` is the same after a filter of response h."""

    def __init__(self, rate, seed, count=80):
        rng = np.random.default_rng(seed)
        self.rate, self.size = rate, int(PERIOD_S * rate)
        bins = np.unique(np.round(np.geomspace(LOW, HIGH, count) * PERIOD_S).astype(int))
        self.bins = bins[(bins > 0) & (bins < self.size // 2)]
        self.hertz = self.bins / PERIOD_S
        self.tones = np.exp(2j * np.pi * rng.uniform(size=len(self.bins)))
        self.tones *= 0.5 / np.max(np.abs(self.period()))

    def period(self, h=1.0):
        spectrum = np.zeros(self.size // 2 + 1, complex)
        spectrum[self.bins] = self.tones * h * self.size / 2
        return np.fft.irfft(spectrum, self.size)

    def take(self, h=1.0):
        return np.tile(self.period(h), REPEATS)

    def measured(self, clip):
        """Response from the emf to the clip, at self.hertz; the stretch lies in the middle."""
        start = (REPEATS // 2) * self.size
        return np.fft.rfft(clip[start:start + self.size])[self.bins] / (self.tones * self.size / 2)


def error_db(got, due):
    return np.max(np.abs(20 * np.log10(np.abs(got / due))))


class Folder:
    def __init__(self):
        self.room = tempfile.TemporaryDirectory()
        self.path = pathlib.Path(self.room.name)

    def hookup(self, name, text):
        file = self.path / f"{name}.hookup.toml"
        file.write_text(text, encoding="utf-8")
        return file

    def render(self, take, rate, hookup, *words):
        """([clip samples], what was said)."""
        sound.write_wav(self.path / "take.wav", take, rate)
        out = self.path / "clips"
        done = subprocess.run([program.path(), "render", self.path / "take.wav", "--hookup", hookup, *map(str, words), "--out", out,
                               "--depth", "float", "--force"], capture_output=True, text=True)
        if done.returncode != 0:
            raise AssertionError(done.stderr[-2000:])
        clips = []
        for row in program.table(done.stdout, program.CLIPS):
            samples, got_rate = sound.read_wav(out / row["file"])
            if got_rate != rate or len(samples) != len(take) or float(row["gain_db"]) != 0:
                raise AssertionError(f"{row}: {samples.shape} at {got_rate} Hz for a take of {len(take)}")
            clips.append(samples[:, 0] if samples.shape[1] == 1 else samples)
        return clips, done.stderr


class RecordedThroughTest(unittest.TestCase):
    def setUp(self):
        self.folder = Folder()
        self.addCleanup(self.folder.room.cleanup)

    def test_recorded_through_the_hookup_itself_gives_the_take_back(self):
        worst = {"held": (0, ""), "turning": (0, ""), "degrees": (0, "")}
        for number, (name, text) in enumerate(HOOKUPS.items()):
            file = self.folder.hookup("same", text)
            for rate in RATES if number in (0, 4) else RATES[:2]:
                sines = Sines(rate, number)
                for kind, words in (("held", ("--dial", 7)), ("turning", ("--turn", "0:7,1:7"))):
                    (clip,), _ = self.folder.render(sines.take(), rate, file, *words, "--recorded-through", f"{file}@7")
                    got = sines.measured(clip)
                    worst[kind] = max(worst[kind], (error_db(got, 1.0), f"{name}, {rate} Hz"))
                    worst["degrees"] = max(worst["degrees"], (np.max(np.abs(np.degrees(np.angle(got)))), f"{name}, {rate} Hz, {kind}"))
        print("recorded through the hookup itself at 7, 20 Hz to 18 kHz: " +
              ", ".join(f"{kind} {value:.4f} ({where})" for kind, (value, where) in worst.items()))
        self.assertLess(worst["held"][0], BOUND_DB)
        self.assertLess(worst["turning"][0], BOUND_DB)
        self.assertLess(worst["degrees"][0], 0.1)

    def test_a_mono_take_of_two_sources_comes_back_too(self):
        text = HOOKUPS[next(iter(HOOKUPS))]
        second = text[text.index("[source]"):text.index("[volume]")].replace("[source]", "[second.source]")
        for phase in ("in", "out"):
            more = second + f'[second.volume]\nresistance = "250k"\ntaper = "linear"\ndial = 6\n'
            both = f'second_channel = 1\n{text}\n{more}[selector]\nphase = "{phase}"\n'
            file = self.folder.hookup("both", both)
            sines = Sines(48000, 5)
            (clip,), _ = self.folder.render(sines.take(), 48000, file, "--dial", 7, "--recorded-through", f"{file}@7")
            error = error_db(sines.measured(clip), 1.0)
            print(f"mono take of two sources, phase = {phase}: {error:.4f} dB")
            self.assertLess(error, BOUND_DB)

    def test_recorded_at_10_and_auditioned_elsewhere_is_the_emf_auditioned_there(self):
        worst, turning = (0, ""), (-300, "")
        for number, (name, text) in enumerate(HOOKUPS.items()):
            file = self.folder.hookup("ten", text)
            for rate in RATES[:2]:
                sines = Sines(rate, 100 + number)
                model = Hookup(text)
                at_ten = nodal.transfer(model.circuit(10), sines.hertz)
                recording = sines.take(at_ten)
                undo = ("--recorded-through", f"{file}@10")
                (clip,), _ = self.folder.render(recording, rate, file, "--dial", 5, *undo)
                (emf,), _ = self.folder.render(sines.take(), rate, file, "--dial", 5)
                got = sines.measured(clip)
                worst = max(worst, (error_db(got, sines.measured(emf)), f"{name}, {rate} Hz"))
                worst = max(worst, (error_db(got, nodal.transfer(model.circuit(5), sines.hertz)), f"{name}, {rate} Hz"))
                turn = ("--turn", "1:10,1.5:2,2:8,2.05:4,3:9")
                (clip,), _ = self.folder.render(recording, rate, file, *turn, *undo)
                (emf,), _ = self.folder.render(sines.take(), rate, file, *turn)
                part = slice(int(1.0 * rate), int(3.0 * rate))
                rest = np.sqrt(np.mean((clip[part] - emf[part]) ** 2) / np.mean(emf[part] ** 2))
                turning = max(turning, (20 * np.log10(rest), f"{name}, {rate} Hz"))
        print(f"recorded at 10, auditioned at 5, against the emf at 5: {worst[0]:.4f} dB ({worst[1]}); with the knob turning "
              f"the clips differ by {turning[0]:.1f} dB of their rms ({turning[1]})")
        self.assertLess(worst[0], BOUND_DB)
        self.assertLess(turning[0], -60)

    def test_instrument_is_the_source_with_its_pot_at_10_and_a_lead(self):
        text = HOOKUPS["coil, audio, end 20, tone"]
        file = self.folder.hookup("first", text)
        lead = (turn_cases.COIL + turn_cases.volume("500k", "audio 15%", 'end_resistance = "20"') +
                turn_cases.ending("300 pF"))
        sines = Sines(48000, 7)
        for_lead = nodal.transfer(Hookup(lead).circuit(10), sines.hertz)
        (clip,), said = self.folder.render(sines.take(for_lead), 48000, file, "--dial", 7, "--recorded-through", "instrument")
        error = error_db(sines.measured(clip), nodal.transfer(Hookup(text).circuit(7), sines.hertz))
        print(f"recorded through the instrument: {error:.4f} dB")
        self.assertLess(error, BOUND_DB)
        self.assertNotIn("counts as", said)

    def test_nothing_is_the_default_and_said_in_one_line(self):
        file = self.folder.hookup("first", DARK)
        sines = Sines(48000, 8)
        (plain,), said = self.folder.render(sines.take(), 48000, file)
        self.assertEqual(said, "unsoldered render: the take counts as the signal inside the source; --recorded-through says otherwise\n")
        (named,), _ = self.folder.render(sines.take(), 48000, file, "--recorded-through", "nothing")
        np.testing.assert_array_equal(plain, named)

    def worst_boost(self, played, dials, recorded, dial, hertz):
        through = nodal.transfer(Hookup(recorded).circuit(dial), hertz)
        return np.max([np.abs(nodal.transfer(Hookup(played).circuit(d), hertz) / through) for d in dials], axis=0)

    def test_the_limiter_starts_where_it_says_and_holds_the_boost(self):
        start_worst, level_worst = 0.0, 0.0
        cases = [  # played, its motion, its dials in use, recorded, at dial, limit, which way
            (BRIGHT, ("--dial", "10"), (10,), DARK, 10, None, "up"),
            (BRIGHT, ("--dial", "10,5"), (10, 5), DARK, 10, 30, "up"),
            (BRIGHT, ("--turn", "0:2,1:8"), np.linspace(2, 8, 121), DARK, 8, 24, "up"),
            (DARK, ("--turn", "0:3,1:9"), np.linspace(3, 9, 121), DARK, 5, 8, "below"),
            (BRIGHT, ("--dial", "7"), (7,), COUPLED, 10, 12, "below"),
        ]
        for number, (played, motion, dials, recorded, dial, limit, way) in enumerate(cases):
            file, other = self.folder.hookup("played", played), self.folder.hookup("recorded", recorded)
            limit_db = 24 if limit is None else limit
            more = () if limit is None else ("--boost-limit", limit)

            def excess(log_hertz):
                hertz = np.exp(np.atleast_1d(log_hertz))
                return np.squeeze(20 * np.log10(self.worst_boost(played, dials, recorded, dial, hertz)) - limit_db)
            grid = np.log(np.geomspace(6, 20e3, 400))
            over = excess(grid) > 0
            crossings = [np.exp(scipy.optimize.brentq(excess, a, b, xtol=1e-6)) for a, b, i, j in
                         zip(grid, grid[1:], over, over[1:]) if i != j]
            self.assertGreaterEqual(len(crossings), 1, f"case {number}: the limit is never reached")
            sines = Sines(48000, 200 + number, 200)
            clips, said = self.folder.render(sines.take(), 48000, file, *motion, "--recorded-through", f"{other}@{dial}", *more)
            self.assertIn(f"the boost is held at {limit_db} dB", said)
            words = re.search(r"(?:hookup\.toml: )([^:\n]*) the boost is held", said)[1]
            numbers = [float(n) * (1000 if unit == "kHz" else 1) for n, unit in re.findall(r"([0-9.]+) (k?Hz)", words)]
            self.assertEqual(len(numbers), len(crossings), f"case {number}: said '{words}', exact {crossings}")
            for got, due in zip(sorted(numbers), crossings):
                start_worst = max(start_worst, abs(got / due - 1))
            self.assertIn(way, words)
            if motion[0] != "--dial":
                continue
            boost = self.worst_boost(played, dials, recorded, dial, sines.hertz)
            through = nodal.transfer(Hookup(recorded).circuit(dial), sines.hertz)
            for clip, d in zip(clips, dials):
                due = np.abs(nodal.transfer(Hookup(played).circuit(d), sines.hertz) / through)
                due *= np.minimum(1, 10 ** (limit_db / 20) / boost)
                level_worst = max(level_worst, error_db(sines.measured(clip), due))
        print(f"limiter: start as reported off by {100 * start_worst:.2f} % at most; the limited response by {level_worst:.4f} dB")
        self.assertLess(start_worst, 0.01)
        self.assertLess(level_worst, BOUND_DB)

    def test_alignment_and_channels(self):
        worst = 0.0
        rng = np.random.default_rng(5)
        for name in ("coil, audio, end 20, tone", "coil, coupling 22n into 220k"):
            file = self.folder.hookup("same", HOOKUPS[name])
            for rate in RATES:
                take = align_test.noise(rate, 1.5, rng)
                for words in (("--dial", "7"), ("--turn", "0:7,1:7")):
                    (clip,), _ = self.folder.render(np.stack([take, 0.5 * take], 1), rate, file, *words, "--recorded-through", f"{file}@7")
                    for channel in range(2):
                        worst = max(worst, abs(align_test.delay_samples(take, clip[:, channel], rate, lambda f: np.ones(len(f)))))
                    np.testing.assert_allclose(clip[:, 1], 0.5 * clip[:, 0], atol=1e-6)
        print(f"recorded through the hookup itself: off by {worst:.1e} samples at most")
        self.assertLess(worst, 0.01)

    def test_below_a_coupling_capacitor_it_says_from_where_it_cannot_undo(self):
        file = self.folder.hookup("coupled", COUPLED)
        sines = Sines(48000, 9)
        _, said = self.folder.render(sines.take(), 48000, file, "--recorded-through", f"{file}@10")
        found = re.search(r"below ([0-9.]+) Hz what .* took cannot be undone", said)
        self.assertTrue(found, said)
        self.assertLess(float(found[1]), 20)


if __name__ == "__main__":
    unittest.main()
