"""Turning knob as rendered against ngspice transients: twelve hookups, three turns each. About half an hour on two cores."""

import pathlib
import sys
import unittest

sys.path.insert(0, str(pathlib.Path(__file__).resolve().parents[1] / "reference"))

import turn_cases  # noqa: E402
import turn_check  # noqa: E402


class TurnRenderLong(unittest.TestCase):
    def test_every_hookup_and_turn(self):
        turn_check.check(self, "turning knob, full set", turn_cases.every_case())


if __name__ == "__main__":
    unittest.main()
