#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""tests/cli/malformed_coverage.py BUILD: which check of the program each malformed case reaches.

BUILD is a build made with the `coverage` preset. Each case of malformed_cases.CASES runs with counters of its own; told is
the line of the sources that it alone ran, or where none is its own one that as few others as any did. Fails where two
cases ran exactly the same lines: one of them proves nothing that the other does not.
"""
import collections
import hashlib
import json
import os
import pathlib
import subprocess
import sys
import tempfile

HOUSE = pathlib.Path(__file__).resolve().parents[2]
BY_CHANCE = {"src/cli/signals.cpp", "src/pass/run_pass.cpp"}  # what runs there depends on how threads meet


def digest(counters):
    """Of an object's counters, its summary of the whole run left out."""
    summary = counters.find(b"\0\0\0\xa1")  # tag, length, two numbers
    return hashlib.sha256(counters[:summary] + counters[summary + 16:]).digest()


class Lines:
    """{(source, line)} that were run, from counters; what an object's counters say is worked out once."""

    def __init__(self, build):
        self.build, self.known = build, {}

    def of_objects(self, counted):
        """[lines] of these .gcda files; gcov wants them beside their .gcno files and answers one line of JSON each."""
        for gcda, origin in counted:
            gcda.with_suffix(".gcno").symlink_to(origin.with_suffix(".gcno"))
        done = subprocess.run(["gcov", "--json-format", "--stdout", "--relative-only", "--source-prefix", HOUSE,
                               *(gcda for gcda, _ in counted)], cwd=self.build, capture_output=True, check=True)
        for text in done.stdout.decode().splitlines():
            run = set()
            for source in json.loads(text)["files"]:
                path = pathlib.Path(os.path.normpath(self.build / source["file"]))
                path = path.relative_to(HOUSE) if path.is_relative_to(HOUSE) else path
                run.update((str(path), line["line_number"]) for line in source["lines"] if line["count"] > 0)
            yield {(path, number) for path, number in run if (HOUSE / path).exists() and path not in BY_CHANCE}

    def run_by(self, counters):
        found = {}
        for gcda in counters.rglob("*.gcda"):
            origin = pathlib.Path("/") / gcda.relative_to(counters)
            found[origin, digest(gcda.read_bytes())] = gcda
        new = [key for key in found if key not in self.known]
        if new:
            self.known.update(zip(new, self.of_objects([(found[key], key[0]) for key in new])))
        return frozenset().union(*(self.known[key] for key in found))


def main(build):
    os.environ["TONEWALK"] = str(build / "tonewalk")
    from malformed_cases import CASES
    from malformed_test import Outcome

    lines, run = Lines(build), {}
    with tempfile.TemporaryDirectory() as folder:
        for number, case in enumerate(CASES):
            work, counters = pathlib.Path(folder) / str(number), pathlib.Path(folder) / f"{number}.counters"
            work.mkdir()
            got = Outcome(case, work, {"GCOV_PREFIX": str(counters)})
            if got.status != case.status:
                sys.exit(f"{case.kind}, {case.name}: status {got.status}, not {case.status}: {got.err}")
            run[case.kind, case.name] = lines.run_by(counters)
    often = collections.Counter(line for lines in run.values() for line in lines)
    for case, lines in run.items():
        fewest = min(often[line] for line in lines)
        rare = sorted(line for line in lines if often[line] == fewest)
        text = (HOUSE / rare[-1][0]).read_text().splitlines()[rare[-1][1] - 1].strip()
        print(f"{', '.join(case)}: {fewest - 1} others; {rare[-1][0]}:{rare[-1][1]}: {text}")
    twins = collections.defaultdict(list)
    for case, lines in run.items():
        twins[lines].append(", ".join(case))
    same = [cases for cases in twins.values() if len(cases) > 1]
    for cases in same:
        print(f"REACH THE SAME: {'; '.join(cases)}")
    print(f"{len(run)} cases, {len(twins)} different ways through the program")
    return 1 if same else 0


if __name__ == "__main__":
    sys.exit(main(pathlib.Path(sys.argv[1]).resolve()))
