# SPDX-License-Identifier: GPL-3.0-or-later
"""What a user may expect of any good command: streams, files, terminals, locales, names."""
import gzip
import json
import os
import pathlib
import re
import shutil
import signal
import stat
import subprocess
import threading
import time
import unittest

from program import PROGRAM, ProgramTest, am, run, write_cf32
from shells import Terminal, jobs, need, options

RATE = 48_000.0
KNOWN = ("--format", "cf32_le", "--rate", "48k")
SCENE = """[recording]
rate_hz = 48000.0
duration_s = 1.0
[[carrier]]
offset_hz = 7312.5
"""


class Manners(ProgramTest):
    def setUp(self):
        super().setUp()
        self.recording = write_cf32(self.folder / "r.cf32", am(1.0, RATE, 7312.34, -20.0, 1013.7, 0.3))
        (self.folder / "s.toml").write_text(SCENE)
        self.folder.chmod(0o755)

    def typed(self, job, *more):
        """A command line of a job that succeeds in the test's folder."""
        if job == "make":
            return ["make", "s.toml", "-o", "made", "--force", *more]
        return [job, "r.cf32", *KNOWN, *(["-o", "a.wav", "--force"] if job == "hear" else []), *more]

    def do(self, *words, status=0, **options):
        return run(*words, status=status, cwd=self.folder, **options)

    def complaint(self, status, *words, **options):
        done = self.do(*words, status=status, stdin=subprocess.DEVNULL, **options)
        self.assertEqual(done.out, "")
        self.assertRegex(done.err, r"\Atonewalk: [^\n]+; [^\n]+\n\Z")
        return done.err


class Values(Manners):
    def test_an_empty_value_is_no_value(self):
        for job in jobs():
            for option, form in options(job).items():
                if form:
                    with self.subTest(job=job, option=option):
                        words = [word for word in self.typed(job) if word != "--force"]
                        if option in words:
                            words = words[:words.index(option)] + words[words.index(option) + 2:]
                        line = self.complaint(2, *words, f"{option}=" if option.startswith("--") else option, *(
                            [] if option.startswith("--") else [""]))
                        self.assertIn(option if option.startswith("--") else "--output", line)
                        if option.startswith("--"):
                            self.assertIn(option, self.complaint(2, *words, option, ""))
        for job in jobs():
            self.complaint(2, job, "")
        self.complaint(2, "")

    def test_every_option_has_a_near_name(self):
        for job in jobs():
            for option in options(job):
                if option.startswith("--") and len(option) > 5:
                    wrong = option[:-1] + ("x" if option[-1] != "x" else "z")
                    line = self.complaint(2, *self.typed(job), wrong)
                    self.assertIn(f"{wrong}: unknown option; did you mean --", line)

    def test_values_are_told_as_typed(self):
        for words, told in ((["levels", "--window", "1ms"], "--window 1ms: "),
                            (["levels", "--window", "1.5s"], "--window 1.5s: "),
                            (["levels", "--width", "90k"], "--width 90k: "),
                            (["levels", "--carrier", "+30k"], "--carrier +30k: "),
                            (["levels", "--tone", "23.9k"], "--tone 23.9k: "),
                            (["hear", "-o", "a.wav", "--band", "3k:300"], "--band 3k:300: "),
                            (["hear", "-o", "a.wav", "--band", "300:90k"], "--band 300:90k: ")):
            with self.subTest(words=words):
                done = self.do(words[0], "r.cf32", *KNOWN, *words[1:], status=None)
                self.assertIn(done.returncode, (2, 3))
                self.assertTrue(done.err.startswith("tonewalk: " + told), done.err)

    def test_a_band_is_judged_before_files_are_opened(self):
        for band in ("3k:300", "300:300", "1:3k", "300:90k", ":", "300", "a:b"):
            with self.subTest(band=band):
                self.assertIn("--band", self.complaint(2, "hear", "missing", *KNOWN, "-o", "a.wav", "--band", band))
        self.assertIn("--band", self.complaint(3, *self.typed("hear"), "--band", "300:20k", "--width", "4k"))


