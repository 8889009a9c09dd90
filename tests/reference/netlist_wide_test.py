"""`netlist` over hookups with second sources, selectors, blends, further stages, buffers and second gangs."""

import unittest

import netlist_check
import wide_hookups


class NetlistWideTest(unittest.TestCase):
    def test_decks_run_and_agree_with_response(self):
        netlist_check.check(self, "netlist, wide", [f"netlist {i}" for i in range(30)], wide_hookups)


if __name__ == "__main__":
    unittest.main()
