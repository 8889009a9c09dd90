"""`response` over many random hookups against ngspice AC; response_test.py runs it small, response_all_test.py in full."""

import pathlib
import tempfile

import numpy as np

import nodal
import program
import random_hookups
import spice
from hookup_model import Hookup

LEVEL_BOUND_DB = 1e-3
PHASE_BOUND_DEG = 1e-2
FLOOR = 1e-6  # -120 dB re emf
# Group delay is given with nine digits; it is held to a part in 10^5 of itself or of a radian at that frequency.
DELAY_BOUND = 1e-5


def compare(seeds, dials=4, extras=True, family=random_hookups):
    """One program call a hookup (two with a stereo gang), one ngspice process for all. Returns (worst deviations, failures).

    `family`: the module that draws the hookups."""
    cases = []
    for seed in seeds:
        chosen = random_hookups.dials_of(seed, dials)
        text, model = family.hookup(seed, extras=extras, dials=chosen)
        cases.append((seed, text, (), [(d, model.circuit(d)) for d in chosen]))
        if "right = {" in text:
            model = Hookup(text, right=True)
            cases.append((f"{seed} right", text, ("--right",), [(d, model.circuit(d)) for d in chosen]))
    grid, spiced = spice.transfers([c for *_, marks in cases for _, c in marks])
    spiced = iter(spiced)
    worst = {"level_db": (0.0, ""), "phase_deg": (0.0, ""), "delay": (0.0, ""), "points": 0, "hookups": len(cases),
             "nodal": 0.0}
    failures = []

    def note(what, value, bound, where):
        if value > worst[what][0]:
            worst[what] = (value, where)
        if not value <= bound:
            failures.append(f"{where}: {what} off by {value:.3g}")

    with tempfile.TemporaryDirectory() as folder:
        for seed, text, words, marks in cases:
            file = pathlib.Path(folder) / "case.hookup.toml"
            file.write_text(text, encoding="utf-8")
            reference = [next(spiced) for _ in marks]
            try:
                answers = program.response(file, [d for d, _ in marks], grid, *words)
            except AssertionError as error:
                failures.append(f"seed {seed}: {error}\n{text}")
                continue
            for (dial, circuit), h in zip(marks, reference):
                own, delay = nodal.transfer(circuit, grid, delay=True)
                for i, row in enumerate(answers[dial]):
                    where = f"seed {seed} dial {dial} {grid[i]:.6g} Hz"
                    size = abs(h[i])
                    if circuit.silent:
                        if row["level_db"] != -np.inf:
                            failures.append(f"{where}: level {row['level_db']} of a shorted output is not -inf")
                        continue
                    if size < FLOOR:
                        # Too small to hold to a part in 10^4; it must still be small.
                        if row["level_db"] is None or row["level_db"] > nodal.decibel(FLOOR) + 0.01:
                            failures.append(f"{where}: level {row['level_db']} where ngspice has {nodal.decibel(size):.2f}")
                        continue
                    if any(row[k] is None or not np.isfinite(row[k]) for k in ("level_db", "phase_deg", "group_delay_us")):
                        failures.append(f"{where}: {row} where ngspice has {nodal.decibel(size):.2f} dB")
                        continue
                    worst["points"] += 1
                    worst["nodal"] = max(worst["nodal"], abs(own[i] / h[i] - 1.0))
                    note("level_db", abs(row["level_db"] - nodal.decibel(h[i])), LEVEL_BOUND_DB, where)
                    turn = (row["phase_deg"] - np.degrees(np.angle(h[i])) + 180.0) % 360.0 - 180.0
                    note("phase_deg", abs(turn), PHASE_BOUND_DEG, where)
                    scale = abs(delay[i]) + 1.0 / (2.0 * np.pi * grid[i])
                    note("delay", abs(row["group_delay_us"] * 1e-6 - delay[i]) / scale, DELAY_BOUND, where)
    return worst, failures


def report(name, worst):
    print(f"{name}: {worst['hookups']} random hookups, {worst['points']} points 20 Hz to 1.2 MHz against ngspice AC: "
          f"worst {worst['level_db'][0]:.2e} dB ({worst['level_db'][1]}), {worst['phase_deg'][0]:.2e} degrees "
          f"({worst['phase_deg'][1]}), group delay {worst['delay'][0]:.1e} of itself or a radian ({worst['delay'][1]}); "
          f"own nodal analysis against ngspice {worst['nodal']:.1e}")


def check(test, name, seeds, extras=True, family=random_hookups):
    worst, failures = compare(seeds, extras=extras, family=family)
    report(name, worst)
    test.assertGreater(worst["points"], 20 * len(seeds))
    test.assertLess(worst["nodal"], 1e-6)  # the delay reference is the same circuit ngspice solved
    test.assertEqual(len(failures), 0, "\n".join(failures[:20]))
