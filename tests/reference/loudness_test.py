# check: slow
"""Loudness and true peak of clips: the signals of EBU Tech 3341 through the program, its columns against the required
values, and matched clips measured by an implementation of BS.1770 that shares nothing with the program's.

The hookup the signals pass is a pot at full on a source of 0 ohm: it changes nothing.
"""

import pathlib
import tempfile
import unittest

import numpy as np

import bs1770
import program
import sound

NOTHING = """
[source]
kind = "line"
resistance = "0"
[volume]
resistance = "10k"
taper = "linear"
[load]
resistance = "1M"
"""
REQUIRED_LU = 0.1  # EBU Tech 3341
MATCH_LU = 0.1
PEAK_BOUND_DB = 0.1  # between two ways to interpolate: EBU Tech 3341 allows +0.2/-0.4 dB


def tones(parts, rate, channels=2, hertz=1000.0):
    """A sine through (level in dBFS, seconds) parts, the same in all channels."""
    level = np.concatenate([np.full(round(seconds * rate), 10**(db / 20)) for db, seconds in parts])
    return np.repeat((level * np.sin(2 * np.pi * hertz * np.arange(len(level)) / rate))[:, None], channels, axis=1)


def peaks(divisor, amplitude, degrees, rate=48000):
    """A steady sine at rate / divisor, faded so that its onset does not overshoot between the samples."""
    i = np.arange(rate)
    fade = np.sin(np.pi / 2 * np.minimum(1, np.minimum(i, rate - 1 - i) / (0.01 * rate)))**2
    return (amplitude * fade * np.sin(2 * np.pi * (i / divisor + degrees / 360)))[:, None]


# (name, signal by rate, required LUFS)
SIGNALS = [
    ("BS.1770 anchor", lambda rate: tones([(0, 20)], rate, 1, 997.0), -3.01),
    ("Tech 3341 case 1", lambda rate: tones([(-23, 20)], rate), -23.0),
    ("Tech 3341 case 2", lambda rate: tones([(-33, 20)], rate), -33.0),
    ("Tech 3341 case 3", lambda rate: tones([(-36, 10), (-23, 60), (-36, 10)], rate), -23.0),
    ("Tech 3341 case 4", lambda rate: tones([(-72, 10), (-36, 10), (-23, 60), (-36, 10), (-72, 10)], rate), -23.0),
    ("Tech 3341 case 5", lambda rate: tones([(-26, 20), (-20, 20.1), (-26, 20)], rate), -23.0),
    ("Tech 3341 case 6", lambda rate: tones([(0, 20)], rate, 5) * 10**(np.array([-28, -28, -24, -30, -30]) / 20), -23.0),
]
# (case, sine, required dBTP within +0.2/-0.4)
PEAKS = [(15, (4, 0.50, 0), -6.0), (16, (4, 0.50, 45), -6.0), (17, (6, 0.50, 60), -6.0), (18, (8, 0.50, 67.5), -6.0),
         (19, (4, 1.41, 45), 3.0)]


