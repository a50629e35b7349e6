# SPDX-License-Identifier: GPL-3.0-or-later
"""SIGINT and SIGTERM: what was measured is written as if the recording ended there; a second one leaves at once."""
import json
import os
import pathlib
import re
import select
import signal
import subprocess
import time
import unittest

import numpy

from program import PROGRAM, ProgramTest, am, notes, run, run_json, write_cf32

RATE = 48_000.0
KNOWN = ("--format", "cf32_le", "--rate", "48k")
STATUS = {signal.SIGINT: 130, signal.SIGTERM: 143}
STOPPED = "tonewalk: stopped before there was anything to write\n"
SCENE = """[recording]
rate_hz = 48000.0
duration_s = {seconds}
[[carrier]]
offset_hz = 7312.5
"""


def without_names(result):
    """A result without what the promise leaves out for a partial one: name, command, `partial`."""
    result = json.loads(json.dumps(result))
    del result["command"], result["recording"]["name"], result["recording"]["partial"]
    result["notes"] = [note for note in result["notes"] if note["code"] != "partial"]
    return result


class Stopping(ProgramTest):
    def setUp(self):
        super().setUp()
        noise = numpy.random.Generator(numpy.random.PCG64(20260818)).normal(0.0, 1e-4, (int(3 * RATE), 2))
        self.samples = (am(3.0, RATE, 7312.34, -20.0, 1013.7, 0.3) + noise[:, 0] + 1j * noise[:, 1]).astype("<c8")
        self.recording = write_cf32(self.folder / "r.cf32", self.samples)

    def start(self, *words, **options):
        options = {"stdin": subprocess.PIPE, **options}
        child = subprocess.Popen([PROGRAM, *map(str, words)], stdout=subprocess.PIPE, stderr=subprocess.PIPE,
                                 cwd=self.folder, **options)
        self.addCleanup(self.end, child)
        return child

    @staticmethod
    def end(child):
        child.kill()
        child.wait()
        for stream in (child.stdin, child.stdout, child.stderr):
            if stream:
                stream.close()

    def feed(self, child, samples):
        """All of them are read when this returns: the pipe is empty, the program waits for more."""
        child.stdin.write(samples.tobytes())
        child.stdin.flush()
        self.settle(child)

    def settle(self, child):
        """Waits until the program sleeps: it takes no processor time for a while."""
        def ticks():
            fields = pathlib.Path(f"/proc/{child.pid}/stat").read_text().rsplit(")", 1)[1].split()
            return int(fields[11]) + int(fields[12])

        end = time.monotonic() + 60.0
        before = -1
        while time.monotonic() < end:
            now = ticks()
            if now == before:
                return
            before = now
            time.sleep(0.4)
        raise AssertionError("it never rests")

    def stop(self, child, number=signal.SIGINT, within=10.0):
        """Sends a signal; returns (standard output, standard error) of a program that ends in time with its status."""
        child.send_signal(number)
        return self.ended(child, STATUS[number], within)

    def ended(self, child, status, within=10.0):
        try:
            child.wait(within)
        except subprocess.TimeoutExpired:
            raise AssertionError(f"still there {within} s later") from None
        out, err = child.stdout.read().decode(), child.stderr.read().decode()
        self.assertEqual(child.returncode, status, err)
        return out, err

    def left_behind(self, *allowed):
        return {path.name for path in self.folder.iterdir()} - {"r.cf32", "s.toml", *allowed}

    def writers(self):
        yield "levels", ["levels", "-", *KNOWN, "--json", "out.json", "--csv", "out.csv", "--force"]
        yield "hear", ["hear", "-", *KNOWN, "-o", "out.wav", "--json", "out.json", "--force"]
        yield "look", ["look", "-", *KNOWN, "--json", "out.json", "--force"]

    def cut_result(self, job, samples, *more):
        """JSON of the recording cut at so many samples, given on a pipe too."""
        words = [job, "-", *KNOWN, "--json", "-", *more] + (["-o", "cut.wav", "--force"] if job == "hear" else [])
        return json.loads(run(*words, cwd=self.folder, input=self.recording.read_bytes()[:8 * samples]).out)


