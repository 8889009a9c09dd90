# check: slow
"""Held knob as rendered against the circuit: 48 random hookups, all five rates."""

import unittest

import render_check


class HeldRenderAllTest(unittest.TestCase):
    def test_random_hookups(self):
        render_check.check(self, "held render", range(48))


if __name__ == "__main__":
    unittest.main()
