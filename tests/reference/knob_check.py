"""Every column of `knob` against a nodal analysis that the same run holds to ngspice, and .noise for noise_uv.

knob_test.py and knob_wide_test.py bring the hookups.
"""

import pathlib
import tempfile

import numpy as np

import nodal
import program
import spice

STEPS = 41
# Levels 0.001 dB; differences of two levels twice that; frequencies, resistances relative.
BOUNDS = {"degrees": 1e-6, "element_fraction": 1e-8, "level_db": 1e-3, "treble_lost_db": 2e-3, "treble_5k_1k_db": 2e-3,
          "corner_hz": 1e-4, "peak_db": 1e-3, "output_ohm": 1e-4, "noise_uv": 1e-3}
# A maximum that stands out less than this from its surroundings may be found or not.
FLAT_DB = 1e-4


def bands(model):
    treble, body = ((5e3, 15e3) if model.kind == "line" else (2e3, 5e3)), (200.0, 800.0)
    listening = model.data.get("listening", {})
    return listening.get("treble_band", treble), listening.get("body_band", body)


def tilt(circuit, treble, body):
    return nodal.mean_power_db(circuit, *treble) - nodal.mean_power_db(circuit, *body)


def peak_due(circuit):
    """(hertz, dB, how far it stands out) of the highest local maximum inside 20 Hz to 100 kHz, or None."""
    found = nodal.peaks(circuit)
    if not found:
        return None
    hertz, level = found[0]
    grid = np.geomspace(20.0, 1e5, 4001)
    line = nodal.decibel(nodal.transfer(circuit, grid))
    out = min(level - np.min(line[grid < hertz], initial=level), level - np.min(line[grid > hertz], initial=level))
    return hertz, level, out


def check_marks(test, name, text, model, worst):
    """All marks of one hookup; `model` says which gang."""
    with tempfile.TemporaryDirectory() as folder:
        file = pathlib.Path(folder) / "case.hookup.toml"
        file.write_text(text, encoding="utf-8")
        rows = program.knob(file, STEPS, *(("--right",) if model.right else ()))
    test.assertEqual(len(rows), STEPS)
    circuits = [model.circuit(d) for d in np.linspace(0, 10, STEPS)]
    grid, spiced = spice.transfers(circuits, per_decade=40)
    for circuit, h in zip(circuits, spiced):  # the analysis below is the one ngspice makes
        own, seen = nodal.transfer(circuit, grid), np.abs(h) > 1e-7
        test.assertLess(np.max(np.abs(own[seen] / h[seen] - 1.0), initial=0.0), 1e-6, name)
    noise = spice.noise_volts(circuits)
    treble, body = bands(model)
    top = None if circuits[-1].silent else tilt(circuits[-1], treble, body)
    for i, (row, circuit) in enumerate(zip(rows, circuits)):
        dial = 10.0 * i / (STEPS - 1)
        where = f"{name}, dial {dial}: {row}"

        def same(column, due, relative=False, floor=0.0):
            test.assertIsNotNone(row[column], f"{column} empty, {due} was due; {where}")
            off = abs(row[column] - due)
            off = off / max(abs(due), floor) if relative and off else off
            if off > worst.get(column, (0.0,))[0]:
                worst[column] = (off, f"{name}, dial {dial}")
            test.assertLessEqual(off, BOUNDS[column], f"{column}: {due} was due; {where}")

        test.assertAlmostEqual(row["dial"], dial, delta=1e-9)
        same("degrees", model.volume.travel * dial / 10.0)
        same("element_fraction", model.volume.below(dial) / model.volume.total)
        bare = model.bare_circuit(dial)
        if bare is not None:
            same("output_ohm", float(np.abs(nodal.impedance(bare, 1e3))[0]), relative=True, floor=1e-3)
        if noise[i] > 0.0:
            same("noise_uv", noise[i] * 1e6, relative=True)
        else:
            test.assertEqual(row["noise_uv"], 0.0, where)
        if circuit.silent or abs(nodal.transfer(circuit, 1e3)[0]) == 0.0:
            test.assertEqual(row["level_db"], -np.inf, where)
            for column in ("treble_lost_db", "treble_5k_1k_db", "corner_hz", "peak_hz", "peak_db"):
                test.assertIsNone(row[column], f"{column} of silence; {where}")
            continue
        level = nodal.decibel(nodal.transfer(circuit, [1e3, 5e3]))
        same("level_db", level[0])
        same("treble_5k_1k_db", level[1] - level[0])
        if top is None:  # nothing at 10 to compare with
            test.assertIsNone(row["treble_lost_db"], where)
        else:
            same("treble_lost_db", top - tilt(circuit, treble, body))
        corner = nodal.corner_hz(circuit)
        if corner is None:
            test.assertIsNone(row["corner_hz"], where)
        else:
            same("corner_hz", corner, relative=True)
        peak = peak_due(circuit) if not spice.driven_outright(circuit) else None
        test.assertEqual(row["peak_hz"] is None, row["peak_db"] is None, where)
        if peak is None or peak[2] < FLAT_DB:
            if row["peak_hz"] is not None and peak is None:
                test.fail(f"a peak where there is none; {where}")
            continue
        same("peak_db", peak[1])
        # A flat top has no sharp place: the level at the stated frequency must be the highest there is.
        at_stated = float(nodal.decibel(nodal.transfer(circuit, row["peak_hz"]))[0])
        test.assertGreater(at_stated, peak[1] - 1e-5, f"peak at {peak[0]} Hz was due; {where}")
        worst["peak_hz"] = max(worst.get("peak_hz", (0.0, "")), (abs(row["peak_hz"] / peak[0] - 1), f"{name}, dial {dial}"))


def report(name, count, worst):
    shown = ", ".join(f"{k} {v[0]:.1e} ({v[1]})" for k, v in sorted(worst.items()))
    print(f"{name}: {count} tables of {STEPS} marks, worst: {shown}")
