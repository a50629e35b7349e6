# SPDX-License-Identifier: GPL-3.0-or-later
"""Help, manual page, completions and documents tell of the same jobs and options."""
import os
import pathlib
import re
import shlex
import subprocess
import unittest

from program import ProgramTest, run
from shells import Terminal, jobs, need, options

DOCS = pathlib.Path(os.environ.get("TONEWALK_DOCS", pathlib.Path(__file__).parents[2] / "docs"))


class Help(ProgramTest):
    def pages(self):
        return [("--help",), *((job, "--help") for job in jobs())]

    def test_it_fits_a_screen_of_80_columns_and_one_of_40(self):
        self.assertLessEqual({"hear", "levels", "look", "make"}, set(jobs()))
        for page in self.pages():
            with self.subTest(page=page):
                text = run(*page).out
                self.assertLessEqual(max(map(len, text.splitlines())), 80)
                narrow = Terminal(*page, columns=40)
                self.assertEqual(narrow.finish(), 0)
                prose = narrow.seen.split("Examples:")[0].splitlines()
                self.assertLessEqual(max(len(line) for line in prose if not line.startswith("  -")), 40)
                self.assertEqual(narrow.seen.split("Examples:")[0].split(), text.split("Examples:")[0].split())
                wide = Terminal(*page, columns=300)
                self.assertEqual(wide.finish(), 0)
                self.assertEqual(wide.seen.replace("\r\n", "\n"), text)

    def test_every_page_shows_usage_and_examples_that_parse(self):
        for page in self.pages():
            with self.subTest(page=page):
                text = run(*page).out
                self.assertRegex(text, r"(?m)^Usage:\n  tonewalk ")
                examples = text.split("Examples:\n")[1].splitlines()
                self.assertGreater(len(examples), 0)
                for example in examples:
                    words = shlex.split(example.split("|")[-1].split("<")[0])
                    self.assertEqual(words[0], "tonewalk")
                    done = run(*words[1:], status=3, cwd=self.folder, stdin=subprocess.DEVNULL)
                    self.assertRegex(done.err, r"holds no samples|cannot be read")  # and no word was unknown

    def test_exit_statuses_and_no_words_of_a_library(self):
        self.assertRegex(run("--help").out, r"(?s)Exit status:\n  0 .*\n  2 .*\n  3 .*\n  4 .*\n  5 .*\n  130, 143 ")
        for page in self.pages():
            self.assertNotRegex(run(*page).out, r"TEXT|REQUIRED|Positionals|Subcommands|OPTIONS\]")

    def test_every_option_has_a_form_and_a_text(self):
        for job in jobs():
            for line in run(job, "--help").out.split("Examples:")[0].splitlines():
                if line.startswith("  -"):
                    self.assertNotRegex(line, r"\bTEXT\b|\bFLOAT\b|\bUINT\b")
            self.assertGreater(len(options(job)), 4)


class JobPages(unittest.TestCase):
    """docs/jobs/JOB.md tells of every option in a row of its own table, or in a row shared with near kin."""

    def test_every_option_has_its_row(self):
        for job in jobs():
            section = (DOCS / "jobs" / f"{job}.md").read_text().split("\n## All options\n")[1].split("\n## ")[0]
            rows = re.findall(r"^\|([^|]*`-[^|]*)\|(.*)\|$", section, re.MULTILINE)
            told = {name for names, meaning in rows if meaning.strip()
                    for name in re.findall(r"`(--?[a-z][-a-z0-9]*)", names)}
            self.assertEqual(set(options(job)) - told - {"-h", "--help"}, set(), job)
            self.assertEqual(told - set(options(job)), set(), job)


