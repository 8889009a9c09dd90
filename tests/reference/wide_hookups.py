"""Seeded random hookups with a second source, a selector or blend, further stages, buffers and stereo gangs.

The second family beside random_hookups.py, drawn the same way: `hookup(seed)` is always the same text for the same seed,
every part is buildable, the whole need not be sensible. An extra part never bridges a buffer: nodes come in zones, one
before the first buffer and one after each.
"""

from hookup_model import EMF, GROUND, Circuit, Hookup, ShortedSource
from random_hookups import Writer, _pot, _taper
from trade_values import draw

KINDS = (("pickup", "pickup"),) * 4 + (("line", "line"), ("piezo", "piezo"), ("pickup", "piezo"), ("pickup", "line"))


def _knob_dial(r):
    """Where a knob that is not turned stands: an end half of the time."""
    return str(r.choice((0, 10, 10, 5, round(r.uniform(0, 10), 1), round(r.uniform(0.1, 9.9), 2))))


def _source(w, prefix, kind):
    r = w.rng
    w.block(f"{prefix}source")
    w.key("kind", f'"{kind}"')
    if kind == "pickup":
        w.value("inductance", 1.0, 9.0, "henry")
        w.value("resistance", 2e3, 2e4, "ohm")
        w.value("capacitance", 4e-11, 4e-10, "farad")
        w.key("loss_resistance", '"none"' if w.chance(0.3) else draw(r, 1e5, 1e6, "ohm"))
    elif kind == "line":
        w.key("resistance", r.choice(("0", '"100"', draw(r, 10.0, 1e4, "ohm"), draw(r, 10.0, 1e4, "ohm"))))
        if w.chance(0.3):
            w.value("capacitance", 1e-7, 1e-5, "farad")
    else:
        w.value("capacitance", 3e-10, 1e-8, "farad")
        if w.chance(0.5):
            w.value("leak_resistance", 1e6, 1e8, "ohm")


def _right(w, low, high):
    """The second gang, with some keys of its own. After every other key of the block."""
    if not w.chance(0.35):
        return
    r = w.rng
    keys = {"resistance": draw(r, low, high, "ohm"), "taper": _taper(w, named_only=True),
            "end_resistance": draw(r, 1.0, 0.02 * low, "ohm"), "dead_travel": r.choice(("15", "[5, 20]", "0"))}
    chosen = [k for k in keys if w.chance(0.5)] or ["resistance"]
    w.key("right", "{ " + ", ".join(f"{k} = {keys[k]}" for k in chosen) + " }")


def _volume(w, block, low, high, dial):
    """Returns what the source is on: "top" or "wiper"."""
    r = w.rng
    on = r.choice(("top", "top", "top", "wiper"))
    w.block(f"{block}volume")
    measured = len(w.lines)
    _pot(w, low, high, measured=True)
    if on == "wiper" or w.chance(0.3):
        w.key("source_on", f'"{on}"')
    if dial and w.chance(0.8):
        w.key("dial", _knob_dial(r))
    if not any("measured_total" in line for line in w.lines[measured:]):
        _right(w, low, high)
    if w.chance(0.4):
        w.block(f"{block}treble_bleed")
        w.value("capacitor", 1e-10, 3e-9, "farad")
        extra = r.choice(("", "parallel_resistor", "series_resistor"))
        if extra:
            w.value(extra, 2e4, 5e5, "ohm")
    return on


def _tone(w, block, low, high):
    r = w.rng
    w.block(f"{block}tone")
    _pot(w, low, high)
    w.value("capacitor", 1e-9, 1e-7, "farad")
    if w.chance(0.6):
        w.key("position", r.choice(('"source"', '"output"')))
    if w.chance(0.8):
        w.key("dial", _knob_dial(r))
    if w.chance(0.4):
        w.key("no_load", r.choice(("true", "true", "false")))
    _right(w, low, high)


def _cable(w, block):
    w.block(f"{block}cable")
    if w.chance(0.4):
        w.value("capacitance", 5e-11, 2e-9, "farad")
    else:
        w.key("length", w.rng.choice(('"18 ft"', '"5 m"', '"3.5 m"', "4", '"0.3 m"')))
        w.value("capacitance_per_metre", 5e-11, 2e-10, "farad")


