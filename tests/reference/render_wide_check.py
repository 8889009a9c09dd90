"""Held knob, as rendered, over hookups with a second source, further stages and stereo gangs.

Takes of several channels: odd ones go through the left gang, even ones through the right; with `second_channel` that
channel is the second source's emf and what comes out of every channel is the sum of both sources. Channels of the first
source and the second's own carry every other sine, so that each line of the spectrum shows one source alone.
"""

import pathlib
import tempfile

import numpy as np

import nodal
import render_check
import sound
import wide_hookups
from hookup_model import Hookup

DIALS = (10, 7, 2, 0.5)
RATES = (44100, 48000, 96000)


def models_of(text):
    """The left gang's circuit and the right one's."""
    return Hookup(text), Hookup(text, right=True)


def settles(text):
    return all(render_check.settles(m, DIALS) for m in models_of(text))


def channels_of(text, number):
    """How many channels the take of a case has."""
    model = Hookup(text)
    if model.second_channel:
        return max(2, model.second_channel) + number % 2
    return 2 + number % 2 if "right = {" in text else 1 + number % 2


def measure(folder, text, rate, seed, channels):
    """[(where, hertz, measured H, true H)] of every channel and dial."""
    left, right = models_of(text)
    rng = np.random.default_rng(seed)
    settle = max(render_check.settling_s(m, DIALS) for m in (left, right))
    own = left.second_channel - 1 if left.second_channel else None
    waves = [render_check.multisine(rate, settle, rng, share=slice(None) if own is None else slice(c == own, None, 2))
             for c in range(channels)]
    period, start = waves[0][2:]
    take = np.stack([w[0] for w in waves], axis=1).astype(np.float32).astype(float)
    given = np.fft.rfft(take[start:start + period], axis=0)
    sound.write_wav(folder / "take.wav", take, rate)
    file = folder / "case.hookup.toml"
    file.write_text(text, encoding="utf-8")
    out, clips = render_check.render(folder, folder / "take.wav", file, "--dial", ",".join(f"{d:g}" for d in DIALS))
    if len(clips) != len(DIALS):
        raise AssertionError(f"{len(clips)} clips for {len(DIALS)} dials")
    answers = []
    for dial, clip in zip(DIALS, clips):
        samples, got_rate = sound.read_wav(out / clip["file"])
        if got_rate != rate or samples.shape != take.shape:
            raise AssertionError(f"{clip['file']}: {samples.shape} at {got_rate} Hz for a take of {take.shape} at {rate} Hz")
        got = np.fft.rfft(samples[start:start + period], axis=0)
        for c in range(channels):
            # The second's own channel repeats the first of the others, whichever gang that goes through.
            shown = c if c != own else (1 if own == 0 else 0)
            model = right if shown % 2 else left
            sources = [(shown, left.driven)] if own is None else [(shown, "first"), (own, "second")]
            for source, drive in sources:
                bins = waves[source][1]
                hertz = bins * rate / period
                answers.append((f"dial {dial}, channel {c + 1} of {channels}, {drive} source", hertz,
                                got[bins, c] / given[bins, source], nodal.transfer(model.circuit(dial, drive=drive), hertz)))
    return answers


def check(test, name, seeds, rates=RATES):
    """Random hookups."""
    check_texts(test, name, {f"held {seed}": wide_hookups.hookup(f"held {seed}", dials=DIALS, accept=lambda m: settles(m.text))[0]
                             for seed in seeds}, rates)


def check_texts(test, name, texts, rates=RATES):
    tally = render_check.Tally()
    circuits = []
    for text in texts.values():
        for m in models_of(text):
            drives = ("first", "second") if m.second_channel else (m.driven,)
            circuits += [m.circuit(d, drive=drive) for d in DIALS for drive in drives]
    tally.worst["nodal"] = render_check.nodal_against_ngspice(circuits)
    with tempfile.TemporaryDirectory() as folder:
        for number, (title, text) in enumerate(texts.items()):
            for rate in rates:
                try:
                    answers = measure(pathlib.Path(folder), text, rate, render_check.seed_number(title),
                                      channels_of(text, number))
                except AssertionError as error:
                    tally.failures.append(f"{title} at {rate} Hz: {error}\n{text}")
                    continue
                for where, hertz, got, due in answers:
                    tally.clip(f"{title}, {rate} Hz, {where}", hertz, got, due)
    render_check.report(test, name, f"{len(texts)} hookups, dials {DIALS}, rates {rates}", tally.worst, tally.failures,
                        50 * len(texts) * len(rates))
