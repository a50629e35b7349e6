# SPDX-License-Identifier: GPL-3.0-or-later
"""The job look, and the corrections of levels, on recordings written by numpy from the formulas."""
import hashlib
import json
import os
import pathlib
import subprocess
import sys
import unittest

import numpy

from program import ProgramTest, am, notes, run, run_json, write_cf32, write_sigmf

HOUSE = pathlib.Path(__file__).parents[2]
RATE = 48_000.0
KNOWN = ("--format", "cf32_le", "--rate", "48k")


def db(amplitude):
    return 20.0 * numpy.log10(amplitude)


def noise(seconds, density_dbfs_hz, seed):
    """White complex noise of that density over the whole band."""
    random = numpy.random.default_rng(seed)
    rms = 10.0 ** (density_dbfs_hz / 20.0) * numpy.sqrt(RATE / 2.0)
    count = int(round(seconds * RATE))
    return rms * (random.standard_normal(count) + 1j * random.standard_normal(count))


def unequal(z, gain_db, phase_deg):
    """I = cos, Q = sin(wt + e), gains apart by `gain_db`, as 2-jobs and docs/results.md define them."""
    g, e = 10.0 ** (gain_db / 40.0), numpy.radians(phase_deg)
    return g * z.real + 1j * (z.imag * numpy.cos(e) + z.real * numpy.sin(e)) / g


class LookTest(ProgramTest):
    def look(self, samples, *more):
        path = write_cf32(self.folder / "r.cf32", samples)
        return run_json("look", path, *KNOWN, *more)