class Targets(Manners):
    def writers(self):
        """Command lines that write one file each, the target's name at the end."""
        yield "csv", ["levels", "r.cf32", *KNOWN, "--csv"]
        for job in jobs():
            if "--json" in options(job):
                yield "json", self.typed(job, "--json")
        yield "wav", ["hear", "r.cf32", *KNOWN, "-o"]

    def whole(self, kind, data):
        """Whether these bytes are a whole output of that kind."""
        if kind == "csv":
            return data.startswith(b"time_s,") and data.endswith(b"\n")
        if kind == "json":
            return json.loads(data)["tonewalk"]["schema"] == 1
        return data[:4] == b"RIFF" and len(data) == 8 + int.from_bytes(data[4:8], "little")

    def test_a_fifo_gets_the_whole_output(self):
        for kind, words in self.writers():
            with self.subTest(words=words):
                fifo = self.folder / f"fifo.{kind}"
                os.mkfifo(fifo)
                got = []
                reader = threading.Thread(target=lambda: got.append(fifo.read_bytes()))
                reader.start()
                self.do(*words, fifo.name)
                reader.join(10)
                self.assertTrue(self.whole(kind, got[0]))
                self.assertTrue(stat.S_ISFIFO(fifo.stat().st_mode))
                fifo.unlink()

    def test_a_fifo_whose_reader_leaves_is_quiet(self):
        os.mkfifo(self.folder / "fifo.json")
        reader = subprocess.Popen(["head", "-c", "1", self.folder / "fifo.json"], stdout=subprocess.DEVNULL)
        done = self.do("levels", "r.cf32", *KNOWN, "--every", "2ms", "--json", "fifo.json", "--csv", "a.csv")
        reader.wait()
        self.assertNotIn("tonewalk:", done.err)
        self.assertTrue(self.whole("csv", (self.folder / "a.csv").read_bytes()))

    def test_devices(self):
        for kind, words in self.writers():
            with self.subTest(words=words):
                if kind == "wav":
                    os.symlink("/dev/full", self.folder / "full.wav")
                    self.assertIn("full.wav", self.complaint(4, *words, "full.wav"))
                    os.symlink("/dev/null", self.folder / "null.wav")
                    self.do(*words, "null.wav")
                    self.assertTrue((self.folder / "null.wav").is_symlink())
                    continue
                self.do(*words, "/dev/null")
                self.assertIn("/dev/full: cannot be written (No space left on device); make room",
                              self.complaint(4, *words, "/dev/full"))
                done = self.do(*words, "/dev/stdout")
                self.assertTrue(self.whole(kind, done.stdout))
                self.assertIn("r.cf32", done.err)  # the summary went there
        self.assertTrue(stat.S_ISCHR(os.stat("/dev/null").st_mode))

    def test_standard_output_that_is_full(self):
        for words in (["--help"], ["--version"], ["--man"], ["--completion", "bash"], *map(self.typed, jobs())):
            with self.subTest(words=words), open("/dev/full", "wb") as full:
                done = subprocess.run([PROGRAM, *words], stdout=full, stderr=subprocess.PIPE, cwd=self.folder,
                                      text=True)
                self.assertEqual(done.returncode, 4, done.stderr)
                self.assertIn("standard output: cannot be written", done.stderr)

    def test_folders_links_and_what_may_not_be_written(self):
        (self.folder / "sub").mkdir()
        os.symlink("sub", self.folder / "to-sub")
        os.symlink("nowhere", self.folder / "dangling")
        (self.folder / "kept").write_text("mine")
        os.symlink("kept", self.folder / "to-kept")
        for target, told in (("sub", "is a folder"), ("to-sub", "is a folder"), ("sub/", "is a folder"),
                             (".", "is a folder"), ("no/a", "folder that does not exist; make the folder first"),
                             ("kept/a", "folder"), ("kept", "--force"), ("to-kept", "--force"), ("dangling", "--force"),
                             ("x" * 300, "File name too long")):
            with self.subTest(target=target):
                self.assertIn(told, self.complaint(4, "levels", "r.cf32", *KNOWN, "--csv", target))
        self.assertEqual((self.folder / "kept").read_text(), "mine")
        self.do("levels", "r.cf32", *KNOWN, "--csv", "to-kept", "--force")  # written where the link leads
        self.assertTrue((self.folder / "to-kept").is_symlink())
        self.assertTrue((self.folder / "kept").read_text().startswith("time_s,"))
        for base in (".", "..", "sub/", "-"):
            self.assertIn("is no base name", self.complaint(2, "make", "s.toml", "-o", base))

    def test_folders_and_files_of_others(self):
        def as_nobody():
            if os.geteuid() == 0:
                os.setgroups([])
                os.setgid(65534)
                os.setuid(65534)

        closed = self.folder / "closed"
        closed.mkdir(mode=0o555)
        probe = subprocess.run([PROGRAM, "--version"], preexec_fn=as_nobody, capture_output=True)
        if probe.returncode != 0:
            self.skipTest("another user cannot start the program here")
        for words in (["levels", "r.cf32", *KNOWN, "--csv", "closed/a.csv"],
                      ["hear", "r.cf32", *KNOWN, "-o", "closed/a.wav"], ["make", "s.toml", "-o", "closed/x"]):
            with self.subTest(words=words):
                line = self.complaint(4, *words, preexec_fn=as_nobody)
                self.assertRegex(line, r"closed/.*Permission denied.*; choose a folder in which you may write")
        self.recording.chmod(0o000)
        self.assertIn("Permission denied", self.complaint(3, "levels", "r.cf32", *KNOWN, preexec_fn=as_nobody))

    def test_nothing_replaces_without_force_and_no_temporaries_stay(self):
        for kind, words in self.writers():
            target = self.folder / f"kept.{kind}"
            target.write_text("mine")
            plain = [word for word in words if word != "--force"]
            if plain[0] != "hear" or kind == "wav":
                self.assertIn("exists already; choose another name or add --force",
                              self.complaint(4, *plain, target.name))
                self.assertEqual(target.read_text(), "mine")
            self.do(*plain, target.name, "--force")
            self.assertTrue(self.whole(kind, target.read_bytes()))
        self.assertEqual([path.name for path in self.folder.iterdir() if path.name.startswith(".")], [])

    def test_closed_standard_streams_reach_no_file(self):
        shell = '"$0" "$@" --force <&- >&- 2>&-'
        for kind, words in self.writers():
            with self.subTest(words=words):
                plain = [word for word in words if word != "--force"]
                target = self.folder / f"out.{kind}"
                subprocess.run(["bash", "-c", shell, PROGRAM, *plain, target.name], cwd=self.folder, check=True)
                self.assertTrue(self.whole(kind, target.read_bytes()))
        self.assertEqual(self.recording.stat().st_size, 8 * int(RATE))


