"""Decks for ngspice, written from a Circuit, and its binary raw files. One process runs many decks."""

import pathlib
import re
import subprocess
import tempfile

import numpy as np

from hookup_model import GROUND


def node(name):
    return "0" if name == GROUND else name.replace("-", "_").lower()


def elements(circuit):
    """Element lines. A node without a path for direct current gets 1e15 ohm that makes no noise."""
    lines = [f"{p.kind}_{p.name.replace('-', '_')} {node(p.a)} {node(p.b)}"
             f"{f' {node(p.control)} 0' if p.kind == 'E' else ''} {p.value!r}" for p in circuit.parts]
    held, grown = {GROUND}, True
    while grown:
        grown = False
        for p in [*circuit.parts, *circuit.generators]:
            if p.kind != "C" and (p.a in held) != (p.b in held):
                held |= {p.a, p.b}
                grown = True
    lines += [f"R_hold_{node(n)} {node(n)} 0 1e15 noisy=0" for n in circuit.nodes if n not in held]
    return lines


def generator(circuit):
    """The line of the one generator that is driven."""
    (g,) = circuit.generators
    return f"Vemf {node(g.a)} {node(g.b)} DC 0 AC {g.value!r}"


def driven_outright(circuit):
    """The output is the emf itself, or ground: nothing in the circuit can change it."""
    return circuit.output == GROUND or any(g.a == circuit.output and g.b == GROUND for g in circuit.generators)


def run(decks, commands, folder=None):
    """Runs each deck (text without .end) with its own control commands in one ngspice process.

    `commands[i]` is a list of control lines; RAW stands for the raw file. Returns the plots of the raw file in order.
    """
    with tempfile.TemporaryDirectory(dir=folder) as work:
        work = pathlib.Path(work)
        control = ["* control", "V1 1 0 1", "R1 1 0 1", ".control", "set filetype=binary", "set appendwrite"]
        for i, (deck, lines) in enumerate(zip(decks, commands)):
            (work / f"deck{i}.cir").write_text(deck + "\n.end\n", encoding="utf-8")
            control.append(f"source deck{i}.cir")
            control += [line.replace("RAW", "out.raw") for line in lines]
            control += ["destroy all", "remcirc"]
        control += ["quit", ".endc", ".end"]
        (work / "main.cir").write_text("\n".join(control) + "\n", encoding="utf-8")
        done = subprocess.run(["ngspice", "-b", "main.cir"], cwd=work, capture_output=True, text=True)
        raw = work / "out.raw"
        if not raw.exists():
            raise RuntimeError(f"ngspice wrote nothing:\n{done.stdout[-2000:]}\n{done.stderr[-2000:]}")
        return read_raw(raw.read_bytes())


def read_raw(data):
    """All plots of a binary raw file: a list of {variable name: array}."""
    plots, at = [], 0
    while True:
        mark = data.find(b"Binary:\n", at)
        if mark < 0:
            return plots
        head = data[at:mark].decode("utf-8", "replace")
        count = int(re.search(r"No\. Variables:\s*(\d+)", head)[1])
        points = int(re.search(r"No\. Points:\s*(\d+)", head)[1])
        names = re.findall(r"^\t\d+\t(\S+)\t", head.split("Variables:")[-1], re.M)
        kind = complex if re.search(r"^Flags:.*complex", head, re.M) else float
        size = count * points * (16 if kind is complex else 8)
        start = mark + len(b"Binary:\n")
        table = np.frombuffer(data[start:start + size], dtype=kind).reshape(points, count)
        plots.append({name: table[:, i] for i, name in enumerate(names)})
        at = start + size


# ngspice takes a matrix element for pivot that is a thousandth of the largest, and none under 1e-13; with an amplifier's 1
# among microsiemens that costs it up to fifteen digits. It is told to look for the large ones.
PIVOT = "pivrel=0.9 pivtol=1e-30"


def ac_deck(circuit, title="circuit"):
    return "\n".join([f"* {title}", f".options noopac {PIVOT}", generator(circuit), *elements(circuit)])


def ac_grid(per_decade, low, high):
    """The frequencies of ngspice's `ac dec`: its ratio is stretched so that the last one is `high`."""
    return np.geomspace(low, high, int(np.floor(np.log10(high / low) * per_decade + 1e-9)) + 1)


def transfers(circuits, per_decade=4, low=20.0, high=1.2e6):
    """H of every circuit on the `dec` grid by ngspice AC. Silent outputs are not asked for: they come back as zeros."""
    asked = [c for c in circuits if not c.silent]
    decks = [ac_deck(c) for c in asked]
    commands = [[f"ac dec {per_decade} {low!r} {high!r}", f"write RAW v({node(c.output)})"] for c in asked]
    plots = iter(run(decks, commands) if asked else [])
    grid = ac_grid(per_decade, low, high)
    answers = []
    for c in circuits:
        if c.silent:
            answers.append(np.zeros(grid.shape, complex))
            continue
        plot = next(plots)
        hertz = plot["frequency"].real
        if hertz.shape != grid.shape or np.max(np.abs(hertz / grid - 1.0)) > 1e-9:
            raise RuntimeError("ngspice used another frequency grid")
        answers.append(plot[f"v({node(c.output)})"])
    return grid, answers


def noise_volts(circuits):
    """Integrated output noise of every circuit at 20 degrees Celsius by ngspice .noise.

    The steps are made finer where a sharp resonance asks for it: until halving them changes less than a part in 10^4."""
    volts = _noise_volts(circuits, 250)
    unsettled = range(len(circuits))
    for per_decade in (500, 1000, 4000, 16000, 64000):
        fine = dict(zip(unsettled, _noise_volts([circuits[i] for i in unsettled], per_decade)))
        unsettled = [i for i, v in fine.items() if abs(v - volts[i]) > 1e-4 * v]
        for i, v in fine.items():
            volts[i] = v
        if not unsettled:
            return volts
    raise RuntimeError(f"{len(unsettled)} noise integrals do not settle")


def _noise_volts(circuits, per_decade, low=20.0, high=20e3):
    from scipy.integrate import simpson
    asked = [c for c in circuits if not driven_outright(c)]
    decks = ["\n".join(["* noise", ".temp 20", f".options {PIVOT}", generator(c), *elements(c)]) for c in asked]
    commands = [[f"noise v({node(c.output)}) Vemf dec {per_decade} {low!r} {high!r}", "setplot noise1",
                 "write RAW onoise_spectrum"] for c in asked]
    plots = iter(run(decks, commands) if asked else [])
    answers = []
    for c in circuits:
        if driven_outright(c):
            answers.append(0.0)
            continue
        plot = next(plots)
        f = np.real(plot["frequency"])
        density = np.real(plot["onoise_spectrum"])  # V per root hertz
        answers.append(float(np.sqrt(simpson(density**2 * f, x=np.log(f)))))
    return answers
