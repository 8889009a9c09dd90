"""`knob`'s noise_uv against ngspice .noise at 20 degrees Celsius, 20 Hz to 20 kHz, load included."""

import pathlib
import tempfile
import unittest

import program
import random_hookups
import spice

HOOKUPS = 40
BOUND = 1e-3


class NoiseTest(unittest.TestCase):
    def test_random_hookups(self):
        cases, circuits = [], []
        dials = [0.0, 2.5, 5.0, 7.5, 10.0]  # the marks of --steps 5
        for i in range(HOOKUPS):
            text, model = random_hookups.hookup(f"knob noise {i}", dials=dials)
            cases.append(text)
            circuits += [model.circuit(d) for d in dials]
        spiced = iter(spice.noise_volts(circuits))
        worst, where = 0.0, ""
        with tempfile.TemporaryDirectory() as folder:
            file = pathlib.Path(folder) / "case.hookup.toml"
            for i, text in enumerate(cases):
                file.write_text(text, encoding="utf-8")
                rows = program.knob(file, len(dials))
                self.assertEqual([r["dial"] for r in rows], dials)
                for row in rows:
                    volts = next(spiced)
                    if volts == 0.0:
                        self.assertEqual(row["noise_uv"], 0.0, f"hookup {i} dial {row['dial']}")
                        continue
                    self.assertIsNotNone(row["noise_uv"], f"hookup {i} dial {row['dial']}\n{text}")
                    off = abs(row["noise_uv"] * 1e-6 / volts - 1.0)
                    if off > worst:
                        worst, where = off, f"hookup {i} dial {row['dial']}"
                    self.assertLess(off, BOUND, f"hookup {i} dial {row['dial']}: {row['noise_uv']} uV, "
                                    f"ngspice {volts * 1e6:.6g} uV\n{text}")
        print(f"noise: {HOOKUPS} random hookups, {len(circuits)} marks against ngspice .noise: worst {worst:.2e} ({where})")


if __name__ == "__main__":
    unittest.main()