class Streams(Manners):
    def test_a_reader_that_leaves_is_quiet(self):
        for words in (["--help"], ["--man"], ["--version", "--licences"], ["--completion", "zsh"],
                      *([job, "--help"] for job in jobs()), *map(self.typed, jobs()),
                      self.typed("levels", "--every", "2ms", "--json", "-"),
                      self.typed("levels", "--every", "2ms", "--csv", "-")):
            for reader in ("head -1 >/dev/null", "true"):
                with self.subTest(words=words, reader=reader):
                    script = f'"$0" "$@" | {reader}; exit "${{PIPESTATUS[0]}}"'
                    done = subprocess.run(["bash", "-c", script, PROGRAM, *words], cwd=self.folder,
                                          capture_output=True, text=True)
                    self.assertEqual(done.returncode, 0, done.stderr)
                    self.assertNotIn("tonewalk:", done.stderr)

    def test_results_and_talk_do_not_mix(self):
        for job in ("levels", "look", "hear"):
            json.loads(self.do(*self.typed(job, "--json", "-")).out)
        rows = self.do(*self.typed("levels", "--csv", "-")).out.splitlines()
        self.assertTrue(all(row.count(",") > 10 for row in rows))

    def test_quiet(self):
        for job in jobs():
            with self.subTest(job=job):
                loud, quiet = self.do(*self.typed(job)), self.do(*self.typed(job, "--quiet"))
                self.assertEqual(quiet.err, "")
                if job != "make":
                    self.assertIn("centre-unknown", loud.err)
                    self.assertEqual(quiet.out, loud.out)
        self.assertRegex(self.do("levels", "no", "--quiet", *KNOWN, status=3).err, r"^tonewalk: no: ")


class Screens(Manners):
    ESCAPES = re.compile(r"\x1b\[[0-9;]*[A-Za-z]")

    def screen(self, *words, **options):
        terminal = Terminal(*words, cwd=self.folder, **options)
        self.assertEqual(terminal.finish(), 0)
        return terminal.seen.replace("\r\n", "\n")

    def test_colour_only_on_a_terminal_that_wants_it(self):
        for job in ("levels", "look", "hear"):
            with self.subTest(job=job):
                words = self.typed(job)
                self.assertRegex(self.screen(*words), self.ESCAPES)
                for environment in ({"NO_COLOR": "1"}, {"TERM": "dumb"}):
                    self.assertNotRegex(self.screen(*words, environment=environment), r"\x1b\[[0-9;]*m")
                self.assertRegex(self.screen(*words, environment={"NO_COLOR": ""}), r"\x1b\[[0-9;]*m")
                piped = self.do(*words)
                self.assertNotIn("\x1b", piped.out + piped.err)
                self.assertNotIn("\x1b", self.screen(*words, "--json", "-", stderr=subprocess.DEVNULL))

    def test_narrow_and_wide(self):
        for job in ("levels", "look", "hear"):
            for columns in (1, 40, 79, 300):
                with self.subTest(job=job, columns=columns):
                    text = self.ESCAPES.sub("", self.screen(*self.typed(job), columns=columns))
                    self.assertLessEqual(max(map(len, text.splitlines())), max(40, columns))
                    self.assertIn("7.31", text)


