"""Bad inputs: each gets its status and a message with the value, what is accepted and the next step; nothing crashes,
hangs, leaves a partial file or overwrites unasked.

    python3 tests/end_to_end/bad_inputs_test.py --list     the table of cases, with status and message
"""

import os
import pathlib
import resource
import shutil
import stat
import subprocess
import sys
import tempfile
import textwrap
import unittest
import wave

HERE = pathlib.Path(__file__).resolve().parent
sys.path[:0] = [str(HERE), str(HERE.parent / "reference")]
import bad_inputs
import program

LIMIT_S = 10
LEAST_CASES = 60
NOBODY = 65534
NO_SMALL_DISK = 99


def tree(folder):
    """Everything below the folder: kind, and content of files."""
    found = {}
    for path in sorted(folder.rglob("*")):
        mode = path.lstat().st_mode
        if stat.S_ISLNK(mode):
            found[str(path.relative_to(folder))] = ("link", os.readlink(path))
        elif stat.S_ISREG(mode):
            content = path.read_bytes() if os.access(path, os.R_OK) else b"not readable"
            found[str(path.relative_to(folder))] = ("file", content)
        else:
            found[str(path.relative_to(folder))] = ("other", stat.S_IFMT(mode))
    return found


class Runs:
    """Makes a case's folder, runs the program in it and keeps what came of it."""

    def __init__(self):
        built = program.path()
        self.home = pathlib.Path(tempfile.mkdtemp(prefix="unsoldered-bad-"))
        self.home.chmod(0o755)  # the unprivileged user has to reach the program and the inputs
        self.program = self.home / "unsoldered"
        shutil.copy(built, self.program)
        self.program.chmod(0o755)
        self.count = 0

    def close(self):
        shutil.rmtree(self.home)

    def run(self, case):
        self.count += 1
        folder = self.home / str(self.count)
        folder.mkdir()
        folder.chmod(0o755)
        bad_inputs.good_folder(folder)
        case.make(folder)
        command = [str(self.program), *case.arguments]
        options = {"cwd": folder, "stdin": subprocess.DEVNULL, "stdout": subprocess.PIPE, "stderr": subprocess.PIPE,
                   "text": True, "errors": "replace", "timeout": LIMIT_S}
        full = None
        if case.how == "nobody" and os.getuid() == 0:
            options |= {"user": NOBODY, "group": NOBODY, "extra_groups": []}
        elif case.how == "small disk":
            command = self.on_small_disk(folder, command)
        elif case.how == "small files":
            options["preexec_fn"] = lambda: resource.setrlimit(resource.RLIMIT_FSIZE, (100000, 100000))
        elif case.how == "full output":
            full = open("/dev/full", "w", encoding="utf-8")
            options["stdout"] = full
        before = tree(folder)
        try:
            done = subprocess.run(command, check=False, **options)
        finally:
            if full:
                full.close()
        return folder, before, done

    def on_small_disk(self, folder, command):
        """A file system of 256 KiB on disk/, seen by this one run only; what is left on it goes to left.txt in the home."""
        (folder / "disk").mkdir()
        script = (f'mount -t tmpfs -o size=256k none disk || exit {NO_SMALL_DISK}; "$@"; status=$?; '
                  f'find disk -mindepth 1 >"{self.home}/left.txt"; exit $status')
        enter = ["unshare", "--mount"] + ([] if os.getuid() == 0 else ["--user", "--map-root-user"])
        (self.home / "left.txt").unlink(missing_ok=True)
        return [*enter, "sh", "-c", script, "sh", *command]

    def left_on_small_disk(self):
        return (self.home / "left.txt").read_text(encoding="utf-8").split()


def faults(case, runs):
    """What is wrong with the way the program took the case, and what it said."""
    try:
        folder, before, done = runs.run(case)
    except subprocess.TimeoutExpired:
        return [f"still running after {LIMIT_S} s"], None, ""
    said = done.stderr.strip()
    found = []
    if case.how == "small disk" and done.returncode in (NO_SMALL_DISK, 1):
        found.append("no small file system could be mounted here: run as root or where user namespaces are allowed")
    if done.returncode != case.status:
        found.append(f"status {done.returncode} instead of {case.status}")
    found += [f"message without {word!r}" for word in case.words if word not in said]
    if not said.splitlines()[-1:] or not said.splitlines()[-1].startswith("unsoldered"):
        found.append("the last line does not say who speaks")
    if "terminate called" in said or "std::" in said:
        found.append("the message is one of the language, not of the program")
    if done.stdout:
        found.append(f"results on standard output: {done.stdout[:80]!r}")
    after = tree(folder)
    for name in sorted(before.keys() | after.keys()):
        if name not in after:
            found.append(f"'{name}' is gone")
        elif name not in before:
            found.append(f"'{name}' was left behind")
        elif before[name] != after[name]:
            found.append(f"'{name}' was changed")
    if case.how == "small disk" and done.returncode != NO_SMALL_DISK:
        found += [f"'{name}' was left behind on the full disk" for name in runs.left_on_small_disk()]
    return found, done.returncode, said


