"""The demo hookups, their catalogue names looked up by this script alone, against its own nodal analysis."""

import json
import tomllib
import unittest

import numpy as np

import nodal
import program
from hookup_model import Hookup

KINDS = ("source", "volume", "treble_bleed", "tone", "cable", "load", "buffer")
DIALS = (10, 7, 4, 1)
HERTZ = list(np.geomspace(20, 20e3, 25))
BOUND_DB = 1e-3  # as for every other response
FLOOR = 1e-6     # -120 dB re emf


def entries():
    with open(program.ROOT / "assets/catalogue.toml", "rb") as file:
        return {(entry["kind"], entry["name"]): entry["values"] for entry in tomllib.load(file)["entry"]}


def looked_up(table, known):
    """A table of a hookup with the entries in the place of their names."""
    out = {}
    for key, value in table.items():
        if key in KINDS and isinstance(value, str):
            value = known[key, value]
        elif key in KINDS and "catalogue" in value:
            value = known[key, value["catalogue"]] | {k: v for k, v in value.items() if k != "catalogue"}
        elif isinstance(value, dict):
            value = looked_up(value, known)
        elif isinstance(value, list):
            value = [looked_up(entry, known) if isinstance(entry, dict) else entry for entry in value]
        out[key] = value
    return out


def inline(value):
    """A value as TOML; JSON spells text, numbers and flags the same way."""
    if isinstance(value, dict):
        return "{ " + ", ".join(f"{key} = {inline(entry)}" for key, entry in value.items()) + " }"
    if isinstance(value, list):
        return "[" + ", ".join(inline(entry) for entry in value) + "]"
    return json.dumps(value)


class Demo(unittest.TestCase):
    def test_demo_hookups_are_the_circuits_their_catalogue_names_say(self):
        known = entries()
        files = sorted((program.ROOT / "assets/demo").glob("*.hookup.toml"))
        self.assertGreaterEqual(len(files), 12)
        worst, points, named = 0.0, 0, 0
        for file in files:
            data = tomllib.loads(file.read_text(encoding="utf-8"))
            full = looked_up(data, known)
            named += full != data
            model = Hookup("".join(f"{key} = {inline(value)}\n" for key, value in full.items()))
            answers = program.response(file, DIALS, HERTZ)
            for dial in DIALS:
                reference = nodal.transfer(model.circuit(dial), np.array(HERTZ))
                for row, h in zip(answers[dial], reference):
                    if abs(h) < FLOOR:
                        continue
                    points += 1
                    worst = max(worst, abs(row["level_db"] - nodal.decibel(h)))
                    self.assertLess(abs(row["level_db"] - nodal.decibel(h)), BOUND_DB, f"{file.name} at {dial}: {row}")
        self.assertGreater(named, 5)
        print(f"{len(files)} demo hookups, {named} of them by catalogue names, {points} points: worst {worst:.1e} dB")


if __name__ == "__main__":
    unittest.main()
