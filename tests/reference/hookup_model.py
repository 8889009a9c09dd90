"""From the text of a hookup file to its parts at a knob position, written from the description of the file format alone.

Nothing here reads the program. `Hookup(text).parts(dial)` is a list of resistors, capacitors and inductors between
named nodes; a part of zero ohm is a wire. nodal.py and spice.py turn that list into numbers.
"""

import bisect
import math
import re
import tomllib
from dataclasses import dataclass, field

from trade_values import parse

GROUND = "ground"
EMF = "emf"


@dataclass(frozen=True)
class Part:
    kind: str  # R, C or L
    name: str
    a: str
    b: str
    value: float
    block: str = ""  # source, volume, treble_bleed, tone, cable, load, extra


class Law:
    """Share of the element below the wiper against electrical travel. `corners`: where straight sections meet."""

    def __init__(self, inner, corners=None):
        self.inner = inner
        self.corners = corners  # list of (x, r), or None when the law is curved

    def share(self, x):
        return 0.0 if x <= 0.0 else 1.0 if x >= 1.0 else self.inner(x)


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
    """A pot's element: total, law, travel and end resistance."""

    def __init__(self, block):
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
            self.law = law_of(block["taper"])

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
    """One section of a pot between two nodes; follows the volume knob when `dial` is None."""

    name: str
    pot: Pot
    half: str  # above or below
    a: str
    b: str
    dial: float | None
    block: str
    opens_at_ten: bool = False


@dataclass
class Wire:
    name: str
    a: str
    b: str


@dataclass
class Hookup:
    text: str
    data: dict = field(init=False)

    def __post_init__(self):
        self.data = tomllib.loads(self.text)
        self.fixed, self.sections, self.wires = [], [], []
        self._source()
        self._volume()
        self._bleed()
        self._tone()
        self._cable_and_load()
        self._extra()

    # The blocks, each as the description draws it.

    def _add(self, kind, name, a, b, value, block):
        self.fixed.append(Part(kind, name, a, b, value, block))

    def _source(self):
        s = self.data["source"]
        self.kind = s["kind"]
        if self.kind == "pickup":
            self._add("R", "Rsource", EMF, "coil", parse(s["resistance"], "ohm"), "source")
            self._add("L", "Lsource", "coil", "source", parse(s["inductance"], "henry"), "source")
            if "capacitance" in s:
                self._add("C", "Csource", "source", GROUND, parse(s["capacitance"], "farad"), "source")
            if s["loss_resistance"] != "none":
                self._add("R", "Rloss", "source", GROUND, parse(s["loss_resistance"], "ohm"), "source")
        elif self.kind == "line":
            resistance = parse(s["resistance"], "ohm")
            if "capacitance" in s:
                self._add("R", "Rsource", EMF, "line", resistance, "source")
                self._add("C", "Csource", "line", "source", parse(s["capacitance"], "farad"), "source")
            else:
                self._add("R", "Rsource", EMF, "source", resistance, "source")
        else:
            self._add("C", "Csource", EMF, "source", parse(s["capacitance"], "farad"), "source")
            if "leak_resistance" in s:
                self._add("R", "Rleak", "source", GROUND, parse(s["leak_resistance"], "ohm"), "source")

    def _volume(self):
        v = self.data["volume"]
        self.volume = Pot(v)
        if v.get("source_on", "top") == "top":
            self.wires += [Wire("source-top", "source", "top"), Wire("wiper-output", "wiper", "output")]
        else:
            self.wires += [Wire("source-wiper", "source", "wiper"), Wire("top-output", "top", "output")]
        self.wires.append(Wire("bottom-ground", "bottom", GROUND))
        self.sections.append(Section("RA", self.volume, "above", "top", "wiper", None, "volume"))
        self.sections.append(Section("RB", self.volume, "below", "wiper", "bottom", None, "volume"))

    def _bleed(self):
        b = self.data.get("treble_bleed")
        if b is None:
            return
        c = parse(b["capacitor"], "farad")
        if "series_resistor" in b:
            self._add("C", "Cbleed", "top", "bleed", c, "treble_bleed")
            self._add("R", "Rbleed", "bleed", "wiper", parse(b["series_resistor"], "ohm"), "treble_bleed")
            return
        self._add("C", "Cbleed", "top", "wiper", c, "treble_bleed")
        if "parallel_resistor" in b:
            self._add("R", "Rbleed", "top", "wiper", parse(b["parallel_resistor"], "ohm"), "treble_bleed")

    def _tone(self):
        t = self.data.get("tone")
        if t is None:
            return
        at = t.get("position", "source")
        self.tone = Pot(t)
        self.sections.append(Section("Rtone", self.tone, "below", at, "tone", float(t.get("dial", 10)), "tone",
                                     bool(t.get("no_load", False))))
        self._add("C", "Ctone", "tone", GROUND, parse(t["capacitor"], "farad"), "tone")

    def _cable_and_load(self):
        cable = self.data.get("cable", {})
        if "capacitance" in cable:
            self._add("C", "Ccable", "output", GROUND, parse(cable["capacitance"], "farad"), "cable")
        elif "length" in cable:
            farad = parse(cable["length"], "metre") * parse(cable["capacitance_per_metre"], "farad")
            self._add("C", "Ccable", "output", GROUND, farad, "cable")
        load = self.data["load"]
        if "coupling" in load:
            self._add("C", "Ccoupling", "output", "grid", parse(load["coupling"], "farad"), "load")
        else:
            self.wires.append(Wire("output-grid", "output", "grid"))
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
                pot, dial = Pot(part), float(part.get("dial", 10))
                self.sections.append(Section(f"RA{name}", pot, "above", nodes[0], nodes[1], dial, "extra"))
                self.sections.append(Section(f"RB{name}", pot, "below", nodes[1], nodes[2], dial, "extra"))
                continue
            kind, unit = {"resistor": ("R", "ohm"), "capacitor": ("C", "farad"), "inductor": ("L", "henry")}[part["part"]]
            self._add(kind, f"{kind}{name}", nodes[0], nodes[1], parse(part["value"], unit), "extra")

    # What the rest uses.

    def parts(self, dial, without=()):
        """Every part at this dial, zero-ohm wires included; `without` names blocks to leave out."""
        found = [p for p in self.fixed if p.block not in without]
        found += [Part("R", w.name, w.a, w.b, 0.0, "wire") for w in self.wires]
        for s in self.sections:
            at = dial if s.dial is None else s.dial
            if s.block in without or (s.opens_at_ten and at == 10):
                continue
            ohm = s.pot.above(at) if s.half == "above" else s.pot.below(at)
            found.append(Part("R", s.name, s.a, s.b, max(0.0, ohm), s.block))
        return found

    def circuit(self, dial, without=(), output="grid"):
        return Circuit(self.parts(dial, without), output)