class ManualPage(unittest.TestCase):
    def rendered(self):
        need("groff")
        done = subprocess.run(["groff", "-man", "-Tutf8", "-ww", "-P-cbou"], input=run("--man").stdout,
                              capture_output=True, check=True)
        self.assertEqual(done.stderr, b"")
        return done.stdout.decode().replace("\u2010", "-").replace("\u2212", "-")

    def test_it_renders_without_a_warning_and_has_the_usual_sections(self):
        sections = re.findall(r"^([A-Z][A-Z ]+)$", self.rendered(), re.MULTILINE)
        self.assertEqual(sections, ["NAME", "SYNOPSIS", "DESCRIPTION", "OPTIONS", "JOBS", "SHARED OPTIONS",
                                    "EXIT STATUS", "ENVIRONMENT", "EXAMPLES"])

    def test_every_job_and_option_stands_in_it(self):
        page = re.sub(r"\\f[BIR]", "", run("--man").out).replace("\\-", "-")
        sections = dict(re.findall(r"^\.SS ([a-z]+)\n(.*?)(?=^\.S[SH] )", page, re.MULTILINE | re.DOTALL))
        self.assertEqual(set(sections), set(jobs()))
        shared = page.split(".SH SHARED OPTIONS")[1]
        for job in jobs():
            for option, value in options(job).items():
                if option != "-h":
                    self.assertRegex(sections[job], rf"(?<![-a-z]){option}(?![-a-z])", job)
                own = re.search(rf"^(?:-., )?{option}( |$)", sections[job], re.MULTILINE)
                if option.startswith("--") and not own:
                    self.assertRegex(shared, rf"(?m)^(?:-., )?{option}{' ' + re.escape(value) if value else ''}$")
        for option in options():
            self.assertIn(option, page)

    def test_its_lines_are_safe(self):
        known = {".TH", ".SH", ".SS", ".TP", ".B", ".I", ".br", ".PP", ".EX", ".EE"}
        for line in run("--man").out.splitlines():
            if line.startswith((".", "'")):
                self.assertIn(line.split()[0], known)


class Completions(ProgramTest):
    def setUp(self):
        super().setUp()
        (self.folder / "walk.sigmf-meta").write_text("")
        (self.folder / "two words.cf32").write_text("")

    def bash(self, *words):
        """What bash offers for the last word."""
        script = ('source "$1"; shift; COMP_WORDS=("$@"); COMP_CWORD=$(($# - 1)); _tonewalk; '
                  'printf "%s\\n" "${COMPREPLY[@]}"')
        (self.folder / "script").write_text(run("--completion", "bash").out)
        done = subprocess.run(["bash", "-uc", script, "bash", "./script", "tonewalk", *words], cwd=self.folder,
                              capture_output=True, text=True, check=True)
        self.assertEqual(done.stderr, "")
        return set(done.stdout.splitlines()) - {""}

    def test_bash_completes_jobs_and_options(self):
        self.assertEqual(self.bash(""), set(jobs()) | set(options()))
        self.assertEqual(self.bash("lev"), {"levels"})
        self.assertEqual(self.bash("--ver"), {"--version"})
        for job in jobs():
            self.assertEqual(self.bash(job, "-"), set(options(job)), job)
        self.assertEqual(self.bash("levels", "--progress", "never", "--qui"), {"--quiet"})

    def test_bash_completes_choices_files_and_nothing_else(self):
        files = {"walk.sigmf-meta", "two words.cf32", "script"}
        for job in jobs():
            for option, form in options(job).items():
                if form:
                    typed = {word for word in form.split("|") if word == word.lower()}
                    expected = files if form in ("FILE", "BASE") else typed
                    with self.subTest(job=job, option=option):
                        self.assertEqual(self.bash(job, option, ""), expected)
                        self.assertEqual(self.bash(job, option, "=", ""), expected)
        self.assertEqual(self.bash("levels", "w"), {"walk.sigmf-meta"})
        self.assertEqual(self.bash("levels", "--csv", "two"), {"two words.cf32"})
        self.assertEqual(self.bash("levels", "--progress", "=", "n"), {"never"})

    def test_the_other_shells_scripts_name_every_option(self):
        zsh, fish = run("--completion", "zsh").out, run("--completion", "fish").out
        for job in jobs():
            for option in options(job):
                self.assertRegex(zsh, rf"[ ']{option}[ ']")
                name = f"-l {option[2:]}" if option.startswith("--") else f"-s {option[1:]}"
                self.assertRegex(fish, rf"(?m)^.*seen_subcommand_from {job}' .*{name} ")

    def test_scripts_are_well_formed(self):
        for shell, check in (("bash", ["bash", "-n"]), ("zsh", ["zsh", "-n"]), ("fish", ["fish", "--no-execute"])):
            with self.subTest(shell=shell):
                need(shell)
                script = self.folder / "script"
                script.write_text(run("--completion", shell).out)
                subprocess.run([*check, script], check=True)
        self.assertIn("bash or zsh or fish", run("--completion", "tcsh", status=2).err)


if __name__ == "__main__":
    unittest.main()
