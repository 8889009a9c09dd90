"""A long render that is stopped (Ctrl-C, a polite kill, a closed terminal) ends at once with status 130 and leaves
nothing behind; progress goes to standard error and only there."""

import os
import pathlib
import pty
import re
import signal
import subprocess
import sys
import tempfile
import time
import unittest

import numpy as np

HERE = pathlib.Path(__file__).resolve().parent
sys.path[:0] = [str(HERE), str(HERE.parent / "reference")]
import bad_inputs
import program

HOOKUPS = [str(program.ROOT / "assets/demo" / name) for name in
           ("a-500k-audio-short-cable.hookup.toml", "c-500k-treble-bleed.hookup.toml", "d-250k-linear.hookup.toml")]
TAKE_S = 3600       # far longer than the test waits
UNDER_WAY = 200000  # bytes of clips on the disk: the render is at work
STARTS_WITHIN_S = 20
ENDS_WITHIN_S = 2


def make_take(path, seconds):
    """Mono, 48 kHz, 16 bits; one second of noise over and over."""
    second = np.random.default_rng(3).normal(0, 0.1, (48000, 1)).clip(-0.9, 0.9)
    once = bad_inputs.wav(second)
    with open(path, "wb") as file:
        file.write(bad_inputs.wav(second, promised=seconds * 96000)[:44])
        for _ in range(seconds):
            file.write(once[44:])


def size_of(folder):
    total = 0
    for path in folder.rglob("*"):
        try:
            total += path.stat().st_size
        except FileNotFoundError:
            pass
    return total


