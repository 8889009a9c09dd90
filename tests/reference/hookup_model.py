"""From the text of a hookup file to its parts at a knob position, written from the description of the file format alone.

Nothing here reads the program. `Hookup(text).parts(dial)` is a list of resistors, capacitors, inductors, generators and
amplifiers between named nodes; a part of zero ohm is a wire. nodal.py and spice.py turn that list into numbers.

`Hookup(text, right=True)` reads the second gang of every stereo pot. `circuit(dial, drive="second")` drives the second
source with the first at rest; a generator at rest is a wire.
"""

import bisect
import math
import re
import tomllib
from dataclasses import dataclass, field

from trade_values import parse

GROUND = "ground"
EMF = "emf"
EMF2 = "emf2"


@dataclass(frozen=True)
class Part:
    kind: str  # R, C, L; V: a generator of `value` times the take; E: an amplifier that drives a with value * V(control)
    name: str
    a: str
    b: str
    value: float
    block: str = ""  # source, volume, treble_bleed, tone, cable, load, extra, second, blend, then
    control: str = ""  # E only


class Law:
    """Share of the element below the wiper against electrical travel. `corners`: where straight sections meet."""

    def __init__(self, inner, corners=None):
        self.inner = inner
        self.corners = corners  # list of (x, r), or None when the law is curved

    def share(self, x):
        return 0.0 if x <= 0.0 else 1.0 if x >= 1.0 else self.inner(x)


class BlendLaw(Law):
    """Straight sections whose ends are where their corners say, not at 0 and 1."""

    def __init__(self, corners):
        super().__init__(straight_sections(corners).inner, corners)

    def share(self, x):
        return self.corners[0][1] if x <= 0.0 else self.corners[-1][1] if x >= 1.0 else self.inner(x)


# Share of the element below the wiper. The linear blend has its top at the first pickup, where dial 0 is.
BLEND_LINEAR = [(0.0, 1.0), (1.0, 0.0)]
BLEND_FIRST = [(0.0, 1.0), (0.5, 1.0), (1.0, 0.0)]
BLEND_SECOND = [(0.0, 0.0), (0.5, 1.0), (1.0, 1.0)]


def straight_sections(points):
    xs = [p[0] for p in points]

    def inner(x):
        i = bisect.bisect_right(xs, x)
        (x0, r0), (x1, r1) = points[i - 1], points[i]
        return r0 + (r1 - r0) * (x - x0) / (x1 - x0)

    return Law(inner, [tuple(p) for p in points])


def law_of(taper):
    """`taper` as in a hookup file: a name or a table with sections."""
    if isinstance(taper, dict):
        return straight_sections([tuple(p) for p in taper["sections"]])
    if taper == "linear":
        return straight_sections([(0.0, 0.0), (1.0, 1.0)])
    named = re.fullmatch(r"(ideal )?(reverse )?audio ([0-9.]+) ?%", taper)
    if not named:
        raise ValueError(f"taper {taper!r}")
    ideal, reverse, m = named[1], named[2], float(named[3]) / 100.0
    if ideal:
        b = ((1.0 - m) / m) ** 2

        def forward(x):
            return math.expm1(x * math.log(b)) / (b - 1.0)

        return Law((lambda x: 1.0 - forward(1.0 - x)) if reverse else forward)
    if reverse:
        return straight_sections([(0.0, 0.0), (0.5, 1.0 - m), (1.0, 1.0)])
    return straight_sections([(0.0, 0.0), (0.5, m), (1.0, 1.0)])


