# SPDX-License-Identifier: GPL-3.0-or-later
"""Carrier and tone are found where they are, and what cannot be found is said: the whole program."""
import unittest

import numpy

from program import ProgramTest, am, notes, run, run_json, write_cf32

RATE = 48_000.0
KNOWN = ("--format", "cf32_le", "--rate", "48k")
CARRIER_HZ, TONE_HZ = 7_312.34, 1_013.7


def noise(samples, dbfs_hz, seed=1, rate=RATE):
    """Complex white noise of that density."""
    draw = numpy.random.Generator(numpy.random.PCG64(seed)).normal(0.0, 1.0, (samples, 2))
    return numpy.sqrt(10.0 ** (dbfs_hz / 10.0) * rate / 2.0) * (draw[:, 0] + 1j * draw[:, 1])


def station(offset_hz=CARRIER_HZ, dbfs=-20.0, tone_hz=TONE_HZ, depth=0.3, seconds=3.0, **more):
    return am(seconds, RATE, offset_hz, dbfs, tone_hz, depth, **more)


def pure(offset_hz, dbfs, seconds=3.0):
    return am(seconds, RATE, offset_hz, dbfs, 1000.0, 0.0, phase=1.1)


def syllables(seconds, seed):
    """Speech as formulas have it: gliding harmonics in syllables of 0.1 to 0.2 s; peak 1."""
    draw = numpy.random.Generator(numpy.random.PCG64(seed))
    voice = numpy.zeros(int(seconds * RATE))
    start = 0.0
    while start < seconds:
        length = draw.uniform(0.1, 0.2)
        t = numpy.arange(int(length * RATE)) / RATE
        pitch = draw.uniform(100.0, 200.0)
        turns = pitch * t + 0.5 * draw.uniform(-0.3, 0.3) * pitch / length * t * t
        part = sum(numpy.cos(2 * numpy.pi * k * turns + draw.uniform(0, 6.3)) / k for k in range(1, 16))
        first = int(start * RATE)
        part = (part * numpy.sin(numpy.pi * t / length) ** 2)[:len(voice) - first]
        voice[first:first + len(part)] += part
        start += length + draw.uniform(0.02, 0.15)
    return voice / numpy.max(numpy.abs(voice))


class Finding(ProgramTest):
    def write(self, samples, noise_dbfs_hz=-123.0):
        return write_cf32(self.folder / "r.cf32", samples + noise(len(samples), noise_dbfs_hz))

    def levels(self, samples, *arguments, noise_dbfs_hz=-123.0):
        return run_json("levels", self.write(samples, noise_dbfs_hz), *KNOWN, *arguments)

    def refused(self, samples, *arguments, status=3, noise_dbfs_hz=-123.0):
        """The one line on standard error."""
        done = run("levels", self.write(samples, noise_dbfs_hz), *KNOWN, *arguments, status=status)
        self.assertEqual(done.out, "")
        self.assertEqual(done.err.count("\n"), 1)
        return done.err

    def expect(self, result, offset_hz=CARRIER_HZ, tone_hz=TONE_HZ):
        self.assertAlmostEqual(result["signal"]["carrier_offset_hz"], offset_hz, delta=0.05)
        self.assertAlmostEqual(result["signal"]["tone_hz"], tone_hz, delta=0.05)
        self.assertEqual(result["signal"]["quantity"], "tone")

    def advice(self, result, code):
        return next(note["advice"] for note in result["notes"] if note["code"] == code)


