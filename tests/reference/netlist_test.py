"""`netlist`: a deck that ngspice runs as it stands and that answers as `response` does."""

import pathlib
import subprocess
import tempfile
import unittest

import numpy as np

import nodal
import program
import random_hookups
import spice

HOOKUPS = 25
BOUND_DB, BOUND_DEG = 1e-3, 1e-2


def run_deck(text, folder):
    """Runs a deck untouched; when it asks for no analysis, with an .ac line before its .end."""
    lines = text.splitlines()
    if not any(line.strip().lower().startswith((".ac", "ac ")) for line in lines):
        at = next((i for i, line in enumerate(lines) if line.strip().lower() == ".end"), len(lines))
        lines.insert(at, ".ac dec 4 20 1.2e6")
    deck, raw = folder / "deck.cir", folder / "deck.raw"
    deck.write_text("\n".join(lines) + "\n", encoding="utf-8")
    raw.unlink(missing_ok=True)
    done = subprocess.run(["ngspice", "-b", "-r", raw.name, deck.name], cwd=folder, capture_output=True, text=True)
    if not raw.exists():
        raise AssertionError(f"ngspice made nothing of\n{text}\n{done.stdout[-1500:]}\n{done.stderr[-1500:]}")
    plot = next((p for p in spice.read_raw(raw.read_bytes()) if "frequency" in p), None)
    if plot is None or len(plot["frequency"]) == 0:
        raise AssertionError(f"ngspice ran no AC analysis of\n{text}\n{done.stdout[-1500:]}\n{done.stderr[-1500:]}")
    return plot["frequency"].real, plot["v(grid)"]


class NetlistTest(unittest.TestCase):
    def check_deck(self, file, model, dial, folder):
        """(points compared, worst dB, worst degrees)"""
        points = worst_db = worst_deg = 0
        deck = program.call("netlist", file, "--dial", dial)
        words = [" ".join(line.split()).lower() for line in deck.splitlines()]
        self.assertIn("vemf emf 0 ac 1", words)
        self.assertEqual(words[-1], ".end")
        grid, h = run_deck(deck, folder)
        rows = program.response(file, [dial], grid)[dial]
        own = nodal.transfer(model.circuit(dial), grid)
        for row, spiced, mine, hertz in zip(rows, h, own, grid):
            if abs(mine) < 1e-6:
                # What `response` calls silence may be joined by a tiny resistance in a deck.
                self.assertLess(abs(spiced), 2e-6, f"{hertz} Hz\n{deck}")
                continue
            points += 1
            level = abs(nodal.decibel(spiced) - row["level_db"])
            turn = abs((np.degrees(np.angle(spiced)) - row["phase_deg"] + 180.0) % 360.0 - 180.0)
            worst_db, worst_deg = max(worst_db, level), max(worst_deg, turn)
            self.assertLess(level, BOUND_DB, f"{hertz} Hz\n{deck}")
            self.assertLess(turn, BOUND_DEG, f"{hertz} Hz\n{deck}")
        return points, worst_db, worst_deg

    def test_decks_run_and_agree_with_response(self):
        worst_db = worst_deg = 0.0
        points = 0
        with tempfile.TemporaryDirectory() as folder:
            folder = pathlib.Path(folder)
            file = folder / "case.hookup.toml"
            for i in range(HOOKUPS):
                text, model = random_hookups.hookup(f"netlist {i}")
                file.write_text(text, encoding="utf-8")
                for dial in (5, 10, 0):
                    with self.subTest(hookup=i, dial=dial):
                        found = self.check_deck(file, model, dial, folder)
                        points += found[0]
                        worst_db, worst_deg = max(worst_db, found[1]), max(worst_deg, found[2])
        self.assertGreater(points, 100)
        print(f"netlist: {HOOKUPS} hookups at dials 5, 10, 0 run by ngspice as they stand, {points} points against "
              f"response: worst {worst_db:.2e} dB, {worst_deg:.2e} degrees")


if __name__ == "__main__":
    unittest.main()
