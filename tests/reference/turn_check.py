"""Turning knob, as rendered, against an ngspice transient of the same circuit driven by the same analytic sum of sines.

The pot's sections are resistors whose value is an expression of time. The transient is run at two fixed steps; the finer
must change the result by less than -90 dB, and what the trapezoidal rule still owes (its error goes with the square of
the step) is taken out by extrapolating from the two.
"""

import concurrent.futures
import hashlib
import math
import os
import pathlib
import subprocess
import tempfile
import zlib

import numpy as np

import program
import render_check
import sound
import spice
import turn_cases
from hookup_model import Hookup

BOUND_DB = -80.0
HALVING_DB = -90.0
STEP_RATIO = 1.001
FLOOR_OHM = 1e-3
FADE_S = 0.02
SINES = 24
STEPS_PER_SAMPLE = (64, 128, 256)  # the last only where the first two differ by more than HALVING_DB


class Sines:
    """24 sines up to 18 kHz with random phases, faded in by sin^4; even in frequency or in its logarithm."""

    def __init__(self, seed, even):
        rng = np.random.default_rng(seed)
        hertz = np.linspace(18e3 / SINES, 18e3, SINES) if even else np.geomspace(60.0, 18e3, SINES)
        # Off the grid, so that nothing repeats within a turn; the highest stays where it is.
        self.hertz = hertz * np.append(1.0 - 0.03 * rng.random(SINES - 1), 1.0)
        self.phase = rng.uniform(0.0, 2.0 * np.pi, SINES)
        self.size = 0.9 / SINES

    def at(self, seconds):
        wave = sum(np.sin(2 * np.pi * f * seconds + p) for f, p in zip(self.hertz, self.phase)) * self.size
        return wave * np.where(seconds < FADE_S, np.sin(0.5 * np.pi * seconds / FADE_S) ** 4, 1.0)

    def expression(self):
        sines = "+".join(f"sin({2 * np.pi * f!r}*time+{p!r})" for f, p in zip(self.hertz.tolist(), self.phase.tolist()))
        edge = f"sin({0.5 * np.pi / FADE_S!r}*time)"
        return f"{self.size!r}*(time<{FADE_S!r}?{edge}*{edge}*{edge}*{edge}:1)*({sines})"


def corners(pot, turn):
    """(seconds, x) at every corner of x(t), the places included where the pot's law or its dead travel has a kink."""
    kinks = [pot.dial_at(x) for x, _ in (pot.law.corners or [(0.0, 0), (1.0, 1)])]
    found = []
    for (t0, d0), (t1, d1) in zip(turn, turn[1:]):
        found.append((t0, d0))
        inside = [(t0 + (k - d0) / (d1 - d0) * (t1 - t0), k) for k in kinks if d0 != d1 and min(d0, d1) < k < max(d0, d1)]
        found += sorted(inside)
    found += [turn[-1], (turn[-1][0] + 10.0, turn[-1][1])]
    return [(t, pot.electrical(d)) for t, d in found]


def section_expressions(pot, turn):
    """Ohm above and below the wiper as expressions of `time`."""
    points = corners(pot, turn)
    span = pot.total - 2.0 * pot.end

    def table(values):
        return "pwl(time," + ",".join(f"{t!r},{v!r}" for (t, _), v in zip(points, values)) + ")"

    if pot.law.corners:
        below = [max(FLOOR_OHM, pot.end + pot.law.share(x) * span) for _, x in points]
        above = [max(FLOOR_OHM, pot.end + (1.0 - pot.law.share(x)) * span) for _, x in points]
        return table(above), table(below)
    x = table([v for _, v in points])
    # An exponential law: r = (b^x - 1)/(b - 1), or 1 - r(1 - x); b from its own mid-point.
    half = pot.law.share(0.5)
    m = min(half, 1.0 - half)
    log_b = 2.0 * math.log((1.0 - m) / m)
    size = span / math.expm1(log_b)
    low = max(FLOOR_OHM, pot.end)
    if half < 0.5:
        low_side = f"({size!r}*(exp({log_b!r}*{x})-1))"
    else:
        low_side = f"({span!r}-{size!r}*(exp({log_b!r}*(1-{x}))-1))"
    return f"{low!r}+{span!r}-{low_side}", f"{low!r}+{low_side}"


def deck(model, turn, sines, step_s, stop_s):
    circuit = model.circuit(5.0)
    above, below = section_expressions(model.volume, turn)
    lines = []
    for line in spice.elements(circuit):
        name, a, b, *value = line.split(" ", 3)
        expression = {"R_RA": above, "R_RB": below}.get(name)
        lines.append(f"{name} {a} {b} R='{expression}'" if expression else line)
    if sum("R='" in line for line in lines) != 2:
        raise ValueError("the pot's two sections are not both in the circuit")
    # Steps are given by the largest one allowed, not by the error estimate (trtol), so that both runs are regular.
    return "\n".join(["* turning knob", ".options reltol=1e-7 abstol=1e-12 vntol=1e-12 trtol=1e6 method=trap",
                      f"Bemf emf 0 V={sines.expression()}", *lines, ".control", "set filetype=binary",
                      f"save v({spice.node(circuit.output)})", f"tran {step_s!r} {stop_s!r} 0 {step_s!r} uic",
                      f"write out.raw v({spice.node(circuit.output)})", "quit", ".endc", ".end", ""])