class _Places:
    """Nodes and wires an extra part may use, by zone."""

    def __init__(self):
        self.nodes, self.wires = [[]], [[]]

    def add(self, *nodes):
        self.nodes[-1] += nodes

    def wire(self, a, b):
        self.wires[-1].append(f"{a}-{b}")

    def next_zone(self):
        self.nodes.append([])
        self.wires.append([])


def _controls(places, on, prefix, source, ground, output):
    """Nodes and wires of a volume pot (`on`: what the source is on) or of the wire in its place."""
    if on is None:
        places.wire(source, output)
        return
    top, wiper, bottom = (prefix + n for n in ("top", "wiper", "bottom"))
    places.add(top, wiper, bottom)
    places.wire(source, top if on == "top" else wiper)
    places.wire(wiper if on == "top" else top, output)
    places.wire(bottom, ground)


def _stage(w, places, number, at, low, high):
    """One [[then]]; returns its output node."""
    r = w.rng
    prefix = f"then{number + 1}_"
    output = prefix + "output"
    w.lines.append("[[then]]")
    if w.chance(0.35):
        keys = [f"input = {draw(r, 5e4, 5e6, 'ohm')}"]
        if w.chance(0.6):
            keys.append(f"input_capacitance = {draw(r, 5e-12, 3e-10, 'farad')}")
        keys.append(f"output = {draw(r, 50.0, 2e4, 'ohm') if w.chance(0.7) else 0}")
        if w.chance(0.5):
            keys.append(f"gain_db = {r.choice((0, 6, -3, 12.5, 20, round(r.uniform(-20, 20), 1)))}")
        w.key("buffer", "{ " + ", ".join(keys) + " }")
        if w.chance(0.5):
            _cable(w, "then.")
        places.next_zone()
        places.add(output)
        return output
    on = None
    volume = w.chance(0.75)
    if volume:
        on = _volume(w, "then.", low, high, dial=True)
    if w.chance(0.35) or not volume and w.chance(0.5):
        _tone(w, "then.", low, high)
        bare = False
    else:
        bare = not volume
    if bare or w.chance(0.6):
        _cable(w, "then.")
    places.add(output)
    _controls(places, on, prefix, at, GROUND, output)
    return output


def _extra(w, places):
    r = w.rng
    zone = r.randrange(len(places.nodes)) if w.chance(0.5) else 0
    nodes, wires = places.nodes[zone] + [GROUND], places.wires[zone]
    if len(nodes) < 3:
        return
    part = r.choice(("resistor", "resistor", "capacitor", "capacitor", "inductor", "pot"))
    w.lines.append("[[extra]]")
    w.key("part", f'"{part}"')
    if part == "pot":
        w.key("value", draw(r, 1e3, 2e6, "ohm"))
        w.key("taper", _taper(w, named_only=True))
        w.key("dial", _knob_dial(r))
        a, b, c = r.sample(nodes, 3)
        w.key("between", f'["{a}", "{b}", "{c}"]')
        return
    low, high, unit = {"resistor": (1e2, 5e6, "ohm"), "capacitor": (2e-11, 4e-7, "farad"),
                       "inductor": (1e-2, 10.0, "henry")}[part]
    w.value("value", low, high, unit)
    if wires and w.chance(0.3):
        w.key("in_place_of", f'"{wires.pop(r.randrange(len(wires)))}"')
        if w.chance(0.8):
            return  # in the wire's place
    a, b = r.sample(nodes, 2)
    w.key("between", f'["{a}", "{b}"]')