class LoudnessTest(unittest.TestCase):
    def setUp(self):
        self.room = tempfile.TemporaryDirectory(prefix="unsoldered-loudness-")
        self.folder = pathlib.Path(self.room.name)
        (self.folder / "nothing.hookup.toml").write_text(NOTHING, encoding="utf-8")

    def tearDown(self):
        self.room.cleanup()

    def render(self, take, hookups, *words):
        """Rows of the list, and each clip's samples and rate."""
        out = self.folder / "clips"
        text = program.call("render", take, "--hookup", *hookups, *words, "--depth", "float", "--force", "--out", out)
        rows = program.table(text, program.CLIPS)
        return rows, [sound.read_wav(out / row["file"]) for row in rows]

    def measured(self, samples, rate):
        take = self.folder / "take.wav"
        sound.write_wav(take, samples, rate)
        rows, _ = self.render(take, [self.folder / "nothing.hookup.toml"], "--measure")
        return rows[0]

    def test_loudness_of_the_published_signals(self):
        for rate in (44100, 48000, 96000):
            worst = 0.0
            for name, signal, required in SIGNALS:
                samples = signal(rate)
                got = float(self.measured(samples, rate)["loudness_lufs"])
                own = bs1770.integrated(samples, rate)
                with self.subTest(name, rate=rate):
                    self.assertAlmostEqual(got, required, delta=REQUIRED_LU)
                    self.assertAlmostEqual(got, own, delta=0.01)
                worst = max(worst, abs(got - required))
            print(f"{rate} Hz: worst of {len(SIGNALS)} signals {worst:.4f} LU from the required value")

    def test_true_peak_of_the_published_signals(self):
        for case, sine, required in PEAKS:
            samples = peaks(*sine)
            got = float(self.measured(samples, 48000)["peak_dbtp"])
            with self.subTest(case=case):
                self.assertLessEqual(got, required + 0.2)
                self.assertGreaterEqual(got, required - 0.4)
                self.assertAlmostEqual(got, bs1770.true_peak_db(samples), delta=PEAK_BOUND_DB)
            print(f"case {case}: {got:.4f} dBTP, required {required}")

    def test_the_independent_filters_have_one_response_at_every_rate(self):
        # The standard's own table is that of 48 kHz. At other rates its high-pass, whose numerator is 1 -2 1 at all of
        # them, passes 0.004 dB more (44.1 kHz) or 0.022 dB less (96 kHz).
        for rate in bs1770.SHELF:
            for hertz, db in ((100, -1.1335), (1000, 0.6977), (8000, 4.0394)):
                gain = 1.0
                for b, a in (bs1770.SHELF[rate], bs1770.HIGH_PASS[rate]):
                    z = np.exp(-2j * np.pi * hertz / rate)
                    gain *= abs(np.polyval(b[::-1], z) / np.polyval(a[::-1], z))
                self.assertAlmostEqual(20 * np.log10(gain), db, delta=0.001 if rate == 48000 else 0.025)

    def matched(self, take, hookups, dials):
        rows, clips = self.render(take, hookups, "--dial", ",".join(map(str, dials)), "--match-loudness")
        worst = 0.0
        left_out = 0
        for dial in dials:
            marks = [(row, *clip) for row, clip in zip(rows, clips) if float(row["dial"]) == dial]
            self.assertEqual(len(marks), len(hookups))
            loud = []
            highest = -np.inf
            for row, samples, rate in marks:
                lufs = bs1770.integrated(samples, rate)
                if not np.isfinite(lufs):
                    self.assertEqual(float(row["gain_db"]), 0)
                    left_out += 1
                    continue
                loud.append(lufs)
                self.assertAlmostEqual(float(row["loudness_lufs"]), lufs, delta=0.01)
                highest = max(highest, bs1770.true_peak_db(samples))
            if loud:
                worst = max(worst, max(loud) - min(loud))
                self.assertLess(max(loud) - min(loud), MATCH_LU, f"dial {dial}")
                # The highest such loudness: one clip stands at the ceiling, none above.
                self.assertAlmostEqual(highest, -1, delta=PEAK_BOUND_DB)
        return worst, left_out

    def test_matched_clips_are_of_one_loudness(self):
        hookups = sorted((program.ROOT / "assets/demo").glob("*.hookup.toml"))[:6]
        worst, left_out = self.matched("built-in", hookups, (10, 7, 3, 0))
        print(f"matched: worst spread at a dial {worst:.4f} LU, {left_out} clips left out")
        short = self.folder / "short.wav"  # under 3 s: ungated, with a rest that a gate would take out
        rng = np.random.default_rng(5)
        noise = np.concatenate([rng.standard_normal(40000) * 0.2, np.zeros(60000)])
        sound.write_wav(short, noise, 48000)
        worst, left_out = self.matched(short, hookups, (10, 5))
        self.assertEqual(left_out, 0)
        print(f"matched, 2.1 s: worst spread {worst:.4f} LU")

    def test_turning_clips_are_matched_as_wholes(self):
        hookups = sorted((program.ROOT / "assets/demo").glob("*.hookup.toml"))[:3]
        rows, clips = self.render("built-in", hookups, "--turn", "0:10,8:2", "--match-loudness")
        loud = [bs1770.integrated(samples, rate) for samples, rate in clips]
        self.assertLess(max(loud) - min(loud), MATCH_LU)
        self.assertEqual({row["dial"] for row in rows}, {"turn"})

    def test_gain_is_what_was_applied(self):
        hookups = sorted((program.ROOT / "assets/demo").glob("*.hookup.toml"))[:2]
        plain = self.render("built-in", hookups, "--dial", "10,4")
        matched = self.render("built-in", hookups, "--dial", "10,4", "--match-loudness")
        for row, (before, _), (after, _) in zip(matched[0], plain[1], matched[1]):
            self.assertNotEqual(float(row["gain_db"]), 0)
            np.testing.assert_allclose(after, before * 10**(float(row["gain_db"]) / 20), atol=2e-7)


if __name__ == "__main__":
    unittest.main()
