"""`knob`'s noise_uv against ngspice .noise at 20 degrees Celsius, 20 Hz to 20 kHz, load included."""

import pathlib
import tempfile

import program
import random_hookups
import spice

BOUND = 1e-3
DIALS = [0.0, 2.5, 5.0, 7.5, 10.0]  # the marks of --steps 5


def check(test, name, seeds, family=random_hookups):
    cases = [family.hookup(seed, dials=DIALS) for seed in seeds]
    circuits = [model.circuit(d) for _, model in cases for d in DIALS]
    spiced = iter(spice.noise_volts(circuits))
    worst, where = 0.0, ""
    with tempfile.TemporaryDirectory() as folder:
        file = pathlib.Path(folder) / "case.hookup.toml"
        for seed, (text, _) in zip(seeds, cases):
            file.write_text(text, encoding="utf-8")
            rows = program.knob(file, len(DIALS))
            test.assertEqual([r["dial"] for r in rows], DIALS)
            for row in rows:
                volts, at = next(spiced), f"{seed} dial {row['dial']}"
                if volts == 0.0:
                    test.assertEqual(row["noise_uv"], 0.0, at)
                    continue
                test.assertIsNotNone(row["noise_uv"], f"{at}\n{text}")
                off = abs(row["noise_uv"] * 1e-6 / volts - 1.0)
                if off > worst:
                    worst, where = off, at
                test.assertLess(off, BOUND, f"{at}: {row['noise_uv']} uV, ngspice {volts * 1e6:.6g} uV\n{text}")
    print(f"{name}: {len(seeds)} random hookups, {len(circuits)} marks against ngspice .noise: worst {worst:.2e} ({where})")
