# check: slow
"""Turning knob as rendered against ngspice transients, ten cases; tests/long/turn_render_long.py has them all."""

import unittest

import turn_cases
import turn_check


class TurnRenderTest(unittest.TestCase):
    def test_short_turns(self):
        turn_check.check(self, "turning knob, short set", turn_cases.SHORT_CASES)


if __name__ == "__main__":
    unittest.main()
