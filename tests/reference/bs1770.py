"""Loudness and true peak in numpy and scipy alone, written from ITU-R BS.1770-4: nothing of the program's library.

The filter coefficients for 48 kHz are the standard's tables 1 and 2; those for 44.1 and 96 kHz are re-derived from the
same analogue prototype (tests/reference/loudness_test.py compares all three in their response).
"""

import numpy as np
import scipy.signal

SHELF = {
    48000: ((1.53512485958697, -2.69169618940638, 1.19839281085285), (1.0, -1.69065929318241, 0.73248077421585)),
    44100: ((1.53084123005035, -2.65097999515473, 1.16907907992159), (1.0, -1.66365511325602, 0.71259542807323)),
    96000: ((1.55971422897580, -2.92674157825108, 1.37826120231582), (1.0, -1.84460946989011, 0.85584332293064)),
}
HIGH_PASS = {
    48000: ((1.0, -2.0, 1.0), (1.0, -1.99004745483398, 0.99007225036621)),
    44100: ((1.0, -2.0, 1.0), (1.0, -1.98916967362980, 0.98919903578704)),
    96000: ((1.0, -2.0, 1.0), (1.0, -1.99501754472472, 0.99502375904092)),
}
WEIGHTS = {1: (1,), 2: (1, 1), 3: (1, 1, 1), 5: (1, 1, 1, 1.41, 1.41)}


def weighted(samples, rate):
    """K-weighted, frames by channels."""
    return scipy.signal.lfilter(*HIGH_PASS[rate], scipy.signal.lfilter(*SHELF[rate], samples, axis=0), axis=0)


def lufs(power):
    return -0.691 + 10 * np.log10(power) if power > 0 else -np.inf


def integrated(samples, rate):
    """LUFS with both gates; under 3 s of the whole, ungated."""
    samples = samples[:, None] if samples.ndim == 1 else samples
    power = weighted(samples, rate)**2 @ np.array(WEIGHTS[samples.shape[1]], float)
    if len(power) < 3 * rate:
        return lufs(np.mean(power))
    running = np.concatenate(([0.0], np.cumsum(power)))
    starts = np.arange(0, len(power) - 4 * (rate // 10) + 1, rate // 10)
    blocks = (running[starts + 4 * (rate // 10)] - running[starts]) / (4 * (rate // 10))
    blocks = blocks[blocks > 10**((-70 + 0.691) / 10)]
    if not len(blocks):
        return -np.inf
    return lufs(np.mean(blocks[blocks > np.mean(blocks) / 10]))


def true_peak_db(samples):
    """dBTP of the band-limited signal, sixteen times finer than the samples."""
    samples = samples[:, None] if samples.ndim == 1 else samples
    padded = np.pad(samples, ((256, 256), (0, 0)))
    fine = scipy.signal.resample_poly(padded, 16, 1, axis=0, window=("kaiser", 12.0))
    return 20 * np.log10(np.max(np.abs(fine)))
