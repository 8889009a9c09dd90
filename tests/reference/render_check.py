"""Held knob, as rendered: the transfer measured on clips against the circuit, shared by the quick and the full test.

The take is a sum of sines, each periodic in the measured stretch, that has been running long enough for every time
constant of the circuit to have died away; the last stretch is compared bin by bin. Clips have their latency removed.
"""

import pathlib
import tempfile

import numpy as np

import nodal
import program
import random_hookups
import sound
import spice

BOUND_DB, BOUND_DEG = 1e-2, 0.1
QUIET, LEFT_OUT, QUIET_BOUND = 1e-4, 1e-5, 1e-6  # -80, -100, -120 dB re emf
DIALS = (10, 9.5, 7, 5, 2, 0.5)
RATES = (44100, 48000, 88200, 96000, 192000)
LONGEST_SETTLING_S = 1.6


def settling_s(model, dials):
    """Seconds until what the start of the take set off is down by 180 dB, at the slowest of the dials."""
    return 20.7 * max(nodal.slowest_seconds(model.circuit(d)) for d in dials)


def settles(model, dials=DIALS):
    return settling_s(model, dials) < LONGEST_SETTLING_S


def multisine(rate, settle_s, rng, sines=60, share=slice(None)):
    """(take, bins, length of the last stretch, its start). Fades in over the first 20 ms, ends on a whole period.

    `share`: which of the sines, where channels of one take are to be told apart."""
    period = int(round(0.2 * rate))
    top = min(20e3, 0.45 * rate)
    bins = np.unique(np.round(np.geomspace(20.0, top, sines) * period / rate).astype(int))
    bins = bins[bins * rate / period <= top][share]
    n = np.arange(period)
    wave = sum(np.cos(2 * np.pi * (k * n / period) + rng.uniform(0, 2 * np.pi)) for k in bins)
    wave *= 0.9 / np.max(np.abs(wave))
    lead = int(np.ceil(settle_s * rate)) + period // 4
    repeats = -(-lead // period) + 1
    take = np.tile(wave, repeats)
    fade = int(0.02 * rate)
    take[:fade] *= np.sin(0.5 * np.pi * np.arange(fade) / fade) ** 4
    # The filter looks ahead: another half period follows the stretch that is measured.
    return np.concatenate([take, wave[: period // 2]]), bins, period, (repeats - 1) * period


def render(folder, take, hookup_file, *words):
    """{cell of clips.csv: samples} of one render call."""
    out = folder / "clips"
    text = program.call("render", take, "--hookup", hookup_file, *words, "--out", out, "--depth", "float", "--force")
    return out, program.table(text, program.CLIPS)


def measure(folder, text, model, rate, seed, dials=DIALS):
    """[(dial, hertz, measured H, true H)] for one hookup at one rate."""
    rng = np.random.default_rng(seed)
    take, bins, period, start = multisine(rate, settling_s(model, dials), rng)
    take = take.astype(np.float32).astype(float)
    sound.write_wav(folder / "take.wav", take, rate)
    file = folder / "case.hookup.toml"
    file.write_text(text, encoding="utf-8")
    out, clips = render(folder, folder / "take.wav", file, "--dial", ",".join(f"{d:g}" for d in dials))
    if len(clips) != len(dials):
        raise AssertionError(f"{len(clips)} clips for {len(dials)} dials")
    given = np.fft.rfft(take[start:start + period])[bins]
    hertz = bins * rate / period
    answers = []
    for dial, clip in zip(dials, clips):
        if abs(float(clip["dial"]) - dial) > 1e-9 or float(clip["gain_db"]) != 0.0:
            raise AssertionError(f"clip {clip} where dial {dial} without gain was due")
        samples, got_rate = sound.read_wav(out / clip["file"])
        if got_rate != rate or samples.shape != (len(take), 1):
            raise AssertionError(f"{clip['file']}: {samples.shape} at {got_rate} Hz for a take of {len(take)} at {rate} Hz")
        got = np.fft.rfft(samples[start:start + period, 0])[bins]
        answers.append((dial, hertz, got / given, nodal.transfer(model.circuit(dial), hertz)))
    return answers


class Tally:
    """The worst deviations seen and those outside the bounds."""

    def __init__(self):
        self.worst = {"db": (0.0, ""), "deg": (0.0, ""), "quiet": (0.0, ""), "points": 0, "clips": 0}
        self.failures = []

    def note(self, what, value, bound, where):
        if value > self.worst[what][0]:
            self.worst[what] = (value, where)
        if not value <= bound:
            self.failures.append(f"{where}: {what} {value:.3g} (at most {bound})")

    def clip(self, where, hertz, got, due):
        """One channel of one clip: measured against true transfer, bin by bin."""
        self.worst["clips"] += 1
        for f, g, h in zip(hertz, got, due):
            at = f"{where}, {f:.0f} Hz, {nodal.decibel(h):.1f} dB"
            if abs(h) < LEFT_OUT:
                continue
            self.worst["points"] += 1
            if abs(h) < QUIET:
                self.note("quiet", abs(g - h), QUIET_BOUND, at)
                continue
            self.note("db", abs(nodal.decibel(g) - nodal.decibel(h)), BOUND_DB, at)
            self.note("deg", abs(np.degrees(np.angle(g / h))), BOUND_DEG, at)


def nodal_against_ngspice(circuits):
    """The nodal analysis used here is the one ngspice makes: worst relative difference."""
    grid, spiced = spice.transfers(circuits)
    return max(np.max(np.abs(nodal.transfer(c, grid)[np.abs(h) > 1e-7] / h[np.abs(h) > 1e-7] - 1), initial=0.0)
               for c, h in zip(circuits, spiced))


def compare(seeds, rates=RATES, dials=DIALS):
    """Returns (worst, failures)."""
    tally = Tally()

    circuits = []
    cases = []
    for seed in seeds:
        text, model = random_hookups.hookup(f"held {seed}", dials=dials, accept=lambda m: settles(m, dials))
        cases.append((seed, text, model))
        circuits += [model.circuit(d) for d in dials]
    tally.worst["nodal"] = nodal_against_ngspice(circuits)
    with tempfile.TemporaryDirectory() as folder:
        for seed, text, model in cases:
            for rate in rates:
                try:
                    answers = measure(pathlib.Path(folder), text, model, rate, seed_number(seed), dials)
                except AssertionError as error:
                    tally.failures.append(f"held {seed} at {rate} Hz: {error}\n{text}")
                    continue
                for dial, hertz, got, due in answers:
                    tally.clip(f"held {seed}, {rate} Hz, dial {dial}", hertz, got, due)
    return tally.worst, tally.failures


def seed_number(seed):
    import zlib
    return zlib.crc32(str(seed).encode())


def check(test, name, seeds, rates=RATES):
    worst, failures = compare(seeds, rates)
    report(test, name, f"{len(seeds)} random hookups, dials {DIALS}, rates {rates}", worst, failures,
           50 * len(seeds) * len(rates))


def report(test, name, what, worst, failures, least_points):
    print(f"{name}: {what}, {worst['clips']} clips, {worst['points']} "
          f"points: worst {worst['db'][0]:.4f} dB ({worst['db'][1]}), {worst['deg'][0]:.4f} degrees ({worst['deg'][1]}), "
          f"below -80 dB {nodal.decibel(worst['quiet'][0]):.1f} dB re emf ({worst['quiet'][1]}); "
          f"own nodal analysis against ngspice {worst['nodal']:.1e}")
    test.assertLess(worst["nodal"], 1e-6)
    test.assertGreater(worst["points"], least_points)
    test.assertEqual(len(failures), 0, f"{len(failures)} points outside:\n" + "\n".join(failures[:25]))
