"""Seeded random hookups as the text of a hookup file, over every block of the format.

`hookup(seed)` is always the same text for the same seed. What it draws is meant to be buildable, but not sensible:
extra parts go anywhere, values span decades, pots have no end resistance half of the time.
"""

import random

from hookup_model import EMF, GROUND, Hookup, ShortedSource
from trade_values import draw, parse

TRAVELS = (300, 270, 280.0, 265)


class Writer:
    def __init__(self, seed):
        self.rng = random.Random(seed)
        self.lines = [f'title = "Random hookup {seed}"']

    def block(self, name):
        self.lines.append(f"[{name}]")

    def key(self, name, text):
        self.lines.append(f"{name} = {text}")

    def value(self, name, low, high, unit):
        self.key(name, draw(self.rng, low, high, unit, tidy=self.rng.choice((1, 2, 2, 3))))

    def chance(self, share):
        return self.rng.random() < share


def _taper(w, named_only=False):
    r = w.rng
    percent = r.choice((5, 10, 12, 15, 15, 20, 25, 30, 49, 1))
    kind = r.choice(("linear", "linear", "audio", "audio", "audio", "ideal", "reverse", "ideal reverse", "sections"))
    if kind == "linear":
        return '"linear"'
    if kind == "sections" and not named_only:
        xs = sorted(r.sample(range(5, 96), r.choice((1, 2, 3))))
        rs = sorted(r.randint(0, 100) for _ in xs)
        inner = ", ".join(f"[{x / 100}, {y / 100}]" for x, y in zip(xs, rs))
        return f"{{ sections = [[0, 0], {inner}, [1, 1]] }}"
    name = {"audio": "audio", "sections": "audio", "ideal": "ideal audio", "reverse": "reverse audio",
            "ideal reverse": "ideal reverse audio"}[kind]
    return f'"{name} {percent}{r.choice(("%", "%", " %"))}"'


def _pot(w, low, high, measured=False):
    """Keys shared by every knob."""
    r = w.rng
    text = draw(r, low, high, "ohm", tidy=2)
    ohm = parse(text.strip('"') if text.startswith('"') else float(text), "ohm")
    end = "0"
    if w.chance(0.5):
        end = draw(r, 1.0, min(200.0, ohm / 50.0), "ohm", tidy=2)
    if measured and w.chance(0.12):
        w.key("measured_total", text)
        w.key("measured_half", draw(r, ohm * 0.06, ohm * 0.9, "ohm", tidy=3))
    else:
        w.key("resistance", text)
        w.key("taper", _taper(w))
    if end != "0" or w.chance(0.3):
        w.key("end_resistance", end)
    if w.chance(0.4):
        w.key("travel", str(r.choice(TRAVELS)))
    if w.chance(0.4):
        w.key("dead_travel", r.choice(("15", "[15, 15]", "[10, 20]", "[0, 12.5]", "5.5")))


def _extra(w, nodes, wires, new_nodes):
    r = w.rng
    w.lines.append("[[extra]]")
    part = r.choice(("resistor", "resistor", "capacitor", "capacitor", "inductor", "pot"))
    w.key("part", f'"{part}"')
    if part == "pot":
        w.key("value", draw(r, 1e3, 2e6, "ohm"))
        w.key("taper", _taper(w, named_only=True))
        w.key("dial", str(r.choice((0, 10, 5, round(r.uniform(0, 10), 2)))))
        a, b, c = r.sample(nodes + new_nodes, 3)
        w.key("between", f'["{a}", "{b}", "{c}"]')
        return
    low, high, unit = {"resistor": (1e2, 5e6, "ohm"), "capacitor": (2e-11, 4e-7, "farad"),
                       "inductor": (1e-2, 10.0, "henry")}[part]
    w.value("value", low, high, unit)
    if wires and w.chance(0.25):
        w.key("in_place_of", f'"{wires.pop(r.randrange(len(wires)))}"')
        if w.chance(0.7):
            return  # in the wire's place
    a, b = r.sample(nodes + new_nodes, 2)
    w.key("between", f'["{a}", "{b}"]')