class Pipes(Stopping):
    def test_before_the_first_sample_nothing_is_written(self):
        for _, words in self.writers():
            for number in STATUS:
                with self.subTest(words=words, number=number):
                    child = self.start(*words)
                    self.settle(child)
                    out, err = self.stop(child, number)
                    self.assertEqual((out, err), ("", STOPPED))
                    self.assertEqual(self.left_behind(), set())

    def test_with_less_than_a_record_nothing_is_written(self):
        for job, words in self.writers():
            if job != "look":
                with self.subTest(words=words):
                    child = self.start(*words)
                    self.feed(child, self.samples[:int(0.15 * RATE)])
                    out, err = self.stop(child)
                    self.assertEqual((out, err), ("", STOPPED))
                    self.assertEqual(self.left_behind(), set())

    def partial(self, job, words, samples, number):
        """Stops a job that has read so many samples; its JSON, and what a recording cut there gives."""
        child = self.start(*words)
        self.feed(child, self.samples[:samples])
        self.stop(child, number)
        partial = json.loads((self.folder / "out.json").read_text())
        self.assertTrue(partial["recording"]["partial"])
        self.assertIn("partial", notes(partial))
        return partial, self.cut_result(job, partial["recording"]["samples"])

    def test_in_the_opening_the_result_is_that_of_the_recording_cut_there(self):
        for (job, words), number in zip(self.writers(), (*STATUS, signal.SIGINT)):
            with self.subTest(job=job):
                samples = int(1.3 * RATE) + 17
                partial, cut = self.partial(job, words, samples, number)
                self.assertEqual(partial["recording"]["samples"], samples)
                self.assertEqual(without_names(partial), without_names(cut))
        self.assertEqual((self.folder / "out.wav").read_bytes(), (self.folder / "cut.wav").read_bytes())
        rows = (self.folder / "out.csv").read_text().splitlines()
        self.assertGreater(len(rows), 5)

    def test_after_the_opening_too(self):
        for (job, words), number in zip(self.writers(), (*STATUS, signal.SIGINT)):
            with self.subTest(job=job):
                partial, cut = self.partial(job, words, int(2.9 * RATE) + 5, number)
                self.assertGreaterEqual(partial["recording"]["samples"], int(2 * RATE))
                self.assertEqual(without_names(partial), without_names(cut))
        self.assertEqual((self.folder / "out.wav").read_bytes(), (self.folder / "cut.wav").read_bytes())

    def test_a_fifo_that_nobody_writes_to(self):
        os.mkfifo(self.folder / "idle")
        child = self.start("levels", "idle", *KNOWN, "--json", "a.json", stdin=subprocess.DEVNULL)
        self.settle(child)
        self.stop(child)
        self.assertEqual(self.left_behind("idle"), set())


class LongRecordings(Stopping):
    def test_in_the_middle_of_a_gigabyte(self):
        rate, seconds, blocks = 2.4e6, 2.0, 52
        t = numpy.arange(int(rate * seconds)) / rate
        noise = numpy.random.Generator(numpy.random.PCG64(18082026)).normal(0.0, 3e-3, (t.size, 2))
        fade = 10.0 ** ((-20.0 - 6.0 * numpy.cos(numpy.pi * t)) / 20.0)  # whole turns in a block: no seam
        z = fade * (1.0 + 0.5 * numpy.cos(2e3 * numpy.pi * t)) * numpy.exp(2j * numpy.pi * 3e5 * t)
        codes = numpy.rint(32767.0 * (numpy.stack([z.real, z.imag], 1) + noise))
        block = codes.astype("<i2").tobytes()
        path = self.folder / "big.ci16"
        with open(path, "wb") as file:
            for _ in range(blocks):
                file.write(block)
        self.assertGreater(path.stat().st_size, 0.95e9)
        known = ("levels", "big.ci16", "--format", "ci16_le", "--rate", "2.4M", "--curves", "none")
        child = self.start(*known, "--json", "cut.json", "--csv", "cut.csv", stdin=subprocess.DEVNULL)
        self.wait_until_read(child, 0.3e9)
        self.stop(child)
        partial = json.loads((self.folder / "cut.json").read_text())
        whole = run_json(*known, cwd=self.folder)
        samples = partial["recording"]["samples"]
        self.assertTrue(partial["recording"]["partial"])
        self.assertTrue(15.0 * rate < samples < seconds * blocks * rate, samples)
        self.same_but_near_the_cut(partial["result"]["log"], whole["result"]["log"], samples / rate - 10.0)
        os.truncate(path, 4 * samples)
        self.assertEqual(without_names(run_json(*known, cwd=self.folder)), without_names(partial))

    def wait_until_read(self, child, size):
        """The program has taken in so many bytes."""
        end = time.monotonic() + 60.0
        while int(re.search(r"rchar: (\d+)", pathlib.Path(f"/proc/{child.pid}/io").read_text()).group(1)) < size:
            self.assertLess(time.monotonic(), end)
            time.sleep(0.002)

    def same_but_near_the_cut(self, part, whole, until_s):
        compared = 0
        for key in ("carrier_dbfs", "tone_dbfs", "depth_percent"):
            for k, time_s in enumerate(part["time_s"]):
                if time_s < until_s:
                    compared += 1
                    self.assertEqual(time_s, whole["time_s"][k])
                    apart = abs(part[key][k] - whole[key][k])
                    self.assertLessEqual(apart, 0.01 * whole[key + "_u95"][k], (key, time_s))
        self.assertGreater(compared, 100)

    def endless(self):
        """A device without an end, and a carrier given, so that it is measured all the same."""
        return ("/dev/zero", "--format", "ci16_le", "--rate", "2.4M", "--carrier", "+120k", "--tone", "1k")

    def test_a_device_without_end_is_measured_until_it_is_stopped(self):
        child = self.start("levels", *self.endless(), "--json", "a.json", stdin=subprocess.DEVNULL)
        self.wait_until_read(child, 100e6)
        self.stop(child, signal.SIGTERM)
        self.assertTrue(json.loads((self.folder / "a.json").read_text())["recording"]["partial"])

    def test_a_check_of_the_hash_ends_at_once(self):
        with open(self.folder / "big.ci16", "wb") as file:
            file.truncate(40 << 30)
        child = self.start("levels", "big.ci16", "--format", "ci16_le", "--rate", "2.4M", "--verify",
                           "--json", "a.json", stdin=subprocess.DEVNULL)
        time.sleep(0.5)
        out, err = self.stop(child)
        self.assertEqual((out, err), ("", STOPPED))
        self.assertEqual(self.left_behind("big.ci16"), set())


