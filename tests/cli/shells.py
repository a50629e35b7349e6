# SPDX-License-Identifier: GPL-3.0-or-later
"""What the tests of help, manual page, completions and manners share: option lists as help tells them, terminals."""
import fcntl
import os
import pty
import re
import select
import shutil
import signal
import struct
import subprocess
import sys
import termios
import time
import unittest

from program import PROGRAM, run


def jobs():
    """Every job, as the program's own help lists them."""
    listed = re.search(r"^Jobs:\n(.*?)\n\n", run("--help").out, re.MULTILINE | re.DOTALL).group(1)
    return re.findall(r"^  ([a-z]+) ", listed, re.MULTILINE)


def options(*job):
    """{option: form of its value, "" for a flag} of a job, or of the program itself; short names too."""
    found = {}
    for names, value in re.findall(r"^  (-[-a-z, ]*?)(?: ([a-zA-Z0-9|:]+))?(?:  .*)?$", run(*job, "--help").out,
                                   re.MULTILINE):
        found.update({name.strip(): value for name in names.split(",")})
    return found


def need(tool):
    """Skips the test loudly where a tool is missing."""
    if shutil.which(tool) is None:
        print(f"SKIPPED: {tool} is not installed", file=sys.stderr)
        raise unittest.SkipTest(f"{tool} is not installed")
    return tool


class Terminal:
    """The program on a pseudo-terminal of a given width: everything that appears there, in `seen`."""

    def __init__(self, *arguments, columns=80, stdin=subprocess.DEVNULL, environment=None, **options):
        self.master, slave = pty.openpty()
        fcntl.ioctl(slave, termios.TIOCSWINSZ, struct.pack("HHHH", 24, columns, 0, 0))
        environment = {**os.environ, "TERM": "xterm", **(environment or {})}
        options = {"stdout": slave, "stderr": slave, **options}
        self.child = subprocess.Popen([PROGRAM, *map(str, arguments)], stdin=stdin, env=environment, **options)
        os.close(slave)
        self.seen = ""

    def watch(self, until=None, timeout=60.0):
        """Reads until the pattern was seen, or to the program's end."""
        end = time.monotonic() + timeout
        while until is None or not re.search(until, self.seen):
            if time.monotonic() > end:
                raise AssertionError(f"not seen within {timeout} s: {until}\n{self.seen}")
            if not select.select([self.master], [], [], 0.1)[0]:
                continue
            try:
                part = os.read(self.master, 65536)
            except OSError:  # the other side is closed
                break
            if not part:
                break
            self.seen += part.decode("utf-8", "replace")
        return self.seen

    def finish(self, number=None):
        """Optionally sends a signal; waits for the end; returns the exit status."""
        if number is not None:
            self.child.send_signal(number)
        self.watch()
        status = self.child.wait(timeout=30)
        os.close(self.master)
        return status


INTERRUPT, TERMINATE = signal.SIGINT, signal.SIGTERM
