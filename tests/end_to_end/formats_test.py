"""Clips in every file format as other programs see them: decoded by sox against what was rendered, tags read by sox and
from the bytes, the same bytes again on a second run, many clips at once with few file handles.
"""

import pathlib
import resource
import struct
import subprocess
import sys
import tempfile
import unittest

import numpy as np

HERE = pathlib.Path(__file__).resolve().parent
sys.path.insert(0, str(HERE.parent / "reference"))
import bs1770
import program
import sound

HOOKUP = program.ROOT / "assets/demo/a-500k-audio-short-cable.hookup.toml"
SMALL_HANDLES = 48
MANY = 64
MEMORY_BYTES = 300e6


def sox(*words):
    subprocess.run(["sox", "-D", *map(str, words)], check=True, capture_output=True)


def comments(path):
    """What sox finds written in a file."""
    return subprocess.run(["soxi", "-a", str(path)], check=True, capture_output=True, text=True).stdout


def id3_texts(path):
    """Title and comment of the ID3v2.3 tag at the start of an MP3 file (id3.org, ID3v2.3.0)."""
    data = path.read_bytes()
    assert data[:3] == b"ID3", data[:10]
    size = sum((byte & 0x7F) << (7 * place) for place, byte in enumerate(reversed(data[6:10])))
    at, found = 10, {}
    while at + 10 <= 10 + size and data[at:at + 4].isalnum():
        length = struct.unpack(">I", data[at + 4:at + 8])[0]
        body = data[at + 10:at + 10 + length]
        text = {0: "latin-1", 1: "utf-16"}[body[0]]
        start = 4 if data[at:at + 4] == b"COMM" else 1  # a comment has its language first, then a short name
        words = body[start:].decode(text).split("\0")
        found[data[at:at + 4].decode()] = [word for word in words if word][-1]
        at += 10 + length
    return found["TIT2"], found["COMM"]


def delay_samples(wanted, got):
    """How much later `got` is, to first order: the part of the difference that goes with the slope."""
    slope = np.gradient(wanted)
    return -float(np.sum((got - wanted) * slope) / np.sum(slope * slope))


