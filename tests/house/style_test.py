#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Habits of all tracked files: licence lines, no trace of the machine they were written on, formatting."""
import pathlib
import re
import shutil
import subprocess
import unittest

HOUSE = pathlib.Path(__file__).resolve().parents[2]
TRACKED = [HOUSE / name for name in subprocess.run(
    ["git", "-C", HOUSE, "ls-files", "-z"], capture_output=True, text=True, check=True).stdout.split("\0")
    if name and (HOUSE / name).is_file()]
SOURCES = [path for path in TRACKED if path.suffix in (".cpp", ".hpp")]

# Folders of one machine, and hosts that packages come from. (Brackets keep this file from finding itself.)
TRACES = re.compile(r"(?<![\w.])/(wor[k]|hom[e]|roo[t])/|\b(registry|deb|pypi|proxy|repo\d?)\.[a-z]+[.](org|com|dev)\b")
LICENCE_LINE = "SPDX-License-Identifier: GPL-3.0-or-later"


def text_of(path):
    try:
        return path.read_text(encoding="utf-8")
    except UnicodeDecodeError:
        return ""  # data


def is_script(path):
    return path.suffix in (".sh", ".py") or text_of(path).startswith("#!")


class Style(unittest.TestCase):
    def none_of(self, paths):
        self.assertEqual([str(path.relative_to(HOUSE)) for path in paths], [])

    def test_there_are_sources(self):
        self.assertGreater(len(SOURCES), 0)

    def test_sources_begin_with_their_licence(self):
        self.none_of(path for path in SOURCES if text_of(path).split("\n", 1)[0] != f"// {LICENCE_LINE}")

    def test_scripts_name_their_licence_at_the_top(self):
        self.none_of(path for path in TRACKED
                     if is_script(path) and f"# {LICENCE_LINE}" not in text_of(path).split("\n")[:2])

    def test_the_licence_is_the_gpl_version_3(self):
        head = text_of(HOUSE / "LICENSE")[:200]
        self.assertIn("GNU GENERAL PUBLIC LICENSE", head)
        self.assertIn("Version 3", head)

    def test_no_traces_of_a_machine(self):
        self.none_of(path for path in TRACKED if TRACES.search(text_of(path)))

    def test_text_ends_in_one_newline_without_trailing_blanks(self):
        texts = [path for path in TRACKED if path.suffix in (".cpp", ".hpp", ".py", ".sh", ".cmake", ".md", ".toml")]
        self.none_of(path for path in texts if re.search(r"[ \t]\n|\n\n\Z|[^\n]\Z", text_of(path)))

    def test_sources_are_formatted(self):
        self.assertIsNotNone(shutil.which("clang-format"), "clang-format is missing")
        run = subprocess.run(["clang-format", "--dry-run", "-Werror", *SOURCES], capture_output=True, text=True,
                             check=False)
        self.assertEqual(run.returncode, 0, run.stderr[:4000])


if __name__ == "__main__":
    unittest.main()