def transient(text, folder, times):
    """Runs a deck and reads its output at `times` by cubic interpolation."""
    (folder / "turn.cir").write_text(text, encoding="utf-8")
    (folder / "out.raw").unlink(missing_ok=True)
    done = subprocess.run(["ngspice", "-b", "turn.cir"], cwd=folder, capture_output=True, text=True)
    raw = folder / "out.raw"
    if not raw.exists():
        raise RuntimeError(f"ngspice: {done.stdout[-1500:]}\n{done.stderr[-1500:]}")
    plot = spice.read_raw(raw.read_bytes())[0]
    raw.unlink()
    t = plot["time"].real
    v = next(a for name, a in plot.items() if name.startswith("v("))
    if t[-1] < times[-1]:
        raise RuntimeError(f"ngspice stopped at {t[-1]} s: {done.stdout[-1500:]}\n{done.stderr[-1500:]}")
    i = np.clip(np.searchsorted(t, times, side="right") - 1, 1, len(t) - 3)
    result = np.zeros(len(times))
    for j in range(-1, 3):  # Lagrange through four points
        weight = np.ones(len(times))
        for k in range(-1, 3):
            if k != j:
                weight *= (times - t[i + k]) / (t[i + j] - t[i + k])
        result += weight * v[i + j]
    return result


def rms(x):
    return float(np.sqrt(np.mean(np.square(x))))


def ratio_db(a, b):
    return 20.0 * math.log10(max(rms(a), 1e-300) / rms(b))


def reference(name, turn_name, rate):
    """(samples inside the turn, index of the first, change by halving in dB), kept in UNSOLDERED_REFERENCE_CACHE if set."""
    turn = turn_cases.TURNS[turn_name]
    sines = sines_of(name, turn_name)
    model = Hookup(turn_cases.text_of(name))
    first, last = int(math.ceil(turn[1][0] * rate)), int(math.floor(turn[-1][0] * rate))
    times = np.arange(first, last + 1) / rate
    coarse = fine = halving = None
    for steps in STEPS_PER_SAMPLE:
        text = deck(model, turn, sines, 1.0 / (rate * steps), turn[-1][0] + 4.0 / rate)
        coarse, fine = fine, kept_transient(text, times)
        if coarse is not None:
            halving = ratio_db(fine - coarse, fine)
            if halving < HALVING_DB:
                break
    return fine + (fine - coarse) / 3.0, first, halving


def kept_transient(text, times):
    cache = os.environ.get("UNSOLDERED_REFERENCE_CACHE")
    kept = pathlib.Path(cache) / (hashlib.sha256(text.encode()).hexdigest()[:32] + ".npy") if cache else None
    if kept and kept.exists():
        return np.load(kept)
    with tempfile.TemporaryDirectory() as folder:
        result = transient(text, pathlib.Path(folder), times)
    if kept:
        kept.parent.mkdir(parents=True, exist_ok=True)
        np.save(kept, result)
    return result


def sines_of(name, turn_name):
    # Half of the cases have their sines even in frequency: more treble than any music.
    number = zlib.crc32(f"{name}/{turn_name}".encode())
    return Sines(number, even=number % 2 == 0)


def rendered(name, turn_name, rate, folder):
    turn = turn_cases.TURNS[turn_name]
    n = np.arange(int(math.ceil((turn[-1][0] + 0.03) * rate)))
    take = sines_of(name, turn_name).at(n / rate)
    sound.write_wav(folder / "take.wav", take, rate)
    file = folder / "case.hookup.toml"
    file.write_text(turn_cases.text_of(name), encoding="utf-8")
    words = ",".join(f"{t:g}:{d:g}" for t, d in turn)
    out, clips = render_check.render(folder, folder / "take.wav", file, "--turn", words)
    samples, got_rate = sound.read_wav(out / clips[0]["file"])
    if len(clips) != 1 or got_rate != rate or samples.shape != (len(n), 1):
        raise AssertionError(f"{name}: {len(clips)} clips, {samples.shape} at {got_rate} Hz")
    return samples[:, 0]


def run_case(case):
    """(case, error dB, step ratio, halving dB) or (case, what went wrong)."""
    name, turn_name, rate = case
    with tempfile.TemporaryDirectory() as folder:
        clip = rendered(name, turn_name, rate, pathlib.Path(folder))
    due, first, halving = reference(name, turn_name, rate)
    got = clip[first:first + len(due)]
    steps = np.max(np.abs(np.diff(got))) / np.max(np.abs(np.diff(due)))
    return case, ratio_db(got - due, due), float(steps), halving


def check(test, name, cases):
    program.path()  # skips when there is none
    with concurrent.futures.ThreadPoolExecutor(2) as pool:
        results = list(pool.map(run_case, cases))
    print(f"{name}: {len(cases)} turns against ngspice transients at 1/{STEPS_PER_SAMPLE[0]} sample and finer")
    print(f"{'hookup':58} {'turn':18} {'rate':>6} {'error dB':>9} {'step ratio':>10} {'halving dB':>10}")
    for (hookup, turn, rate), error, steps, halving in results:
        print(f"{hookup:58} {turn:18} {rate:6d} {error:9.1f} {steps:10.5f} {halving:10.1f}")
    print(f"worst: error {max(r[1] for r in results):.1f} dB, step ratio {max(r[2] for r in results):.5f}, "
          f"halving {max(r[3] for r in results):.1f} dB")
    for case, error, steps, halving in results:
        with test.subTest(case=case):
            test.assertLess(halving, HALVING_DB, "the reference itself is not settled")
            test.assertLess(error, BOUND_DB)
            test.assertLessEqual(steps, STEP_RATIO)
