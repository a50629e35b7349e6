#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""headers_test.py COMPILER: every public header compiles alone, and included twice, as a user would."""
import concurrent.futures
import os
import pathlib
import subprocess
import sys

INCLUDE = pathlib.Path(__file__).resolve().parents[2] / "include"


def compile_alone(compiler, name):
    run = subprocess.run(
        [compiler, "-std=c++20", "-Wall", "-Wextra", "-Wpedantic", "-Werror", "-fsyntax-only", f"-I{INCLUDE}",
         "-x", "c++", "-"],
        input=f'#include "{name}"\n#include "{name}"\n', capture_output=True, text=True, check=False)
    return run.stderr if run.returncode else ""


def main():
    names = sorted(str(path.relative_to(INCLUDE)) for path in INCLUDE.glob("tonewalk/**/*.hpp"))
    if not names:
        sys.exit(f"no headers under {INCLUDE}")
    with concurrent.futures.ThreadPoolExecutor(os.cpu_count()) as pool:
        complaints = list(pool.map(lambda name: compile_alone(sys.argv[1], name), names))
    for name, complaint in zip(names, complaints):
        if complaint:
            print(f"{name} does not stand alone:\n{complaint}")
    print(f"{complaints.count('')} of {len(names)} headers stand alone")
    sys.exit(any(complaints))


if __name__ == "__main__":
    main()
