"""Every column of `knob` over hookups with second sources, selectors, blends, further stages, buffers and second gangs."""

import unittest

import numpy as np

import knob_check
import wide_hookups
from hookup_model import Hookup

HOOKUPS = 8


class KnobWideTest(unittest.TestCase):
    def test_every_column(self):
        worst, tables = {}, 0
        marks = np.linspace(0, 10, knob_check.STEPS)
        for i in range(HOOKUPS):
            text, model = wide_hookups.hookup(f"knob {i}", extras=i % 2 == 0, dials=marks)
            for right in (False, True) if "right = {" in text else (False,):
                tables += 1
                with self.subTest(hookup=i, right=right):
                    knob_check.check_marks(self, f"wide {i}{' right' if right else ''}", text, Hookup(text, right), worst)
        knob_check.report("knob, wide", tables, worst)


if __name__ == "__main__":
    unittest.main()
