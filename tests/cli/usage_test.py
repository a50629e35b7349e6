# SPDX-License-Identifier: GPL-3.0-or-later
"""Exit statuses, one-line complaints, outputs that appear whole or not at all."""
import json
import subprocess
import unittest

from program import ProgramTest, am, run, write_cf32

RATE = 48_000.0
KNOWN = ("--format", "cf32_le", "--rate", "48k")
SCENE = """[recording]
rate_hz = 48000.0
duration_s = 1.5
[[carrier]]
offset_hz = 7312.5
[[carrier.tone]]
frequency_hz = 1013.7
"""


class UsageTest(ProgramTest):
    def setUp(self):
        super().setUp()
        self.recording = write_cf32(self.folder / "r.cf32", am(3.0, RATE, 7312.34, -20.0, 1013.7, 0.3))
        self.scene = self.folder / "s.toml"
        self.scene.write_text(SCENE)

    def complaint(self, status, *arguments, **options):
        """The one line that a refusal prints."""
        done = run(*arguments, status=status, cwd=self.folder, stdin=subprocess.DEVNULL, **options)
        self.assertEqual(done.out, "")
        self.assertRegex(done.err, r"^tonewalk: [^\n]+\n$")
        return done.err

    def refuses(self, status, *cases):
        """Each case: the words typed, and what the line has to name."""
        for words, *named in cases:
            with self.subTest(words=words):
                line = self.complaint(status, *words)
                for name in named:
                    self.assertIn(name, line)

    def left_behind(self, *allowed):
        return {path.name for path in self.folder.iterdir()} - {"r.cf32", "s.toml", *allowed}


class CommandLine(UsageTest):
    def test_what_was_typed_wrong_is_named_with_the_mend(self):
        levels = ("levels", "r.cf32", *KNOWN)
        self.refuses(
            2,
            ([], "levels"),
            (["levles", "r.cf32"], "levles", "did you mean levels?"),
            (["levels"], "RECORDING"),
            (["levels", "r.cf32", "other.cf32", *KNOWN], "other.cf32"),
            ([*levels, "--csvv", "a.csv"], "--csvv", "did you mean --csv?"),
            ([*levels, "--windw", "1"], "--windw", "did you mean --window?"),
            ([*levels, "--nothing-like-it"], "--nothing-like-it", "--help"),
            ([*levels, "--csv"], "--csv", "needs a value"),
            ([*levels, "--csv", "--quiet"], "--csv", "needs a value"),
            ([*levels, "--tone", "1k", "--tone", "2k"], "--tone", "once"),
            ([*levels, "--tone", "1kk"], "--tone", "1kk"),
            ([*levels, "--tone", "-1k"], "--tone"),
            ([*levels, "--tone", "nan"], "--tone"),
            ([*levels, "--width", "0"], "--width"),
            ([*levels, "--rate", "1e999"], "--rate"),
            ([*levels, "--carrier", "here"], "--carrier", "here"),
            ([*levels, "--every", "5m"], "--every", "min"),
            ([*levels, "--every", "m"], "--every"),
            ([*levels, "--every", "0"], "--every"),
            ([*levels, "--window", "200kg"], "--window"),
            ([*levels, "--from", "1:2:3:4"], "--from"),
            ([*levels, "--lane", "-1"], "--lane"),
            ([*levels, "--threads", "0"], "--threads"),
            ([*levels, "--threads", "two"], "--threads"),
            ([*levels, "--progress", "loud"], "--progress", "never"),
            ([*levels, "--detector", "crystal"], "--detector", "envelope"),
            ([*levels, "--quantity", "noise"], "--quantity", "carrier"),
            ([*levels, "--curves", "some"], "--curves"),
            (["levels", "r.cf32", "--rate", "48k", "--format", "ci12"], "--format", "ci16_le"),
            (["hear", "r.cf32", *KNOWN], "--output"),
            (["hear", "r.cf32", *KNOWN, "-o", "a.mp3"], "a.mp3", ".wav"),
            (["hear", "r.cf32", *KNOWN, "-o", "a.wav", "--band", "300"], "--band"),
            (["hear", "r.cf32", *KNOWN, "-o", "a.wav", "--audio-rate", "7k"], "--audio-rate"),
            (["hear", "r.cf32", *KNOWN, "-o", "a.wav", "--sample", "pcm12"], "--sample", "pcm16"),
            (["hear", "r.cf32", *KNOWN, "-o", "a.wav", "--loudness", "steady", "--gain", "3"], "--gain"),
            (["hear", "r.cf32", *KNOWN, "-o", "a.wav", "--every", "1"], "--every"),  # not of this job
            (["make", "s.toml"], "--output"),
            (["make", "-o", "x"], "SCENE"),
            (["make", "s.toml", "-o", "x", "--quite"], "--quite", "did you mean --quiet?"))
        self.assertEqual(self.left_behind(), set())

    def test_values_are_judged_before_files_are_opened(self):
        for words in (["--threads", "99"], ["--progress", "loud"], ["--quantity", "noise"],
                      ["--detector", "crystal"], ["--every", "0"], ["--curves", "some"]):
            with self.subTest(words=words):
                self.assertIn(words[0], self.complaint(2, "levels", "missing.cf32", *KNOWN, *words))
        for words in (["--threads", "99"], ["--progress", "loud"], ["--curves", "some"]):
            with self.subTest(job="hear", words=words):
                self.assertIn(words[0], self.complaint(2, "hear", "missing.cf32", *KNOWN, "-o", "a.wav", *words))

    def test_what_the_recording_lacks(self):
        self.refuses(2, (["levels", "r.cf32"], "--format", "--rate"),
                     (["levels", "r.cf32", "--format", "cf32_le"], "--rate"),
                     (["levels", "r.cf32", *KNOWN, "--carrier", "145.2M"], "--carrier", "--centre"),
                     (["levels", "-"], "--format"))

    def test_inputs_that_cannot_be_used(self):
        self.refuses(
            3,
            (["levels", "missing.cf32", *KNOWN], "missing.cf32"),
            (["levels", "missing.sigmf-meta"], "missing.sigmf-meta"),
            (["levels", "r.cf32", *KNOWN, "--from", "4"], "--from"),
            (["levels", "r.cf32", *KNOWN, "--lane", "1"], "lane"),
            (["levels", "r.cf32", *KNOWN, "--carrier", "+30k"], "--carrier"),
            (["levels", "r.cf32", *KNOWN, "--tone", "20k"], "--tone"),
            (["levels", "r.cf32", *KNOWN, "--width", "40k"], "--width"),
            (["levels", "r.cf32", *KNOWN, "--window", "4"], "--window"),
            (["hear", "missing.cf32", *KNOWN, "-o", "a.wav"], "missing.cf32"),
            (["make", "missing.toml", "-o", "x"], "missing.toml"))
        (self.folder / "empty.cf32").write_bytes(b"")
        self.complaint(3, "levels", "empty.cf32", *KNOWN)
        self.scene.write_text(SCENE.replace("frequency_hz", "frequenzy_hz"))
        self.assertIn("frequenzy_hz", self.complaint(3, "make", "s.toml", "-o", "x"))
        self.assertEqual(self.left_behind("empty.cf32"), set())

    def test_version_and_help(self):
        self.assertRegex(run("--version").out, r"^tonewalk \d+\.\d+\.\d+\n$")
        self.assertIn("FFTW", run("--version", "--licences").out)
        for words in (["--help"], ["levels", "--help"], ["hear", "--help"], ["make", "-h"]):
            done = run(*words)
            self.assertIn("tonewalk", done.out)
            self.assertEqual(done.err, "")


