"""`response` against ngspice AC over thirty hookups with second sources, blends, stages, buffers and second gangs."""

import unittest

import response_check
import wide_hookups


class ResponseWideTest(unittest.TestCase):
    def test_thirty_random_hookups(self):
        response_check.check(self, "response, wide, quick", [f"quick {i}" for i in range(30)], family=wide_hookups)


if __name__ == "__main__":
    unittest.main()
