# SPDX-License-Identifier: GPL-3.0-or-later
"""Every case and variant of malformed_cases.py: its status, its one line with the mend, in time, in little memory, nothing left."""
import contextlib
import os
import re
import subprocess
import time
import unittest

from malformed_cases import CASES, VARIANTS
from program import PROGRAM, ProgramTest

MOST_SECONDS, MOST_KIB = 5.0, 300 * 1024
SANITIZED = "sanitize" in os.environ.get("TONEWALK_FLAGS", "")  # such a program may take more of both


class Outcome:
    """What a run of a case gave."""

    def __init__(self, case, folder, environment=None):
        case.make(folder)
        before = {path.name for path in folder.iterdir()}
        out, err = folder.parent / (folder.name + ".out"), folder.parent / (folder.name + ".err")
        begin = time.monotonic()
        with open(out, "wb") as stdout, open(err, "wb") as stderr:
            child = subprocess.Popen([PROGRAM, *case.words.split()], cwd=folder, stdout=stdout, stderr=stderr,
                                     stdin=subprocess.DEVNULL if case.feed is None else subprocess.PIPE,
                                     env={**os.environ, **(environment or {})})
            if case.feed is not None:
                with contextlib.suppress(BrokenPipeError):  # it may have refused already
                    child.stdin.write(case.feed)
                with contextlib.suppress(BrokenPipeError):
                    child.stdin.close()
            _, status, used = os.wait4(child.pid, 0)
        child.returncode = os.waitstatus_to_exitcode(status)
        self.status, self.seconds, self.kib = child.returncode, time.monotonic() - begin, used.ru_maxrss
        self.out, self.err = out.read_text(errors="replace"), err.read_text(errors="replace")
        self.new = {path.name for path in folder.iterdir()} - before
        out.unlink()
        err.unlink()


def pattern(line):
    """A line as a regular expression: (*) stands for any words in brackets, brackets among them."""
    return re.escape(line).replace(re.escape("(*)"), r"\([^\n]*\)")


class Malformed(ProgramTest):
    def outcome(self, number, case):
        folder = self.folder / str(number)
        folder.mkdir()
        return Outcome(case, folder)

    def test_the_table_is_wide(self):
        kinds = [case.kind for case in CASES]
        for kind in ("metadata", "archive", "container", "raw", "scene", "option", "output", "pipe"):
            self.assertGreaterEqual(kinds.count(kind), 6, kind)
        self.assertGreaterEqual(len(CASES), 55)
        self.assertEqual(len({(case.kind, case.name) for case in CASES + VARIANTS}), len(CASES + VARIANTS))

    def test_every_case(self):
        for number, case in enumerate(CASES + VARIANTS):
            with self.subTest(kind=case.kind, name=case.name):
                got = self.outcome(number, case)
                self.assertEqual(got.status, case.status, got.err)
                self.assertEqual(got.new, set())
                if not SANITIZED:
                    self.assertLess(got.seconds, MOST_SECONDS)
                    self.assertLess(got.kib, MOST_KIB)
                if case.status == 0:
                    self.assertIn(case.line, " ".join(got.err.split()))
                else:
                    self.assertEqual(got.out, "")
                    self.assertRegex(got.err, rf"\Atonewalk: {pattern(case.line)}\n\Z")


if __name__ == "__main__":
    unittest.main()
