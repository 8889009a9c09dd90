"""Heard through: the loudspeaker against its definition, impulse responses against a convolution made here.

    python3 tests/reference/heard_through_test.py
"""

import pathlib
import subprocess
import tempfile
import unittest

import numpy as np
import scipy.signal

import nodal
import program
import sound
import turn_cases
from hookup_model import Hookup

TEXT = turn_cases.FILE.format(title="plain") + turn_cases.LINE + turn_cases.volume("10k", "linear") + turn_cases.ending("100 pF")
RATES = (44100, 48000, 96000, 192000)


def loudspeaker(hertz):
    """The prototype as the program's description has it, by its zeros and poles."""
    def pair(hz, q):
        w = 2 * np.pi * hz
        return np.roots([1, w / q, w * w])

    butterworth = [1 / (2 * np.cos(np.pi / 8)), 1 / (2 * np.cos(3 * np.pi / 8))]
    zeros = np.concatenate([[0, 0], pair(2900, 1.3 / 10 ** (6 / 20))])
    poles = np.concatenate([pair(75, 1.2), pair(2900, 1.3), *(pair(5000, q) for q in butterworth)])
    gain = (2 * np.pi * 5000) ** 4
    return scipy.signal.freqs_zpk(zeros, poles, gain, 2 * np.pi * np.asarray(hertz))[1]


class HeardThroughTest(unittest.TestCase):
    def setUp(self):
        room = tempfile.TemporaryDirectory()
        self.addCleanup(room.cleanup)
        self.folder = pathlib.Path(room.name)
        self.hookup = self.folder / "plain.hookup.toml"
        self.hookup.write_text(TEXT, encoding="utf-8")

    def render(self, take, rate, *words):
        sound.write_wav(self.folder / "take.wav", take, rate)
        out = self.folder / "clips"
        done = subprocess.run([program.path(), "render", self.folder / "take.wav", "--hookup", self.hookup, *map(str, words),
                               "--out", out, "--depth", "float", "--force"], capture_output=True, text=True)
        self.assertEqual(done.returncode, 0, done.stderr)
        (row,) = program.table(done.stdout, program.CLIPS)
        samples, got_rate = sound.read_wav(out / row["file"])
        self.assertEqual(got_rate, rate)
        self.assertEqual(len(samples), len(take))
        self.assertAlmostEqual(float(row["peak_dbfs"]), 20 * np.log10(np.max(np.abs(samples))), delta=1e-4)
        return samples

    def test_loudspeaker_is_its_definition_at_every_rate(self):
        worst = (0, "")
        for rate in RATES:
            # A click without anything above 18 kHz, where the program's own pass band ends.
            size = rate
            click = np.zeros(size)
            click[rate // 4] = 0.5
            spectrum = np.fft.rfft(click)
            hertz = np.arange(len(spectrum)) * rate / size
            spectrum[hertz > 18e3] = 0
            take = np.fft.irfft(spectrum, size)
            take = take.astype(np.float32).astype(float)
            clip = self.render(take, rate, "--heard-through", "guitar loudspeaker")[:, 0]
            self.assertTrue(np.array_equal(clip, self.render(take, rate, "--heard-through", "guitar-loudspeaker")[:, 0]))
            use = (hertz >= 20) & (hertz <= 17e3)
            got = np.fft.rfft(clip)[use] / np.fft.rfft(take)[use]
            due = loudspeaker(hertz[use]) * nodal.transfer(Hookup(TEXT).circuit(10), hertz[use])
            db = np.max(np.abs(20 * np.log10(np.abs(got / due))))
            degrees = np.max(np.abs(np.degrees(np.angle(got / due))))
            worst = max(worst, (db, f"{rate} Hz, {degrees:.3f} degrees"))
            self.assertLess(db, 0.05, f"{rate} Hz")
            self.assertLess(degrees, 0.5, f"{rate} Hz")
        level = 20 * np.log10(np.abs(loudspeaker([40, 75, 500, 1000, 3000, 5000, 10000])))
        print(f"loudspeaker: worst {worst[0]:.4f} dB ({worst[1]}); levels at 40, 75, 500, 1000, 3000, 5000, 10000 Hz: "
              + ", ".join(f"{x:.1f}" for x in level) + " dB")
        # What makes it a guitar loudspeaker: common practice.
        self.assertLess(level[0], -8)
        self.assertLess(abs(level[2]), 1)
        self.assertTrue(3 < level[4] - level[2] < 8)
        self.assertLess(level[6], -20)

    def test_impulse_responses_are_convolved_as_they_are(self):
        rng = np.random.default_rng(1)
        rate, worst = 48000, 0.0
        take = (0.2 * rng.standard_normal((70001, 2))).astype(np.float32).astype(float)
        plain = self.render(take, rate)
        for taps in (1, 2, 100, 1025, 5000, 16384, 20000, 100000, 480000):
            for channels in (1, 2):
                ir = (rng.standard_normal((taps, channels)) * np.exp(-4 * np.arange(taps) / taps)[:, None] / np.sqrt(taps))
                ir = ir.astype(np.float32).astype(float)
                sound.write_wav(self.folder / "ir.wav", ir, rate)
                clip = self.render(take, rate, "--heard-through", self.folder / "ir.wav")
                for channel in range(2):
                    # A float clip is exact to 6e-8 of its samples, and so is what it is compared with.
                    due = scipy.signal.fftconvolve(plain[:, channel], ir[:, channel % channels])[:len(take)]
                    off = np.max(np.abs(clip[:, channel] - due)) / np.max(np.abs(due))
                    worst = max(worst, off)
                    self.assertLess(off, 1e-6, f"{taps} taps, {channels} channels, channel {channel}")
        print(f"impulse responses of 1 to 480000 taps, mono and stereo: off by {20 * np.log10(worst):.1f} dB of the peak at most")

    def test_a_take_of_one_sample(self):
        sound.write_wav(self.folder / "ir.wav", np.array([0.5, 0.25]), 48000)
        self.assertEqual(len(self.render(np.array([0.5]), 48000, "--heard-through", self.folder / "ir.wav")), 1)


if __name__ == "__main__":
    unittest.main()