class WhatItHolds(LookTest):
    def test_figures_of_the_raw_samples(self):
        z = am(4.0, RATE, 7312.34, -20.0, 1013.7, 0.3) + noise(4.0, -90.0, 1) + 0.001 * (1 + 1j)
        r = self.look(z)["result"]
        self.assertAlmostEqual(r["rms_dbfs"], db(numpy.sqrt(numpy.mean(numpy.abs(z) ** 2))), places=4)
        self.assertAlmostEqual(r["peak_dbfs"], db(numpy.abs(z).max()), places=4)
        component = max(numpy.abs(z.real).max(), numpy.abs(z.imag).max())
        self.assertAlmostEqual(r["peak_component_dbfs"], db(component), places=4)
        self.assertAlmostEqual(r["headroom_db"], -db(component), places=4)
        self.assertAlmostEqual(r["dc_dbfs"], db(abs(numpy.mean(z))), places=3)
        self.assertEqual(r["clipped_samples"], 0)
        self.assertAlmostEqual(r["noise_density_dbfs_hz"], -90.0, delta=0.2)

    def test_carriers_strongest_first_with_their_tones_and_what_to_type(self):
        z = (am(4.0, RATE, 7312.34, -20.0, 1013.7, 0.3) + am(4.0, RATE, -11_024.6, -32.0, 611.3, 0.5)
             + noise(4.0, -100.0, 2))
        path = write_cf32(self.folder / "r.cf32", z)
        result = run_json("look", path, *KNOWN, "--centre", "145M")
        strong, weak = result["result"]["carriers"]
        for carrier, offset, level, tone, depth in ((strong, 7312.34, -20.0, 1013.7, 30.0),
                                                    (weak, -11_024.6, -32.0, 611.3, 50.0)):
            self.assertAlmostEqual(carrier["offset_hz"], offset, delta=0.05)
            self.assertAlmostEqual(carrier["frequency_hz"], 145e6 + offset, delta=0.05)
            self.assertAlmostEqual(carrier["level_dbfs"], level, delta=0.05)
            self.assertAlmostEqual(carrier["carrier_to_noise_density_dbhz"], level + 100.0, delta=0.3)
            (found,) = carrier["tones"]
            self.assertAlmostEqual(found["frequency_hz"], tone, delta=0.05)
            self.assertAlmostEqual(found["depth_percent"], depth, delta=0.5)
            width_hz = max(2000.0, 6.0 * tone)
            self.assertAlmostEqual(carrier["snr_db"], level + 100.0 - 10.0 * numpy.log10(width_hz), delta=0.4)
            option = carrier["carrier_option"].split()
            levels = run_json("levels", path, *KNOWN, *option)
            self.assertAlmostEqual(levels["signal"]["carrier_offset_hz"], offset, delta=0.05)
        self.assertIn("several-carriers", notes(result))

    def test_a_recording_without_carrier_is_looked_at_all_the_same(self):
        result = self.look(noise(3.0, -70.0, 3))
        self.assertEqual(result["result"]["carriers"], [])
        self.assertIsNone(result["result"]["gain_control"]["suspected"])
        self.assertAlmostEqual(result["result"]["noise_density_dbfs_hz"], -70.0, delta=0.2)
        self.assertAlmostEqual(result["result"]["rms_dbfs"], -70.0 + 10 * numpy.log10(RATE), delta=0.05)

    def test_gain_and_phase_error_of_the_receiver(self):
        for gain_db, phase_deg, seed in ((0.5, 1.5, 4), (-0.23, -0.7, 5), (0.0, 0.0, 6)):
            with self.subTest(gain_db=gain_db):
                z = am(8.0, RATE, 7312.34, -20.0, 1013.7, 0.3) + noise(8.0, -95.0, seed)
                r = self.look(unequal(z, gain_db, phase_deg))["result"]
                self.assertAlmostEqual(r["iq_gain_error_db"], gain_db, delta=0.01)
                self.assertAlmostEqual(r["iq_phase_error_deg"], phase_deg, delta=0.05)

    def test_real_samples_have_no_gain_error(self):
        z = am(3.0, RATE, 12_000.0, -20.0, 1000.0, 0.5).real.astype("<f4")
        (self.folder / "r.f32").write_bytes(z.tobytes())
        r = run_json("look", self.folder / "r.f32", "--format", "rf32_le", "--rate", "48k")["result"]
        self.assertIsNone(r["iq_gain_error_db"])
        self.assertAlmostEqual(r["carriers"][0]["level_dbfs"], -20.0, delta=0.02)

    def test_segments_and_gaps(self):
        z = (am(4.0, RATE, 7312.34, -20.0, 1013.7, 0.3) + noise(4.0, -95.0, 7)).astype("<c8")
        meta = write_sigmf(self.folder / "g", z.tobytes(), "cf32_le", RATE, captures=[
            {"core:sample_start": 0, "core:global_index": 0, "core:frequency": 145e6,
             "core:datetime": "2026-05-04T09:30:00Z"},
            {"core:sample_start": 96_000, "core:global_index": 120_000, "core:frequency": 145e6}])
        result = run_json("look", meta)
        first, second = result["result"]["segments"]
        self.assertEqual((first["samples"], first["time_s"], first["centre_hz"]), (96_000, 0.0, 145e6))
        self.assertEqual((second["first_sample"], second["time_s"]), (96_000, 2.5))
        self.assertEqual(second["start_utc"], "2026-05-04T09:30:02.500000Z")
        (gap,) = result["result"]["gaps"]
        self.assertEqual((gap["time_s"], gap["duration_s"], gap["samples"]), (2.0, 0.5, 24_000))
        self.assertIn("samples-missing", notes(result))

    def test_the_form_keeps_to_the_schema(self):
        cases = {"am": am(3.0, RATE, 7312.34, -20.0, 1013.7, 0.3) + noise(3.0, -95.0, 8),
                 "nothing": noise(3.0, -70.0, 9), "short": am(0.1, RATE, 7000.0, -20.0, 1000.0, 0.3)}
        for name, samples in cases.items():
            path = write_cf32(self.folder / f"{name}.cf32", samples)
            run("look", path, *KNOWN, "--json", self.folder / f"{name}.json")
        done = subprocess.run([sys.executable, HOUSE / "tests/support/hold_against_schema.py",
                               HOUSE / "docs/results.schema.json", *self.folder.glob("*.json")],
                              capture_output=True, text=True)
        self.assertEqual(done.returncode, 0, done.stdout + done.stderr)

    def test_a_pipe_shows_the_same_figures_of_the_raw_samples(self):
        path = write_cf32(self.folder / "r.cf32", am(3.0, RATE, 7312.34, -20.0, 1013.7, 0.3) + noise(3.0, -95.0, 10))
        file, pipe = run_json("look", path, *KNOWN), run_json("look", "-", *KNOWN, input=path.read_bytes())
        for key in ("rms_dbfs", "peak_dbfs", "dc_dbfs", "clipped_samples"):
            self.assertEqual(file["result"][key], pipe["result"][key])
        self.assertEqual(pipe["result"]["segments"][0]["samples"], 144_000)
        self.assertAlmostEqual(pipe["result"]["carriers"][0]["offset_hz"], 7312.34, delta=0.05)


