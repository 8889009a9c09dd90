"""Hookups and turns of the turning-knob check with second sources, further stages, buffers and second gangs."""

import random
from dataclasses import dataclass

import numpy as np

import nodal
import wide_hookups
from hookup_model import Circuit
from turn_cases import COIL, DOUBLE_COIL, LINE, ending, volume

SECOND_COIL = """[second.source]
kind = "pickup"
inductance = "3.3 H"
resistance = "7k1"
capacitance = "130 pF"
loss_resistance = "350k"
"""
SECOND_VOLUME = '[second.volume]\nresistance = "500k"\ntaper = "audio 15%"\ndial = {dial}\n'
PEDAL = '[[then]]\n[then.volume]\nresistance = "{ohm}"\ntaper = "{taper}"\ndial = {dial}\n[then.cable]\ncapacitance = "{cable}"\n'
BUFFER = '[[then]]\nbuffer = { input = "1M", input_capacitance = "20 pF", output = "1k", gain_db = 3 }\n'
BOTH = "second_channel = 2\n"


def tone(ohm, capacitor, more="", name="tone"):
    return f'[{name}]\nresistance = "{ohm}"\ntaper = "audio 15%"\ncapacitor = "{capacitor}"\n{more}\n'


def blend(law, more=""):
    return f'[blend]\nlaw = "{law}"\nresistance = "500k"\n{more}\n'


HOOKUPS = {
    "two coils, two volumes": BOTH + COIL + volume("500k", "audio 15%") + SECOND_COIL + SECOND_VOLUME.format(dial=10)
    + ending("500 pF"),
    "two coils, the second at rest": COIL + volume("500k", "audio 15%") + SECOND_COIL + SECOND_VOLUME.format(dial=6)
    + tone("500k", "22n", "dial = 6", "second.tone") + ending("500 pF"),
    "two coils in series, out of phase": BOTH + COIL + volume("500k", "audio 15%") + SECOND_COIL
    + SECOND_VOLUME.format(dial=8) + '[selector]\njoined = "series"\nphase = "out"\n' + ending("500 pF"),
    "second alone, its volume": COIL + volume("500k", "audio 15%") + SECOND_COIL + SECOND_VOLUME.format(dial=10)
    + '[selector]\nuse = "second"\nphase = "out"\n' + ending("500 pF"),
    "two coils, MN blend": BOTH + COIL + volume("500k", "linear") + SECOND_COIL + blend("MN") + ending("500 pF"),
    "two coils, MN blend, end 100": BOTH + COIL + volume("500k", "linear") + SECOND_COIL
    + blend("MN", 'end_resistance = "100"\ndead_travel = 10') + ending("500 pF"),
    "two coils, linear blend": BOTH + COIL + volume("500k", "audio 15%") + SECOND_COIL + blend("linear") + ending("500 pF"),
    "coil, lead, pedal, lead": COIL + volume("500k", "audio 15%") + '[cable]\ncapacitance = "500 pF"\n'
    + PEDAL.format(ohm="250k", taper="audio 15%", dial=7, cable="300 pF") + ending(),
    "coil, buffer, 25k pedal": DOUBLE_COIL + volume("500k", "audio 15%") + '[cable]\ncapacitance = "500 pF"\n' + BUFFER
    + PEDAL.format(ohm="25k", taper="linear", dial=7, cable="500 pF") + ending(load="220k", more='coupling = "22n"'),
    "coil, no-load tone": COIL + volume("500k", "audio 15%") + tone("500k", "22n", "no_load = true\ndial = 10")
    + ending("500 pF"),
    "coil, tone at the output": DOUBLE_COIL + volume("500k", "audio 15%", 'end_resistance = "20"')
    + tone("250k", "10n", 'position = "output"\ndial = 8') + ending("500 pF"),
    "coil, stereo pots": COIL + volume("500k", "audio 15%", 'right = { resistance = "430k", taper = "audio 10%" }')
    + tone("500k", "22n", 'dial = 7\nright = { resistance = "560k" }') + ending("500 pF"),
    "line, stereo pot": LINE + volume("10k", "audio 15%", 'right = { resistance = "11k", taper = "linear" }')
    + ending("2.2 nF", "22k"),
    "coil, tone of a further stage": COIL + volume("500k", "audio 15%") + '[cable]\ncapacitance = "300 pF"\n'
    + '[[then]]\n' + tone("500k", "4.7n", "dial = 5", "then.tone") + ending(),
    "coil, extra pot before the grid": COIL + volume("500k", "audio 15%") + ending("500 pF", more='capacitance = "60 pF"')
    + '[[extra]]\npart = "pot"\nvalue = "500k"\ntaper = "linear"\ndial = 5\nin_place_of = "output-grid"\n'
    + 'between = ["output", "grid", "ground"]\n',
}

