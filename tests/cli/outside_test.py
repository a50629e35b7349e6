# SPDX-License-Identifier: GPL-3.0-or-later
"""The main job on input that this project did not make: SoX and scipy."""
import json
import math
import shutil
import subprocess
import unittest
import wave

import numpy
import scipy.signal

from program import ProgramTest, am, notes, run, run_json, write_cf32

# `tremolo 1000 60` multiplies by 1 - 0.6 (1 + sin)/2 (SoX manual, effect tremolo: depth in percent of the
# level): mean 0.7, swing 0.3. With gain -6 dB: carrier 20 log(10^(-6/20) 0.7), depth 0.3/0.7.
SOX_DEPTH_PERCENT = 100.0 * 0.6 / (2.0 - 0.6)
SOX_CARRIER_DBFS = -6.0 + 20.0 * math.log10(0.7)
SOX_TONE_DBFS = SOX_CARRIER_DBFS + 20.0 * math.log10(SOX_DEPTH_PERCENT / 100.0)


class SoxRealSignal(ProgramTest):
    def setUp(self):
        super().setUp()
        if shutil.which("sox") is None:
            self.skipTest("SoX is not installed: the real-signal check did not run")
        subprocess.run("sox -r 192000 -n -b 32 am.wav synth 5 sine 24000 gain -6 tremolo 1000 60".split(),
                       cwd=self.folder, check=True)

    def test_tone_and_levels(self):
        result = run_json("levels", self.folder / "am.wav")
        self.assertAlmostEqual(result["signal"]["tone_hz"], 1000.0, delta=0.01)
        self.assertAlmostEqual(result["signal"]["carrier_offset_hz"], 24000.0, delta=0.01)
        log = result["result"]["log"]
        self.assertGreater(len(log["time_s"]), 40)
        for level in log["carrier_dbfs"]:
            self.assertAlmostEqual(level, SOX_CARRIER_DBFS, delta=0.002)
        for level in log["tone_dbfs"]:
            self.assertAlmostEqual(level, SOX_TONE_DBFS, delta=0.002)
        for depth in log["depth_percent"]:
            self.assertAlmostEqual(depth, SOX_DEPTH_PERCENT, delta=0.01)

    def test_recovered_audio_is_clean(self):
        out = self.folder / "am-audio.wav"
        result = run_json("hear", self.folder / "am.wav", "-o", out, "--sample", "float")
        tone = result["result"]["tone"]
        self.assertAlmostEqual(tone["frequency_hz"], 1000.0, delta=0.01)
        self.assertLess(tone["thd_percent"], 0.02)
        # The same by SoX's own decoding and numpy: harmonics 2 to 9 of the middle 3 s.
        raw = subprocess.run(["sox", out, "-t", "f64", "-"], capture_output=True, check=True).stdout
        audio = numpy.frombuffer(raw, "<f8")[48000:4 * 48000]
        window = scipy.signal.windows.blackmanharris(len(audio), sym=False)
        t = numpy.arange(len(audio)) / 48000.0
        lines = [abs(numpy.sum(window * audio * numpy.exp(-2j * numpy.pi * 1000.0 * n * t)))
                 for n in range(1, 10)]
        self.assertLess(100.0 * math.sqrt(sum(x * x for x in lines[1:])) / lines[0], 0.02)

    def test_audio_file_has_the_length_of_the_recording(self):
        out = self.folder / "am-audio.wav"
        run("hear", self.folder / "am.wav", "-o", out)
        with wave.open(str(out)) as audio:
            self.assertEqual(audio.getframerate(), 48000)
            self.assertEqual(audio.getnframes(), 5 * 48000)


class ScipyComplexSignal(ProgramTest):
    """Sign and scale from the formula, both sides of the centre."""

    RATE = 250_000.0

    def check(self, offset_hz):
        samples = am(3.0, self.RATE, offset_hz, -23.7, 1337.7, 0.312)
        path = write_cf32(self.folder / "am.cf32", samples)
        result = run_json("levels", path, "--format", "cf32_le", "--rate", "250k", "--centre", "145.2M")
        self.assertAlmostEqual(result["signal"]["carrier_offset_hz"], offset_hz, delta=0.002)
        self.assertAlmostEqual(result["signal"]["carrier_hz"], 145.2e6 + offset_hz, delta=0.002)
        self.assertAlmostEqual(result["signal"]["tone_hz"], 1337.7, delta=0.01)
        for level in result["result"]["log"]["carrier_dbfs"]:
            self.assertAlmostEqual(level, -23.7, delta=0.002)
        for level in result["result"]["log"]["tone_dbfs"]:
            self.assertAlmostEqual(level, -23.7 + 20 * math.log10(0.312), delta=0.002)

    def test_above_the_centre(self):
        self.check(37_123.4)

    def test_below_the_centre(self):
        self.check(-61_877.9)

    def test_swapped_and_inverted_spectra_mirror_the_offset(self):
        samples = am(2.0, self.RATE, 37_123.4, -23.7, 1337.7, 0.312)
        path = write_cf32(self.folder / "am.cf32", samples)
        for option in ("--swap-iq", "--inverted"):
            result = run_json("levels", path, "--format", "cf32_le", "--rate", "250k", option)
            self.assertAlmostEqual(result["signal"]["carrier_offset_hz"], -37_123.4, delta=0.002)


class ScipyEnvelope(ProgramTest):
    """With a second carrier 6 dB down in the channel the envelope's tone is what scipy's envelope holds."""

    def test_second_carrier_in_the_channel(self):
        rate, tone, width = 96_000.0, 1012.3, 12_000.0
        wanted = am(4.0, rate, 11_234.5, -20.0, tone, 0.3)
        other = am(4.0, rate, 11_234.5 + 3_217.9, -26.0, 400.0, 0.0, phase=1.9)
        samples = wanted + other
        path = write_cf32(self.folder / "two.cf32", samples)
        result = run_json("levels", path, "--format", "cf32_le", "--rate", "96k", "--carrier", "+11234.5",
                          "--tone", "1012.3", "--width", "12k", "--detector", "envelope")
        log = result["result"]["log"]
        # Both carriers and all sidebands lie inside the flat width, so scipy needs no channel filter.
        envelope = numpy.abs(samples)
        window = scipy.signal.windows.hann(int(0.2 * rate), sym=False)
        compared = 0
        for time_s, reading in zip(log["time_s"], log["envelope_tone_dbfs"]):
            first = int(round((time_s - 0.1) * rate))
            part = envelope[first:first + len(window)]
            t = (first + numpy.arange(len(window))) / rate
            line = 2.0 * numpy.sum(window * part * numpy.exp(-2j * numpy.pi * tone * t)) / numpy.sum(window)
            self.assertAlmostEqual(reading, 20 * math.log10(abs(line)), delta=0.05)
            compared += 1
        self.assertGreater(compared, 30)


if __name__ == "__main__":
    unittest.main()
