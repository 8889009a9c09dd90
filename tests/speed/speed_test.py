"""Speed and memory of the commands, printed as ratios to sox in the same run. No time is ever a failure: machines are
shared and noisy. Clips that are not whole are, and so is a render that takes as much memory as the take is long.

    python3 tests/speed/speed_test.py            ten minutes, mono, 48 kHz, 24 bits
    python3 tests/speed/speed_test.py --hour     also the memory for an hour at 96 kHz (needs 4 GB of disk)
"""
# check: slow
# check: alone

import os
import pathlib
import select
import statistics
import struct
import subprocess
import sys
import tempfile
import time
import unittest

HERE = pathlib.Path(__file__).resolve().parent
sys.path.insert(0, str(HERE.parent / "reference"))
import program

MINUTES = 10
RATE = 48000
HOOKUP = program.ROOT / "assets/demo/a-500k-audio-short-cable.hookup.toml"
# A low, a middle and a high section: ordinary values, the work does not depend on them.
BIQUADS = [("1.002", "-1.995", "0.993", "1", "-1.995", "0.995"), ("1.02", "-1.90", "0.90", "1", "-1.90", "0.92"),
           ("0.30", "0.25", "0.05", "1", "-0.45", "0.05")]
DIALS = [10 - i * 10 / 15 for i in range(16)]
RUNS = 3    # of a command whose ratio is printed: the least of them is the least disturbed
STARTS = 20  # of a short command, whose median is printed


def peak_memory_mb(pid):
    """Most memory the process has held so far. Not from wait4, whose figure begins with what this interpreter holds."""
    try:
        for line in pathlib.Path(f"/proc/{pid}/status").read_text(encoding="ascii").splitlines():
            if line.startswith("VmHWM:"):
                return int(line.split()[1]) / 1024
    except (FileNotFoundError, ProcessLookupError):
        pass
    return 0


class Cost:
    """What one run of a command took; memory only when it is watched, as looking disturbs a short run."""

    def __init__(self, words, watch=False):
        began = time.perf_counter()
        run = subprocess.Popen([str(word) for word in words], stdout=subprocess.PIPE, stderr=subprocess.STDOUT)
        self.memory_mb = 0
        while watch:
            ready, _, _ = select.select([run.stdout], [], [], 0.01)
            self.memory_mb = max(self.memory_mb, peak_memory_mb(run.pid))
            watch = not ready  # the program writes when it is done
        self.said = run.stdout.read()
        run.stdout.close()
        _, status, used = os.wait4(run.pid, 0)
        run.returncode = os.waitstatus_to_exitcode(status)
        self.wall_s = time.perf_counter() - began
        self.processor_s = used.ru_utime + used.ru_stime
        if run.returncode != 0:
            raise AssertionError(f"{' '.join(map(str, words))}: status {run.returncode}\n{self.said.decode()[-2000:]}")


def wav_frames(path):
    """(frames, rate, channels, bits) of a WAV whose sound is all there: the data chunk ends inside the file."""
    with open(path, "rb") as file:
        head = file.read(65536)
    if head[:4] != b"RIFF" or head[8:12] != b"WAVE":
        raise AssertionError(f"{path} is not a WAV file")
    at = 12
    while at + 8 <= len(head):
        name, size = head[at:at + 4], struct.unpack("<I", head[at + 4:at + 8])[0]
        if name == b"fmt ":
            _, channels, rate, _, frame, bits = struct.unpack("<HHIIHH", head[at + 8:at + 24])
        elif name == b"data":
            if at + 8 + size > path.stat().st_size:
                raise AssertionError(f"{path} ends before its sound")
            return size // frame, rate, channels, bits
        at += 8 + size + (size & 1)
    raise AssertionError(f"{path} holds no sound")


