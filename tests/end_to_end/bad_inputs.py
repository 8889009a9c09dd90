"""The table of bad inputs: what is wrong, how it is made, how the program is called and what its message must hold.

Each case runs in a folder of its own with a good hookup (good.hookup.toml) and a good take (take.wav, take.flac), which
its `make` then spoils. A message must name what was given, what is accepted and what to do next; `words` are parts of all
three.
"""

import dataclasses
import os
import struct
import subprocess
import typing

import numpy as np

HOOKUP = """title = "Bench"
[source]
kind = "pickup"
inductance = "2.4 H"
resistance = "6k2"
capacitance = "110 pF"
loss_resistance = "300k"
[volume]
resistance = "500k"
taper = "audio 15%"
dead_travel = [15, 15]
end_resistance = "50"
[tone]
resistance = "500k"
taper = "audio 15%"
capacitor = "22n"
[cable]
length = "5 m"
capacitance_per_metre = "100 pF"
[load]
resistance = "1M"
capacitance = "20 pF"
"""
LINE = """[source]
kind = "line"
resistance = "0"
[volume]
resistance = "10k"
taper = "linear"
[load]
resistance = "47k"
"""


@dataclasses.dataclass
class Case:
    name: str
    words: tuple
    arguments: list
    make: typing.Callable = lambda folder: None
    status: int = 2
    how: str = "plain"  # or: nobody, small disk, small files, full output: see bad_inputs_test.py


def tone(frames=9600, channels=1):
    rising = np.sin(2 * np.pi * 440 / 48000 * np.arange(frames))[:, None] * 0.25
    return np.repeat(rising, channels, axis=1)


