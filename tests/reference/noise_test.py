"""`knob`'s noise_uv over random hookups with one source; see noise_check.py."""

import unittest

import noise_check


class NoiseTest(unittest.TestCase):
    def test_random_hookups(self):
        noise_check.check(self, "noise", [f"knob noise {i}" for i in range(40)])


if __name__ == "__main__":
    unittest.main()