class Interrupt(unittest.TestCase):
    @classmethod
    def setUpClass(cls):
        cls.room = tempfile.TemporaryDirectory(prefix="unsoldered-interrupt-")
        cls.folder = pathlib.Path(cls.room.name)
        make_take(cls.folder / "long.wav", TAKE_S)
        make_take(cls.folder / "short.wav", 2)
        make_take(cls.folder / "middle.wav", 400)  # long enough for the bar, which comes every tenth of a second

    @classmethod
    def tearDownClass(cls):
        cls.room.cleanup()

    def command(self, take, out, *more):
        motion = () if "--turn" in more else ("--dial", "10,5")
        return [program.path(), "render", str(self.folder / take), "--hookup", *HOOKUPS, *motion, "--jobs", "2", "--out",
                str(out), *more]

    def stopped(self, number, out, *more, when=UNDER_WAY):
        """Starts a long render, sends the signal when so many bytes are written; (status, stdout, stderr, seconds)."""
        run = subprocess.Popen(self.command("long.wav", out, *more), stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)
        try:
            limit = time.monotonic() + STARTS_WITHIN_S
            while not out.exists() or size_of(out) < when:
                self.assertIsNone(run.poll(), "it ended by itself")
                self.assertLess(time.monotonic(), limit, "it never began to write")
                time.sleep(0.01)
            began = time.monotonic()
            run.send_signal(number)
            told, said = run.communicate(timeout=ENDS_WITHIN_S + 20)
            return run.returncode, told, said, time.monotonic() - began
        finally:
            if run.poll() is None:
                run.kill()
                run.communicate()

    def check(self, number, out, *more, when=UNDER_WAY):
        before = sorted(out.iterdir()) if out.exists() else None
        status, told, said, seconds = self.stopped(number, out, *more, when=when)
        self.assertEqual(status, 130, said)
        self.assertEqual(told, "")
        self.assertEqual(said, "unsoldered render: interrupted; nothing was left half done\n")
        self.assertLess(seconds, ENDS_WITHIN_S)
        after = sorted(out.iterdir()) if out.exists() else None
        self.assertEqual(after, before, "files were left behind" if before is None else "the folder is not as it was")
        print(f"{signal.Signals(number).name} {' '.join(more) or '--dial 10,5'}: ended after {seconds * 1000:.0f} ms")

    def test_each_signal_stops_a_render(self):
        for number in (signal.SIGINT, signal.SIGTERM, signal.SIGHUP):
            self.check(number, self.folder / "new" / "clips")
            self.assertFalse((self.folder / "new").exists(), "a folder made for the clips was left behind")

    def test_a_turning_knob_stops_as_well(self):
        self.check(signal.SIGINT, self.folder / "turning", "--turn", "0:0,3600:10")

    def test_right_at_the_start(self):
        self.check(signal.SIGINT, self.folder / "early", when=0)

    def test_what_was_in_the_folder_stays_and_a_second_run_works(self):
        out = self.folder / "kept"
        out.mkdir()
        (out / "mine.txt").write_text("mine", encoding="utf-8")
        self.check(signal.SIGINT, out)
        done = subprocess.run(self.command("short.wav", out), capture_output=True, text=True, check=False)
        self.assertEqual(done.returncode, 0, done.stderr)
        rows = program.table(done.stdout, program.CLIPS)
        self.assertEqual(len(rows), 6)
        self.assertEqual({path.name for path in out.iterdir()}, {"mine.txt", "clips.csv"} | {row["file"] for row in rows})
        self.assertEqual((out / "mine.txt").read_text(encoding="utf-8"), "mine")

    def test_a_forced_render_that_is_stopped_keeps_the_old_clips(self):
        out = self.folder / "old"
        clips = [f"long_{pathlib.Path(hookup).name.removesuffix('.hookup.toml')}_dial-{dial}.wav" for hookup in HOOKUPS
                 for dial in ("10.00", "05.00")] + ["clips.csv"]
        out.mkdir()
        for name in clips:
            (out / name).write_text("old", encoding="utf-8")
        self.check(signal.SIGINT, out, "--force")
        self.assertEqual({path.read_text(encoding="utf-8") for path in out.iterdir()}, {"old"})

    def test_long_tables_stop_as_well(self):
        for words in (["knob", HOOKUPS[1], "--steps", "10001"], ["response", HOOKUPS[1], "--points", "1000000"]):
            run = subprocess.Popen([program.path(), *words], stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)
            time.sleep(0.2)
            self.assertIsNone(run.poll(), "it was done before it could be stopped")
            began = time.monotonic()
            run.send_signal(signal.SIGINT)
            told, said = run.communicate(timeout=ENDS_WITHIN_S + 20)
            self.assertEqual((run.returncode, told), (130, ""), said)
            self.assertLess(time.monotonic() - began, ENDS_WITHIN_S)

    def test_a_signal_ignored_from_outside_stays_ignored(self):
        out = self.folder / "nohup"
        command = self.command("short.wav", out)
        run = subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True,
                               preexec_fn=lambda: signal.signal(signal.SIGHUP, signal.SIG_IGN))
        run.send_signal(signal.SIGHUP)
        _, said = run.communicate(timeout=60)
        self.assertEqual(run.returncode, 0, said)

    def test_progress_is_on_the_terminal_and_the_list_alone_on_standard_output(self):
        out = self.folder / "shown"
        ours, theirs = pty.openpty()
        run = subprocess.Popen(self.command("middle.wav", out), stdout=subprocess.PIPE, stderr=theirs)
        os.close(theirs)
        shown = b""
        while True:
            try:
                piece = os.read(ours, 4096)
            except OSError:  # the other end is closed
                break
            if not piece:
                break
            shown += piece
        told = run.communicate(timeout=60)[0]
        os.close(ours)
        self.assertEqual(run.returncode, 0, shown)
        self.assertEqual(told, (out / "clips.csv").read_bytes())
        self.assertEqual(len(program.table(told.decode(), program.CLIPS)), 6)
        self.assertRegex(shown.decode(), r"rendering \[[#-]{20}\] +\d+ %  \d+:\d\d left")
        rest = re.sub(r"rendering [^\r]*|unsoldered render: the take counts as [^\r]*", "", shown.decode())
        self.assertTrue(rest.strip("\r\n\x1b[K") == "", shown)

    def test_no_progress_where_nobody_watches(self):
        done = subprocess.run(self.command("short.wav", self.folder / "quiet"), capture_output=True, text=True, check=True)
        self.assertNotIn("rendering", done.stderr)
        self.assertEqual(done.stderr.count("\n"), 1, done.stderr)  # what the take counts as


if __name__ == "__main__":
    unittest.main()
