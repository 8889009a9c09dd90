"""Hookups and turns of the turning-knob check."""

FILE = 'title = "{title}"\n'

COIL = """[source]
kind = "pickup"
inductance = "2.4 H"
resistance = "6k2"
capacitance = "110 pF"
loss_resistance = "300k"
"""
DOUBLE_COIL = """[source]
kind = "pickup"
inductance = "4.5 H"
resistance = "8k"
capacitance = "100 pF"
loss_resistance = "none"
"""
LINE = """[source]
kind = "line"
resistance = "100"
"""


def volume(ohm, taper, more=""):
    return f'[volume]\nresistance = "{ohm}"\ntaper = "{taper}"\n{more}\n'


def ending(cable="", load="1M", more=""):
    lead = f'[cable]\ncapacitance = "{cable}"\n' if cable else ""
    return f'{lead}[load]\nresistance = "{load}"\n{more}\n'


def bleed(capacitor, more=""):
    return f'[treble_bleed]\ncapacitor = "{capacitor}"\n{more}\n'


HOOKUPS = {
    "coil, audio, end 0": COIL + volume("500k", "audio 15%") + ending("500 pF"),
    "coil, audio, end 20, tone": COIL + volume("500k", "audio 15%", 'end_resistance = "20"\ndead_travel = [15, 15]')
    + '[tone]\nresistance = "500k"\ntaper = "audio 15%"\ncapacitor = "22n"\ndial = 7\n' + ending("500 pF", more='capacitance = "20 pF"'),
    "double coil, linear, bleed 1n": DOUBLE_COIL + volume("500k", "linear") + bleed("1n") + ending("500 pF"),
    "double coil, audio, bleed 1n with 150k": DOUBLE_COIL + volume("500k", "audio 15%", 'end_resistance = "20"')
    + bleed("1n", 'parallel_resistor = "150k"') + ending("680 pF"),
    "double coil, audio 10%, bleed 1.2n in series with 130k": DOUBLE_COIL + volume("500k", "audio 10%")
    + bleed("1.2n", 'series_resistor = "130k"') + ending("500 pF", "500k"),
    "line 100 ohm, 10k linear": LINE + volume("10k", "linear") + ending("470 pF", "47k"),
    "line 100 ohm, 10k audio": LINE + volume("10k", "audio 15%") + ending("2.2 nF", "10k"),
    "coil on the wiper": COIL + volume("250k", "linear", 'source_on = "wiper"') + ending("600 pF"),
    "piezo": '[source]\nkind = "piezo"\ncapacitance = "1.2 nF"\nleak_resistance = "50M"\n' + volume("1M", "audio 20%")
    + ending("300 pF"),
    "coil, coupling 22n into 220k": COIL + volume("250k", "audio 15%") + ending("500 pF", "220k",
                                                                               'capacitance = "120 pF"\ncoupling = "22n"'),
    "coil, ideal audio, tone at the output": COIL + volume("500k", "ideal audio 15%")
    + '[tone]\nresistance = "250k"\ntaper = "linear"\ncapacitor = "10n"\ndial = 3\nposition = "output"\n' + ending("500 pF"),
    "line through 1 uF, ideal reverse, bleed": '[source]\nkind = "line"\nresistance = "600"\ncapacitance = "1 uF"\n'
    + volume("50k", "ideal reverse audio 15%", 'end_resistance = "20"') + bleed("1n") + ending("1 nF", "22k"),
}

# Corners (seconds, dial). The take fades in over the first 20 ms.
TURNS = {
    "10-0-10 in 0.3 s": ((0.0, 10.0), (0.03, 10.0), (0.18, 0.0), (0.33, 10.0)),
    "0-10 in 50 ms": ((0.0, 0.0), (0.04, 0.0), (0.09, 10.0)),
    "9-2 in 0.5 s": ((0.0, 9.0), (0.03, 9.0), (0.53, 2.0)),
    "10-0 in 50 ms": ((0.0, 10.0), (0.04, 10.0), (0.09, 0.0)),
}


def text_of(name):
    return FILE.format(title=name) + HOOKUPS[name]


def every_case():
    """(hookup, turn, rate): each hookup with three turns; 44.1 and 48 kHz by turns, one at 96 kHz."""
    names = list(HOOKUPS)
    cases = []
    for i, name in enumerate(names):
        fast = "0-10 in 50 ms" if i % 2 == 0 else "10-0 in 50 ms"
        for j, turn in enumerate(("10-0-10 in 0.3 s", fast, "9-2 in 0.5 s")):
            rate = 96000 if (i == 2 and j == 1) else (44100, 48000)[(i + j) % 2]
            cases.append((name, turn, rate))
    return cases


# What the everyday check runs: the stiffest, the bleed near the top, and one of each remaining kind.
SHORT_CASES = [
    ("coil, audio, end 0", "10-0-10 in 0.3 s", 44100),
    ("double coil, linear, bleed 1n", "10-0 in 50 ms", 44100),
    ("double coil, audio, bleed 1n with 150k", "0-10 in 50 ms", 48000),
    ("line 100 ohm, 10k audio", "0-10 in 50 ms", 44100),
    ("line 100 ohm, 10k linear", "10-0 in 50 ms", 48000),
    ("coil on the wiper", "10-0 in 50 ms", 44100),
    ("piezo", "0-10 in 50 ms", 44100),
    ("coil, coupling 22n into 220k", "0-10 in 50 ms", 48000),
    ("coil, ideal audio, tone at the output", "10-0 in 50 ms", 44100),
    ("line through 1 uF, ideal reverse, bleed", "0-10 in 50 ms", 44100),
]
