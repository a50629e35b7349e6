#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""What the documents say is so: their links, their options, their table of allowed errors.

The program's path comes in the environment variable TONEWALK.
"""
import functools
import os
import pathlib
import re
import subprocess
import unittest

HOUSE = pathlib.Path(__file__).resolve().parents[2]
DOCUMENTS = sorted([*HOUSE.glob("*.md"), *(HOUSE / "docs").glob("**/*.md"), *HOUSE.glob("iq-demo/**/*.md")])
LITERALS = r'\s*((?:"[^"]*"\s*)+)'


def allowed_errors():
    """The rows of src/base/allowed_errors.cpp as texts: key, quantity, conditions, unit; and the figure."""
    text = (HOUSE / "src/base/allowed_errors.cpp").read_text()
    rows = re.findall(r"\{" + ",".join([LITERALS] * 4) + r",\s*([-+0-9.e]+)\}", text)
    return [["".join(re.findall(r'"([^"]*)"', cell)) for cell in row[:4]] + [float(row[4])] for row in rows]


def documented_errors():
    text = (HOUSE / "docs/measurements.md").read_text()
    rows = re.findall(r"^\| `([a-z0-9_.]+)` \| ([^|]+) \| ([^|]+) \| ([-0-9.]+) ?([^|]*) \|$", text, re.MULTILINE)
    return [[key, quantity, conditions, unit or "1", float(figure)] for key, quantity, conditions, figure, unit in rows]


class Documents(unittest.TestCase):
    def test_allowed_errors_are_those_of_the_code(self):
        rows = documented_errors()
        self.assertGreater(len(rows), 5)
        for row in rows:
            self.assertIn(row, allowed_errors())

    def test_links_lead_somewhere(self):
        broken = []
        for document in DOCUMENTS:
            for link in re.findall(r"\]\(([^)#\s]+)(?:#[^)]*)?\)", document.read_text()):
                if "://" not in link and not (document.parent / link).exists():
                    broken.append(f"{document.relative_to(HOUSE)}: {link}")
        self.assertEqual(broken, [])

    def test_every_source_that_is_cited_is_listed(self):
        listed = set(re.findall(r"^\| \[(\w+)\]", (HOUSE / "docs/references.md").read_text(), re.MULTILINE))
        cited = set(re.findall(r"\[(\w+)\](?!\()", (HOUSE / "docs/measurements.md").read_text())) - {"brackets"}
        self.assertEqual(cited - listed, set())


class JobDocuments(unittest.TestCase):
    @functools.cache
    def options_of(self, job):
        run = subprocess.run([os.environ["TONEWALK"], job, "--help"], capture_output=True, text=True, check=True)
        return set(re.findall(r"--[a-z][a-z0-9-]*", run.stdout))

    def test_every_option_they_name_exists(self):
        unknown = {}
        for document in sorted((HOUSE / "docs/jobs").glob("*.md")):
            named = re.findall(r"(?:`([a-z]+) )?(--[a-z][a-z0-9-]*)", document.read_text())  # "`levels --width`"
            missing = {option for job, option in named
                       if option not in self.options_of(job if job and job != "tonewalk" else document.stem)}
            if missing:
                unknown[document.name] = sorted(missing)
        self.assertEqual(unknown, {})


if __name__ == "__main__":
    unittest.main()