class WhichCarrier(Finding):
    def test_stronger_pure_neighbour(self):
        result = self.levels(station() + pure(-11_021.0, -8.0))
        self.expect(result)
        self.assertIn("--carrier -11021", self.advice(result, "several-carriers"))
        self.expect(self.levels(pure(-11_021.0, -8.0) + station(-4000.0), "--carrier", "-4k"), -4000.0)

    def test_weak_neighbour_is_not_worth_a_note(self):
        self.assertNotIn("several-carriers", notes(self.levels(station() + pure(-11_021.0, -41.0))))

    def test_direct_current(self):
        self.expect(self.levels(station(dbfs=-40.0) + 0.4))
        self.assertIn("--carrier", self.refused(0.4 * numpy.ones(int(3 * RATE))))

    def test_image(self):
        samples = station()
        result = self.levels(samples + 10 ** (-25 / 20) * numpy.conj(samples))
        self.expect(result)
        self.assertNotIn("several-carriers", notes(result))

    def test_second_transmitter_4_khz_off(self):
        result = self.levels(station() + station(CARRIER_HZ + 4000.0, -24.0, tone_hz=800.0))
        self.expect(result)
        self.assertLessEqual({"several-carriers", "carrier-in-channel"}, notes(result))
        self.expect(self.levels(station() + station(CARRIER_HZ + 4000.0, -24.0, tone_hz=800.0),
                                "--carrier", "+11300"), CARRIER_HZ + 4000.0, 800.0)

    def test_carrier_at_the_centre_needs_a_tone(self):
        self.expect(self.levels(station(0.0)), 0.0)
        self.refused(pure(0.0, -20.0))

    def test_offset_carriers_beat_but_give_no_tone(self):
        result = self.levels(pure(2000.0, -20.0) + pure(4500.0, -24.0))
        self.assertIsNone(result["signal"]["tone_hz"])
        self.assertEqual(result["signal"]["quantity"], "carrier")
        self.assertLessEqual({"no-tone", "several-carriers", "carrier-in-channel"}, notes(result))
        self.assertAlmostEqual(result["signal"]["carrier_offset_hz"], 2000.0, delta=0.05)

    def test_noise_only(self):
        self.assertIn("--carrier", self.refused(numpy.zeros(int(3 * RATE)), noise_dbfs_hz=-80.0))

    def test_weak_carrier(self):
        # C/N -3 dB in 20 kHz
        result = self.levels(station(dbfs=-40.0, seconds=5.0), noise_dbfs_hz=-40.0 + 3.0 - 43.0103)
        self.assertAlmostEqual(result["signal"]["carrier_offset_hz"], CARRIER_HZ, delta=0.1)
        self.assertAlmostEqual(result["signal"]["tone_hz"], TONE_HZ, delta=0.1)

    def test_drift_wobble_and_fades(self):
        t = numpy.arange(int(10 * RATE)) / RATE
        drift = numpy.exp(2j * numpy.pi * 0.5 * (5.0 / 60.0) * t * t)
        wobble = numpy.exp(2j * numpy.pi * 1.5 / (2 * numpy.pi * 1.3) * numpy.sin(2 * numpy.pi * 1.3 * t))
        fades = 1.0 + 0.9 * numpy.exp(2j * numpy.pi * 1.7 * t)
        for name, path in {"drift": drift, "wobble": wobble, "fades": fades}.items():
            with self.subTest(name):
                result = self.levels(station(seconds=10.0) * path)
                self.assertAlmostEqual(result["signal"]["carrier_offset_hz"], CARRIER_HZ, delta=3.0)
                self.assertAlmostEqual(result["signal"]["tone_hz"], TONE_HZ, delta=0.05)


class WhichTone(Finding):
    def test_speech_has_none(self):
        for seed in range(3):
            carrier = pure(CARRIER_HZ, -20.0, seconds=5.0)
            result = self.levels(carrier * (1.0 + 0.8 * syllables(5.0, seed)))
            self.assertIn("no-steady-tone", notes(result), seed)
            self.assertIsNone(result["signal"]["tone_hz"])
            self.assertEqual(result["signal"]["quantity"], "carrier")
            self.assertTrue(all(level is None for level in result["result"]["log"]["tone_dbfs"]))
            self.assertAlmostEqual(result["signal"]["carrier_offset_hz"], CARRIER_HZ, delta=0.2)

    def test_hum_above_the_tone(self):
        hum = am(3.0, RATE, 0.0, 0.0, 100.0, 0.048)
        result = self.levels(station(depth=0.02) * hum)
        self.expect(result)
        self.expect(self.levels(pure(CARRIER_HZ, -20.0) * am(3.0, RATE, 0.0, 0.0, 100.0, 0.30)), tone_hz=100.0)

    def test_given_tone_is_taken_within_two_percent(self):
        both = station(depth=0.1) + station(depth=0.5, tone_hz=2500.0)
        self.expect(self.levels(both), tone_hz=2500.0)
        self.expect(self.levels(both, "--tone", "1k"))

    def test_tone_out_of_the_band(self):
        self.assertIn("--tone", self.refused(station(17_000.0), "--tone", "8k"))


