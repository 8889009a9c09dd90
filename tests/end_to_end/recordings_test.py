"""Recordings that nobody here made, mono and stereo, WAV and FLAC: clips keep length, rate and channels, the level falls
with the dial and is the one that the computed response says, and the channels stay where they were.

The recordings come with Debian packages: alsa-utils (spoken words) and sonic-pi-samples (a guitar and other instruments).
"""

import pathlib
import subprocess
import sys
import tempfile
import unittest

import numpy as np

HERE = pathlib.Path(__file__).resolve().parent
sys.path.insert(0, str(HERE.parent / "reference"))
import program
import sound

DIALS = (10, 7, 4, 2)
HOOKUPS = [program.ROOT / "assets/demo" / name for name in ("a-500k-audio-short-cable.hookup.toml",
                                                            "f-preamp-25k-line.hookup.toml")]
WORDS = pathlib.Path("/usr/share/sounds/alsa")
MUSIC = pathlib.Path("/usr/share/sonic-pi/samples")
MONO_WAV = [WORDS / "Front_Center.wav", WORDS / "Rear_Left.wav", WORDS / "Side_Right.wav"]
MONO_FLAC = [MUSIC / "guit_e_slide.flac", MUSIC / "guit_harmonics.flac", MUSIC / "tabla_na.flac"]
STEREO_FLAC = [MUSIC / "guit_em9.flac", MUSIC / "guit_e_fifths.flac", MUSIC / "loop_garzul.flac",
               MUSIC / "perc_swash.flac"]  # the last has 24 bits
LEVEL_BOUND_DB = 0.05  # of a Parseval sum over a response read between 600 points


def sox(*words):
    subprocess.run(["sox", "-D", *map(str, words)], check=True, capture_output=True)


def about(path):
    """(frames, rate, channels) as another program reads them."""
    asked = [subprocess.run(["soxi", option, str(path)], check=True, capture_output=True, text=True) for option in
             ("-s", "-r", "-c")]
    return tuple(int(done.stdout) for done in asked)


def level_db(samples):
    return 10 * np.log10(np.mean(samples**2))


def computed_level_db(take, rate, rows):
    """The level of the take after the response of one dial: the sum over its spectrum."""
    power = np.abs(np.fft.rfft(take, axis=0))**2
    hertz = np.fft.rfftfreq(len(take), 1 / rate)
    level = np.interp(np.log(np.maximum(hertz, 1)), np.log([r["frequency_hz"] for r in rows]), [r["level_db"] for r in rows])
    twice = np.full(len(hertz), 2.0)
    twice[0] = 1
    twice[-1] = 1 if len(take) % 2 == 0 else 2
    gain = twice * 10**(level / 10)
    return 10 * np.log10(np.sum(gain[:, None] * power) / (take.shape[1] * len(take)**2))