UP, DOWN = ((0.0, 0.0), (0.04, 0.0), (0.09, 10.0)), ((0.0, 10.0), (0.04, 10.0), (0.09, 0.0))
THERE_AND_BACK = ((0.0, 10.0), (0.03, 10.0), (0.18, 0.0), (0.33, 10.0))
INNER_UP, INNER_DOWN = ((0.0, 2.0), (0.04, 2.0), (0.29, 9.0)), ((0.0, 9.0), (0.04, 9.0), (0.29, 2.0))
INNER_BACK = ((0.0, 8.0), (0.04, 8.0), (0.165, 1.0), (0.29, 8.0))
ONE_BOUND_DB, TWO_BOUND_DB = -80.0, -60.0


@dataclass(frozen=True)
class Case:
    hookup: str
    turns: tuple  # ((knob, points), ...)
    rate: int = 48000
    held: float = 10.0  # the volume, where it does not turn
    channel: int = 1  # the channel of the clip that is compared
    drawn: str = ""  # the text of a random hookup

    @property
    def bound_db(self):
        return ONE_BOUND_DB if len(self.turns) == 1 else TWO_BOUND_DB

    def __str__(self):
        knobs = " and ".join(f"{k} {'-'.join(f'{d:g}' for _, d in p[1:])} in {p[-1][0] - p[1][0]:.2g} s" for k, p in self.turns)
        return f"{self.hookup}: {knobs}{f', channel {self.channel}' if self.channel > 1 else ''}"


def text_of(case):
    return case.drawn or 'title = "Turning"\n' + HOOKUPS[case.hookup]


def one(hookup, knob, points, **more):
    return Case(hookup, ((knob, points),), **more)


def two(hookup, first, points, second, points2, **more):
    return Case(hookup, ((first, points), (second, points2)), **more)


# What every check runs: another knob, another knob with the volume.
QUICK_CASES = [
    one("two coils, the second at rest", "second.volume", UP, rate=44100, held=8.0),
    two("coil, buffer, 25k pedal", "volume", UP, "pedal", DOWN, rate=44100),
]

# What the everyday check runs: one of each kind of knob, one of each kind of pair.
SHORT_CASES = [
    one("two coils, two volumes", "second.volume", DOWN, rate=44100),
    one("two coils, MN blend", "blend", UP, rate=44100),
    one("coil, buffer, 25k pedal", "pedal", UP, held=7.0),
    one("coil, no-load tone", "tone", DOWN, rate=44100, held=8.0),
    one("coil, stereo pots", "volume", DOWN, channel=2),
    two("coil, tone at the output", "volume", UP, "tone", DOWN, rate=44100),
    two("two coils, two volumes", "volume", DOWN, "second.volume", UP),
    two("coil, buffer, 25k pedal", "volume", UP, "pedal", DOWN, rate=44100),
    two("two coils, MN blend", "volume", DOWN, "blend", UP),
]