class Pot:
    """A pot's element: total, law, travel and end resistance. With `right` the second gang where there is one."""

    def __init__(self, block, right=False, law=None):
        if right:
            block = {**block, **block.get("right", {})}
        self.travel = float(block.get("travel", 300.0))
        dead = block.get("dead_travel", 0.0)
        self.dead_low, self.dead_high = (float(d) for d in (dead if isinstance(dead, list) else (dead, dead)))
        self.end = parse(block.get("end_resistance", 0), "ohm")
        if "measured_total" in block:
            self.total = parse(block["measured_total"], "ohm")
            half = parse(block["measured_half"], "ohm")
            r_half = (half - self.end) / (self.total - 2.0 * self.end)
            self.law = straight_sections([(0.0, 0.0), (self.electrical(5.0), r_half), (1.0, 1.0)])
        else:
            self.total = parse(block.get("resistance", block.get("value")), "ohm")
            self.law = law or law_of(block["taper"])

    def electrical(self, dial):
        """x: share of the electrical travel at a knob position."""
        live = self.travel - self.dead_low - self.dead_high
        return min(1.0, max(0.0, (self.travel * dial / 10.0 - self.dead_low) / live))

    def dial_at(self, x):
        """The knob position at which the electrical travel is x."""
        live = self.travel - self.dead_low - self.dead_high
        return 10.0 * (self.dead_low + x * live) / self.travel

    def below(self, dial):
        """RB, ohm."""
        return self.end + self.law.share(self.electrical(dial)) * (self.total - 2.0 * self.end)

    def above(self, dial):
        """RA, ohm, in the form that is exactly zero at the top when there is no end resistance."""
        return self.end + (1.0 - self.law.share(self.electrical(dial))) * (self.total - 2.0 * self.end)


@dataclass
class Section:
    """One section of a pot between two nodes; `dial` is where its knob stands in the file (None: the volume's)."""

    name: str
    pot: Pot
    half: str  # above or below
    a: str
    b: str
    dial: float | None
    block: str
    knob: str
    opens_at_ten: bool = False

    def ohm(self, dial):
        """At least 0; infinite where a no-load pot is off its track."""
        if self.opens_at_ten and dial == 10:
            return math.inf
        return max(0.0, self.pot.above(dial) if self.half == "above" else self.pot.below(dial))


@dataclass
class Wire:
    name: str
    a: str
    b: str