class WhatIsSaid(Finding):
    def test_signed_and_unsigned_carriers(self):
        self.expect(self.levels(station(), "--carrier", "+7300"))
        self.assertIn("centre-unknown", notes(self.levels(station(), "--carrier", "+7300")))
        result = self.levels(station(), "--carrier", "145.2073M", "--centre", "145.2M")
        self.expect(result)
        self.assertNotIn("centre-unknown", notes(result))
        self.assertAlmostEqual(result["signal"]["carrier_hz"], 145.2e6 + CARRIER_HZ, delta=0.05)
        self.assertIn("--centre", self.refused(station(), "--carrier", "145.2073M", status=2))
        self.assertIn("--carrier", self.refused(station(), "--carrier", "+24.5k"))
        self.refused(station(), "--carrier", "145.3M", "--centre", "145.2M")

    def test_width(self):
        edge = station(21_300.0)  # 2.7 kHz below the band's end
        result = self.levels(edge)
        self.assertAlmostEqual(result["signal"]["channel_width_hz"], 5400.0, delta=0.2)
        self.assertIn("channel-narrowed", notes(result))
        self.assertNotIn("channel-narrowed", notes(self.levels(station(20_900.0))))
        self.assertNotIn("channel-narrowed", notes(self.levels(edge, "--width", "5k")))
        self.assertIn("--width 6k", self.refused(edge, "--width", "6k"))

    def test_short_opening(self):
        self.assertIn("short-opening", notes(self.levels(station(seconds=0.98))))
        self.assertNotIn("short-opening", notes(self.levels(station(seconds=1.0))))

    def test_late_carrier_in_a_file_and_on_a_pipe(self):
        samples = station(seconds=12.0)
        samples[:int(5 * RATE)] = 0.0
        path = self.write(samples)
        result = run_json("levels", path, *KNOWN)
        self.expect(result)
        self.assertIn("late-carrier", notes(result))
        piped = run("levels", "-", *KNOWN, status=3, input=path.read_bytes())
        self.assertIn("--carrier", piped.err)
        given = run_json("levels", "-", *KNOWN, "--carrier", "+7312.34", "--tone", "1013.7",
                         input=path.read_bytes())
        self.expect(given)
        self.assertNotIn("late-carrier", notes(given))

    def test_clean_recordings_have_no_notes(self):
        for offset_hz in (CARRIER_HZ, 900.0, -350.0):
            result = self.levels(station(offset_hz), "--centre", "145.2M")
            self.assertEqual(notes(result), set(), offset_hz)

    def test_the_receivers_own_lines(self):
        near = station(1200.0)
        self.assertIn("dc-in-channel", notes(self.levels(near + 10 ** (-79 / 20))))
        self.assertNotIn("dc-in-channel", notes(self.levels(near + 10 ** (-81 / 20))))
        self.assertIn("image-in-channel", notes(self.levels(near + 10 ** (-59 / 20) * numpy.conj(near))))
        self.assertNotIn("image-in-channel", notes(self.levels(near + 10 ** (-61 / 20) * numpy.conj(near))))


class RealSamples(Finding):
    def test_intermediate_frequency(self):
        samples = numpy.real(station(11_312.34)) + numpy.real(noise(int(3 * RATE), -123.0))
        path = self.folder / "if.s16"
        numpy.round(samples * 32768.0).astype("<i2").tofile(path)
        result = run_json("levels", path, "--format", "ri16_le", "--rate", "48k")
        self.expect(result, 11_312.34)
        for level in result["result"]["log"]["carrier_dbfs"]:
            self.assertAlmostEqual(level, -20.0, delta=0.01)


if __name__ == "__main__":
    unittest.main()
