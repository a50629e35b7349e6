# SPDX-License-Identifier: GPL-3.0-or-later
"""Rows of the table of allowed errors through the whole program: nothing on round numbers, three places in
the band, and a carrier that drifts, wobbles, comes late and fades."""
import math
import unittest

import numpy

from program import ProgramTest, notes, run_json, write_cf32

ALLOWED_CLEAN_DB = 0.002  # "carrier and tone level", cf32, no noise: every record


def draw(generator, low, high):
    return float(generator.uniform(low, high))


class CleanLevels(ProgramTest):
    def check(self, seed, place):
        generator = numpy.random.Generator(numpy.random.PCG64(seed))
        rate = draw(generator, 40e3, 700e3)
        tone = draw(generator, 350.0, 1900.0)
        depth = draw(generator, 0.1, 0.9)
        # 5 % of the rate from the band's edge, unless the channel of three harmonics does not fit there.
        edge = rate / 2 - max(0.05 * rate, 3.01 * tone)
        offset = {"low": -edge, "middle": draw(generator, 0.05, 0.25) * rate, "high": edge}[place]
        carrier_dbfs = draw(generator, -90.0, 0.0) - 20 * math.log10(1 + depth)
        t = numpy.arange(int(4.3 * rate)) / rate
        envelope = 1 + depth * numpy.cos(2 * numpy.pi * tone * t + draw(generator, 0, 6.28))
        z = 10 ** (carrier_dbfs / 20) * envelope * numpy.exp(
            1j * (2 * numpy.pi * offset * t + draw(generator, 0, 6.28)))
        path = write_cf32(self.folder / "row.cf32", z)
        result = run_json("levels", path, "--format", "cf32_le", "--rate", repr(rate))
        self.assertAlmostEqual(result["signal"]["carrier_offset_hz"], offset, delta=0.001)
        self.assertAlmostEqual(result["signal"]["tone_hz"], tone, delta=0.001)
        log = result["result"]["log"]
        self.assertGreater(len(log["time_s"]), 38)
        for level in log["carrier_dbfs"]:
            self.assertAlmostEqual(level, carrier_dbfs, delta=ALLOWED_CLEAN_DB)
        for level in log["tone_dbfs"]:
            self.assertAlmostEqual(level, carrier_dbfs + 20 * math.log10(depth), delta=ALLOWED_CLEAN_DB)

    def test_at_three_places_in_the_band(self):
        for seed in range(1, 5):
            for place in ("low", "middle", "high"):
                with self.subTest(seed=seed, place=place):
                    self.check(100 * seed + len(place), place)


class MovingCarrier(ProgramTest):
    """5 Hz a minute of drift, a wobble of ±0.5 Hz in 60 s; then with noise, a late start and a fade."""

    RATE, OFFSET, TONE, DEPTH, CARRIER_DBFS = 24_013.0, 4_321.7, 517.3, 0.57, -14.2

    def signal(self, seconds, amplitude=None, noise_dbfs_hz=None, seed=7):
        t = numpy.arange(int(seconds * self.RATE)) / self.RATE
        wobble = 0.5 * 60 / (2 * numpy.pi) * numpy.sin(2 * numpy.pi * t / 60)  # turns, of 0.5 cos(..) Hz
        turns = self.OFFSET * t + 0.5 * (5 / 60) * t * t + wobble
        z = 10 ** (self.CARRIER_DBFS / 20) * (1 + self.DEPTH * numpy.cos(2 * numpy.pi * self.TONE * t)) * \
            numpy.exp(2j * numpy.pi * turns)
        if amplitude is not None:
            z = z * amplitude(t)
        if noise_dbfs_hz is not None:
            generator = numpy.random.Generator(numpy.random.PCG64(seed))
            sigma = math.sqrt(10 ** (noise_dbfs_hz / 10) * self.RATE / 2)
            z = z + generator.normal(0, sigma, len(z)) + 1j * generator.normal(0, sigma, len(z))
        return write_cf32(self.folder / "moving.cf32", z)

    def levels(self, path):
        return run_json("levels", path, "--format", "cf32_le", "--rate", repr(self.RATE))

    def test_drift_and_wobble_leave_levels_exact(self):
        log = self.levels(self.signal(65.0))["result"]["log"]
        for level in log["carrier_dbfs"]:
            self.assertAlmostEqual(level, self.CARRIER_DBFS, delta=ALLOWED_CLEAN_DB)
        for level in log["tone_dbfs"]:
            self.assertAlmostEqual(level, self.CARRIER_DBFS + 20 * math.log10(self.DEPTH),
                                   delta=ALLOWED_CLEAN_DB)

    def coverage(self, log, key, truth_db, usable):
        inside = total = 0
        for k, time_s in enumerate(log["time_s"]):
            if k % 2 or not usable(time_s):
                continue
            low, high, truth = log[key + "_low95"][k], log[key + "_high95"][k], truth_db(time_s)
            inside += (low is None or low <= truth) and truth <= high
            total += 1
        return inside / total

    def test_a_start_below_the_noise_and_a_long_fade_hold_their_intervals(self):
        def amplitude(t):
            late = numpy.where(t < 15.0, 10 ** (-75 / 20), 1.0)
            fade = 10 ** (-70 / 20 * numpy.clip(1.0 - numpy.abs(t - 40.0) / 7.5, 0.0, 1.0))
            return late * fade

        def truth_db(time_s):
            return self.CARRIER_DBFS + 20 * math.log10(float(amplitude(numpy.array([time_s]))[0]))

        result = self.levels(self.signal(60.0, amplitude, noise_dbfs_hz=-75.0))
        self.assertIn("late-carrier", notes(result))
        log = result["result"]["log"]
        steady = lambda time_s: time_s < 14.7 or 15.3 < time_s < 32.0 or time_s > 48.0
        self.assertGreater(self.coverage(log, "carrier_dbfs", truth_db, steady), 0.93)
        self.assertGreater(self.coverage(log, "tone_dbfs", lambda x: truth_db(x) + 20 * math.log10(self.DEPTH),
                                         steady), 0.93)
        # In the middle of the fade nothing is detected, and the bound lies above the truth.
        middle = [k for k, time_s in enumerate(log["time_s"]) if 38.0 < time_s < 42.0]
        self.assertTrue(all(log["carrier_dbfs"][k] is None for k in middle))
        self.assertTrue(all(log["carrier_dbfs_high95"][k] > truth_db(log["time_s"][k]) for k in middle))


if __name__ == "__main__":
    unittest.main()