@dataclass
class Hookup:
    text: str
    right: bool = False
    data: dict = field(init=False)

    def __post_init__(self):
        self.data = tomllib.loads(self.text)
        self.fixed, self.sections, self.wires = [], [], []
        self.kinds = {}
        second, selector = self.data.get("second"), self.data.get("selector", {})
        self.use = selector.get("use", "both") if second else "first"
        self.second_channel = self.data.get("second_channel")
        # The source that the take drives when the take says nothing about which.
        self.driven = "second" if second and self.use == "second" and self.second_channel is None else "first"
        self.reversed = selector.get("phase", "in") == "out"
        self._pickup(self.data, "", EMF, GROUND, "first_output" if second else "output")
        self.volume = next(s.pot for s in self.sections if s.knob == "volume")
        if second:
            self._pickup(second, "second_", EMF2, "second_ground", "second_output")
            self._join(selector)
        self._cable_and_load()
        self._extra()
        self.kind = self.kinds[self.driven]

    # The blocks, each as the description draws it.

    def _add(self, kind, name, a, b, value, block):
        self.fixed.append(Part(kind, name, a, b, value, block))

    def _wire(self, a, b):
        self.wires.append(Wire(f"{a}-{b}", a, b))

    def _pickup(self, data, prefix, emf, ground, output):
        """One source with its own controls, from its emf to the node `output`."""
        self._source(data["source"], prefix, emf, ground)
        knob = prefix.replace("_", ".")
        source = prefix + "source"
        if "volume" in data:
            self._volume(data["volume"], prefix, source, ground, output, f"{knob}volume", "volume",
                         float(data["volume"].get("dial", 10)) if prefix else None)
            self._bleed(data.get("treble_bleed"), prefix, "treble_bleed")
        else:
            self._wire(source, output)
        self._tone(data.get("tone"), prefix, source, output, ground, f"{knob}tone", "tone")

    def _source(self, s, prefix, emf, ground):
        kind, block = s["kind"], "source"
        self.kinds["second" if prefix else "first"] = kind
        source = prefix + "source"
        if kind == "pickup":
            self._add("R", f"R{source}", emf, f"{prefix}coil", parse(s["resistance"], "ohm"), block)
            self._add("L", f"L{source}", f"{prefix}coil", source, parse(s["inductance"], "henry"), block)
            if "capacitance" in s:
                self._add("C", f"C{source}", source, ground, parse(s["capacitance"], "farad"), block)
            if s["loss_resistance"] != "none":
                self._add("R", f"R{prefix}loss", source, ground, parse(s["loss_resistance"], "ohm"), block)
        elif kind == "line":
            resistance = parse(s["resistance"], "ohm")
            if "capacitance" in s:
                self._add("R", f"R{source}", emf, f"{prefix}line", resistance, block)
                self._add("C", f"C{source}", f"{prefix}line", source, parse(s["capacitance"], "farad"), block)
            else:
                self._add("R", f"R{source}", emf, source, resistance, block)
        else:
            self._add("C", f"C{source}", emf, source, parse(s["capacitance"], "farad"), block)
            if "leak_resistance" in s:
                self._add("R", f"R{prefix}leak", source, ground, parse(s["leak_resistance"], "ohm"), block)

    def _volume(self, v, prefix, source, ground, output, knob, block, dial):
        top, wiper, bottom = (prefix + n for n in ("top", "wiper", "bottom"))
        if v.get("source_on", "top") == "top":
            self._wire(source, top)
            self._wire(wiper, output)
        else:
            self._wire(source, wiper)
            self._wire(top, output)
        self._wire(bottom, ground)
        pot = Pot(v, self.right)
        self.sections.append(Section(f"RA{prefix}", pot, "above", top, wiper, dial, block, knob))
        self.sections.append(Section(f"RB{prefix}", pot, "below", wiper, bottom, dial, block, knob))

    def _bleed(self, b, prefix, block):
        if b is None:
            return
        top, wiper, between = prefix + "top", prefix + "wiper", prefix + "bleed"
        c = parse(b["capacitor"], "farad")
        if "series_resistor" in b:
            self._add("C", f"C{between}", top, between, c, block)
            self._add("R", f"R{between}", between, wiper, parse(b["series_resistor"], "ohm"), block)
            return
        self._add("C", f"C{between}", top, wiper, c, block)
        if "parallel_resistor" in b:
            self._add("R", f"R{between}", top, wiper, parse(b["parallel_resistor"], "ohm"), block)

    def _tone(self, t, prefix, source, output, ground, knob, block):
        if t is None:
            return
        at = source if t.get("position", "source") == "source" else output
        node = prefix + "tone"
        self.sections.append(Section(f"R{node}", Pot(t, self.right), "below", at, node, float(t.get("dial", 10)), block,
                                     knob, bool(t.get("no_load", False))))
        self._add("C", f"C{node}", node, ground, parse(t["capacitor"], "farad"), block)

    def _join(self, selector):
        """Selector or blend: from first_output and second_output to `output`."""
        blend = self.data.get("blend")
        series = selector.get("joined", "parallel") == "series" and self.use == "both"
        self._wire("second_ground", "first_output" if series else GROUND)
        if blend:
            dial = float(blend.get("dial", 5))

            def track(name, corners, top, wiper, bottom):
                pot = Pot(blend, law=BlendLaw(corners))
                self.sections.append(Section(f"RA{name}", pot, "above", top, wiper, dial, "blend", "blend"))
                self.sections.append(Section(f"RB{name}", pot, "below", wiper, bottom, dial, "blend", "blend"))

            if blend["law"] == "linear":
                track("blend", BLEND_LINEAR, "first_output", "output", "second_output")
            else:
                track("blend1", BLEND_FIRST, "output", "first_output", GROUND)
                track("blend2", BLEND_SECOND, "output", "second_output", GROUND)
            return
        if self.use in ("both", "first") and not series:
            self._wire("first_output", "output")
        if self.use in ("both", "second"):
            self._wire("second_output", "output")

    def _cable(self, cable, name, at, block):
        if cable is None:
            return
        if "capacitance" in cable:
            farad = parse(cable["capacitance"], "farad")
        elif "length" in cable:
            farad = parse(cable["length"], "metre") * parse(cable["capacitance_per_metre"], "farad")
        else:
            return
        self._add("C", name, at, GROUND, farad, block)

    def _stage(self, stage, number, at):
        """One [[then]] whose input is the node `at`; returns its output."""
        prefix = f"then{number + 1}_"
        output = prefix + "output"
        buffer = stage.get("buffer")
        if buffer:
            self._add("R", f"R{prefix}input", at, GROUND, parse(buffer["input"], "ohm"), "then")
            if "input_capacitance" in buffer:
                self._add("C", f"C{prefix}input", at, GROUND, parse(buffer["input_capacitance"], "farad"), "then")
            gain = 10.0 ** (float(buffer.get("gain_db", 0)) / 20.0)
            self.fixed.append(Part("E", f"E{prefix}buffer", prefix + "amplifier", GROUND, gain, "then", at))
            self._add("R", f"R{prefix}out", prefix + "amplifier", output, parse(buffer.get("output", 0), "ohm"), "then")
        elif "volume" in stage:
            self._volume(stage["volume"], prefix, at, GROUND, output, f"then.{number}.volume", "then",
                         float(stage["volume"].get("dial", 10)))
            self._bleed(stage.get("treble_bleed"), prefix, "then")
        else:
            self._wire(at, output)
        self._tone(stage.get("tone"), prefix, at, output, GROUND, f"then.{number}.tone", "then")
        self._cable(stage.get("cable"), f"C{prefix}cable", output, "then")
        return output

    def _cable_and_load(self):
        self._cable(self.data.get("cable"), "Ccable", "output", "cable")
        last = "output"
        for number, stage in enumerate(self.data.get("then", [])):
            last = self._stage(stage, number, last)
        load = self.data["load"]
        if "coupling" in load:
            self._add("C", "Ccoupling", last, "grid", parse(load["coupling"], "farad"), "load")
        else:
            self._wire(last, "grid")
        self._add("R", "Rload", "grid", GROUND, parse(load["resistance"], "ohm"), "load")
        if "capacitance" in load:
            self._add("C", "Cload", "grid", GROUND, parse(load["capacitance"], "farad"), "load")

    def _extra(self):
        for number, part in enumerate(self.data.get("extra", [])):
            name = f"x{number}"
            nodes = part.get("between")
            if "in_place_of" in part:
                wire = next(w for w in self.wires if w.name == part["in_place_of"])
                self.wires.remove(wire)
                nodes = nodes or [wire.a, wire.b]
            if part["part"] == "pot":
                pot, dial, knob = Pot(part), float(part.get("dial", 10)), f"extra.{number}"
                self.sections.append(Section(f"RA{name}", pot, "above", nodes[0], nodes[1], dial, "extra", knob))
                self.sections.append(Section(f"RB{name}", pot, "below", nodes[1], nodes[2], dial, "extra", knob))
                continue
            kind, unit = {"resistor": ("R", "ohm"), "capacitor": ("C", "farad"), "inductor": ("L", "henry")}[part["part"]]
            self._add(kind, f"{kind}{name}", nodes[0], nodes[1], parse(part["value"], unit), "extra")

    # What the rest uses.

    def generators(self, drive):
        """Both emfs; the one that is not driven is a wire. `drive` may be "both"."""
        found = []
        for name, a, b, size in (("first", EMF, GROUND, 1.0),
                                 ("second", EMF2, "second_ground", -1.0 if self.reversed else 1.0)):
            if name in self.kinds:
                driven = drive in (name, "both")
                found.append(Part("V", "Vemf" if name == "first" else "Vemf2", a, b, size, "emf") if driven
                             else Part("R", f"Rrest_{a}", a, b, 0.0, "wire"))
        return found

    def parts(self, dial, without=(), drive=None, dials=None, kept=()):
        """Every part at this dial, zero-ohm wires included; `without` names blocks to leave out, `dials` other knobs'
        places ({"blend": 3}); sections of the knobs in `kept` come as 1 ohm whatever their dial."""
        dials = dials or {}
        found = self.generators(drive or self.driven) + [p for p in self.fixed if p.block not in without]
        found += [Part("R", w.name, w.a, w.b, 0.0, "wire") for w in self.wires]
        for s in self.sections:
            at = dials.get(s.knob, dial if s.dial is None else s.dial)
            ohm = 1.0 if s.knob in kept else s.ohm(at)
            if s.block not in without and math.isfinite(ohm):
                found.append(Part("R", s.name, s.a, s.b, ohm, s.block))
        return found

    def circuit(self, dial, without=(), output="grid", drive=None, dials=None):
        return Circuit(self.parts(dial, without, drive, dials), output)

    def bare_circuit(self, dial):
        """What `output` sees when it looks back: nothing that follows it. None where an extra part makes that unclear."""
        for part in self.data.get("extra", []):
            for node in [*part.get("between", []), *part.get("in_place_of", "").split("-")]:
                if node and not re.fullmatch(r"(second_)?(emf2?|coil|source|top|wiper|bottom|output|ground)|first_output", node):
                    return None
        try:
            return self.circuit(dial, without=("cable", "then", "load"), output="output")
        except ValueError:
            return None