class Circuit:
    """Parts with every zero-ohm connection made: nodes merged, shorted parts dropped, what hangs loose left out."""

    def __init__(self, parts, output="grid"):
        parent = {}

        def find(node):
            parent.setdefault(node, node)
            while parent[node] != node:
                node = parent[node]
            return node

        rank = {GROUND: 3, EMF: 2, output: 1}
        for part in parts:
            a, b = find(part.a), find(part.b)
            if part.kind == "R" and part.value == 0.0 and a != b:
                if rank.get(a, 0) < rank.get(b, 0):
                    a, b = b, a
                parent[b] = a
        if find(EMF) == find(GROUND):
            raise ShortedSource("the emf is shorted to ground")
        live = [Part(p.kind, p.name, find(p.a), find(p.b), p.value, p.block) for p in parts
                if not (p.kind == "R" and p.value == 0.0) and find(p.a) != find(p.b)]
        reached, grown = {GROUND, EMF}, True
        while grown:
            grown = False
            for p in live:
                if (p.a in reached) != (p.b in reached):
                    reached |= {p.a, p.b}
                    grown = True
        self.parts = [p for p in live if p.a in reached]
        self.output = find(output)
        self.silent = self.output == GROUND
        if self.output not in reached:
            raise ValueError("nothing reaches the output")
        self.nodes = sorted({n for p in self.parts for n in (p.a, p.b)} - {GROUND, EMF})


class ShortedSource(ValueError):
    """A zero-ohm source with its terminals joined: no circuit theory gives an answer."""
