# SPDX-License-Identifier: GPL-3.0-or-later
"""File, archive or pipe, whatever threads and reads: every byte of JSON, CSV and audio is the same."""
import json
import os
import subprocess
import tarfile
import threading
import unittest

import numpy

from program import PROGRAM, ProgramTest, run, write_sigmf

RATE = 120_000.0
PRIME_LENGTH = 2_000_003


def nasty_samples():
    """Drift, a long fade down to the noise, clipping, a NaN, a prime length; cf32."""
    t = numpy.arange(PRIME_LENGTH) / RATE
    noise = numpy.random.Generator(numpy.random.PCG64(20260504)).normal(0.0, 1e-4, (PRIME_LENGTH, 2))
    fade = 10.0 ** (-90.0 * numpy.exp(-((t - 9.0) / 2.5) ** 2) / 20.0)
    phase = 2 * numpy.pi * (31_234.56 * t + 0.5 * (5.0 / 60.0) * t * t)
    z = 0.5 * fade * (1.0 + 0.83 * numpy.cos(2 * numpy.pi * 1043.21 * t + 0.4)) * numpy.exp(1j * phase)
    z = z + noise[:, 0] + 1j * noise[:, 1]
    z = numpy.clip(z.real, -0.8, 0.8) + 1j * numpy.clip(z.imag, -0.8, 0.8)
    z = z.astype("<c8")
    z[617_283] = complex(float("nan"), 0.1)
    return z


def comparable(text):
    """A result without what the promise leaves out: name, format, sha512 and the command."""
    result = json.loads(text)
    del result["command"]
    for key in ("name", "format", "sha512"):
        result["recording"].pop(key)
    return result


def piped(data, read_size, *arguments):
    """Runs the program on a pipe that is fed `read_size` bytes at a time (the start; then faster)."""
    child = subprocess.Popen([PROGRAM, *arguments], stdin=subprocess.PIPE, stdout=subprocess.PIPE,
                             stderr=subprocess.PIPE)

    def feed():
        small = min(len(data), 20_000 * read_size)
        view = memoryview(data)
        for start in range(0, small, read_size):
            os.write(child.stdin.fileno(), view[start:start + read_size])
        child.stdin.write(view[small:])
        child.stdin.close()

    feeder = threading.Thread(target=feed)
    feeder.start()
    out, err = child.stdout.read(), child.stderr.read()
    feeder.join()
    if child.wait() != 0:
        raise AssertionError(err.decode())
    return out.decode()


class Identity(ProgramTest):
    @classmethod
    def setUpClass(cls):
        cls.samples = nasty_samples()

    def outputs(self, name, *arguments):
        """JSON, CSV of levels and the audio of hear."""
        csv, wav = self.folder / f"{name}.csv", self.folder / f"{name}.wav"
        levels = run("levels", *arguments, "--detector", "envelope", "--csv", csv, "--json", "-").out
        hear = run("hear", *arguments, "-o", wav, "--json", "-").out
        return comparable(levels), csv.read_bytes(), comparable(hear), wav.read_bytes()

    def test_threads_file_and_archive(self):
        half = 1_000_003
        captures = [{"core:sample_start": 0, "core:global_index": 0, "core:frequency": 145.2e6},
                    {"core:sample_start": half, "core:global_index": half + 24_017,
                     "core:frequency": 145.2e6}]
        meta = write_sigmf(self.folder / "nasty", self.samples.tobytes(), "cf32_le", RATE, captures=captures)
        archive = self.folder / "nasty.sigmf"
        with tarfile.open(archive, "w", format=tarfile.PAX_FORMAT) as tar:
            for part in ("nasty.sigmf-meta", "nasty.sigmf-data"):
                tar.add(self.folder / part, arcname=f"nasty/{part}")
        reference = self.outputs("one", meta, "--threads", "1")
        self.assertIn("non-finite-samples", str(reference[0]))
        for name, arguments in {"two": (meta, "--threads", "2"), "three": (meta, "--threads", "3"),
                                "seven": (meta, "--threads", "7"),
                                "archive": (archive, "--threads", "2")}.items():
            with self.subTest(name):
                self.assertEqual(self.outputs(name, *arguments), reference)

    def test_pipe_and_file(self):
        raw = self.folder / "nasty.iq"
        raw.write_bytes(self.samples.tobytes())
        known = ("--format", "cf32_le", "--rate", "120k", "--centre", "145.2M")
        reference = comparable(run("levels", raw, *known, "--json", "-").out)
        for read_size in (1, 7, 4093):
            for threads in ("1", "3"):
                with self.subTest(read_size=read_size, threads=threads):
                    text = piped(raw.read_bytes(), read_size, "levels", "-", *known, "--threads", threads,
                                 "--json", "-")
                    self.assertEqual(comparable(text), reference)


if __name__ == "__main__":
    unittest.main()
