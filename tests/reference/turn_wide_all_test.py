# check: slow
"""Turning knobs of second sources, blends, stages and second gangs, nine cases; tests/long/turn_wide_long.py has all."""

import unittest

import turn_wide_cases
import turn_wide_check


class TurnWideAllTest(unittest.TestCase):
    def test_short_turns(self):
        turn_wide_check.check(self, "turning knobs, wide, short set", turn_wide_cases.SHORT_CASES)


if __name__ == "__main__":
    unittest.main()
