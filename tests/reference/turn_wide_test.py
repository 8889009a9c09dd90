"""Turning knobs of a second source and of a further stage, two cases; turn_wide_all_test.py has more."""

import unittest

import turn_wide_cases
import turn_wide_check


class TurnWideTest(unittest.TestCase):
    def test_quick_turns(self):
        turn_wide_check.check(self, "turning knobs, wide, quick", turn_wide_cases.QUICK_CASES)


if __name__ == "__main__":
    unittest.main()