class Progress(Manners):
    def big(self, seconds):
        """A raw file that takes a while: zeros that are not stored."""
        path = self.folder / "big.ci16"
        with open(path, "wb") as file:
            file.truncate(int(seconds) * 4 * 2_400_000)
        return ("big.ci16", "--format", "ci16_le", "--rate", "2.4M", "--carrier", "+120k", "--tone", "1k",
                "--threads", "1")

    def stopped(self, terminal, pattern):
        terminal.watch(pattern)
        return terminal.finish(signal.SIGINT)

    def test_on_a_terminal_share_rate_and_time_left(self):
        pattern = r"\r *\d+ %, [\d.]+ s measured, [\d.]+ million samples a second, [\d a-z]+ left\x1b\[K"
        for words in (("levels", *self.big(4000)), ("hear", *self.big(4000), "-o", "a.wav")):
            with self.subTest(words=words[0]):
                terminal = Terminal(*words, cwd=self.folder)
                self.assertEqual(self.stopped(terminal, pattern), 130)
                self.assertIn("\r\x1b[K", terminal.seen)  # wiped before the result
                self.assertIn("stopped before the recording's end", " ".join(terminal.seen.split()))
        (self.folder / "s.toml").write_text(SCENE.replace("duration_s = 1.0", "duration_s = 3600.0"))
        making = Terminal("make", "s.toml", "-o", "long", cwd=self.folder)
        self.assertEqual(self.stopped(making, r"\d+ %, .* left"), 130)

    def slow_pipe(self):
        """The reading end of a pipe that brings 8 s of signal within 4 s."""
        read_end, write_end = os.pipe()
        data = self.recording.read_bytes()

        def feed():
            with os.fdopen(write_end, "wb") as pipe:
                for _ in range(8):
                    pipe.write(data)
                    pipe.flush()
                    time.sleep(0.5)

        feeder = threading.Thread(target=feed)
        feeder.start()
        self.addCleanup(feeder.join)
        self.addCleanup(os.close, read_end)
        return read_end

    def test_a_pipe_of_unknown_length_tells_rate_and_no_end(self):
        terminal = Terminal("levels", "-", *KNOWN, stdin=self.slow_pipe(), cwd=self.folder)
        terminal.watch(r"\r[\d.]+ s measured, [\d.]+ million samples a second\x1b\[K")
        self.assertEqual(terminal.finish(), 0)
        self.assertNotIn("left", terminal.seen)

    def test_never_elsewhere_unless_asked(self):
        def piped(*more):
            return subprocess.Popen([PROGRAM, "levels", "-", *KNOWN, *more], cwd=self.folder, text=True,
                                    stdin=self.slow_pipe(), stdout=subprocess.DEVNULL, stderr=subprocess.PIPE)

        plain, asked, asked_quiet = piped(), piped("--progress", "always"), piped("--progress", "always", "--quiet")
        on_terminal = [Terminal("levels", "-", *KNOWN, *more, stdin=self.slow_pipe(), cwd=self.folder)
                       for more in (["--progress", "never"], ["--quiet"])]
        for terminal in on_terminal:
            self.assertEqual(terminal.finish(), 0)
            self.assertNotIn("million samples", terminal.seen)
        told = [child.communicate(timeout=60)[1] for child in (plain, asked, asked_quiet)]
        self.assertNotIn("million samples", told[0] + told[2])
        self.assertRegex(told[1], r"(?m)^[\d.]+ s measured, [\d.]+ million samples a second$")
        self.assertNotRegex(told[1], r"[\r\x1b]")