class BadInputs(unittest.TestCase):
    @classmethod
    def setUpClass(cls):
        cls.runs = Runs()

    @classmethod
    def tearDownClass(cls):
        cls.runs.close()

    def test_each_is_refused_as_it_should_be(self):
        cases = list(bad_inputs.all_cases())
        self.assertGreaterEqual(len(cases), LEAST_CASES)
        self.assertEqual(len({case.name for case in cases}), len(cases), "two cases of one name")
        for case in cases:
            with self.subTest(case.name):
                found, _, said = faults(case, self.runs)
                self.assertEqual(found, [], f"\n  called: {' '.join(case.arguments)[:300]}\n  said: {said[-1500:]}")
        print(f"{len(cases)} bad inputs refused, each with status and message")

    def test_the_good_input_under_them_is_taken(self):
        # Were the hookup or the take of all cases wrong, every one would be refused for the wrong reason.
        for arguments in (bad_inputs.render(), bad_inputs.render(take="built-in"), ["knob", "good.hookup.toml"]):
            _, _, done = self.runs.run(bad_inputs.Case("good", (), arguments))
            self.assertEqual(done.returncode, 0, done.stderr)

    def test_the_line_hookup_under_them_is_taken(self):
        case = bad_inputs.Case("good", (), bad_inputs.KNOB, bad_inputs.file("bad.hookup.toml", bad_inputs.LINE))
        self.assertEqual(self.runs.run(case)[2].returncode, 0)

    def test_force_replaces_what_is_no_input(self):
        clip = "clips/take_good_dial-10.00.wav"
        case = bad_inputs.Case("forced", (), bad_inputs.render("--force"),
                               bad_inputs.both(bad_inputs.file(clip, "old"), bad_inputs.file("clips/mine.txt", "mine")))
        folder, _, done = self.runs.run(case)
        self.assertEqual(done.returncode, 0, done.stderr)
        self.assertEqual((folder / clip).read_bytes()[:4], b"RIFF")
        self.assertEqual((folder / "clips/mine.txt").read_text(encoding="utf-8"), "mine")

    def test_takes_cut_short_are_played_as_far_as_they_go_and_said_so(self):
        samples = bad_inputs.tone()
        for name, whole, head in (("cut.wav", bad_inputs.wav(samples), 44), ("cut.aiff", bad_inputs.aiff(samples), 54),
                                  ("long.wav", bad_inputs.rf64(samples), 80)):
            case = bad_inputs.Case("cut", (), bad_inputs.render(take=name),
                                   bad_inputs.file(name, whole[:head + 2 * 4800]))
            folder, _, done = self.runs.run(case)
            self.assertEqual(done.returncode, 0, done.stderr)
            for word in (name, "cut short", "9600 bytes", "0.1 s"):
                self.assertIn(word, done.stderr)
            with wave.open(str(folder / f"clips/{name.split('.')[0]}_good_dial-10.00.wav")) as clip:
                self.assertEqual(clip.getnframes(), 4800)

    def test_w64_cut_short_likewise(self):
        def cut(folder):
            bad_inputs.sox(folder, "take.wav", "whole.w64")
            (folder / "cut.w64").write_bytes((folder / "whole.w64").read_bytes()[:-9600])

        folder, _, done = self.runs.run(bad_inputs.Case("cut", (), bad_inputs.render(take="cut.w64"), cut))
        self.assertEqual(done.returncode, 0, done.stderr)
        for word in ("cut.w64", "cut short", "9600 bytes", "0.1 s"):
            self.assertIn(word, done.stderr)
        with wave.open(str(folder / "clips/cut_good_dial-10.00.wav")) as clip:
            self.assertEqual(clip.getnframes(), 4800)


def print_table():
    runs = Runs()
    bad = 0
    try:
        for number, case in enumerate(bad_inputs.all_cases(), 1):
            found, status, said = faults(case, runs)
            bad += bool(found)
            print(f"{number:3}  {case.name}: status {status}{'' if not found else '  FAULT: ' + '; '.join(found)}")
            print(textwrap.fill(said.replace(str(runs.home), "") or "(nothing)", 116, initial_indent="       ",
                                subsequent_indent="       "))
    finally:
        runs.close()
    return 1 if bad else 0


if __name__ == "__main__":
    if sys.argv[1:] == ["--list"]:
        sys.exit(print_table())
    unittest.main()
