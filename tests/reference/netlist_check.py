"""`netlist`: a deck that ngspice runs as it stands and that answers as `response` does."""

import pathlib
import subprocess
import tempfile

import numpy as np

import nodal
import program
import random_hookups
import spice
from hookup_model import Hookup

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


def check_deck(test, file, model, dial, folder):
    """(points compared, worst dB, worst degrees)"""
    words = ("--right",) if model.right else ()
    points = worst_db = worst_deg = 0
    deck = program.call("netlist", file, "--dial", dial, *words)
    lines = [" ".join(line.split()).lower() for line in deck.splitlines()]
    driven = [line for line in lines if line.startswith("vemf")]
    test.assertEqual(driven, ["vemf emf 0 ac 1"] if model.driven == "first"
                     else ["vemf emf2 second_ground ac 1" + (" 180" if model.reversed else "")])
    test.assertEqual(lines[-1], ".end")
    grid, h = run_deck(deck, folder)
    rows = program.response(file, [dial], grid, *words)[dial]
    own = nodal.transfer(model.circuit(dial), grid)
    for row, spiced, mine, hertz in zip(rows, h, own, grid):
        if abs(mine) < 1e-6:
            # What `response` calls silence may be joined by a tiny resistance in a deck.
            test.assertLess(abs(spiced), 2e-6, f"{hertz} Hz\n{deck}")
            continue
        points += 1
        level = abs(nodal.decibel(spiced) - row["level_db"])
        turn = abs((np.degrees(np.angle(spiced)) - row["phase_deg"] + 180.0) % 360.0 - 180.0)
        worst_db, worst_deg = max(worst_db, level), max(worst_deg, turn)
        test.assertLess(level, BOUND_DB, f"{hertz} Hz\n{deck}")
        test.assertLess(turn, BOUND_DEG, f"{hertz} Hz\n{deck}")
    return points, worst_db, worst_deg


def check(test, name, seeds, family=random_hookups):
    worst_db = worst_deg = 0.0
    points = decks = 0
    with tempfile.TemporaryDirectory() as folder:
        folder = pathlib.Path(folder)
        file = folder / "case.hookup.toml"
        for seed in seeds:
            text, _ = family.hookup(seed)
            file.write_text(text, encoding="utf-8")
            for right in (False, True) if "right = {" in text else (False,):
                for dial in (5, 10, 0):
                    with test.subTest(hookup=seed, dial=dial, right=right):
                        found = check_deck(test, file, Hookup(text, right), dial, folder)
                        decks += 1
                        points += found[0]
                        worst_db, worst_deg = max(worst_db, found[1]), max(worst_deg, found[2])
    test.assertGreater(points, 4 * decks)
    print(f"{name}: {len(seeds)} hookups at dials 5, 10, 0, {decks} decks run by ngspice as they stand, {points} points "
          f"against response: worst {worst_db:.2e} dB, {worst_deg:.2e} degrees")