def text_of(seed, extras=True):
    """One draw; not yet known to have an answer."""
    w = Writer(seed)
    r = w.rng
    places = _Places()
    second = w.chance(0.8)
    stages = r.choice((0, 0, 1, 1, 2, 3)) if second else r.choice((1, 1, 2, 3))
    kinds = r.choice(KINDS)
    low, high = (5e3, 2e5) if "line" in kinds else (1e5, 1e6)
    if second and w.chance(0.3):
        w.key("second_channel", str(r.choice((1, 2, 2, 2, 3))))
    own = "first_output" if second else "output"

    _source(w, "", kinds[0])
    on = _volume(w, "", low, high, dial=False)
    if w.chance(0.4):
        _tone(w, "", low, high)
    places.add(EMF, "source", own, GROUND, *(("coil",) if kinds[0] == "pickup" else ()))
    _controls(places, on, "", "source", GROUND, own)
    places.nodes[0].remove(GROUND)
    if second:
        _source(w, "second.", kinds[1])
        on = _volume(w, "second.", low, high, dial=True) if w.chance(0.75) else None
        if w.chance(0.4):
            _tone(w, "second.", low, high)
        places.add("emf2", "second_source", "second_ground", "second_output",
                   *(("second_coil",) if kinds[1] == "pickup" else ()))
        _controls(places, on, "second_", "second_source", "second_ground", "second_output")
        blend = w.chance(0.35)
        use, series = "both", False
        if blend:
            if w.chance(0.4):
                w.block("selector")
                w.key("phase", r.choice(('"in"', '"out"', '"out"')))
            w.block("blend")
            law = r.choice(("MN", "linear"))
            w.key("law", f'"{law}"')
            w.key("resistance", draw(r, low, high, "ohm"))
            if w.chance(0.5):
                w.key("end_resistance", draw(r, 1.0, 0.02 * low, "ohm"))
            if w.chance(0.3):
                w.key("dead_travel", r.choice(("15", "[5, 20]")))
            if w.chance(0.2):
                w.key("travel", "270")
            if w.chance(0.85):
                w.key("dial", _knob_dial(r))
        elif w.chance(0.8):
            use = r.choice(("both", "both", "both", "first", "second"))
            series = use == "both" and w.chance(0.5)
            w.block("selector")
            if use != "both" or w.chance(0.3):
                w.key("use", f'"{use}"')
            if series or w.chance(0.4):
                # With one source alone the word "joined" has nothing to say; it is then left out.
                if use == "both":
                    w.key("joined", '"series"' if series else '"parallel"')
            if w.chance(0.6):
                w.key("phase", r.choice(('"in"', '"out"', '"out"')))
        places.wire("second_ground", "first_output" if series else GROUND)
        if not blend:
            if use != "second" and not series:
                places.wire("first_output", "output")
            if use != "first":
                places.wire("second_output", "output")
        places.add("output")
    if w.chance(0.7):
        _cable(w, "")
    last = "output"
    for number in range(stages):
        last = _stage(w, places, number, last, low, high)
    w.block("load")
    w.value("resistance", 1e4 if "line" in kinds else 5e4, 2e6, "ohm")
    if w.chance(0.6):
        w.value("capacitance", 5e-12, 3e-10, "farad")
    if w.chance(0.3):
        w.value("coupling", 1e-9, 1e-6, "farad")
    else:
        places.wire(last, "grid")
    places.add("grid")
    if extras and w.chance(0.55):
        for _ in range(r.choice((1, 1, 2, 3))):
            _extra(w, places)
    return "\n".join(w.lines) + "\n"


def _sound(text, dials):
    """Whether the hookup has an answer at these dials, both gangs and either source driven, by the reference's reading."""
    for right in (False, True):
        model = Hookup(text, right)
        drives = ("first", "second") if "second" in model.data else ("first",)
        for drive in drives:
            for dial in dials:
                try:
                    circuit = model.circuit(dial, drive=drive)
                except (ShortedSource, ValueError):
                    return False
                if circuit.loose:
                    return False
        # Something must sound, away from the ends of every knob's travel.
        middle = {s.knob: 5.0 for s in model.sections}
        if Circuit(model.parts(5.0, dials=middle)).silent:
            return False
    return True


def hookup(seed, extras=True, dials=(0, 5, 10), accept=None):
    """The first draw from `seed` on that has an answer at every dial (and that `accept` takes). Returns (text, Hookup)."""
    for attempt in range(800):
        text = text_of(f"wide {seed}/{attempt}" if attempt else f"wide {seed}", extras)
        if _sound(text, dials):
            model = Hookup(text)
            if accept is None or accept(model):
                return text, model
    raise RuntimeError(f"wide seed {seed}: no hookup found")


# What the family has to reach, as words of its texts.
FEATURES = ('[second.source]', '[second.volume]', '[second.treble_bleed]', '[second.tone]', 'use = "first"', 'use = "second"',
            'joined = "series"', 'joined = "parallel"', 'phase = "out"', 'law = "MN"', 'law = "linear"', "[then.volume]",
            "[then.treble_bleed]", "[then.tone]", "[then.cable]", "buffer = {", "gain_db", "right = {", "second_channel",
            "no_load = true", '"second_ground"', '"second_coil"', '"then1_wiper"', '"then2_output"', '"first_output"',
            'in_place_of = "second_', 'in_place_of = "then', '"emf2"', 'part = "pot"')