class Recordings(unittest.TestCase):
    def setUp(self):
        self.room = tempfile.TemporaryDirectory(prefix="unsoldered-recordings-")
        self.folder = pathlib.Path(self.room.name)

    def tearDown(self):
        self.room.cleanup()

    def samples(self, path):
        plain = self.folder / "plain.wav"
        sox(path, "-e", "floating-point", "-b", "32", plain)
        return sound.read_wav(plain)

    def render(self, take, hookup, out, *more):
        """The clips in the order of the dials, and the rows of the list."""
        folder = self.folder / out
        text = program.call("render", take, "--hookup", hookup, "--dial", ",".join(map(str, DIALS)), "--out", folder, *more)
        rows = program.table(text, program.CLIPS)
        self.assertEqual([float(row["dial"]) for row in rows], list(DIALS))
        self.assertEqual(text, (folder / "clips.csv").read_text(encoding="utf-8"))
        return [folder / row["file"] for row in rows], rows

    def check(self, take, kind, channels, out):
        self.assertTrue(take.is_file(), f"{take} is missing: install alsa-utils and sonic-pi-samples")
        form = about(take)
        self.assertEqual(form[2], channels, f"{take} is not what this test takes it for")
        samples, rate = self.samples(take)
        self.assertEqual(samples.shape, (form[0], channels))
        for hookup in HOOKUPS:
            name = hookup.name[0]
            clips, _ = self.render(take, hookup, f"{out}-{name}", "--depth", "float")
            response = {dial: program.table(program.call("response", hookup, "--dial", dial, "--from", "1", "--to",
                                                         rate / 2, "--points", "600"), program.RESPONSE) for dial in DIALS}
            levels = []
            for dial, clip in zip(DIALS, clips):
                self.assertEqual(about(clip), form, f"{clip.name}: length, rate or channels changed")
                heard, heard_rate = sound.read_wav(clip)
                self.assertEqual(heard_rate, rate)
                levels.append(level_db(heard))
                rows = [{k: float(v) for k, v in row.items()} for row in response[dial]]
                expected = computed_level_db(samples, rate, rows)
                self.assertLess(abs(levels[-1] - expected), LEVEL_BOUND_DB, f"{clip.name}: {levels[-1]} dB, computed {expected}")
            self.assertTrue(all(a > b for a, b in zip(levels, levels[1:])), f"{take.name}: {levels} does not fall")
            print(f"{kind} {take.name} through {name}: {level_db(samples):.2f} dBFS becomes "
                  + ", ".join(f"{level:.2f} at {dial}" for dial, level in zip(DIALS, levels)))

    def check_whole_depths(self, take, out):
        """16 and 24 bits: the same form, and one common gain at most."""
        for depth in ("16", "24"):
            clips, rows = self.render(take, HOOKUPS[0], f"{out}-{depth}", "--depth", depth)
            self.assertEqual(len({row["gain_db"] for row in rows}), 1)
            for clip, row in zip(clips, rows):
                self.assertEqual(about(clip), about(take))
                bits = subprocess.run(["soxi", "-b", clip], check=True, capture_output=True, text=True).stdout.strip()
                self.assertEqual(bits, depth)
                peak = np.max(np.abs(self.samples(clip)[0]))
                self.assertAlmostEqual(20 * np.log10(peak), float(row["peak_dbfs"]), places=3)
                self.assertLessEqual(float(row["peak_dbfs"]), -0.999)

    def test_mono_wav(self):
        for i, take in enumerate(MONO_WAV):
            self.check(take, "mono WAV", 1, f"w{i}")
        self.check_whole_depths(MONO_WAV[0], "whole")

    def test_mono_flac(self):
        for i, take in enumerate(MONO_FLAC):
            self.check(take, "mono FLAC", 1, f"f{i}")
        self.check_whole_depths(MONO_FLAC[0], "whole")

    def test_stereo_flac(self):
        for i, take in enumerate(STEREO_FLAC):
            self.check(take, "stereo FLAC", 2, f"s{i}")
        self.check_whole_depths(STEREO_FLAC[0], "whole")

    def test_stereo_wav(self):
        # The packages ship none; the same recordings rewritten, whose samples do not change.
        for i, take in enumerate(STEREO_FLAC):
            wav = self.folder / f"{take.stem}.wav"
            sox(take, "-b", "24", wav)
            self.check(wav, "stereo WAV", 2, f"t{i}")

    def test_channels_stay_where_they_were(self):
        for take in STEREO_FLAC:
            samples, _ = self.samples(take)
            apart = level_db(samples[:, 0] - samples[:, 1]) - level_db(samples)
            self.assertGreater(apart, -40, f"{take.name} says nothing: both its channels are alike")
            clips, _ = self.render(take, HOOKUPS[0], f"{take.stem}-both", "--depth", "float")
            for side in (0, 1):
                one = self.folder / f"{take.stem}-{side}.wav"
                sox(take, one, "remix", side + 1)
                alone, _ = self.render(one, HOOKUPS[0], f"{take.stem}-{side}", "--depth", "float")
                for both, single in zip(clips, alone):
                    np.testing.assert_allclose(sound.read_wav(both)[0][:, side], sound.read_wav(single)[0][:, 0], rtol=0,
                                               atol=1e-7, err_msg=f"{both.name}, channel {side + 1}")
            print(f"{take.name}: channels {apart:.1f} dB apart, each as if rendered alone")


if __name__ == "__main__":
    unittest.main()