class Doubts(LookTest):
    def said(self, samples, *more):
        path = write_cf32(self.folder / "r.cf32", samples)
        return run("look", path, *KNOWN, *more)

    def test_a_sound_recording_raises_none(self):
        done = self.said(am(4.0, RATE, 7312.34, -20.0, 1013.7, 0.3) + noise(4.0, -95.0, 11))
        self.assertIn("no doubt", done.out)
        self.assertIn("not judged: gain control", done.out)
        self.assertNotIn("warning", done.err)

    def test_each_doubt_stands_first_with_what_to_do(self):
        z = am(4.0, RATE, 7312.34, -12.0, 1013.7, 0.8) + noise(4.0, -95.0, 12)
        limit = 0.97 * numpy.abs(z.real).max()
        clipped = numpy.clip(z.real, -limit, limit) + 1j * numpy.clip(z.imag, -limit, limit)
        done = self.said(clipped)
        self.assertIn("\n1 doubt\n  clipped\n    seen: ", done.out)
        self.assertIn("\n    do: record again with less gain", done.out)
        self.assertLess(done.out.index("clipped"), done.out.index("rms"))
        self.assertNotIn("clipped", done.err)  # said once

    def test_the_image_in_the_channel_names_where_to_tune(self):
        z = unequal(am(4.0, RATE, 700.0, -20.0, 613.7, 0.5), 0.5, 1.5) + noise(4.0, -95.0, 13)
        result = self.look(z, "--centre", "145M")
        (note,) = [each for each in result["notes"] if each["code"] == "image-in-channel"]
        self.assertRegex(note["advice"], r"tune the receiver to 14[45]\.\d+ MHz")

    def test_a_wrong_hash_is_a_doubt_here_and_a_refusal_in_levels(self):
        data = am(3.0, RATE, 7312.34, -20.0, 1013.7, 0.3).astype("<c8").tobytes()
        right, wrong = hashlib.sha512(data).hexdigest(), hashlib.sha512(b"other").hexdigest()
        for stated, doubted in ((right, False), (wrong, True)):
            meta = write_sigmf(self.folder / "h", data, "cf32_le", RATE, sha512=stated)
            result = run_json("look", meta, "--verify")
            self.assertEqual("hash-mismatch" in notes(result), doubted)
            self.assertEqual(result["recording"]["sha512"], right)
            self.assertIsNone(run_json("look", meta)["recording"]["sha512"])
            run("levels", meta, "--verify", status=3 if doubted else 0)

    def test_quiet_keeps_doubts(self):
        z = unequal(am(4.0, RATE, 700.0, -20.0, 613.7, 0.5), 0.5, 1.5)
        self.assertIn("image-in-channel", self.said(z, "--quiet").out)


class Mending(ProgramTest):
    def setUp(self):
        super().setUp()
        # The image of the carrier falls 50 Hz beside the lower line: it spoils the tone.
        clean = am(10.0, RATE, 600.0, -20.0, 1150.0, 0.05, phase=1.0)
        self.clean = write_cf32(self.folder / "clean.cf32", clean + noise(10.0, -100.0, 14))
        self.spoilt = write_cf32(self.folder / "spoilt.cf32",
                                 unequal(clean, 1.2, 3.0) + noise(10.0, -100.0, 14))
        self.real = self.folder / "real.f32"
        self.real.write_bytes(clean.real.astype("<f4").tobytes())

    def levels(self, path, *more):
        return run_json("levels", path, *KNOWN, "--tone", "1150.0", *more)

    def test_levels_without_the_image(self):
        truth = self.levels(self.clean)["result"]
        spoilt = self.levels(self.spoilt)
        mended = self.levels(self.spoilt, "--mend-iq")
        self.assertIn("image-in-channel", notes(spoilt))
        self.assertNotIn("image-in-channel", notes(mended))
        self.assertAlmostEqual(mended["result"]["mended"]["iq_gain_error_db"], 1.2, delta=0.02)
        self.assertAlmostEqual(mended["result"]["mended"]["iq_phase_error_deg"], 3.0, delta=0.1)
        own_gain_db = db(abs(10 ** (1.2 / 40) + numpy.exp(1j * numpy.radians(3.0)) / 10 ** (1.2 / 40)) / 2.0)
        for k, level in enumerate(truth["log"]["carrier_dbfs"]):
            self.assertAlmostEqual(mended["result"]["log"]["carrier_dbfs"][k], level + own_gain_db, delta=0.01)

    def test_hear_without_the_beat_of_carrier_and_image(self):
        def heard(path, name, *more):
            return run_json("hear", path, *KNOWN, "--tone", "1150", "-o", self.folder / name, *more)["result"]
        clean, spoilt = heard(self.clean, "c.wav"), heard(self.spoilt, "s.wav")
        mended = heard(self.spoilt, "m.wav", "--mend-iq")
        self.assertAlmostEqual(mended["mended"]["iq_gain_error_db"], 1.2, delta=0.02)
        self.assertLess(spoilt["tone"]["snr_db"], 3.0)  # the beat at 1200 Hz is louder than the tone
        self.assertGreater(mended["tone"]["snr_db"], clean["tone"]["snr_db"] - 3.0)

    def test_where_nothing_can_be_fitted(self):
        for path, known in ((self.real, ("--format", "rf32_le", "--rate", "48k")),
                            (write_cf32(self.folder / "noise.cf32", noise(3.0, -70.0, 15)), KNOWN)):
            done = run("levels", path, *known, "--carrier", "+600", "--mend-iq", status=3)
            self.assertRegex(done.err, r"^tonewalk: --mend-iq: [^\n]+; leave it out[^\n]*\n$")


