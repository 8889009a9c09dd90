# check: slow
"""`response` against ngspice AC over 200 hookups with second sources, blends, stages, buffers and second gangs."""

import unittest

import response_check
import wide_hookups


class ResponseWideAllTest(unittest.TestCase):
    def test_random_hookups(self):
        response_check.check(self, "response, wide, extras", list(range(150)), family=wide_hookups)

    def test_random_hookups_without_extra_parts(self):
        response_check.check(self, "response, wide, drawn blocks", list(range(1000, 1050)), extras=False, family=wide_hookups)


if __name__ == "__main__":
    unittest.main()
