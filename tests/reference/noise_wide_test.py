"""`knob`'s noise_uv over hookups with second sources, further stages and buffers (which make no noise)."""

import unittest

import noise_check
import wide_hookups


class NoiseWideTest(unittest.TestCase):
    def test_random_hookups(self):
        noise_check.check(self, "noise, wide", [f"noise {i}" for i in range(40)], wide_hookups)


if __name__ == "__main__":
    unittest.main()
