"""`response` against ngspice AC over thirty random hookups; the deck is written from the TOML by this folder alone."""

import unittest

import response_check


class ResponseTest(unittest.TestCase):
    def test_thirty_random_hookups(self):
        response_check.check(self, "response, quick", [f"quick {i}" for i in range(30)])


if __name__ == "__main__":
    unittest.main()