class Circuit:
    """Parts with every zero-ohm connection made: nodes merged, shorted parts dropped, what hangs loose left out."""

    def __init__(self, parts, output="grid"):
        parent = {}

        def find(node):
            parent.setdefault(node, node)
            while parent[node] != node:
                node = parent[node]
            return node

        rank = {GROUND: 4, EMF: 3, EMF2: 2, output: 1}
        for part in parts:
            a, b = find(part.a), find(part.b)
            if part.kind == "R" and part.value == 0.0 and a != b:
                if rank.get(a, 0) < rank.get(b, 0):
                    a, b = b, a
                parent[b] = a
        if any(p.kind in "VE" and find(p.a) == find(p.b) for p in parts):
            raise ShortedSource("an ideal generator or amplifier is shorted")
        live = [Part(p.kind, p.name, find(p.a), find(p.b), p.value, p.block, p.control and find(p.control)) for p in parts
                if not (p.kind == "R" and p.value == 0.0) and find(p.a) != find(p.b)]
        reached = self._grow(live, {GROUND}, lambda p: True)
        inside = [p for p in live if p.a in reached]
        self.parts = [p for p in inside if p.kind != "V"]
        self.generators = [p for p in inside if p.kind == "V"]
        self.loose = {n for n in parent if find(n) not in reached}
        self.output = find(output)
        if self.output not in reached:
            raise ValueError("nothing reaches the output")
        # Nothing leads from the emf to the output: every path passes ground, or an amplifier's input does.
        sounding = {n for g in self.generators for n in (g.a, g.b)} - {GROUND}
        sounding = self._grow(inside, sounding, lambda p: GROUND not in (p.a, p.b))
        self.silent = self.output not in sounding
        self.nodes = sorted({n for p in inside for n in (p.a, p.b)} - {GROUND} - {g.a for g in self.generators})

    @staticmethod
    def _grow(parts, reached, through):
        reached, grown = set(reached), True
        while grown:
            grown = False
            for p in parts:
                if p.kind == "E" and GROUND not in reached:  # forward only
                    if p.control in reached and p.a not in reached:
                        reached.add(p.a)
                        grown = True
                elif through(p) and (p.a in reached) != (p.b in reached):
                    reached |= {p.a, p.b}
                    grown = True
        return reached


class ShortedSource(ValueError):
    """A zero-ohm source with its terminals joined: no circuit theory gives an answer."""