class Outputs(UsageTest):
    def test_two_outputs_in_one_file(self):
        (self.folder / "sub").mkdir()
        self.refuses(2, (["levels", "r.cf32", *KNOWN, "--csv", "a", "--json", "a"], "a"),
                     (["levels", "r.cf32", *KNOWN, "--csv", "a", "--json", "sub/../a"], "a"),
                     (["levels", "r.cf32", *KNOWN, "--csv", "-", "--json", "-"], "standard output"),
                     (["hear", "r.cf32", *KNOWN, "-o", "a.wav", "--json", "a.wav"], "a.wav"))

    def test_an_output_that_exists_stays_without_force(self):
        kept = self.folder / "kept.csv"
        kept.write_text("mine")
        self.assertIn("--force", self.complaint(4, "levels", "r.cf32", *KNOWN, "--csv", "kept.csv"))
        self.assertEqual(kept.read_text(), "mine")
        run("levels", self.recording, *KNOWN, "--csv", kept, "--force")
        self.assertTrue(kept.read_text().startswith("time_s,"))
        audio = self.folder / "a.wav"
        audio.write_text("mine")
        self.assertIn("--force", self.complaint(4, "hear", "r.cf32", *KNOWN, "-o", "a.wav"))
        self.assertEqual(audio.read_text(), "mine")
        (self.folder / "x.sigmf-meta").write_text("mine")
        self.assertIn("--force", self.complaint(4, "make", "s.toml", "-o", "x"))
        self.assertEqual(self.left_behind("kept.csv", "a.wav", "x.sigmf-meta"), set())

    def test_a_missing_folder(self):
        self.refuses(4, (["levels", "r.cf32", *KNOWN, "--csv", "no/a.csv"], "no/a.csv"),
                     (["levels", "r.cf32", *KNOWN, "--json", "no/a.json"], "no/a.json"),
                     (["hear", "r.cf32", *KNOWN, "-o", "no/a.wav"], "no/a.wav"),
                     (["make", "s.toml", "-o", "no/x"], "no/x"))

    def test_the_summary_moves_to_standard_error(self):
        plain = run("levels", self.recording, *KNOWN)
        self.assertIn("tone", plain.out)
        with_json = run("levels", self.recording, *KNOWN, "--json", "-")
        json.loads(with_json.out)
        self.assertIn(plain.out.splitlines()[2], with_json.err)

    def test_quiet_hides_remarks_and_keeps_warnings(self):
        # channel-narrowed is a remark, no-tone a warning
        edge = write_cf32(self.folder / "edge.cf32", am(3.0, RATE, 21_500.0, -20.0, 1000.0, 0.0))
        loud, quiet = run("levels", edge, *KNOWN).err, run("levels", edge, *KNOWN, "--quiet").err
        self.assertIn("narrow", loud.replace("instead of", "narrow"))
        self.assertNotIn("instead of", quiet)
        self.assertIn("no tone was found", quiet)


if __name__ == "__main__":
    unittest.main()
