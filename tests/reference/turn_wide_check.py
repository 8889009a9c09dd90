"""Turning knobs of second sources, blends and further stages, one or two at once, as rendered, against ngspice transients.

As turn_check.py does it; here the sections of every turning knob are expressions of time, and with `second_channel` each
source has a take of its own.
"""

import concurrent.futures
import math
import pathlib
import tempfile
import zlib

import numpy as np

import program
import render_check
import sound
import spice
import turn_check
import turn_wide_cases
from hookup_model import Circuit, Hookup

OPEN_OHM = 1e12


def knob_of(model, name):
    """A knob's name as in the model: "pedal" is the first further stage with a volume."""
    if name != "pedal":
        return name
    return next(f"then.{i}.volume" for i, stage in enumerate(model.data["then"]) if "volume" in stage)


def section_expression(section, turn):
    """Ohm of one section of a pot as an expression of `time`."""
    points = turn_check.corners(section.pot, turn)
    pot = section.pot
    if not pot.law.corners:
        above, below = turn_check.section_expressions(pot, turn)
        text = above if section.half == "above" else below
    else:
        span = pot.total - 2.0 * pot.end
        shares = [pot.law.share(x) for _, x in points]
        ohm = [max(turn_check.FLOOR_OHM, pot.end + (1.0 - r if section.half == "above" else r) * span) for r in shares]
        text = "pwl(time," + ",".join(f"{t!r},{v!r}" for (t, _), v in zip(points, ohm)) + ")"
    if section.opens_at_ten:
        # Off its track wherever the knob stands at 10.
        for (t0, d0), (t1, d1) in zip(turn, turn[1:]):
            if d0 == d1 == 10.0:
                text = f"((time>={t0!r})&&(time<={t1!r})?{OPEN_OHM!r}:{text})"
    return text


def deck(model, turns, held, waves, step_s, stop_s):
    """`waves`: {"Vemf": sines, ...} of the generators that are driven."""
    drive = "both" if len(waves) == 2 else model.driven
    circuit = Circuit(model.parts(held, drive=drive, kept=tuple(turns)))
    due = {f"R_{s.name}": section_expression(s, turns[s.knob]) for s in model.sections if s.knob in turns}
    lines = []
    for line in spice.elements(circuit):
        name, a, b, *value = line.split(" ", 3)
        expression = due.pop(name, None)
        lines.append(f"{name} {a} {b} R='{expression}'" if expression else line)
    if due:
        raise ValueError(f"{sorted(due)} of the turning pots are not in the circuit")
    for g in circuit.generators:
        sines = waves[g.name] if len(waves) == 2 else next(iter(waves.values()))
        lines.append(f"B{g.name} {spice.node(g.a)} {spice.node(g.b)} V={g.value!r}*({sines.expression()})")
    out = spice.node(circuit.output)
    return "\n".join(["* turning knobs", ".options reltol=1e-7 abstol=1e-12 vntol=1e-12 trtol=1e6 method=trap", *lines,
                      ".control", "set filetype=binary", f"save v({out})", f"tran {step_s!r} {stop_s!r} 0 {step_s!r} uic",
                      f"write out.raw v({out})", "quit", ".endc", ".end", ""])


def sines_of(case, channel):
    number = zlib.crc32(f"{case}/{channel}".encode())
    return turn_check.Sines(number, even=zlib.crc32(str(case).encode()) % 2 == 0)


def model_of(case):
    """The gang that the compared channel goes through: with second_channel = 1 the first source has channel 2."""
    text = turn_wide_cases.text_of(case)
    return Hookup(text, right=case.channel % 2 == 0 or Hookup(text).second_channel == 1)


