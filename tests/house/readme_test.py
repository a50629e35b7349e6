#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Replays README.md: every command of its console blocks runs, in order, and answers as shown.

Figures may differ in their last digit shown (another processor), words may not; a line `...` stands for any lines.
The program's path comes in the environment variable TONEWALK.
"""
import os
import pathlib
import re
import shutil
import subprocess
import tempfile
import unittest

HOUSE = pathlib.Path(__file__).resolve().parents[2]
NUMBER = re.compile(r"[-+]?\d+(?:\.\d+)?")


def transcript(text):
    """[(command, [lines of its answer])] of the console blocks that call tonewalk."""
    steps = []
    for block in re.findall(r"^```console\n(.*?)^```", text, re.MULTILINE | re.DOTALL):
        for line in block.splitlines():
            if line.startswith("$ "):
                steps.append((line[2:], []))
            else:
                steps[-1][1].append(line)
    return [step for step in steps if step[0].startswith("tonewalk ")]


def alike(shown, seen):
    """The same words, and figures within one unit of the last digit shown."""
    shown, seen = " ".join(shown.split()), " ".join(seen.split())
    if NUMBER.split(shown) != NUMBER.split(seen):
        return False
    for one, other in zip(NUMBER.findall(shown), NUMBER.findall(seen)):
        decimals = len(one.partition(".")[2])
        if abs(float(one) - float(other)) > 1.01 * 10.0 ** -decimals * ("." in one):
            return False
    return True


def answers_as_shown(shown, seen):
    """`...` matches any run of lines."""
    if not shown:
        return not seen
    if shown[0] == "...":
        return any(answers_as_shown(shown[1:], seen[skip:]) for skip in range(len(seen) + 1))
    return bool(seen) and alike(shown[0], seen[0]) and answers_as_shown(shown[1:], seen[1:])


class Readme(unittest.TestCase):
    def test_its_commands_answer_as_shown(self):
        steps = transcript((HOUSE / "README.md").read_text())
        self.assertGreater(len(steps), 2)
        folder = pathlib.Path(tempfile.mkdtemp(prefix="tonewalk-readme-"))
        self.addCleanup(shutil.rmtree, folder)
        (folder / "iq-demo").symlink_to(HOUSE / "iq-demo")
        (folder / "bin").mkdir()
        (folder / "bin/tonewalk").symlink_to(pathlib.Path(os.environ["TONEWALK"]).resolve())
        path = {**os.environ, "PATH": f"{folder / 'bin'}:{os.environ['PATH']}"}
        for command, shown in steps:
            with self.subTest(command=command):
                run = subprocess.run(command, shell=True, cwd=folder, env=path, text=True, timeout=300,
                                     stdout=subprocess.PIPE, stderr=subprocess.STDOUT, check=False)
                self.assertEqual(run.returncode, 0, run.stdout)
                seen = [line.rstrip() for line in run.stdout.splitlines()]
                self.assertTrue(answers_as_shown(shown, seen), f"shown:\n{chr(10).join(shown)}\nseen:\n{run.stdout}")


class ReadmeCheckNotices(unittest.TestCase):
    def test_what_is_alike_and_what_is_not(self):
        self.assertTrue(alike("level -20.03 dBFS", "level -20.02 dBFS"))
        self.assertFalse(alike("level -20.03 dBFS", "level -20.05 dBFS"))
        self.assertFalse(alike("level -20.03 dBFS", "level -20.03 dBm"))
        self.assertFalse(alike("12 nulls", "13 nulls"))
        self.assertTrue(answers_as_shown(["a", "...", "z"], ["a", "b", "c", "z"]))
        self.assertFalse(answers_as_shown(["a", "...", "z"], ["a", "b", "c"]))


if __name__ == "__main__":
    unittest.main()
