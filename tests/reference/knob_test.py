"""Every column of `knob` over written and random hookups with one source; see knob_check.py."""

import unittest

import numpy as np

import knob_check
import random_hookups
from hookup_model import Hookup

WRITTEN = {
    "single coil, audio, 5 m": """
[source]
kind = "pickup"
inductance = "2.4 H"
resistance = "6k2"
capacitance = "110 pF"
loss_resistance = "300k"
[volume]
resistance = "500k"
taper = "audio 15%"
dead_travel = [15, 15]
end_resistance = "50"
[tone]
resistance = "500k"
taper = "audio 15%"
capacitor = "22n"
dial = 7
[cable]
length = "5 m"
capacitance_per_metre = "100 pF"
[load]
resistance = "1M"
capacitance = "20 pF"
""",
    "treble bleed, no end resistance": """
[source]
kind = "pickup"
inductance = "4.5 H"
resistance = "8k"
capacitance = "100 pF"
loss_resistance = "none"
[volume]
resistance = "500k"
taper = "ideal audio 10%"
[treble_bleed]
capacitor = "1n"
parallel_resistor = "150k"
[cable]
capacitance = "680 pF"
[load]
resistance = "220k"
coupling = "22n"
""",
    "line, 100 ohm into 10k": """
[source]
kind = "line"
resistance = "100"
[volume]
resistance = "10k"
taper = "audio 15%"
[cable]
capacitance = "470 pF"
[load]
resistance = "47k"
""",
    "line, nothing but resistors": """
[source]
kind = "line"
resistance = 0
[volume]
resistance = "100k"
taper = "linear"
end_resistance = "20"
[load]
resistance = "100k"
""",
    "source on the wiper": """
[source]
kind = "pickup"
inductance = "2.5 H"
resistance = "6k"
capacitance = "120 pF"
loss_resistance = "400k"
[volume]
resistance = "250k"
taper = "linear"
source_on = "wiper"
[cable]
length = "18 ft"
capacitance_per_metre = "90 pF"
[load]
resistance = "1M"
""",
    "piezo": """
[source]
kind = "piezo"
capacitance = "1.2 nF"
leak_resistance = "50M"
[volume]
resistance = "1M"
taper = "audio 20%"
[cable]
length = "3 m"
capacitance_per_metre = "100 pF"
[load]
resistance = "1M"
capacitance = "20 pF"
""",
    "own bands": """
[source]
kind = "pickup"
inductance = "3.1 H"
resistance = "7k"
capacitance = "90 pF"
loss_resistance = "500k"
[volume]
resistance = "500k"
taper = "reverse audio 15%"
[cable]
length = "6 m"
capacitance_per_metre = "110 pF"
[load]
resistance = "1M"
[listening]
treble_band = [3000, 8000]
body_band = [150, 600]
""",
}


class KnobTest(unittest.TestCase):
    def test_every_column(self):
        worst = {}
        marks = np.linspace(0, 10, knob_check.STEPS)
        cases = [(name, 'title = "Written"\n' + text) for name, text in WRITTEN.items()]
        cases += [(f"random {i}", random_hookups.hookup(f"knob {i}", extras=i >= 4, dials=marks)[0]) for i in range(8)]
        for name, text in cases:
            with self.subTest(name=name):
                knob_check.check_marks(self, name, text, Hookup(text), worst)
        knob_check.report("knob", len(cases), worst)


if __name__ == "__main__":
    unittest.main()
