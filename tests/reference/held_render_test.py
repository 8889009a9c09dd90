"""Held knob as rendered against the circuit: six random hookups, 44.1, 48 and 96 kHz."""

import unittest

import render_check


class HeldRenderTest(unittest.TestCase):
    def test_random_hookups(self):
        render_check.check(self, "held render, quick", range(6), (44100, 48000, 96000))


if __name__ == "__main__":
    unittest.main()
