#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""tests/cli/malformed_coverage.py BUILD: which check of the program each malformed case reaches.

BUILD is a build made with the `coverage` preset. Each case of malformed_cases.CASES runs with counters of its own; told is
the line of the sources that it alone ran, or where none is its own one that as few others as any did. Fails where two
cases ran exactly the same lines: one of them proves nothing that the other does not.
"""
import collections
import concurrent.futures
import json
import os
import pathlib
import subprocess
import sys
import tempfile

HOUSE = pathlib.Path(__file__).resolve().parents[2]


def lines_run(counters, build):
    """{(source, line)} with a count, from the .gcda files of one run; gcov wants them beside their .gcno files."""
    files = []
    for gcda in counters.rglob("*.gcda"):
        gcno = pathlib.Path("/") / gcda.relative_to(counters).with_suffix(".gcno")
        beside = gcda.with_suffix(".gcno")
        if not beside.exists():
            beside.symlink_to(gcno)
        files.append(gcda)
    done = subprocess.run(["gcov", "--json-format", "--stdout", "--relative-only", "--source-prefix", HOUSE, *files],
                          cwd=build, capture_output=True, check=True)
    run = set()
    for text in done.stdout.decode().splitlines():
        for source in json.loads(text)["files"]:
            path = pathlib.Path(os.path.normpath(build / source["file"]))
            if HOUSE in path.parents and "tests" not in path.parts:
                name = str(path.relative_to(HOUSE))
                run.update((name, line["line_number"]) for line in source["lines"] if line["count"] > 0)
    return run


def main(build):
    os.environ["TONEWALK"] = str(build / "tonewalk")
    from malformed_cases import CASES
    from malformed_test import Outcome

    def lines_of(number, case):
        work, counters = pathlib.Path(folder) / str(number), pathlib.Path(folder) / f"{number}.counters"
        work.mkdir()
        got = Outcome(case, work, {"GCOV_PREFIX": str(counters)})
        if got.status != case.status:
            sys.exit(f"{case.kind}, {case.name}: status {got.status}, not {case.status}: {got.err}")
        return frozenset(lines_run(counters, build))

    with tempfile.TemporaryDirectory() as folder, concurrent.futures.ThreadPoolExecutor(os.cpu_count()) as pool:
        ways = pool.map(lines_of, range(len(CASES)), CASES)
        run = {(case.kind, case.name): lines for case, lines in zip(CASES, ways)}
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
