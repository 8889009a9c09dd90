"""The reference with second sources, stages and buffers held against itself: ngspice, and circuits known by hand."""

import math
import unittest

import numpy as np

import nodal
import spice
import wide_hookups
from hookup_model import Hookup

HOOKUPS = 60

IDEAL = """[source]
kind = "line"
resistance = {first}
[volume]
resistance = "100M"
taper = "linear"
[second.source]
kind = "line"
resistance = {second}
{more}
[load]
resistance = "1000M"
"""


def level(text, drive="first", dial=10, right=False):
    return complex(nodal.transfer(Hookup(text, right).circuit(dial, drive=drive), 1e3)[0])


class ReferenceWideTest(unittest.TestCase):
    def test_nodal_analysis_agrees_with_ngspice(self):
        circuits = []
        for seed in range(HOOKUPS):
            text, model = wide_hookups.hookup(f"nodal {seed}")
            for right in (False, True):
                for drive in ("first", "second") if "second" in model.data else ("first",):
                    circuits += [Hookup(text, right).circuit(d, drive=drive) for d in (0, 3.3, 10)]
        grid, spiced = spice.transfers(circuits)
        worst = worst_delay = 0.0
        for circuit, h in zip(circuits, spiced):
            mine, delay = nodal.transfer(circuit, grid, delay=True)
            seen = np.abs(h) > 1e-6
            worst = max(worst, float(np.max(np.abs(mine[seen] / h[seen] - 1.0), initial=0.0)))
            if not circuit.silent and not spice.driven_outright(circuit):
                seen = np.abs(h) > 1e-4  # below, differences of phase are rounding

                def slope(step):
                    near = [nodal.transfer(circuit, grid * (1 + s)) for s in (-step, step)]
                    return -np.angle(near[1][seen] / near[0][seen]) / (4 * np.pi * grid[seen] * step)

                numeric = (4.0 * slope(3e-5) - slope(6e-5)) / 3.0
                bound = 1e-6 * (np.abs(numeric) + 1.0 / (2 * np.pi * grid[seen]))
                worst_delay = max(worst_delay, float(np.max(np.abs(delay[seen] - numeric) / bound, initial=0.0)))
        print(f"nodal against ngspice, wide: {len(circuits)} circuits, worst relative {worst:.1e}; "
              f"group delay against differences, share of bound {worst_delay:.2f}")
        self.assertLess(worst, 1e-6)
        self.assertLess(worst_delay, 1.0)

    def test_noise_agrees_with_ngspice(self):
        circuits = [wide_hookups.hookup(f"noise {s}")[1].circuit(7) for s in range(20)]
        worst = 0.0
        for circuit, volts in zip(circuits, spice.noise_volts(circuits)):
            if volts:
                worst = max(worst, abs(nodal.johnson_volts(circuit) / volts - 1.0))
        print(f"4kT/R through every resistor's own way against ngspice .noise, wide: worst relative {worst:.1e}")
        self.assertLess(worst, 2e-4)

    def test_the_generator_reaches_every_block(self):
        texts = [wide_hookups.hookup(s)[0] for s in range(300)]
        for word in wide_hookups.FEATURES:
            self.assertTrue(any(word in t for t in texts), word)
        self.assertEqual(wide_hookups.hookup(3)[0], wide_hookups.hookup(3)[0])

    # By hand: two generators of 1k and 3k.

    def test_parallel_sources_divide(self):
        text = IDEAL.format(first=1000, second=3000, more="")
        self.assertAlmostEqual(level(text), 0.75, delta=1e-4)
        self.assertAlmostEqual(level(text, "second"), 0.25, delta=1e-4)

    def test_series_sources_add_and_out_of_phase_is_reversed(self):
        text = IDEAL.format(first=1000, second=3000, more='[selector]\njoined = "series"\nphase = "out"')
        self.assertAlmostEqual(level(text), 1.0, delta=1e-4)
        self.assertAlmostEqual(level(text, "second"), -1.0, delta=1e-4)

    def test_one_source_alone(self):
        for use, first, second in (("first", 1.0, 0.0), ("second", 0.0, 1.0)):
            text = IDEAL.format(first=1000, second=3000, more=f'[selector]\nuse = "{use}"')
            self.assertAlmostEqual(level(text), first, delta=1e-4)
            self.assertAlmostEqual(level(text, "second"), second, delta=1e-4)

    def test_gains_of_the_two_gang_blend(self):
        # Each pickup on a wiper, its level the share of the pot below it as the other pickup's gang loads it; the pot is
        # far above the sources, so the join at `output` is two tracks in series with the sources.
        for dial, first in ((0, 1.0), (5, 0.5), (10, 0.0)):
            more = f'[blend]\nlaw = "MN"\nresistance = "1M"\ndial = {dial}'
            text = IDEAL.format(first=1, second=1, more=more)
            self.assertAlmostEqual(level(text), first, delta=2e-3, msg=f"dial {dial}")
            self.assertAlmostEqual(level(text, "second"), 1.0 - first, delta=2e-3, msg=f"dial {dial}")

    def test_gains_of_the_linear_blend(self):
        for dial in (0, 2, 5, 10):
            more = f'[blend]\nlaw = "linear"\nresistance = "1M"\ndial = {dial}'
            text = IDEAL.format(first=1, second=1, more=more)
            self.assertAlmostEqual(level(text), 1.0 - dial / 10.0, delta=2e-3, msg=f"dial {dial}")

    def test_a_buffer_does_not_load_backwards(self):
        text = """[source]
kind = "line"
resistance = "1k"
[volume]
resistance = "100M"
taper = "linear"
[[then]]
buffer = { input = "3k", output = "500", gain_db = 6 }
[load]
resistance = "1500"
"""
        self.assertAlmostEqual(level(text), 0.75 * 10 ** 0.3 * 0.75, delta=1e-4)
        circuit = Hookup(text).circuit(10)
        volts = nodal.johnson_volts(circuit)
        boltzmann, kelvin, band = 1.380649e-23, 293.15, 19980.0
        through = (0.75 * 10 ** 0.3) ** 2 * 750.0  # 1k and 3k in parallel at the buffer's input
        own = 375.0  # 500 and 1500 in parallel
        self.assertAlmostEqual(volts / math.sqrt(4 * boltzmann * kelvin * band * (through + own)), 1.0, delta=1e-4)

    def test_the_second_gang(self):
        text = """[source]
kind = "line"
resistance = "0"
[volume]
resistance = "100k"
taper = "linear"
right = { taper = "audio 10%" }
[load]
resistance = "1000M"
"""
        self.assertAlmostEqual(level(text, dial=5), 0.5, delta=1e-4)
        self.assertAlmostEqual(level(text, dial=5, right=True), 0.1, delta=1e-4)


if __name__ == "__main__":
    unittest.main()
