# SPDX-License-Identifier: GPL-3.0-or-later
"""A disk that is full at one moment or another: status 4, one line, nothing half-written.

Full means here that no file may pass 1 MiB; what fits is written whole.
"""
import json
import resource
import subprocess
import unittest

import numpy

from program import ProgramTest, run

RATE = 48_000.0
KNOWN = ("--format", "ci8", "--rate", "48k")
FULL = 1 << 20
SCENE = """[recording]
format = "{format}"
rate_hz = 48000.0
duration_s = {seconds}
truth_every_s = {every}
[[carrier]]
offset_hz = 7312.5
"""


def full_disk():
    resource.setrlimit(resource.RLIMIT_FSIZE, (FULL, FULL))


class FullDisk(ProgramTest):
    def record(self, samples):
        """A modulated carrier in bytes, so that the recording is smaller than what comes of it."""
        t = numpy.arange(samples) / RATE
        z = 60.0 * (1.0 + 0.5 * numpy.cos(2 * numpy.pi * 1013.7 * t)) * numpy.exp(2j * numpy.pi * 7312.5 * t)
        codes = numpy.rint(numpy.stack([z.real, z.imag], 1)).astype("i1")
        (self.folder / "r.ci8").write_bytes(codes.tobytes())

    def refused(self, *words, named, whole=()):
        """One line, status 4; then the folder holds the inputs and these whole outputs."""
        done = run(*words, status=4, cwd=self.folder, preexec_fn=full_disk, stdin=subprocess.DEVNULL)
        self.assertEqual(done.out, "")
        self.assertRegex(done.err, rf"\Atonewalk: {named}: [^\n]*File too large[^\n]*; [^\n]*(room|space)[^\n]*\n\Z")
        self.assertEqual({path.name for path in self.folder.iterdir()} - {"r.ci8", "s.toml"}, set(whole))

    def fits(self, *words):
        """The same without a limit: it is the limit alone that was in the way."""
        run(*words, cwd=self.folder, stdin=subprocess.DEVNULL)

    def test_the_audio_that_is_put_aside(self):
        self.record(int(7 * RATE))
        words = ("hear", "r.ci8", *KNOWN, "-o", "a.wav", "--json", "a.json")
        self.refused(*words, named=".*")
        self.fits(*words)

    def test_the_audio_file(self):
        self.record(FULL // 4 - 8)  # as floats it just fits aside, but not with a header
        words = ("hear", "r.ci8", *KNOWN, "-o", "a.wav", "--sample", "float", "--json", "a.json")
        self.refused(*words, named="a.wav")
        self.fits(*words)
        self.assertGreater((self.folder / "a.wav").stat().st_size, FULL)

    def test_the_audio_file_on_its_way_to_a_device(self):
        self.record(FULL // 4 - 8)
        (self.folder / "null.wav").symlink_to("/dev/null")
        words = ("hear", "r.ci8", *KNOWN, "-o", "null.wav", "--sample", "float")
        self.refused(*words, named="null.wav", whole=["null.wav"])

    def test_the_log(self):
        self.record(int(8 * RATE))
        words = ("levels", "r.ci8", *KNOWN, "--every", "2ms", "--csv", "a.csv", "--json", "a.json")
        self.refused(*words, named="a.csv")
        self.fits(*words)

    def test_the_results(self):
        self.record(int(4 * RATE))
        words = ("levels", "r.ci8", *KNOWN, "--every", "2ms", "--csv", "a.csv", "--json", "a.json")
        self.refused(*words, named="a.json", whole=["a.csv"])
        rows = (self.folder / "a.csv").read_text().splitlines()
        self.fits(*words, "--force")
        log = json.loads((self.folder / "a.json").read_text())["result"]["log"]
        self.assertEqual(len(rows) - 1, len(log["time_s"]))

    def test_made_samples(self):
        (self.folder / "s.toml").write_text(SCENE.format(format="cf32_le", seconds=3.0, every=0.1))
        words = ("make", "s.toml", "-o", "made")
        self.refused(*words, named="made.sigmf-data")
        self.fits(*words)

    def test_their_truth(self):
        (self.folder / "s.toml").write_text(SCENE.format(format="ci8", seconds=5.0, every=0.0002))
        words = ("make", "s.toml", "-o", "made")
        self.refused(*words, named="made.truth.json")
        self.fits(*words)


if __name__ == "__main__":
    unittest.main()
