# check: slow
"""`response` against ngspice AC over 240 random hookups with extra parts and 60 without (all the usual blocks)."""

import unittest

import response_check


class ResponseAllTest(unittest.TestCase):
    def test_random_hookups_with_extra_parts(self):
        response_check.check(self, "response, all blocks and extras", list(range(240)))

    def test_random_hookups_of_the_usual_blocks(self):
        response_check.check(self, "response, usual blocks", list(range(1000, 1060)), extras=False)


if __name__ == "__main__":
    unittest.main()