ONE_KNOB = [
    ("two coils, two volumes", "second.volume", 10.0, 1),
    ("two coils, two volumes", "volume", 10.0, 1),
    ("two coils, the second at rest", "second.volume", 8.0, 1),
    ("two coils, the second at rest", "second.tone", 9.0, 1),
    ("two coils in series, out of phase", "second.volume", 9.0, 1),
    ("two coils in series, out of phase", "volume", 10.0, 1),
    ("second alone, its volume", "second.volume", 10.0, 1),
    ("two coils, MN blend", "blend", 10.0, 1),
    ("two coils, MN blend, end 100", "blend", 7.0, 1),
    ("two coils, linear blend", "blend", 9.0, 1),
    ("coil, lead, pedal, lead", "pedal", 8.0, 1),
    ("coil, buffer, 25k pedal", "pedal", 7.0, 1),
    ("coil, no-load tone", "tone", 8.0, 1),
    ("coil, stereo pots", "volume", 10.0, 2),
    ("coil, stereo pots", "tone", 8.0, 2),
    ("line, stereo pot", "volume", 10.0, 2),
    ("coil, tone of a further stage", "then.0.tone", 8.0, 1),
    ("coil, extra pot before the grid", "extra.0", 9.0, 1),
]
TWO_KNOBS = [
    ("coil, tone at the output", "volume", "tone", 1),
    ("coil, no-load tone", "volume", "tone", 1),
    ("coil, stereo pots", "volume", "tone", 2),
    ("two coils, two volumes", "volume", "second.volume", 1),
    ("two coils in series, out of phase", "volume", "second.volume", 1),
    ("coil, buffer, 25k pedal", "volume", "pedal", 1),
    ("coil, lead, pedal, lead", "volume", "pedal", 1),
    ("two coils, MN blend", "volume", "blend", 1),
    ("two coils, linear blend", "volume", "blend", 1),
    ("two coils, the second at rest", "second.volume", "second.tone", 1),
]


def every_case():
    """Each knob and each pair over full turns in 50 ms and 0.15 s and inner ones in 0.25 s; 44.1 and 48 kHz by turns."""
    cases = []
    for i, (hookup, knob, held, channel) in enumerate(ONE_KNOB):
        for j, points in enumerate((THERE_AND_BACK, DOWN if i % 2 else UP, INNER_DOWN)):
            rate = 96000 if (i == 3 and j == 1) else (44100, 48000)[(i + j) % 2]
            cases.append(one(hookup, knob, points, rate=rate, held=held, channel=channel))
    for i, (hookup, first, second, channel) in enumerate(TWO_KNOBS):
        for j, (p, q) in enumerate(((UP, DOWN), (INNER_DOWN, INNER_BACK), (DOWN, DOWN))):
            cases.append(two(hookup, first, p, second, q, rate=(44100, 48000)[(i + j) % 2], channel=channel,
                             held=8.0))
    return cases


def _turnable(model):
    """Knobs whose every section is in the circuit and that leave something to hear."""
    knobs = sorted({s.knob for s in model.sections})
    found = []
    for knob in knobs:
        names = {s.name for s in model.sections if s.knob == knob}
        circuit = Circuit(model.parts(7.0, kept=(knob,)))
        if names <= {p.name for p in circuit.parts}:
            found.append(knob)
    return found


def _audible(model):
    """Not below -50 dB over the sines of the take, the volume at 7."""
    return np.min(nodal.decibel(nodal.transfer(model.circuit(7.0), [200.0, 1e3, 5e3]))) > -50.0


def random_case(seed, count):
    """A random hookup with `count` of its knobs turning through all of their travel in 50 ms."""
    r = random.Random(f"turn {seed}")
    text, model = wide_hookups.hookup(f"turn {seed}", accept=lambda m: len(_turnable(m)) >= count and _audible(m))
    knobs = r.sample(_turnable(model), count)
    channel = 2 if "right = {" in text and not model.second_channel else 1
    turns = tuple((k, r.choice((UP, DOWN))) for k in knobs)
    return Case(f"random {seed}", turns, r.choice((44100, 48000)), 7.0, channel, text)


def random_cases(singles=12, pairs=12):
    return [random_case(i, 1) for i in range(singles)] + [random_case(100 + i, 2) for i in range(pairs)]
