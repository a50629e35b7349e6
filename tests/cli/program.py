# SPDX-License-Identifier: GPL-3.0-or-later
"""What tests of the whole program share: running it, reading its JSON, writing recordings by hand.

The program's path comes in the environment variable TONEWALK. Recordings are written here with numpy or
struct, never by the program itself, unless a test says so.
"""
import json
import os
import pathlib
import shutil
import subprocess
import tempfile
import unittest

import numpy

PROGRAM = os.environ.get("TONEWALK", "tonewalk")


def run(*arguments, status=0, **options):
    """Runs the program and checks its exit status; returns the finished process with text output."""
    options.setdefault("timeout", 120)
    done = subprocess.run([PROGRAM, *map(str, arguments)], capture_output=True, **options)
    done.out = done.stdout.decode("utf-8", "replace")
    done.err = done.stderr.decode("utf-8", "replace")
    if status is not None and done.returncode != status:
        raise AssertionError(f"exit status {done.returncode}, not {status}\n{done.args}\n{done.out}\n{done.err}")
    return done


def run_json(*arguments, **options):
    """Runs a job with --json - and returns the parsed result."""
    return json.loads(run(*arguments, "--json", "-", **options).out)


def notes(result):
    return {note["code"] for note in result["notes"]}


def write_cf32(path, samples):
    """A raw cf32_le file."""
    numpy.asarray(samples, dtype="<c8").tofile(path)
    return path


def write_sigmf(base, data, datatype, rate, **more):
    """BASE.sigmf-meta and BASE.sigmf-data; `data` are the bytes. `more`: captures, and global fields."""
    captures = more.pop("captures", [{"core:sample_start": 0}])
    fields = {"core:datatype": datatype, "core:sample_rate": rate, "core:version": "1.2.5"}
    fields.update({f"core:{key}": value for key, value in more.items()})
    base = pathlib.Path(base)
    base.with_suffix(".sigmf-data").write_bytes(data)
    meta = base.with_suffix(".sigmf-meta")
    meta.write_text(json.dumps({"global": fields, "captures": captures, "annotations": []}))
    return meta


def am(seconds, rate, offset_hz, carrier_dbfs, tone_hz, depth, phase=0.3, tone_phase=0.7):
    """Complex full-carrier AM from the formula: A (1 + m cos(wm t + b)) exp(j(wc t + a))."""
    t = numpy.arange(int(round(seconds * rate))) / rate
    amplitude = 10.0 ** (carrier_dbfs / 20.0)
    envelope = 1.0 + depth * numpy.cos(2 * numpy.pi * tone_hz * t + tone_phase)
    return amplitude * envelope * numpy.exp(1j * (2 * numpy.pi * offset_hz * t + phase))


class ProgramTest(unittest.TestCase):
    """A test with a folder of its own."""

    def setUp(self):
        self.folder = pathlib.Path(tempfile.mkdtemp(prefix="tonewalk-test-"))
        self.addCleanup(shutil.rmtree, self.folder, ignore_errors=True)
