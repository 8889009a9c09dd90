"""`netlist` over random hookups with one source; see netlist_check.py."""

import unittest

import netlist_check


class NetlistTest(unittest.TestCase):
    def test_decks_run_and_agree_with_response(self):
        netlist_check.check(self, "netlist", [f"netlist {i}" for i in range(25)])


if __name__ == "__main__":
    unittest.main()