def text_of(seed, extras=True):
    """One draw; not yet known to have an answer."""
    w = Writer(seed)
    r = w.rng
    kind = r.choice(("pickup", "pickup", "pickup", "line", "line", "piezo"))
    w.block("source")
    w.key("kind", f'"{kind}"')
    pot_low, pot_high = 1e5, 1e6
    if kind == "pickup":
        w.value("inductance", 1.0, 9.0, "henry")
        w.value("resistance", 2e3, 2e4, "ohm")
        w.value("capacitance", 4e-11, 4e-10, "farad")
        w.key("loss_resistance", '"none"' if w.chance(0.3) else draw(r, 1e5, 1e6, "ohm"))
    elif kind == "line":
        w.key("resistance", r.choice(("0", '"100"', '"100 ohm"', draw(r, 10.0, 1e4, "ohm"))))
        if w.chance(0.3):
            w.value("capacitance", 1e-7, 1e-5, "farad")
        pot_low, pot_high = 5e3, 2e5
    else:
        w.value("capacitance", 3e-10, 1e-8, "farad")
        if w.chance(0.5):
            w.value("leak_resistance", 1e6, 1e8, "ohm")
        pot_high = 2e6
    on = r.choice(("top", "top", "wiper"))
    w.block("volume")
    _pot(w, pot_low, pot_high, measured=True)
    if on == "wiper" or w.chance(0.3):
        w.key("source_on", f'"{on}"')
    if w.chance(0.5):
        w.block("treble_bleed")
        w.value("capacitor", 1e-10, 3e-9, "farad")
        extra = r.choice(("", "parallel_resistor", "series_resistor"))
        if extra:
            w.value(extra, 2e4, 5e5, "ohm")
    if w.chance(0.55):
        w.block("tone")
        _pot(w, pot_low, pot_high)
        w.value("capacitor", 1e-9, 1e-7, "farad")
        if w.chance(0.6):
            w.key("position", r.choice(('"source"', '"output"')))
        if w.chance(0.7):
            w.key("dial", str(r.choice((0, 10, 10, 5, round(r.uniform(0, 10), 1)))))
        if w.chance(0.4):
            w.key("no_load", r.choice(("true", "false")))
    if w.chance(0.75):
        w.block("cable")
        if w.chance(0.3):
            w.value("capacitance", 5e-11, 2e-9, "farad")
        else:
            w.key("length", r.choice(('"18 ft"', '"10ft"', '"5 m"', '"3.5 m"', '"6m"', "4", '"0.3 m"')))
            w.value("capacitance_per_metre", 5e-11, 2e-10, "farad")
    w.block("load")
    w.value("resistance", 1e4 if kind == "line" else 5e4, 2e6, "ohm")
    if w.chance(0.6):
        w.value("capacitance", 5e-12, 3e-10, "farad")
    coupled = w.chance(0.35)
    if coupled:
        w.value("coupling", 1e-9, 1e-6, "farad")
    if extras and w.chance(0.6):
        nodes = ["source", "top", "wiper", "output", "grid", "ground", "bottom", "emf"] + (["coil"] if kind == "pickup" else [])
        wires = ["source-top", "wiper-output"] if on == "top" else ["source-wiper", "top-output"]
        wires.append("bottom-ground")
        if not coupled:
            wires.append("output-grid")
        new = r.choice(([], [], ["n1"], ["n1", "n2"]))
        for _ in range(r.choice((1, 1, 2, 3)) + len(new)):
            _extra(w, nodes, wires, new)
    return "\n".join(w.lines) + "\n"


def _sound(text, dials):
    """Whether the hookup has an answer at these dials, by the reference's own reading."""
    hookup = Hookup(text)
    if not _leads_somewhere(hookup):
        return False
    for dial in dials:
        try:
            circuit = hookup.circuit(dial)
        except ShortedSource:
            return False
        except ValueError:  # nothing reaches the output
            return False
        used = {n for p in hookup.parts(dial) for n in (p.a, p.b)}
        new_nodes = {n for n in used if n.startswith("n") and n[1:].isdigit()}
        for new in new_nodes:  # a named node that hangs on one part only is a slip of the pen, not a circuit
            if sum(new in (p.a, p.b) for p in hookup.parts(dial) if p.block == "extra") < 2:
                return False
        if any(n not in circuit.nodes for n in new_nodes if not _merged(hookup, dial, n)):
            return False
    return True


def _leads_somewhere(hookup):
    """Whether something leads from the emf to the grid without passing ground, away from the ends of travel."""
    reached, grown = {EMF}, True
    while grown:
        grown = False
        for p in hookup.parts(5.0):
            if GROUND not in (p.a, p.b) and (p.a in reached) != (p.b in reached):
                reached |= {p.a, p.b}
                grown = True
    return "grid" in reached


def _merged(hookup, dial, name):
    """Whether a node was joined to another by zero ohm."""
    return any(p.value == 0.0 and p.kind == "R" and name in (p.a, p.b) for p in hookup.parts(dial))


def hookup(seed, extras=True, dials=(0, 5, 10), accept=None):
    """The first draw from `seed` on that has an answer at every dial (and that `accept` takes). Returns (text, Hookup)."""
    for attempt in range(500):
        text = text_of(f"{seed}/{attempt}" if attempt else str(seed), extras)
        if _sound(text, dials):
            model = Hookup(text)
            if accept is None or accept(model):
                return text, model
    raise RuntimeError(f"seed {seed}: no hookup found")


def dials_of(seed, count=4):
    """Both ends and some between."""
    r = random.Random(f"dials {seed}")
    inner = [round(r.uniform(0.05, 9.95), 2) for _ in range(count - 2)]
    return [0.0, *sorted(inner), 10.0]
