"""The reference held against itself: values, hookup reading and the numpy nodal analysis against ngspice."""

import random
import unittest

import numpy as np

import nodal
import random_hookups
import spice
from hookup_model import EMF, Hookup
from trade_values import parse, spell

HOOKUPS = 60


class ReferenceTest(unittest.TestCase):
    def test_every_spelling_reads_back(self):
        rng = random.Random(7)
        for _ in range(5000):
            unit, exponent = rng.choice((("ohm", rng.randint(-1, 5)), ("farad", rng.randint(-13, -8)), ("henry", rng.randint(-4, 0))))
            digits = rng.randint(1, 999)
            text = spell(rng, digits, exponent, unit)
            value = parse(text.strip('"') if text.startswith('"') else float(text), unit)
            self.assertAlmostEqual(value / float(f"{digits}e{exponent}"), 1.0, delta=1e-12, msg=text)

    def test_known_spellings(self):
        for text, unit, value in (("4k7", "ohm", 4700.0), ("2M2", "ohm", 2.2e6), ("0.022uF", "farad", 22e-9),
                                  ("22n", "farad", 22e-9), ("470 pF", "farad", 470e-12), ("2.4 H", "henry", 2.4),
                                  ("18 ft", "metre", 5.4864), ("500k", "ohm", 5e5), ("4R7", "ohm", 4.7)):
            self.assertAlmostEqual(parse(text, unit) / value, 1.0, delta=1e-12)

    def test_nodal_analysis_agrees_with_ngspice(self):
        circuits = []
        for seed in range(HOOKUPS):
            _, model = random_hookups.hookup(f"nodal {seed}")
            circuits += [model.circuit(d) for d in random_hookups.dials_of(f"nodal {seed}")]
        grid, spiced = spice.transfers(circuits)
        worst = worst_delay = 0.0
        for circuit, h in zip(circuits, spiced):
            mine, delay = nodal.transfer(circuit, grid, delay=True)
            seen = np.abs(h) > 1e-6
            if np.any(seen):
                worst = max(worst, float(np.max(np.abs(mine[seen] / h[seen] - 1.0))))
            if not circuit.silent and circuit.output != EMF:
                step = 1e-5
                near = [nodal.transfer(circuit, grid * (1 + s)) for s in (-step, step)]
                numeric = -np.angle(near[1][seen] / near[0][seen]) / (4 * np.pi * grid[seen] * step)
                bound = 1e-6 * (np.abs(numeric) + 1.0 / (2 * np.pi * grid[seen]))
                worst_delay = max(worst_delay, float(np.max(np.abs(delay[seen] - numeric) / bound, initial=0.0)))
        print(f"nodal against ngspice: {len(circuits)} circuits, worst relative {worst:.1e}; "
              f"group delay against differences, share of bound {worst_delay:.2f}")
        self.assertLess(worst, 1e-7)
        self.assertLess(worst_delay, 1.0)

    def test_noise_agrees_with_ngspice(self):
        circuits = [random_hookups.hookup(f"noise {s}")[1].circuit(7) for s in range(20)]
        worst = 0.0
        for circuit, volts in zip(circuits, spice.noise_volts(circuits)):
            if volts:
                worst = max(worst, abs(nodal.johnson_volts(circuit) / volts - 1.0))
        print(f"4kT Re Z against ngspice .noise: worst relative {worst:.1e}")
        self.assertLess(worst, 2e-4)

    def test_the_generator_reaches_every_block(self):
        texts = [random_hookups.hookup(s)[0] for s in range(200)]
        for word in ('kind = "pickup"', 'kind = "line"', 'kind = "piezo"', 'source_on = "wiper"', "measured_total", "sections",
                     "ideal reverse", "parallel_resistor", "series_resistor", "no_load = true", 'position = "output"',
                     " ft", "ft\"", "coupling", 'part = "pot"', 'part = "inductor"', "in_place_of", '"n2"', "dead_travel",
                     "end_resistance = 0\n"):
            self.assertTrue(any(word in t for t in texts), word)
        self.assertEqual(random_hookups.hookup(3)[0], random_hookups.hookup(3)[0])
        self.assertIsInstance(random_hookups.hookup(3)[1], Hookup)


if __name__ == "__main__":
    unittest.main()