class Corrections(ProgramTest):
    def test_drift_between_two_references_is_taken_off(self):
        z = am(30.0, RATE, 7312.34, -20.0, 1013.7, 0.3)
        drift_db = 0.8 * numpy.clip((numpy.arange(z.size) / RATE - 4.0) / 22.0, 0.0, 1.0)
        path = write_cf32(self.folder / "d.cf32", z * 10.0 ** (drift_db / 20.0) + noise(30.0, -95.0, 16))
        references = ("--reference", "0s:8s", "--reference", "00:22:00:30")
        r = run_json("levels", path, *KNOWN, *references)["result"]
        self.assertAlmostEqual(r["reference"]["drift_db"], 0.75, delta=0.06)  # of the means over 8 s
        levels, u95 = numpy.array(r["log"]["carrier_dbfs"]), numpy.array(r["log"]["carrier_dbfs_u95"])
        self.assertLess(numpy.abs(levels - levels[0]).max(), 0.15)
        self.assertGreater(u95.min(), 0.5 * r["reference"]["drift_db"])
        for wrong in (("--reference", "0s:8s"), ("--reference", "0s:8s", "--reference", "5s:9s"),
                      ("--reference", "8s:0s", "--reference", "9s:10s"),
                      ("--reference", "0s:1s", "--reference", "2s:3s", "--reference", "4s:5s"),
                      ("--reference", "0s", "--reference", "5s:9s")):
            done = run("levels", path, *KNOWN, *wrong, status=2)
            self.assertRegex(done.err, r"^tonewalk: --reference[^\n]+\n$")
        run("levels", path, *KNOWN, "--reference", "0s:8s", "--reference", "40s:50s", status=3)

    def test_what_stands_there_without_the_transmitter_is_taken_off(self):
        t = numpy.arange(int(20 * RATE)) / RATE
        foreign = 10.0 ** (-52.0 / 20.0) * numpy.exp(2j * numpy.pi * (7312.34 + 0.05) * t)
        on = write_cf32(self.folder / "on.cf32", am(20.0, RATE, 7312.34, -40.0, 1013.7, 0.3) + foreign
                        + noise(20.0, -110.0, 17))
        off = write_cf32(self.folder / "off.cf32", foreign + noise(20.0, -110.0, 18))
        plain = run_json("levels", on, *KNOWN)["result"]
        r = run_json("levels", on, *KNOWN, "--background", off)["result"]
        self.assertAlmostEqual(r["background"]["carrier_dbfs"], -52.0, delta=0.05)
        self.assertIsNone(r["background"]["tone_dbfs"])

        def mean_dbfs(result):
            return 10.0 * numpy.log10(numpy.mean(10.0 ** (numpy.array(result["log"]["carrier_dbfs"]) / 10.0)))
        self.assertAlmostEqual(mean_dbfs(plain), -40.0 + 10.0 * numpy.log10(1.0 + 10.0 ** -1.2), delta=0.05)
        self.assertAlmostEqual(mean_dbfs(r), -40.0, delta=0.05)
        for low, high in zip(r["log"]["carrier_dbfs_low95"], r["log"]["carrier_dbfs_high95"]):
            self.assertLess(low, -40.0)
            self.assertGreater(high, -40.0)
        run("levels", on, *KNOWN, "--background", self.folder / "missing.cf32", status=3)
        run("levels", on, *KNOWN, "--background", "-", status=2)
        run("levels", on, *KNOWN, "--background", off, "--csv", off, "--force", status=2)


if __name__ == "__main__":
    unittest.main()