class WhileWriting(Stopping):
    """The outputs go to a FIFO whose reader waits."""

    MANY = ("--every", "2ms")  # more than a pipe holds

    def blocked(self, *words):
        """A job that has measured and cannot go on writing; and the reader's descriptor."""
        os.mkfifo(self.folder / "fifo")
        child = self.start(*words, stdin=subprocess.DEVNULL)
        reader = os.open(self.folder / "fifo", os.O_RDONLY)
        select.select([reader], [], [], 60)
        self.settle(child)
        return child, reader

    def test_one_signal_lets_it_end_whole_when_the_reader_goes_on(self):
        child, reader = self.blocked("levels", "r.cf32", *KNOWN, *self.MANY, "--csv", "fifo", "--json", "a.json")
        child.send_signal(signal.SIGINT)
        time.sleep(0.3)
        with os.fdopen(reader, "rb") as file:
            rows = file.read().decode().splitlines()
        self.ended(child, 0)  # it was measured to its end
        result = json.loads((self.folder / "a.json").read_text())
        self.assertFalse(result["recording"]["partial"])
        self.assertEqual(len(rows) - 1, len(result["result"]["log"]["time_s"]))

    def test_a_second_signal_leaves_at_once_and_takes_temporaries_away(self):
        for job, words in (("levels", ["levels", "r.cf32", *KNOWN, *self.MANY, "--csv", "fifo", "--json", "a.json"]),
                           ("look", ["look", "r.cf32", *KNOWN, "--json", "fifo"])):
            with self.subTest(job=job):
                if job == "look":
                    os.unlink(self.folder / "fifo")
                child, reader = self.blocked(*words)
                child.send_signal(signal.SIGINT)
                time.sleep(0.3)
                if child.poll() is None:  # else all of it fitted into the pipe
                    self.stop(child, signal.SIGTERM, within=3.0)
                os.close(reader)
                self.assertEqual(self.left_behind("fifo"), set())

    def test_an_output_that_waits_for_its_reader_ends_at_the_first_signal(self):
        os.mkfifo(self.folder / "fifo")
        os.mkfifo(self.folder / "fifo.wav")
        for words in (["levels", "r.cf32", *KNOWN, "--json", "a.json", "--csv", "fifo"],
                      ["hear", "r.cf32", *KNOWN, "-o", "fifo.wav"]):
            with self.subTest(words=words):
                child = self.start(*words, stdin=subprocess.DEVNULL)
                self.settle(child)
                self.stop(child, within=3.0)
                self.assertEqual(self.left_behind("fifo", "fifo.wav"), set())


class Twice(Stopping):
    def test_two_signals_in_a_row_leave_nothing(self):
        (self.folder / "s.toml").write_text(SCENE.format(seconds=3600.0))
        with open(self.folder / "big", "wb") as file:
            file.truncate(30 << 30)
        big = ("big", "--format", "ci16_le", "--rate", "2.4M", "--carrier", "+120k", "--tone", "1k")
        for words in (["levels", *big, "--json", "a.json", "--csv", "a.csv"],
                      ["hear", *big, "-o", "a.wav", "--json", "a.json"], ["make", "s.toml", "-o", "made"]):
            with self.subTest(words=words):
                child = self.start(*words, stdin=subprocess.DEVNULL)
                time.sleep(1.0)
                child.send_signal(signal.SIGSTOP)  # so that both are there when it goes on
                child.send_signal(signal.SIGINT)
                child.send_signal(signal.SIGTERM)
                child.send_signal(signal.SIGCONT)
                child.wait(5.0)
                self.assertIn(child.returncode, STATUS.values())
                self.assertEqual(self.left_behind("big"), set())


class Make(Stopping):
    def test_it_stops_and_leaves_nothing(self):
        (self.folder / "s.toml").write_text(SCENE.format(seconds=3600.0))
        for number in STATUS:
            child = self.start("make", "s.toml", "-o", "made", stdin=subprocess.DEVNULL)
            time.sleep(0.7)
            out, err = self.stop(child, number)
            self.assertEqual((out, err), ("", STOPPED))
            self.assertEqual(self.left_behind(), set())


if __name__ == "__main__":
    unittest.main()