class Speed(unittest.TestCase):
    minutes = MINUTES

    @classmethod
    def setUpClass(cls):
        cls.room = tempfile.TemporaryDirectory(prefix="unsoldered-speed-")
        cls.folder = pathlib.Path(cls.room.name)
        cls.take = cls.make_take("take.wav", cls.minutes * 60, RATE)

    @classmethod
    def tearDownClass(cls):
        cls.room.cleanup()

    @classmethod
    def make_take(cls, name, seconds, rate):
        path = cls.folder / name
        subprocess.run(["sox", "-D", "-n", "-r", str(rate), "-b", "24", "-c", "1", path, "synth", str(seconds), "pinknoise",
                        "gain", "-8"], check=True, capture_output=True)
        return path

    def sox(self):
        """One run of the yardstick: three biquads on the take."""
        out = self.folder / "sox.wav"
        effects = [word for section in BIQUADS for word in ("biquad", *section)]
        cost = Cost(["sox", "-D", self.take, out, *effects])
        self.assertEqual(wav_frames(out)[0], wav_frames(self.take)[0])
        out.unlink()
        return cost

    def render(self, take, *motion):
        """One render into a new folder, whose clips are looked at and removed."""
        out = self.folder / "clips"
        cost = Cost([program.path(), "render", take, "--hookup", HOOKUP, *motion, "--out", out], watch=True)
        self.assertGreater(cost.memory_mb, 1, "the memory could not be seen")
        lines = [line for line in cost.said.decode().splitlines() if not line.startswith("unsoldered render: ")]
        rows = program.table("\n".join(lines), program.CLIPS)
        for row in rows:
            clip = out / row["file"]
            self.assertEqual(wav_frames(clip), wav_frames(take), f"{row['file']} is not as long as the take")
            silent = row["dial"] == "0"
            self.assertTrue(silent or -80 < float(row["peak_dbfs"]) <= -0.999, row)
            clip.unlink()
        (out / "clips.csv").unlink()
        out.rmdir()
        return cost, len(rows)

    def least(self, run):
        return min((run() for _ in range(RUNS)), key=lambda cost: cost.processor_s)

    def test_processor_time_memory_and_many_clips(self):
        sox = self.least(self.sox)
        print(f"{self.minutes} min mono 48 kHz 24-bit: sox with three biquads {sox.processor_s:.2f} s of processor time, "
              f"{sox.wall_s:.2f} s in all")
        size_mb = self.take.stat().st_size / 2**20
        for name, motion, aim in [("held, --dial 5", ("--dial", "5"), "at most 3, aim 1"),
                                  ("turning, --turn 0:0,600:10", ("--turn", "0:0,600:10"), "at most 6, aim 3")]:
            cost = self.least(lambda: self.render(self.take, *motion)[0])
            print(f"{name}: {cost.processor_s:.2f} s of processor time, {cost.processor_s / sox.processor_s:.2f} x sox ({aim}); "
                  f"{cost.memory_mb:.1f} MB of memory for a take of {size_mb:.0f} MB")
            self.assertLess(cost.memory_mb, size_mb, "the take was loaded whole")
        many, clips = self.render(self.take, "--dial", ",".join(f"{dial:.4f}" for dial in DIALS))
        self.assertEqual(clips, len(DIALS))
        print(f"16 clips in one call, {os.cpu_count()} cores: {many.wall_s:.2f} s, {many.wall_s / (16 * sox.wall_s):.2f} x "
              f"16 runs of sox (aim under 0.5); {many.processor_s / sox.processor_s:.1f} x one run in processor time; "
              f"{many.memory_mb:.1f} MB of memory")

    def test_what_the_take_was_recorded_through_and_is_heard_through(self):
        sox = self.least(self.sox)
        plain = self.least(lambda: self.render(self.take, "--dial", "5")[0])
        demo = program.ROOT / "assets/demo"
        ir = self.folder / "ir.wav"
        subprocess.run(["sox", "-D", "-n", "-r", str(RATE), "-b", "24", "-c", "1", ir, "synth", "0.2", "whitenoise", "fade", "l",
                        "0", "0.2", "0.19", "gain", "-30"], check=True, capture_output=True)
        for name, words in [
                ("recorded through the instrument", ("--recorded-through", "instrument")),
                ("recorded through a coupling capacitor", ("--recorded-through", demo / "e-bass-into-220k.hookup.toml@10")),
                ("heard through the loudspeaker", ("--heard-through", "guitar-loudspeaker")),
                ("heard through an impulse response of 0.2 s", ("--heard-through", ir))]:
            cost = self.least(lambda: self.render(self.take, "--dial", "5", *words)[0])
            more = cost.processor_s - plain.processor_s
            print(f"{name}: {more:.2f} s of processor time more, {more / sox.processor_s:.2f} x sox; {cost.memory_mb:.1f} MB")

    def test_short_commands(self):
        for words, rows in [(("knob", HOOKUP), 41), (("response", HOOKUP), 61)]:
            costs = [Cost([program.path(), *words]) for _ in range(STARTS)]
            for cost in costs:
                self.assertEqual(len(cost.said.splitlines()), rows + 1)
            wall, processor = (1000 * statistics.median(values) for values in
                               ([c.wall_s for c in costs], [c.processor_s for c in costs]))
            print(f"{words[0]}, {rows} rows, whole process: {wall:.1f} ms, {processor:.1f} ms of processor time "
                  f"(medians of {STARTS})")


class Hour(Speed):
    """An hour at 96 kHz, for its memory; asked for with --hour."""

    test_processor_time_memory_and_many_clips = None
    test_what_the_take_was_recorded_through_and_is_heard_through = None
    test_short_commands = None

    @classmethod
    def setUpClass(cls):
        cls.room = tempfile.TemporaryDirectory(prefix="unsoldered-speed-")
        cls.folder = pathlib.Path(cls.room.name)
        cls.take = cls.make_take("hour.wav", 3600, 96000)

    def test_memory_for_an_hour(self):
        size_mb = self.take.stat().st_size / 2**20
        for name, motion in [("held", ("--dial", "5")), ("turning", ("--turn", "0:0,3600:10")),
                             ("two clips at a time", ("--dial", "10,5"))]:
            cost, _ = self.render(self.take, *motion)
            print(f"one hour, 96 kHz, {name}: {cost.memory_mb:.1f} MB of memory for a take of {size_mb:.0f} MB, "
                  f"{cost.processor_s:.1f} s of processor time")
            self.assertLess(cost.memory_mb, size_mb / 4, "the take was loaded")


def load_tests(loader, _, __):
    classes = [Speed, Hour] if "--hour" in sys.argv else [Speed]
    return unittest.TestSuite(loader.loadTestsFromTestCase(each) for each in classes)


if __name__ == "__main__":
    unittest.main(argv=[word for word in sys.argv if word != "--hour"])
