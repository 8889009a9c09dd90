"""Turning knobs of second sources, blends, further stages, second gangs and pairs of knobs against ngspice transients.

Eighteen knobs and ten pairs, three turns each, and 24 random hookups. About an hour on two cores.
"""

import pathlib
import sys
import unittest

sys.path.insert(0, str(pathlib.Path(__file__).resolve().parents[1] / "reference"))

import turn_wide_cases  # noqa: E402
import turn_wide_check  # noqa: E402


class TurnWideLong(unittest.TestCase):
    def test_every_case(self):
        turn_wide_check.check(self, "turning knobs, wide, full set", turn_wide_cases.every_case())

    def test_random_hookups(self):
        turn_wide_check.check(self, "turning knobs, random hookups", turn_wide_cases.random_cases())


if __name__ == "__main__":
    unittest.main()
