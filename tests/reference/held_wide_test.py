"""Held knob as rendered over eight hookups with second sources, further stages and second gangs; 44.1, 48 and 96 kHz.

Also circuits that rise with the square of the frequency, whose interpolation images weigh the most.
"""

import unittest

import render_wide_check

STEEP = {
    "piezo into a small coupling capacitor": """
[source]
kind = "piezo"
capacitance = "0.5 nF"
[volume]
resistance = "10k"
taper = "linear"
[load]
resistance = "10k"
coupling = "100 pF"
""",
    "piezo, buffer, coupling capacitor": """
[source]
kind = "piezo"
capacitance = "1 nF"
[volume]
resistance = "47k"
taper = "linear"
[[then]]
buffer = { input = "1M", output = "100", gain_db = 20 }
[load]
resistance = "10k"
coupling = "330 pF"
""",
}


class HeldWideTest(unittest.TestCase):
    def test_random_hookups(self):
        render_wide_check.check(self, "held render, wide, quick", range(8))

    def test_steep_high_passes(self):
        render_wide_check.check_texts(self, "held render, steep", STEEP)


if __name__ == "__main__":
    unittest.main()