def wav(samples, rate=48000, code=1, bits=16, channels=None, promised=None):
    """A WAV file as bytes; `channels` and `promised` (bytes of sound) may contradict the samples."""
    if code == 3:
        body = np.asarray(samples, "<f4").tobytes()
        bits = 32
    else:
        body = np.round(np.asarray(samples) * 32767).astype("<i2").tobytes()
    count = samples.shape[1] if channels is None else channels
    size = len(body) if promised is None else promised
    frame = max(1, count * bits // 8)
    head = struct.pack("<4sI4s4sIHHIIHH4sI", b"RIFF", 36 + size, b"WAVE", b"fmt ", 16, code, count, rate,
                       (rate * frame) & 0xFFFFFFFF, frame & 0xFFFF, bits, b"data", size)
    return head + body


def sox(folder, *words):
    subprocess.run(["sox", "-D", *words], cwd=folder, check=True, capture_output=True)


def good_folder(folder):
    (folder / "good.hookup.toml").write_text(HOOKUP, encoding="utf-8")
    (folder / "take.wav").write_bytes(wav(tone()))


def file(name, content):
    """Makes a file, from text or bytes."""
    def make(folder):
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(content.encode() if isinstance(content, str) else content)
    return make


def both(*makers):
    def make(folder):
        for one in makers:
            one(folder)
    return make


def edited(*changes, base=HOOKUP):
    """The good hookup with pieces replaced: (old, new), … A piece that is not there is a slip of this table."""
    text = base
    for old, new in changes:
        assert text.count(old) >= 1, old
        text = text.replace(old, new, 1)
    return file("bad.hookup.toml", text)


KNOB = ["knob", "bad.hookup.toml", "--steps", "5"]
OUT = ["--out", "clips"]


def render(*more, take="take.wav", hookup="good.hookup.toml", out="clips"):
    return ["render", take, "--hookup", hookup, "--out", out, *more]


def of_hookup(name, words, *changes, base=HOOKUP, **more):
    return Case(name, words, KNOB, edited(*changes, base=base), **more)


def toml_cases():
    yield Case("TOML: text not closed", ("bad.hookup.toml:3", "not valid TOML", "double quote missing"), KNOB,
               edited(('kind = "pickup"', 'kind = "pickup')))
    yield Case("TOML: no equals sign", ("bad.hookup.toml:4", "not valid TOML", "correct this line"), KNOB,
               edited(("inductance =", "inductance")))
    yield Case("TOML: value without quotes", ("bad.hookup.toml:5", "not valid TOML", "double quotes"), KNOB,
               edited(('"6k2"', "6k2")))
    yield Case("TOML: the same key twice", ("bad.hookup.toml:5", "inductance", "correct this line"), KNOB,
               edited(('resistance = "6k2"', 'inductance = "3 H"')))
    yield Case("TOML: the same block twice", ("bad.hookup.toml", "volume", "correct this line"), KNOB,
               edited(("[tone]", "[volume]")))
    yield Case("TOML: a letter in Latin-1", ("bad.hookup.toml:6", "not valid TOML", "UTF-8"), KNOB,
               file("bad.hookup.toml", HOOKUP.replace("110 pF", "0.11 nF # \u00b1").encode("latin-1")))
    yield Case("TOML: UTF-16", ("bad.hookup.toml:1", "not valid TOML", "UTF-8", "right file"), KNOB,
               file("bad.hookup.toml", HOOKUP.encode("utf-16")))
    yield Case("TOML: a sound file for a hookup", ("take.wav", "is a sound file", "text"), ["knob", "take.wav"])
    yield Case("a job file for a hookup", ("a.job.toml", "is a job file", "render --job"), ["knob", "a.job.toml"],
               file("a.job.toml", "unsoldered_job = 1\n"))
    yield Case("TOML: brackets nested 5000 deep", ("bad.hookup.toml:1", "not valid TOML"), KNOB,
               file("bad.hookup.toml", "a = " + "[" * 5000))
    yield Case("TOML: a key of 5000 parts", ("bad.hookup.toml:1", "more than 32 dots", "shorten it"), KNOB,
               file("bad.hookup.toml", ".".join(["a"] * 5000) + " = 1"))
    yield Case("TOML: 2 MiB of comment", ("bad.hookup.toml", "1 MiB", "the right file?"), KNOB,
               file("bad.hookup.toml", "# " + "x" * (2 << 20)))
    yield Case("hookup file empty", ("bad.hookup.toml", "block [source] is missing", "pickup"), KNOB,
               file("bad.hookup.toml", ""))


def key_cases():
    yield of_hookup("key: unknown in a block", ("bad.hookup.toml:9", "volume.resistence", 'was "resistance" meant?'),
                    ('resistance = "500k"', 'resistence = "500k"'))
    yield of_hookup("key: unknown block", ("bad.hookup.toml:13", '"tones"', 'was "tone" meant?', "Accepted are"),
                    ("[tone]", "[tones]"))
    yield of_hookup("key: inductance of a line source", ("source.inductance", "not used by a line source", "accepted"),
                    ('"0"', '"100"\ninductance = "1 H"'), base=LINE)
    yield of_hookup("key: source missing", ("block [source] is missing", "kind", "pickup"),
                    (LINE[:LINE.index("[volume]")], ""), base=LINE)
    yield of_hookup("key: load missing", ("block [load] is missing", "resistance"),
                    ('[load]\nresistance = "47k"\n', ""), base=LINE)
    yield of_hookup("key: loss resistance missing", ("source.loss_resistance", "is missing", '"none"'),
                    ('loss_resistance = "300k"\n', ""))
    yield of_hookup("key: pot without a total", ("volume.resistance", "is missing", "measured_total", "500k"),
                    ('[volume]\nresistance = "500k"\n', "[volume]\n"))
    yield of_hookup("key: pot without a taper", ("volume.taper", "is missing", "measured_half", "audio 15%"),
                    ('taper = "audio 15%"\ndead', "dead"))
    yield of_hookup("key: treble bleed without capacitor", ("treble_bleed.capacitor", "is missing", "10 mF"),
                    ("[cable]", '[treble_bleed]\nparallel_resistor = "150k"\n[cable]'))
    yield of_hookup("key: cable in two ways", ("cable.capacitance", "keep one of the two"),
                    ('length = "5 m"', 'length = "5 m"\ncapacitance = "500 pF"'))
    yield of_hookup("key: block given as a value", ('"volume"', "500", "[volume]"),
                    ('[volume]\nresistance = "10k"\ntaper = "linear"\n', ""),
                    ("[source]", "volume = 500\n[source]"), base=LINE)
    yield of_hookup("key: unknown kind of source", ("source.kind", '"microphone"', '"pickup", "line", "piezo"'),
                    ('"line"', '"microphone"'), base=LINE)
    yield of_hookup("key: unknown wiring of the wiper", ("volume.source_on", '"bottom"', '"top", "wiper"'),
                    ('taper = "linear"', 'taper = "linear"\nsource_on = "bottom"'), base=LINE)


def value_cases():
    yield of_hookup("unit: a capacitance for a resistance", ("volume.resistance", '"500 pF"', "ohm"),
                    ('"500k"', '"500 pF"'))
    yield of_hookup("unit: henry for farad", ("source.capacitance", '"2.4 H"', "farad"), ('"110 pF"', '"2.4 H"'))
    yield of_hookup("unit: ohm for henry", ("source.inductance", '"470 ohm"', "inductance", "2.4 H"), ('"2.4 H"', '"470 ohm"'))
    yield of_hookup("unit: seconds for metre", ("cable.length", '"5 s"', "metre"), ('"5 m"', '"5 s"'))
    yield of_hookup("value: decimal comma", ("source.inductance", '"2,4 H"', "point"), ('"2.4 H"', '"2,4 H"'))
    yield of_hookup("value: two prefixes", ("volume.resistance", '"500kk"', "resistance"), ('"500k"', '"500kk"'))
    yield of_hookup("value: empty text", ("volume.resistance", "empty", "500k"), ('"500k"', '""'))
    yield of_hookup("value: a word", ("load.resistance", '"high"', "no number", "500k, 4k7"), ('"1M"', '"high"'))
    yield of_hookup("value: true", ("load.resistance", "true", "wanted", "1 ohm to 10G"), ('"1M"', "true"))
    yield of_hookup("value: a date", ("load.resistance", "date", "wanted", "1 ohm to 10G"), ('"1M"', "2020-02-02"))
    yield of_hookup("value: a list", ("load.resistance", "list", "wanted", "1 ohm to 10G"), ('"1M"', '["1M"]'))
    yield of_hookup("value: not a number", ("source.resistance", "nan", "ohm"), ('"6k2"', "nan"))
    yield of_hookup("value: infinite", ("source.resistance", "inf", "ohm"), ('"6k2"', "inf"))
    yield of_hookup("value: zero pot", ("volume.resistance", '"0"', "10 ohm", "100M"), ('"500k"', '"0"'))
    yield of_hookup("value: zero load", ("load.resistance", '"0"', "1 ohm"), ('"1M"', '"0"'))
    yield of_hookup("value: zero inductance", ("source.inductance", '"0"', "1 nH"), ('"2.4 H"', '"0"'))
    yield of_hookup("value: negative resistance", ("volume.resistance", '"-500k"', "negative"), ('"500k"', '"-500k"'))
    yield of_hookup("value: negative bare number", ("load.capacitance", "-20 pF", "accepted"), ('"20 pF"', "-2e-11"))
    yield of_hookup("value: milli for mega", ("volume.resistance", '"500m"', "10 ohm", "prefix"), ('"500k"', '"500m"'))
    yield of_hookup("value: 500 megohm pot", ("volume.resistance", '"500M"', "10 ohm to 100M", "prefix"), ('"500k"', '"500M"'))
    yield of_hookup("value: 22 farad", ("tone.capacitor", '"22"', "10 mF", "prefix"), ('"22n"', '"22"'))
    yield of_hookup("value: 1e300 ohm", ("source.resistance", "1e+300", "1G"), ('"6k2"', "1e300"))
    yield of_hookup("value: 5 km of cable", ("cable.length", '"5 km"', "1"), ('"5 m"', '"5 km"'))
    yield of_hookup("value: ends larger than the pot", ("volume.end_resistance", "250k", "500k", "half"),
                    ('"50"', '"250k"'))
    yield of_hookup("value: dead travel over everything", ("volume.dead_travel", "200 and 100", "300 degrees", "accepted"),
                    ("[15, 15]", "[200, 100]"))
    yield of_hookup("value: three dead travels", ("volume.dead_travel", "3 entries", "two"), ("[15, 15]", "[1, 2, 3]"))
    yield of_hookup("value: travel of 0", ("volume.travel", "0", "10 to 3600 degrees"),
                    ("dead_travel = [15, 15]", "travel = 0"))
    yield of_hookup("value: tolerance of 300%", ("tolerance", '"300%"', "%"), ("dead_travel = [15, 15]",
                                                                            'tolerance = "300%"'))
    yield of_hookup("value: tone at 11", ("tone.dial", "11", "0 to 10"), ('"22n"', '"22n"\ndial = 11'))
    yield of_hookup("value: tone at -1", ("tone.dial", "-1", "0 to 10"), ('"22n"', '"22n"\ndial = -1'))
    yield of_hookup("value: no_load as text", ("tone.no_load", '"yes"', "true or false"), ('"22n"', '"22n"\nno_load = "yes"'))


def taper_cases():
    for name, taper, words in [
        ("letter with value", "A500K", ("A500K", "letter", "linear", "measured_half")),
        ("letter A", "A", ('"A"', "letter", "audio N%", "measured_half")),
        ("letter B", "b", ('"b"', "letter", "linear", "measured_half")),
        ("audio without a share", "audio", ('"audio"', "audio 15%")),
        ("a word from a catalogue", "log", ('"log"', "audio")),
        ("audio 60%", "audio 60%", ("60 %", "1 % to 49 %")),
        ("audio 0%", "audio 0%", ("0 %", "1 % to 49 %")),
        ("audio with decimal comma", "audio 12,5%", ("12,5", "point")),
    ]:
        yield of_hookup(f"taper: {name}", ("volume.taper", *words), ('"audio 15%"', f'"{taper}"'))
    for name, taper, words in [
        ("sections that fall", "{ sections = [[0,0],[0.5,0.6],[0.6,0.4],[1,1]] }", ("sections", "0.4")),
        ("sections that end early", "{ sections = [[0,0],[0.9,1]] }", ("sections", "1")),
        ("sections beyond 1", "{ sections = [[0,0],[1,1.2]] }", ("sections", "1.2", "0 to 1")),
        ("sections of three numbers", "{ sections = [[0,0,0],[1,1]] }", ("sections", "entry 1", "pair")),
        ("measured file missing", '{ measured = "none.csv" }', ("measured", "none.csv", "no such file")),
        ("measured file outside the folder", '{ measured = "../pot.csv" }', ("measured", "../pot.csv", "beside")),
        ("sections and measured", '{ sections = [[0,0],[1,1]], measured = "a.csv" }',
         ("measured", "sections", "take one of them out")),
    ]:
        yield of_hookup(f"taper: {name}", ("volume.taper", *words), ('"audio 15%"', taper))
    for name, content, words in [
        ("with semicolons", "travel;share\n0;0\n1;1\n", ("pot.csv", "separator", "travel,share")),
        ("of one line", "0,0\n", ("pot.csv", "1 points", "at least two")),
        ("of words", "travel,share\na,b\nc,d\n", ("pot.csv:2", '"a,b"', "pair of numbers")),
        ("that falls", "0,0\n0.5,0.8\n0.6,0.3\n1,1\n", ("pot.csv", "0.3")),
    ]:
        yield Case(f"taper: measured file {name}", ("volume.taper", *words), KNOB,
                   both(edited(('"audio 15%"', '{ measured = "pot.csv" }')), file("pot.csv", content)))
    yield of_hookup("taper: half reading above the total", ("volume.measured_half", "600k", "499.95k", "bottom lug"),
                    ('taper = "audio 15%"\ndead', 'measured_half = "600k"\ndead'))


def network_cases():
    for name, extra, words in [
        ("ideal source shorted", 'part = "resistor"\nvalue = "0"\nbetween = ["top", "ground"]',
         ("bad.hookup.toml", "short-circuited", "no solution", "give the source (or the buffer")),
        ("a part on an island", 'part = "resistor"\nvalue = "1k"\nbetween = ["x", "y"]',
         ("bad.hookup.toml", '"x"', "extra resistor 1", "no path to ground", "connect it")),
        ("a part on one node", 'part = "capacitor"\nvalue = "1n"\nbetween = ["top"]', ("extra.0.between", "two")),
        ("a part from a node to itself", 'part = "capacitor"\nvalue = "1n"\nbetween = ["top", "top"]',
         ("extra.0.between", "top")),
        ("a pot with two nodes", 'part = "pot"\nvalue = "10k"\ntaper = "linear"\nbetween = ["top", "ground"]',
         ("extra.0.between", "three")),
        ("a node that is a number", 'part = "resistor"\nvalue = "1k"\nbetween = ["top", 0]',
         ("extra.0.between", "0", "wiper")),
        ("no such wire", 'part = "resistor"\nvalue = "1k"\nin_place_of = "hot-cold"', ("hot-cold", "source-top", "accepted")),
        ("no nodes", 'part = "resistor"\nvalue = "1k"', ("extra.0.between", "missing", "in_place_of")),
        ("unknown part", 'part = "valve"\nvalue = "1k"\nbetween = ["top", "ground"]', ("extra.0.part", "valve", "resistor")),
        ("no value", 'part = "resistor"\nbetween = ["top", "ground"]', ("extra.0.value", "missing", "ohm")),
        ("zero capacitor", 'part = "capacitor"\nvalue = "0"\nbetween = ["top", "ground"]', ("extra.0.value", '"0"', "0.01 pF")),
    ]:
        yield of_hookup(f"network: {name}", words, ('[load]', f"[[extra]]\n{extra}\n[load]"), base=LINE)
    island = edited(("[load]", '[[extra]]\npart = "resistor"\nvalue = "1k"\nbetween = ["x", "y"]\n[load]'))
    yield Case("network: one of two hookups has no solution", ("bad.hookup.toml", '"x"', "no path to ground", "connect it"),
               render("--dial", "10,5", "--hookup", "bad.hookup.toml"), island)
    yield Case("network: no solution with a turning knob", ("bad.hookup.toml", '"x"', "no path to ground", "connect it"),
               render("--turn", "0:0,1:10", hookup="bad.hookup.toml"), island)
    yield of_hookup("network: extra as one block", ('"extra"', "[[extra]]"),
                    ("[load]", '[extra]\npart = "resistor"\n[load]'), base=LINE)
    yield of_hookup("network: a blend with nothing to blend", ('"blend"', "nothing to blend with", "[second.source]"),
                    ("[load]", '[blend]\nlaw = "MN"\nresistance = "250k"\n[load]'), base=LINE)
    yield of_hookup("network: a buffer and a volume in one stage", ('"then.0.buffer"', "two [[then]]"),
                    ("[load]", '[[then]]\nbuffer = { input = "1M", output = "1k" }\n'
                     'volume = { resistance = "10k", taper = "linear" }\n[load]'), base=LINE)
    yield of_hookup("network: a stage that holds nothing", ('"then.0"', "a volume, a tone, a cable or a buffer"),
                    ("[load]", '[[then]]\n[load]'), base=LINE)
    yield of_hookup("network: a channel for a source that is not there", ('"second_channel"', "[second.source]"),
                    ("[source]", 'second_channel = 2\n[source]'), base=LINE)
    yield of_hookup("network: a part across a buffer", ('"output" to "then1_output"', "one side"),
                    ("[load]", '[[then]]\nbuffer = { input = "1M", output = "1k" }\n[[extra]]\npart = "resistor"\n'
                     'value = "1k"\nbetween = ["output", "then1_output"]\n[load]'), base=LINE)


def call_cases():
    good = "good.hookup.toml"
    for name, arguments, words in [
        ("nothing at all", [], ("no verb", "response", "render", "--help")),
        ("unknown verb", ["rendr", "take.wav"], ('"rendr"', "render", "--help")),
        ("unknown option", ["knob", good, "--stepps", "5"], ('"--stepps"', "--steps", "--help")),
        ("one name too many", ["knob", good, "second"], ('"second"', "--help")),
        ("knob without a hookup", ["knob"], ("HOOKUP", "missing", "--help")),
        ("render without a take", ["render"], ("TAKE", "missing", "built-in", "--help")),
        ("render without a hookup", ["render", "take.wav", "--out", "clips"], ("--hookup", "missing", "--help")),
        ("render without a folder", ["render", "take.wav", "--hookup", good], ("--out", "missing", "--help")),
        ("option without its value", ["knob", good, "--steps"], ("--steps", "value", "--help")),
        ("dial 11", render("--dial", "10,11"), ("--dial", "11", "0 to 10")),
        ("dial -1", render("--dial", "-1"), ("--dial", "-1", "0 to 10")),
        ("dial in words", render("--dial", "seven"), ("--dial", '"seven"', "0 to 10")),
        ("dial empty", render("--dial", ""), ("--dial", '""', "0 to 10")),
        ("dials with semicolons", render("--dial", "10;5"), ("--dial", '"10;5"', "0 to 10", "comma")),
        ("dial nan", ["response", good, "--dial", "nan"], ("--dial", '"nan"', "0 to 10")),
        ("two dials for a netlist", ["netlist", good, "--dial", "10,5"], ("--dial", '"10,5"', "0 to 10")),
        ("turn without a colon", render("--turn", "8"), ("--turn", '"8"', "seconds:dial", "0:0,8:10")),
        ("turn empty", render("--turn", ""), ("--turn", '""', "seconds:dial", "0:0,8:10")),
        ("turn to 11", render("--turn", "0:0,8:11"), ("--turn", '"8:11"', "11", "0 to 10")),
        ("turn back in time", render("--turn", "5:0,1:10"), ("--turn", "1 s", "5 s", "in the order")),
        ("turn before the start", render("--turn", "-1:0,1:10"), ("--turn", "-1 s", "0 to 1000000 s")),
        ("turn with semicolons", render("--turn", "0:0;8:10"), ("--turn", '"0:0;8:10"', "0:0,8:10")),
        ("turn with decimal comma", render("--turn", "0:0,4:5,5"), ("--turn", '"5"', "0:0,8:10")),
        ("turn with three points at one time", render("--turn", "1:0,1:5,1:9"), ("--turn", "1 s", "third", "at most two")),
        ("turn with a comma at its end", render("--turn", "0:0,8:10,"), ("--turn", '""', "0:0,8:10")),
        ("turn of a knob that is not there", render("--turn", "middle=0:1,1:2"), ("middle", good, "volume, tone")),
        ("turn without the knob's name", render("--turn", "=0:1"), ("--turn", '"=0:1"', "tone=0:10,4:0")),
        ("turn and dial", render("--turn", "0:1", "--dial", "5"), ("--dial and --turn", "one of the two")),
        ("two turns of one knob", render("--turn", "0:1", "--turn", "0:2"), ("--turn", "volume", "in one")),
        ("a boost limit with nothing to undo", render("--boost-limit", "12"), ("--boost-limit 12", "--recorded-through")),
        ("depth 20", render("--depth", "20"), ("--depth", '"20"', "16, 24 or float")),
        ("depth 32", render("--depth", "32"), ("--depth", '"32"', "16, 24 or float")),
        ("jobs 0", render("--jobs", "0"), ("--jobs", "0", "1 to 256")),
        ("jobs -2", render("--jobs", "-2"), ("--jobs", "-2", "1 to 256")),
        ("jobs in words", render("--jobs", "many"), ("--jobs", '"many"', "1 to 256")),
        ("an unknown format", render("--format", "wma"), ("--format", '"wma"', "wav, flac, mp3 or ogg")),
        ("a format in capitals", render("--format", "WAV"), ("--format", '"WAV"', "wav, flac, mp3 or ogg")),
        ("a format with a dot", render("--format", ".flac"), ("--format", '".flac"', "wav, flac, mp3 or ogg")),
        ("no format", render("--format", ""), ("--format", '""', "wav, flac, mp3 or ogg")),
        ("FLAC with float", render("--format", "flac", "--depth", "float"), ("flac", "float", "16 or 24", "--format wav")),
        ("FLAC of 32 bits", render("--format", "flac", "--depth", "32"), ("--depth", '"32"', "16, 24 or float")),
        ("MP3 with a depth", render("--format", "mp3", "--depth", "24"), ("mp3", "--depth 24", "leave --depth", "wav or flac")),
        ("Ogg with a depth", render("--format", "ogg", "--depth", "float"), ("ogg", "float", "leave --depth", "wav or flac")),
        ("an unknown format with a depth", render("--format", "aiff", "--depth", "16"), ('"aiff"', "wav, flac, mp3 or ogg")),
        ("match with a value", render("--match-loudness=-23"), ("--match-loudness", "no value", "leave away", "--help")),
        ("steps 1", ["knob", good, "--steps", "1"], ("--steps", "1", "2 to 10001")),
        ("steps 2.5", ["knob", good, "--steps", "2.5"], ("--steps", '"2.5"', "whole number", "2 to 10001")),
        ("steps beyond counting", ["knob", good, "--steps", "9" * 30], ("--steps", "2 to 10001")),
        ("points 0", ["response", good, "--points", "0"], ("--points", "0", "2 to 1000000")),
        ("points in words", ["response", good, "--points", "some"], ("--points", '"some"', "2 to 1000000")),
        ("at 0 Hz", ["response", good, "--at", "0"], ("--at", '"0"', "1 GHz")),
        ("at -5 Hz", ["response", good, "--at", "-5"], ("--at", '"-5"', "negative", "frequency")),
        ("at nothing", ["response", good, "--at", ""], ("--at", "empty", "frequency")),
        ("at, with a gap", ["response", good, "--at", "100,,200"], ("--at", "empty", "frequency")),
        ("at in ohm", ["response", good, "--at", "5 kohm"], ("--at", '"5 kohm"', "frequency")),
        ("at and a span", ["response", good, "--at", "100", "--from", "20"], ("--at", "--from", "one of the two")),
        ("from above to", ["response", good, "--from", "2k", "--to", "100"], ("--from", "2k", "--to", "100", "swap")),
        ("to beyond reason", ["response", good, "--to", "1e12"], ("--to", "1e12", "1 GHz")),
        ("set without a value", ["knob", good, "--set", "tone.dial"], ("--set", "tone.dial", "KEY=VALUE")),
        ("set nothing", ["knob", good, "--set", ""], ("--set", '""', "KEY=VALUE")),
        ("set an unknown key", ["knob", good, "--set", "tone.dail=4"], ("--set", "tone.dail", 'was "dial" meant?')),
        ("set dial 11", ["knob", good, "--set", "tone.dial=11"], ("--set tone.dial=11", "11", "0 to 10")),
        ("set with decimal comma", ["knob", good, "--set", "tone.dial=4,5"], ("--set", "4,5", "point", "0 to 10")),
        ("set a bare letter", ["knob", good, "--set", "volume.taper=A500K"], ("A500K", "letter", "measured_half")),
        ("set a wrong unit", ["knob", good, "--set", "cable.length=10 lb"], ("--set", "10 lb", "metre")),
        ("set below a value", ["knob", good, "--set", "volume.resistance.x=1"], ("--set", '"x"', "not a table")),
        ("set an entry that is not there", ["knob", good, "--set", "extra.5.value=1k"], ("--set", '"5"', "counted from 0")),
        ("hookup missing", ["knob", "no.hookup.toml"], ("no.hookup.toml", "no such file", "check the name")),
        ("hookup is a folder", ["knob", "."], (".", "folder", "name a file in it")),
        ("hookup without a name", ["knob", ""], ('""', "file name", "give")),
        ("hookup is an endless device", ["knob", "/dev/zero"], ("/dev/zero", "not a regular file", "text file")),
    ]:
        yield Case(f"call: {name}", words, arguments)


def sound_cases():
    for name, take, words in [
        ("missing", "no.wav", ("no.wav", "No such file", "WAV, FLAC", "built-in")),
        ("without a name", "", ("take ''", "WAV, FLAC", "built-in")),
        ("a folder", ".", ("'.'", "folder", "WAV, FLAC")),
        ("a hookup", "good.hookup.toml", ("good.hookup.toml", "not a sound file", "WAV, FLAC")),
        ("an endless device", "/dev/zero", ("/dev/zero", "regular file", "save it")),
        ("with a name of 5000 letters", "x" * 5000, ("name too long", "WAV, FLAC")),
    ]:
        yield Case(f"take: {name}", words, render(take=take))
    frames = tone()
    for name, value in {"NaN": np.nan, "infinite": np.inf, "1e30": 1e30}.items():
        samples = tone(channels=2)
        samples[4800, 1] = value
        yield Case(f"take: a sample is {name}", ("sample 4800", "0.1 s", "channel 2", "full scale is 1", "again"),
                   render(take="bad.wav"), file("bad.wav", wav(samples, code=3)))

    def cut(folder):
        sox(folder, "take.wav", "whole.flac")
        whole = (folder / "whole.flac").read_bytes()
        (folder / "bad.flac").write_bytes(whole[:len(whole) // 2])

    def cut_later(folder):
        sox(folder, "-n", "-r", "48000", "-b", "16", "whole.flac", "synth", "5", "pinknoise")
        whole = (folder / "whole.flac").read_bytes()
        (folder / "bad.flac").write_bytes(whole[:len(whole) * 3 // 4])

    def flipped(folder):
        sox(folder, "-n", "-r", "48000", "-b", "16", "whole.flac", "synth", "5", "pinknoise")
        whole = bytearray((folder / "whole.flac").read_bytes())
        whole[len(whole) // 2:len(whole) // 2 + 300] = bytes(300)
        (folder / "bad.flac").write_bytes(bytes(whole))

    for name, make in [("cut in half", cut), ("of 5 s cut at three quarters", cut_later), ("with a hole", flipped)]:
        yield Case(f"take: FLAC {name}", ("bad.flac", "up to sample", "whole copy"), render(take="bad.flac"), make)
    yield Case("take: FLAC header and then noise", ("bad.flac", "WAV, FLAC"), render(take="bad.flac"),
               file("bad.flac", b"fLaC" + bytes(range(256)) * 8))
    for name, content, words in [
        ("text named .wav", "This is a letter, not a sound.\n" * 20, ("not a sound file", "WAV, FLAC")),
        ("0 bytes", b"", ("not a sound file", "WAV, FLAC")),
        ("half a header", wav(frames)[:20], ("not a sound file", "WAV, FLAC")),
        ("a header and no samples", wav(frames[:0]), ("0 samples", "give a take")),
        ("no channels", wav(frames, channels=0), ("not a sound file", "WAV, FLAC")),
        ("9 channels", wav(tone(channels=9)), ("9 channels", "1 to 8", "split")),
        ("65535 channels", wav(frames, channels=65535), ("WAV, FLAC",)),
        ("4 kHz", wav(frames, rate=4000), ("4000 Hz", "8000 to 384000", "resample")),
        ("768 kHz", wav(frames, rate=768000), ("768000 Hz", "8000 to 384000", "resample")),
        ("0 Hz", wav(frames, rate=0), ("WAV, FLAC",)),
    ]:
        yield Case(f"take: WAV, {name}", ("bad.wav", *words), render(take="bad.wav"), file("bad.wav", content))
    yield Case("take: ADPCM in a WAV", ("bad.wav", "ADPCM", "8 to 32 bits", "convert"), render(take="bad.wav"),
               lambda folder: sox(folder, "take.wav", "-e", "ms-adpcm", "bad.wav"))
    yield Case("take: AU", ("bad.au", "AU", "WAV", "convert"), render(take="bad.au"),
               lambda folder: sox(folder, "take.wav", "bad.au"))
    yield Case("take: Ogg Vorbis named .wav", ("bad.wav", "OGG", "WAV", "convert"), render(take="bad.wav"),
               lambda folder: sox(folder, "take.wav", "-t", "ogg", "bad.wav"))
    yield Case("take: a pipe nobody writes to", ("bad.wav", "regular file", "save it"), render(take="bad.wav"),
               lambda folder: os.mkfifo(folder / "bad.wav"))
    yield Case("take: links in a circle", ("bad.wav", "symbolic links", "WAV, FLAC"), render(take="bad.wav"),
               lambda folder: os.symlink("bad.wav", folder / "bad.wav"))
    yield Case("take: not readable by this user", ("take.wav", "Permission denied", "permissions"), render(),
               lambda folder: (folder / "take.wav").chmod(0), status=3, how="nobody")
    yield Case("hookup: not readable by this user", ("good.hookup.toml", "Permission denied", "permissions"),
               ["knob", "good.hookup.toml"], lambda folder: (folder / "good.hookup.toml").chmod(0), status=3, how="nobody")


def aiff(samples, channels=None, promised=None, rate=48000):
    """A 16-bit AIFF file as bytes; the rate is an 80-bit float (IEEE 754 extended)."""
    body = np.round(np.asarray(samples) * 32767).astype(">i2").tobytes()
    count = samples.shape[1] if channels is None else channels
    size = len(body) if promised is None else promised
    exponent = max(rate, 1).bit_length() - 1
    extended = struct.pack(">HQ", 16383 + exponent, rate << (63 - exponent)) if rate else bytes(10)
    common = struct.pack(">hIh", count, size // (2 * max(1, count)), 16) + extended
    head = b"COMM" + struct.pack(">I", len(common)) + common + b"SSND" + struct.pack(">III", size + 8, 0, 0)
    return b"FORM" + struct.pack(">I", (4 + len(head) + size) & 0xFFFFFFFF) + b"AIFF" + head + body


def rf64(samples, long_size=None):
    """A WAV file with its sizes in a ds64 chunk (EBU Tech 3306)."""
    plain = wav(samples)
    body = plain[44:]
    size = len(body) if long_size is None else long_size
    ds64 = b"ds64" + struct.pack("<IQQQI", 28, size + 72, size, size // 2, 0)
    return b"RF64\xff\xff\xff\xffWAVE" + ds64 + plain[12:36] + b"data\xff\xff\xff\xff" + body


def format_cases():
    """Takes that a file format cannot hold, and takes in the rarer containers that are no good."""
    def take(**more):
        return file("bad.wav", wav(tone(**{key: more.pop(key) for key in ("channels",) if key in more}), **more))

    def call(*words):
        return render(*words, take="bad.wav")

    yield Case("format: MP3 at 96 kHz", ("mp3", "96000 Hz", "44100 or 48000 Hz", "wav, flac or ogg", "resample"),
               call("--format", "mp3"), take(rate=96000))
    yield Case("format: MP3 at 37.8 kHz", ("mp3", "37800 Hz", "44100 or 48000 Hz", "wav, flac or ogg", "resample"),
               call("--format", "mp3"), take(rate=37800))
    yield Case("format: MP3 of 3 channels", ("mp3", "3 channels", "1 or 2", "wav or flac", "mix"),
               call("--format", "mp3"), take(channels=3))
    yield Case("format: MP3 at 96 kHz of 8 channels", ("mp3", "8 channels", "1 or 2", "wav or flac", "mix"),
               call("--format", "mp3"), take(channels=8, rate=96000))
    yield Case("format: Ogg at 384 kHz", ("ogg", "384000 Hz", "200000 Hz", "wav or flac", "resample"),
               call("--format", "ogg"), take(rate=384000))
    yield Case("format: Ogg of 6 channels", ("ogg", "6 channels", "1 or 2", "wav or flac", "mix"),
               call("--format", "ogg"), take(channels=6))
    yield Case("format: FLAC of 9 channels", ("9 channels", "1 to 8", "split"), call("--format", "flac"), take(channels=9))
    yield Case("format: FLAC clip already there", ("take_good_dial-10.00.flac", "already there", "--force"),
               render("--format", "flac"), file("clips/take_good_dial-10.00.flac", "keep me"))
    for name, content, words in [
        ("RF64 cut in its header", rf64(tone())[:60], ("not a sound file", "WAV, FLAC")),
        ("RF64 cut before its samples", rf64(tone())[:80], ("0 samples", "give a take")),
        ("RF64 and nothing else", b"RF64\xff\xff\xff\xffWAVE", ("not a sound file", "WAV, FLAC")),
        ("AIFF cut in its header", aiff(tone())[:30], ("not a sound file", "WAV, FLAC")),
        ("AIFF cut before its samples", aiff(tone())[:54], ("0 samples", "give a take")),
        ("AIFF of 9 channels", aiff(tone(channels=9)), ("9 channels", "1 to 8", "split")),
        ("AIFF at 0 Hz", aiff(tone(), rate=0), ("0 Hz", "8000 to 384000")),
        ("AIFF at 4 kHz", aiff(tone(), rate=4000), ("4000 Hz", "8000 to 384000", "resample")),
        ("AIFF that claims 1 GB and holds nothing", aiff(tone(frames=0), promised=1 << 30), ("0 samples", "give a take")),
        ("WAV that claims 1 GB and holds nothing", wav(tone(frames=0), promised=1 << 30), ("0 samples", "give a take")),
        ("RF64 that claims an exabyte and holds nothing", rf64(tone(frames=0), 1 << 60), ("0 samples", "give a take")),
    ]:
        yield Case(f"take: {name}", ("bad.wav", *words), render(take="bad.wav"), file("bad.wav", content))

    def w64(keep):
        def make(folder):
            sox(folder, "take.wav", "whole.w64")
            (folder / "bad.w64").write_bytes((folder / "whole.w64").read_bytes()[:keep])
        return make

    yield Case("take: W64 cut in its header", ("bad.w64", "not a sound file", "WAV, FLAC"), render(take="bad.w64"), w64(60))
    yield Case("take: ADPCM in a WAV named .aifc", ("bad.aifc", "IMA ADPCM", "unusual", "convert"), render(take="bad.aifc"),
               lambda folder: sox(folder, "take.wav", "-e", "ima-adpcm", "-t", "wav", "bad.aifc"))
    yield Case("take: MP3", ("bad.mp3", "WAV", "convert"), render(take="bad.mp3"), lambda folder: (folder / "bad.mp3").write_bytes(
        (b"\xff\xfb\x94\xc4" + bytes(380)) * 20))


def output_cases():
    def closed_folder(folder):
        (folder / "clips").mkdir(mode=0o555)

    yield Case("output: folder that this user may not write to", ("clips", "Permission denied", "another folder"), render(),
               closed_folder, status=3, how="nobody")
    yield Case("output: new folder where this user may not make one", ("closed/clips", "Permission denied", "another"),
               render(out="closed/clips"), lambda folder: (folder / "closed").mkdir(mode=0o555), status=3, how="nobody")
    yield Case("output: disk full", ("No space left", "free", "another"),
               render("--dial", "10,5", out="disk/clips", take="long.wav"),
               file("long.wav", wav(tone(200000))), status=3, how="small disk")
    yield Case("output: disk full, four at a time", ("No space left", "free", "another"),
               render("--dial", "10,8,6,4", "--jobs", "4", "--depth", "float", out="disk/clips", take="long.wav"),
               file("long.wav", wav(tone(200000))), status=3, how="small disk")
    for kind in ("flac", "mp3", "ogg"):
        yield Case(f"output: disk full, {kind}", ("No space left", "free", "another"),
                   render("--dial", "10,5", "--format", kind, out="disk/clips", take="long.wav"),
                   file("long.wav", wav(np.random.default_rng(1).uniform(-0.3, 0.3, (400000, 1)))), status=3, how="small disk")
    yield Case("output: larger than a file may be", ("File too large", "another"), render(take="long.wav"),
               file("long.wav", wav(tone(200000))), status=3, how="small files")
    yield Case("output: table into a full device", ("standard output", "cannot be written", "disk full"),
               ["response", "good.hookup.toml"], status=3, how="full output")
    yield Case("output: netlist into a full device", ("standard output", "cannot be written", "disk full"),
               ["netlist", "good.hookup.toml"], status=3, how="full output")
    clip = "take_good_dial-10.00.wav"
    yield Case("output: clip already there", (clip, "already there", "another folder", "--force"), render(),
               file(f"clips/{clip}", "keep me"))
    yield Case("output: clip list already there", ("clips.csv", "already there", "another folder", "--force"), render(),
               file("clips/clips.csv", "keep me"))
    yield Case("output: folder in place of a clip, --force", (clip, "is a folder", "another folder"), render("--force"),
               lambda folder: (folder / "clips" / clip).mkdir(parents=True))
    yield Case("output: a file for the folder", ("clips", "is a file", "give a folder"), render(), file("clips", "keep me"))
    yield Case("output: a file on the way to the folder",
               ("clips/deep", "directory", "part of this path is a file", "another folder"), render(out="clips/deep"),
               file("clips", "keep me"))
    yield Case("output: no name", ("--out", "empty", "give a folder"), render(out=""))
    yield Case("output: folder name too long", ("--out", "name too long", "shorter"), render(out="y" * 300))

    def to_itself(folder):
        # No take can bear the name of its own clip, so a second name of the same file stands in the clip's place.
        (folder / "take.wav").rename(folder / clip)
        os.link(folder / clip, folder / "take.wav")

    for more in ([], ["--force"]):
        said = " with --force" if more else ""
        yield Case(f"output: the take itself{said}", (clip, "input", "never overwritten", "another folder"),
                   render(*more, out="."), to_itself)
        yield Case(f"output: the take itself by a link{said}", (clip, "input", "never overwritten", "another folder"),
                   render(*more, out="clips"),
                   both(lambda folder: (folder / "clips").mkdir(),
                        lambda folder: os.symlink("../take.wav", folder / "clips" / clip)))
        yield Case(f"output: the hookup itself{said}", ("clips.csv", "input", "never overwritten", "another folder"),
                   render(*more, out=".", hookup="clips.csv"), file("clips.csv", HOOKUP))
        yield Case(f"output: a measured taper itself{said}", ("clips.csv", "input", "never overwritten", "another folder"),
                   render(*more, out=".", hookup="bad.hookup.toml"),
                   both(edited(('"audio 15%"', '{ measured = "clips.csv" }')), file("clips.csv", "0,0\n0.5,0.2\n1,1\n")))
    yield Case("output: the same dial twice", ("dial-05.00.wav", "two clips", "once"), render("--dial", "5,5"))
    yield Case("output: dials that round to one name", ("dial-05.00.wav", "two clips", "two decimals"),
               render("--dial", "5,5.001"))
    yield Case("output: two hookups of one name", (clip, "two clips", "name of its own"),
               render("--hookup", "other/good.hookup.toml"), file("other/good.hookup.toml", HOOKUP))
    yield Case("output: clip name too long", ("bytes long", "255", "shorten"), render(hookup="n" * 240 + ".toml"),
               file("n" * 240 + ".toml", HOOKUP))


JOB = """unsoldered_job = 1
title = "Dull at 7"
[take]
file = "take.wav"
[settings]
selected = "A"
[[candidate]]
hookup_file = "good.hookup.toml"
dial = 7
"""


def job_cases():
    call = ["render", "--job", "bad.job.toml", "--out", "clips"]

    def of_job(name, words, *changes, arguments=None, base=JOB, more=None):
        text = base
        for old, new in changes:
            assert text.count(old) >= 1, old
            text = text.replace(old, new, 1)
        make = file("bad.job.toml", text)
        return Case(f"job: {name}", words, arguments or call, both(make, more) if more else make)

    leads_out = "leads out of the folder"
    yield of_job("hookup above its folder", ("bad.job.toml:8", "candidate.0.hookup_file", leads_out, "copy the hookup"),
                 ("good.hookup.toml", "../good.hookup.toml"))
    yield of_job("hookup by an absolute path", ("bad.job.toml:8", '"/etc/passwd"', leads_out), ("good.hookup.toml", "/etc/passwd"))
    yield of_job("hookup by a link out of the folder", ("bad.job.toml:8", "link.hookup.toml", leads_out),
                 ("good.hookup.toml", "link.hookup.toml"),
                 more=lambda folder: os.symlink("/etc/passwd", folder / "link.hookup.toml"))
    yield of_job("take above its folder", ("bad.job.toml:4", "take.file", leads_out, "on the command line"),
                 ("take.wav", "x/../../take.wav"))
    yield of_job("impulse response above its folder", ("bad.job.toml:5", "heard_through.impulse_response", leads_out),
                 ("[settings]", 'heard_through = { impulse_response = "../cab.wav" }\n[settings]'))
    yield of_job("recorded through a hookup above its folder", ("bad.job.toml:5", "recorded_through.hookup", leads_out),
                 ("[settings]", 'recorded_through = { hookup = "../x.hookup.toml" }\n[settings]'))
    yield of_job("measured taper out of its folder", ("bad.job.toml:8", "measured", "leads out", "beside it"),
                 ('hookup_file = "good.hookup.toml"', 'hookup = { source = "single coil", load = "line input", volume = '
                  '{ resistance = "500k", taper = { measured = "../m.csv" } } }'))
    yield of_job("no such hookup", ("bad.job.toml:8", "no.hookup.toml", "no such file"), ("good.hookup.toml", "no.hookup.toml"))
    yield of_job("version to come", ("bad.job.toml:1", "version 2", "accepted is 1"), ("unsoldered_job = 1", "unsoldered_job = 2"))
    yield Case("job: a hookup instead", ("good.hookup.toml", "unsoldered_job", "missing", "right file"),
               ["render", "--job", "good.hookup.toml", "--out", "clips"])
    yield of_job("nine candidates", ("9 candidates", "up to 8", "A to H"),
                 ("[[candidate]]", '[[candidate]]\nhookup_file = "good.hookup.toml"\n' * 8 + "[[candidate]]"))
    yield of_job("no candidate", ("[[candidate]] is missing", "hookup_file"), base=JOB[:JOB.index("[[candidate]]")])
    yield of_job("no take", ("[take] is missing", "built_in = true"), ('[take]\nfile = "take.wav"\n', ""))
    yield of_job("take without a file", ("take.file", "missing", "live = true"), ('file = "take.wav"\n', ""))
    yield of_job("two takes", ("bad.job.toml:5", "take.built_in", "another take"), ("[settings]", "built_in = true\n[settings]"))
    yield of_job("live take", ("bad.job.toml", "live", "render TAKE --job"), ('file = "take.wav"', "live = true"))
    yield of_job("selected beyond the candidates", ("settings.selected", '"B"', '"A"'), ('selected = "A"', 'selected = "B"'))
    yield of_job("both hookup and hookup_file", ("bad.job.toml:9", "candidate.0.hookup", "beside hookup_file"),
                 ("dial = 7", "hookup = {}"))
    yield of_job("hookup in it without a source", ("bad.job.toml", "block [source] is missing", "candidate A"),
                 ('hookup_file = "good.hookup.toml"', "hookup = {}"))
    yield of_job("dial off the scale", ("bad.job.toml:9", "candidate.0.dial", "11", "0 to 10"), ("dial = 7", "dial = 11"))
    yield of_job("key with a slip", ("bad.job.toml:6", "selectd", '"selected" meant'), ("selected", "selectd"))
    yield of_job("loop backwards", ("bad.job.toml:5", "take.loop", "after the start"), ("[settings]", "loop = [4, 2]\n[settings]"))
    yield of_job("two candidates of one clip", ("two clips", "once"), arguments=[*call, "--dial", "5,5.001"])
    yield of_job("job and hookup", ("--job and --hookup", "one of the two"), arguments=[*call, "--hookup", "good.hookup.toml"])
    yield of_job("job named by its own clip list", ("clips.csv", "input", "never overwritten"),
                 arguments=["render", "--job", "clips.csv", "--out", ".", "--force"], more=file("clips.csv", JOB))


def catalogue_cases():
    for name, old, new, words in (
            ("load", '[load]\nresistance = "1M"\ncapacitance = "20 pF"\n', 'load = "valve amplifer input"\n',
             ("valve amplifer input", '"valve amplifier input" meant', "unsoldered catalogue load", "[load]")),
            ("cable by its words", '[cable]\nlength = "5 m"\ncapacitance_per_metre = "100 pF"\n', 'cable = "guitar cable"\n',
             ("guitar cable", "cable, ", "meant", "unsoldered catalogue cable")),
            ("block with a catalogue key", 'resistance = "1M"', 'catalogue = "amp"', ("load", '"amp"', "unsoldered catalogue load"))):
        where = 'title = "Bench"\n'
        changes = ((old, new),) if "catalogue =" in new else ((old, ""), (where, where + new))
        line = "bad.hookup.toml:21" if "catalogue =" in new else "bad.hookup.toml:2"
        yield Case(f"catalogue: no such {name}", (line, *words), KNOB, edited(*changes))
    yield Case("catalogue: no such name by --set", ("--set load=line inputs", '"line input" meant'),
               ["knob", "good.hookup.toml", "--set", "load=line inputs"])
    yield Case("catalogue: a part of another kind", ("source.kind", '"pickup"', "unsoldered catalogue source"),
               ["knob", "good.hookup.toml", "--set", 'source={catalogue="humbucker",kind="line"}'])
    yield Case("catalogue: no such kind", ('"loads"', '"load" meant', "treble_bleed"), ["catalogue", "loads"])
    yield Case("catalogue: table into a full device", ("standard output", "cannot be written", "disk full"), ["catalogue"],
               status=3, how="full output")


def selector_cases():
    second = '[second.source]\nkind = "line"\nresistance = "100"\n'
    of_pair = lambda name, words, more: Case(f"selector: {name}", words, KNOB, file("bad.hookup.toml", LINE + second + more))
    yield of_pair("a blend beside one source alone", ("bad.hookup.toml", "blend", "use"),
                  '[selector]\nuse = "first"\n[blend]\nresistance = "500k"\nlaw = "MN"\n')
    yield of_pair("a blend of sources in series", ("bad.hookup.toml", "blend", "series"),
                  '[selector]\njoined = "series"\n[blend]\nresistance = "500k"\nlaw = "MN"\n')
    yield of_pair("a word it does not know", ("bad.hookup.toml:13", "selector.use", '"third"', '"second"'),
                  '[selector]\nuse = "third"\n')
    yield Case("selector: the second of one source", ("bad.hookup.toml", "second"), KNOB,
               file("bad.hookup.toml", LINE + '[selector]\nuse = "second"\n'))


def listening_cases():
    """What a take was recorded through and what it is heard through."""
    def through(text, *more):
        return render("--recorded-through", text, *more)

    # Without the end resistance of the good one.
    yield Case("recorded through: dial 0", ("'dead.hookup.toml'", "dial 0", "nothing comes through", "FILE@7"),
               through("dead.hookup.toml@0"), file("dead.hookup.toml", HOOKUP.replace('end_resistance = "50"', "")))
    for name, arguments, words in [
        ("dial 11", through("good.hookup.toml@11"), ("--recorded-through", "dial 11", "0 to 10")),
        ("dial in words", through("good.hookup.toml@seven"), ("--recorded-through", '"seven"', "0 to 10", "7.5")),
        ("no dial behind the @", through("good.hookup.toml@"), ("--recorded-through", '""', "0 to 10")),
        ("unknown file", through("no.hookup.toml@7"),
         ("--recorded-through", "no.hookup.toml", "no such file", "nothing, instrument, or a hookup file")),
        ("unknown word", through("amp"), ("--recorded-through", "amp", "nothing, instrument, or a hookup file")),
        ("no word", through(""), ("--recorded-through", '""', "nothing, instrument")),
        ("boost limit 61 dB", through("instrument", "--boost-limit", "61"), ("--boost-limit", "61 dB", "0 to 60", "24")),
        ("boost limit -1 dB", through("instrument", "--boost-limit", "-1"), ("--boost-limit", "-1 dB", "0 to 60")),
        ("boost limit in words", through("instrument", "--boost-limit", "much"), ("--boost-limit", '"much"', "0 to 60")),
    ]:
        yield Case(f"recorded through: {name}", words, arguments)

    def heard(name, words, content=None, make=None):
        return Case(f"heard through: {name}", words, render("--heard-through", "ir.wav"),
                    make or (file("ir.wav", content) if content is not None else lambda folder: None))

    with_nan = tone(100)
    with_nan[50, 0] = np.nan
    yield heard("missing impulse response", ('"ir.wav"', "guitar-loudspeaker", "WAV, FLAC"))
    yield heard("impulse response of another rate", ("44100 Hz", "48000 Hz", "resample"), wav(tone(100), rate=44100))
    yield heard("impulse response of more channels", ("2 channels", "take of 1", "used for all"), wav(tone(100, 2)))
    yield heard("silent impulse response", ("ir.wav", "silent", "every sample is 0"), wav(0 * tone(100)))
    yield heard("empty impulse response", ("ir.wav", "0 samples"), wav(tone(0)))
    yield heard("impulse response of 11 s", ("ir.wav", "10 s", "cut it"), wav(tone(11 * 48000)))
    yield heard("NaN in the impulse response", ("impulse response 'ir.wav'", "sample 50", "repair"), wav(with_nan, code=3))
    yield heard("text for an impulse response", ("impulse response 'ir.wav'", "not a sound file", "WAV"), "A letter.\n" * 40)
    yield heard("a folder", ("impulse response 'ir.wav'", "folder"), make=lambda folder: (folder / "ir.wav").mkdir())
    yield Case("heard through: no word", ("--heard-through", '""', "guitar-loudspeaker"), render("--heard-through", ""))
    clip = "take_good_dial-10.00.wav"
    for name, option in [("impulse response", "--heard-through"), ("hookup it was recorded through", "--recorded-through")]:
        content = wav(tone(100)) if option == "--heard-through" else HOOKUP
        yield Case(f"output: the {name} itself with --force", (clip, "input", "never overwritten", "another folder"),
                   render(option, f"clips/{clip}", "--force"), file(f"clips/{clip}", content))


def all_cases():
    for part in (toml_cases, key_cases, value_cases, taper_cases, network_cases, call_cases, sound_cases, format_cases,
                 output_cases, job_cases, catalogue_cases, selector_cases, listening_cases):
        yield from part()
