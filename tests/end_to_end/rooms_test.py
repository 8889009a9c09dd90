"""The rooms keep their direction: gui -> src -> dsp, and dsp stays free of files, threads and devices."""
import os
import pathlib
import re
import tempfile
import unittest

SOURCE = pathlib.Path(os.environ["UNSOLDERED_SOURCE"])

INCLUDE = re.compile(r'^\s*#\s*include\s*[<"]([^>"]+)[>"]', re.MULTILINE)

# What a room must not include, as the start of the included name.
FORBIDDEN = {
    "dsp": ["src/", "gui/", "tests/", "fstream", "iostream", "filesystem", "thread", "mutex", "condition_variable",
            "future", "unistd.h", "fcntl.h", "sys/", "sndfile", "portaudio", "toml++/", "CLI/",
            "nlohmann/", "imgui", "GLFW/", "GL/"],
    "src": ["gui/", "tests/", "imgui", "GLFW/", "GL/"],
}


def violations(tree):
    """Each forbidden include of the tree as 'file: name'."""
    found = []
    for room, names in FORBIDDEN.items():
        for file in sorted((tree / room).glob("**/*")):
            if file.suffix not in (".h", ".cpp"):
                continue
            for included in INCLUDE.findall(file.read_text(encoding="utf-8")):
                if included.startswith(tuple(names)):
                    found.append(f"{file.relative_to(tree)}: {included}")
    return found


class Rooms(unittest.TestCase):
    def test_no_room_looks_upstairs(self):
        self.assertEqual(violations(SOURCE), [])

    def test_the_rooms_are_there(self):
        for room in FORBIDDEN:
            self.assertTrue(list((SOURCE / room).glob("*.h")), room)

    def test_an_upward_include_is_found(self):
        with tempfile.TemporaryDirectory() as folder:
            tree = pathlib.Path(folder)
            for room, line in {"dsp": '#include "src/render.h"', "src": '#  include "gui/window.h"'}.items():
                (tree / room).mkdir()
                (tree / room / "a.cpp").write_text(f"// a file\n{line}\n#include <vector>\n", encoding="utf-8")
            self.assertEqual(violations(tree), ["dsp/a.cpp: src/render.h", "src/a.cpp: gui/window.h"])


if __name__ == "__main__":
    unittest.main()
