# check: slow
"""Held knob as rendered over 64 hookups with second sources, further stages and second gangs; 44.1, 48 and 96 kHz."""

import unittest

import render_wide_check


class HeldWideAllTest(unittest.TestCase):
    def test_random_hookups(self):
        render_wide_check.check(self, "held render, wide", range(64))


if __name__ == "__main__":
    unittest.main()
