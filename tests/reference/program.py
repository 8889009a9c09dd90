"""Calling the program under test: where it is, its CSV, its sound files."""

import csv
import io
import math
import os
import pathlib
import shutil
import subprocess

ROOT = pathlib.Path(os.environ.get("UNSOLDERED_SOURCE", pathlib.Path(__file__).resolve().parents[2]))


def path():
    """The program: UNSOLDERED, else the usual build folder, else the PATH."""
    for candidate in (os.environ.get("UNSOLDERED"), ROOT / "build" / "release" / "unsoldered", ROOT / "build" / "unsoldered",
                      shutil.which("unsoldered")):
        if candidate and pathlib.Path(candidate).exists():
            return str(candidate)
    raise RuntimeError("no program to test: set UNSOLDERED to its path")


def call(*words, cwd=None):
    """Standard output of one run; any other status than 0 is an error that shows what the program said."""
    done = subprocess.run([path(), *map(str, words)], capture_output=True, text=True, cwd=cwd)
    if done.returncode != 0:
        raise AssertionError(f"unsoldered {' '.join(map(str, words))}: status {done.returncode}\n{done.stderr[-3000:]}")
    return done.stdout


def number(cell):
    """A cell of the program's CSV: None when empty."""
    return None if cell == "" else float(cell)


def table(text, header):
    """Rows of a CSV with exactly this header."""
    rows = list(csv.reader(io.StringIO(text)))
    if not rows or ",".join(rows[0]) != header:
        raise AssertionError(f"header {rows[:1]} instead of {header}")
    for row in rows[1:]:
        if len(row) != len(rows[0]):
            raise AssertionError(f"row of {len(row)} cells under a header of {len(rows[0])}: {row}")
    return [dict(zip(rows[0], row)) for row in rows[1:]]


RESPONSE = "dial,frequency_hz,level_db,phase_deg,group_delay_us"
KNOB = ("dial,degrees,element_fraction,level_db,treble_lost_db,treble_5k_1k_db,corner_hz,peak_hz,peak_db,"
        "output_ohm,noise_uv")
CLIPS = "file,hookup,dial,gain_db,peak_dbfs,peak_dbtp,loudness_lufs"


def response(hookup_file, dials, hertz, *words):
    """{dial: list of rows as floats (None: empty)} in the order of `hertz`."""
    out = call("response", hookup_file, "--dial", ",".join(f"{d:g}" for d in dials), "--at",
               ",".join(repr(float(f)) for f in hertz), *words)
    rows = [{k: number(v) for k, v in row.items()} for row in table(out, RESPONSE)]
    if len(rows) != len(dials) * len(hertz):
        raise AssertionError(f"{len(rows)} rows for {len(dials)} dials and {len(hertz)} frequencies")
    found = {}
    for i, dial in enumerate(dials):
        part = rows[i * len(hertz):(i + 1) * len(hertz)]
        for row, f in zip(part, hertz):
            if not math.isclose(row["dial"], dial, abs_tol=1e-9) or not math.isclose(row["frequency_hz"], f, rel_tol=1e-8):
                raise AssertionError(f"row {row} where dial {dial}, {f} Hz was due")
        found[dial] = part
    return found


def knob(hookup_file, steps=41, *words):
    text = call("knob", hookup_file, "--steps", steps, *words)
    return [{k: number(v) for k, v in row.items()} for row in table(text, KNOB)]