def reference(case):
    """(samples inside the turn, index of the first, change by halving in dB)."""
    model = model_of(case)
    turns = {knob_of(model, k): p for k, p in case.turns}
    own = model.second_channel
    waves = ({"Vemf": sines_of(case, 2 if own == 1 else 1), "Vemf2": sines_of(case, own)} if own
             else {"Vemf": sines_of(case, case.channel)})
    begin, end = min(p[1][0] for p in turns.values()), max(p[-1][0] for p in turns.values())
    first, last = int(math.ceil(begin * case.rate)), int(math.floor(end * case.rate))
    times = np.arange(first, last + 1) / case.rate
    coarse = fine = halving = None
    for steps in turn_check.STEPS_PER_SAMPLE:
        text = deck(model, turns, case.held, waves, 1.0 / (case.rate * steps), end + 4.0 / case.rate)
        coarse, fine = fine, turn_check.kept_transient(text, times)
        if coarse is not None:
            halving = turn_check.ratio_db(fine - coarse, fine)
            if halving < turn_check.HALVING_DB:
                break
    return fine + (fine - coarse) / 3.0, first, halving


def rendered(case, folder):
    model = Hookup(turn_wide_cases.text_of(case))
    n = np.arange(int(math.ceil((max(p[-1][0] for _, p in case.turns) + 0.03) * case.rate)))
    channels = max(2, model.second_channel) if model.second_channel else case.channel
    take = np.stack([sines_of(case, c + 1).at(n / case.rate) for c in range(channels)], axis=1)
    sound.write_wav(folder / "take.wav", take, case.rate)
    file = folder / "case.hookup.toml"
    file.write_text(turn_wide_cases.text_of(case), encoding="utf-8")
    words = []
    for knob, points in case.turns:
        text = ",".join(f"{t:g}:{d:g}" for t, d in points)
        words += ["--turn", text if knob == "volume" else f"{knob}={text}"]
    if all(knob != "volume" for knob, _ in case.turns):
        words += ["--turn", f"0:{case.held:g}"]
    out, clips = render_check.render(folder, folder / "take.wav", file, *words)
    samples, got_rate = sound.read_wav(out / clips[0]["file"])
    if len(clips) != 1 or got_rate != case.rate or samples.shape != take.shape:
        raise AssertionError(f"{case}: {len(clips)} clips, {samples.shape} at {got_rate} Hz")
    return samples[:, case.channel - 1]


def run_case(case):
    """(case, error dB, step ratio, halving dB, what went wrong)."""
    due, first, halving = reference(case)
    try:
        with tempfile.TemporaryDirectory() as folder:
            clip = rendered(case, pathlib.Path(folder))
    except AssertionError as error:
        return case, math.inf, math.inf, halving, str(error)
    got = clip[first:first + len(due)]
    steps = np.max(np.abs(np.diff(got))) / np.max(np.abs(np.diff(due)))
    return case, turn_check.ratio_db(got - due, due), float(steps), halving, ""


def check(test, name, cases):
    program.path()
    with concurrent.futures.ThreadPoolExecutor(2) as pool:
        results = list(pool.map(run_case, cases))
    print(f"{name}: {len(cases)} turns against ngspice transients at 1/{turn_check.STEPS_PER_SAMPLE[0]} sample and finer")
    print(f"{'hookup and turn':100} {'rate':>6} {'error dB':>9} {'step ratio':>10} {'halving dB':>10}")
    for case, error, steps, halving, _ in results:
        print(f"{str(case):100} {case.rate:6d} {error:9.1f} {steps:10.5f} {halving:10.1f}")
    for count, words in ((1, "one knob"), (2, "two knobs at once")):
        some = [r for r in results if len(r[0].turns) == count]
        if some:
            print(f"worst, {words}: error {max(r[1] for r in some):.1f} dB, step ratio {max(r[2] for r in some):.5f}, "
                  f"halving {max(r[3] for r in some):.1f} dB")
    for case, error, steps, halving, wrong in results:
        with test.subTest(case=str(case), rate=case.rate):
            test.assertEqual(wrong, "")
            test.assertLess(halving, turn_check.HALVING_DB, "the reference itself is not settled")
            test.assertLess(error, case.bound_db)
            test.assertLessEqual(steps, turn_check.STEP_RATIO)
