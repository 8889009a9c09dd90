"""Clips line up with the take to a hundredth of a sample: the delay left after the circuit's own phase is taken out."""

import pathlib
import tempfile
import unittest

import numpy as np

import nodal
import render_check
import sound
from hookup_model import Hookup

BOUND_SAMPLES = 0.01
PLAIN = """
title = "Next to nothing"
[source]
kind = "line"
resistance = "0"
[volume]
resistance = "10k"
taper = "linear"
[load]
resistance = "1M"
"""
COIL = """
title = "Coil"
[source]
kind = "pickup"
inductance = "2.4 H"
resistance = "6k2"
capacitance = "110 pF"
loss_resistance = "300k"
[volume]
resistance = "500k"
taper = "audio 15%"
[cable]
capacitance = "500 pF"
[load]
resistance = "1M"
"""


def delay_samples(given, got, rate, h_of, low=100.0, high=15e3):
    """Delay of `got` after `given` beyond the circuit's own, by the slope of the cross-spectrum's phase."""
    n = len(given)
    window = np.hanning(n)
    a, b = np.fft.rfft(given * window), np.fft.rfft(got * window)
    hertz = np.arange(len(a)) * rate / n
    use = (hertz > low) & (hertz < high)
    cross = b[use] * np.conj(a[use] * h_of(hertz[use]))
    phase = np.angle(cross)
    w = 2 * np.pi * hertz[use] / rate
    weight = np.abs(cross)
    return -float(np.sum(weight * w * phase) / np.sum(weight * w * w))


def noise(rate, seconds, rng):
    """Noise between 50 Hz and 18 kHz that fades in and out."""
    n = int(seconds * rate)
    spectrum = np.fft.rfft(rng.standard_normal(n))
    hertz = np.arange(len(spectrum)) * rate / n
    spectrum[(hertz < 50) | (hertz > 18e3)] = 0
    wave = np.fft.irfft(spectrum, n)
    return 0.5 * wave / np.max(np.abs(wave)) * np.sin(np.pi * np.arange(n) / n) ** 2


class AlignTest(unittest.TestCase):
    def test_held_and_turning_clips_line_up(self):
        worst = (0.0, "")
        rng = np.random.default_rng(11)
        with tempfile.TemporaryDirectory() as folder:
            folder = pathlib.Path(folder)
            for rate in render_check.RATES:
                take = noise(rate, 0.5, rng).astype(np.float32).astype(float)
                sound.write_wav(folder / "take.wav", take, rate)
                for name, text in (("plain", PLAIN), ("coil", COIL)):
                    model = Hookup(text)
                    file = folder / f"{name}.hookup.toml"
                    file.write_text(text, encoding="utf-8")
                    for dial, words in ((10, ("--dial", "10")), (5, ("--dial", "5")), (10, ("--turn", "0:10,1:10")),
                                        (5, ("--turn", "0:5,1:5"))):
                        out, clips = render_check.render(folder, folder / "take.wav", file, *words)
                        samples, got_rate = sound.read_wav(out / clips[0]["file"])
                        self.assertEqual(got_rate, rate)
                        self.assertEqual(samples.shape, (len(take), 1))
                        circuit = model.circuit(dial)
                        off = delay_samples(take, samples[:, 0], rate, lambda f, c=circuit: nodal.transfer(c, f))
                        where = f"{name}, {rate} Hz, {' '.join(words)}"
                        worst = max(worst, (abs(off), where))
                        self.assertLess(abs(off), BOUND_SAMPLES, where)
        print(f"alignment: worst {worst[0]:.5f} samples ({worst[1]})")

    def test_the_measure_sees_a_hundredth_of_a_sample(self):
        rng = np.random.default_rng(3)
        take = noise(48000, 0.5, rng)
        hertz = np.fft.rfftfreq(len(take))
        late = np.fft.irfft(np.fft.rfft(take) * np.exp(-2j * np.pi * hertz * 0.02), len(take))
        self.assertAlmostEqual(delay_samples(take, late, 48000, lambda f: np.ones(len(f))), 0.02, delta=1e-4)


if __name__ == "__main__":
    unittest.main()