class Formats(unittest.TestCase):
    def setUp(self):
        self.room = tempfile.TemporaryDirectory(prefix="unsoldered-formats-")
        self.folder = pathlib.Path(self.room.name)

    def tearDown(self):
        self.room.cleanup()

    def render(self, out, *words, take="built-in", hookup=HOOKUP):
        text = program.call("render", take, "--hookup", hookup, "--out", self.folder / out, *words)
        rows = program.table(text, program.CLIPS)
        return rows, [self.folder / out / row["file"] for row in rows]

    def decoded(self, path):
        plain = self.folder / "plain.wav"
        sox(path, "-e", "floating-point", "-b", "32", plain)
        return sound.read_wav(plain)

    def test_what_another_program_decodes_is_what_was_rendered(self):
        wanted, rate = sound.read_wav(self.render("float", "--dial", "7", "--depth", "float")[1][0])
        for kind, depth, bound_db in (("wav", "16", -55), ("wav", "24", -110), ("flac", "16", -55), ("flac", "24", -110),
                                      ("ogg", None, -30)):
            words = ["--dial", "7", "--format", kind] + (["--depth", depth] if depth else [])
            rows, files = self.render(f"{kind}-{depth}", *words)
            self.assertEqual(files[0].suffix, "." + kind)
            got, got_rate = self.decoded(files[0])
            self.assertEqual(got_rate, rate)
            self.assertEqual(got.shape, wanted.shape)
            error_db = 10 * np.log10(np.mean((got - wanted)**2) / np.mean(wanted**2))
            late = delay_samples(wanted[:, 0], got[:, 0])
            print(f"{kind} {depth or ''}: error {error_db:.1f} dB, delay {late:+.4f} samples")
            self.assertLess(error_db, bound_db)
            self.assertAlmostEqual(late, 0, delta=0.02)
            if kind == "ogg":
                self.assertAlmostEqual(float(rows[0]["loudness_lufs"]), bs1770.integrated(got, rate), delta=0.1)

    def test_tags(self):
        text = HOOKUP.read_text(encoding="utf-8").replace('title = "A: ', 'title = "Brücke: ')
        self.assertIn("Brücke", text)
        hookup = self.folder / "mine.hookup.toml"
        hookup.write_text(text, encoding="utf-8")
        title = "built-in, Brücke: 500k audio, 3 m cable"
        comment = "hookup mine, dial 7.5, gain 0 dB"
        for kind in ("flac", "ogg"):
            _, files = self.render(kind, "--dial", "7.5", "--format", kind, hookup=hookup)
            found = comments(files[0])
            self.assertIn(title, found)
            self.assertIn(comment, found)
            self.assertIn("Unsoldered", found)
        _, files = self.render("mp3", "--dial", "7.5", "--format", "mp3", hookup=hookup)
        self.assertEqual(id3_texts(files[0]), (title, comment))
        _, files = self.render("wav", "--dial", "7.5", "--format", "wav", hookup=hookup)
        head = files[0].read_bytes()[:1000]
        self.assertIn(b"INAM", head)
        self.assertIn(title.encode(), head)
        self.assertIn(comment.encode(), head)
        self.assertIn(b"Unsoldered", head)

    def test_a_second_run_gives_the_same_bytes(self):
        for kind in ("wav", "flac", "mp3"):
            first, second = (self.render(f"{kind}-{run}", "--dial", "5", "--format", kind)[1][0] for run in (1, 2))
            self.assertEqual(first.read_bytes(), second.read_bytes(), kind)
        first, second = (self.render(f"ogg-{run}", "--dial", "5", "--format", "ogg")[1][0] for run in (1, 2))
        np.testing.assert_array_equal(self.decoded(first)[0], self.decoded(second)[0])

    def test_many_clips_with_few_file_handles_and_little_memory(self):
        rng = np.random.default_rng(1)
        sound.write_wav(self.folder / "take.wav", 0.1 * rng.standard_normal(48000 * 2), 48000)
        dials = ",".join(f"{dial:.2f}" for dial in np.linspace(0, 10, MANY))
        for words in (["--jobs", "8"], ["--jobs", "8", "--match-loudness", "--format", "flac"],
                      ["--jobs", "8", "--format", "ogg"]):
            out = self.folder / ("clips" + "".join(words))
            done = subprocess.run([program.path(), "render", str(self.folder / "take.wav"), "--hookup", str(HOOKUP), "--dial",
                                   dials, "--out", str(out), *words], capture_output=True, text=True, check=False,
                                  preexec_fn=lambda: resource.setrlimit(resource.RLIMIT_NOFILE, (SMALL_HANDLES,) * 2))
            self.assertEqual(done.returncode, 0, done.stderr[-2000:])
            self.assertEqual(len(list(out.iterdir())), MANY + 1)
        used = resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss * 1024
        print(f"{MANY} clips, {SMALL_HANDLES} file handles: at most {used / 1e6:.0f} MB")
        self.assertLess(used, MEMORY_BYTES)

    def test_takes_in_other_containers_are_rendered_alike(self):
        rng = np.random.default_rng(2)
        sound.write_wav(self.folder / "take.wav", np.round(rng.uniform(-0.2, 0.2, (30000, 2)) * 32768) / 32768, 44100)
        reference = None
        for name, words in (("plain.wav", []), ("big.aiff", []), ("other.aifc", []), ("long.w64", ["-t", "w64"]),
                            ("free.flac", [])):
            sox(self.folder / "take.wav", "-b", "16", "-e", "signed-integer", *words, self.folder / name)
            got, rate = sound.read_wav(self.render(f"of-{name}", "--depth", "float", take=self.folder / name)[1][0])
            self.assertEqual((rate, got.shape), (44100, (30000, 2)))
            reference = got if reference is None else reference
            np.testing.assert_array_equal(got, reference, name)


if __name__ == "__main__":
    unittest.main()