class Locales(Manners):
    NAMES = ("de_DE.UTF-8", "tr_TR.UTF-8", "fr_FR.UTF-8")

    def build(self):
        """These locales in a folder of the test's own."""
        need("localedef")
        source = pathlib.Path("/usr/share/i18n")
        if not (source / "locales/tr_TR").exists() or not (source / "charmaps/UTF-8.gz").exists():
            need("the locales package")
        folder = self.folder / "locales"
        folder.mkdir()
        charmap = self.folder / "UTF-8"
        charmap.write_bytes(gzip.decompress((source / "charmaps/UTF-8.gz").read_bytes()))
        for name in self.NAMES:
            subprocess.run(["localedef", "--no-archive", "-i", name.split(".")[0], "-f", charmap, folder / name],
                           capture_output=True, check=False)  # warnings make it return 1
            self.assertTrue((folder / name / "LC_NUMERIC").exists(), name)
        return folder

    def outputs(self, environment):
        for name in ("out.csv", "out.json", "out.wav", "made.truth.json", "made.sigmf-meta", "made.sigmf-data"):
            (self.folder / name).unlink(missing_ok=True)
        plain = {key: value for key, value in os.environ.items()
                 if key not in ("LANG", "LANGUAGE", "TZ") and key[:3] != "LC_"}
        environment = {**plain, **environment}
        texts = [self.do(*words, env=environment, status=None) for words in
                 (self.typed("levels", "--start-utc", "2026-03-29T01:30:00Z", "--csv", "out.csv", "--json", "out.json"),
                  ["hear", "r.cf32", *KNOWN, "-o", "out.wav", "--gain", "1.5"], self.typed("look"), self.typed("make"),
                  ["levels", "r.cf32", *KNOWN, "--window", "0,2"], ["levels", "I.cf32", *KNOWN], ["LEVELS"], ["--man"])]
        files = [(self.folder / name).read_bytes() for name in ("out.csv", "out.json", "out.wav", "made.truth.json",
                                                                "made.sigmf-meta", "made.sigmf-data")]
        return [(text.returncode, text.out, text.err) for text in texts], files

    def test_every_locale_and_zone_gives_the_same_bytes(self):
        folder = self.build()
        works = subprocess.run(["locale", "decimal_point"], capture_output=True, text=True,
                               env={**os.environ, "LOCPATH": str(folder), "LC_ALL": "de_DE.UTF-8"})
        self.assertEqual(works.stdout, ",\n")  # else the test would prove nothing
        reference = self.outputs({"LC_ALL": "C", "TZ": "UTC"})
        locales = [{"LC_ALL": name, "LOCPATH": str(folder)} for name in self.NAMES]
        zones = [{"TZ": zone} for zone in ("Asia/Kolkata", "America/St_Johns", "nonsense")]
        for environment in ({"LC_ALL": "POSIX"}, {}, *locales, {"LC_ALL": "no_SUCH.locale"}, *zones):
            with self.subTest(environment=environment):
                self.assertEqual(self.outputs(environment), reference)


class Names(Manners):
    def test_names_that_are_no_utf8(self):
        odd = os.fsencode(self.folder) + b"/r\xff\xfe.cf32"
        shutil.copyfile(os.fsencode(self.recording), odd)
        target = os.fsencode(self.folder) + b"/o\xe9.json"
        known = [*map(str.encode, KNOWN)]
        done = subprocess.run([PROGRAM, b"levels", odd, *known, b"--json", target], capture_output=True)
        self.assertEqual(done.returncode, 0, done.stderr)
        with open(target, "rb") as file:
            result = json.loads(file.read().decode("utf-8"))
        self.assertIn("\ufffd", result["recording"]["name"])
        done.stdout.decode("utf-8")
        for words in ([b"levels", odd + b"x", *known], [b"levels", odd], [b"make", odd, b"-o", b"x"],
                      [b"l\xffvels"], [b"levels", b"--csv\xff"], [b"levels", odd, *known, b"--tone", b"\xff"],
                      [b"levels", odd, *known, b"--json", target]):
            with self.subTest(words=words):
                done = subprocess.run([PROGRAM, *words], capture_output=True, cwd=self.folder)
                self.assertIn(done.returncode, (2, 3, 4))
                self.assertRegex(done.stderr.decode("utf-8"), r"\Atonewalk: [^\n]+\n\Z")

    def test_names_with_control_characters_stay_on_one_line(self):
        for name in ("a\nb.cf32", "a\x1b[31mb.cf32", "a\rb"):
            line = self.complaint(3, "levels", name, *KNOWN)
            self.assertNotRegex(line[:-1], r"[\x00-\x1f\x7f]")
            line = self.complaint(2, "levels", "r.cf32", *KNOWN, "--" + name)
            self.assertNotRegex(line[:-1], r"[\x00-\x1f\x7f]")


if __name__ == "__main__":
    unittest.main()
