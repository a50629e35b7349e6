#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Holds every include to the order of the rooms and every heavy or outside header to the rooms it may enter.

The order is the table in docs/architecture.md, the links are those of src/ROOM/CMakeLists.txt.
"""
import pathlib
import re
import tempfile
import unittest

HOUSE = pathlib.Path(__file__).resolve().parents[2]

# Which rooms may include what from outside; anything else but the standard library is refused everywhere.
FENCES = {
    r"Eigen/|eigen3/|boost/|fftw3\.h|liquid/|hwy/": {"maths"},
    r"toml\+\+/|csv\.h": {"base"},
    r"nlohmann/|sndfile\.h": {"recording", "report"},
    r"archive(_entry)?\.h|openssl/": {"recording"},
    r"CLI/": {"cli"},
    r"fmt/": {"base", "maths", "recording", "scene", "channel", "detect", "meter", "pass", "reading", "report",
              "cli"},
}
# Headers that clang 14 or GCC 12 cannot do with.
TOO_NEW = {"ranges", "format", "expected", "print"}
SYSTEM = re.compile(r"(sys/)?[a-z0-9_]+(\.h)?$")  # standard C++, C and POSIX
INCLUDE = re.compile(r'^\s*#\s*include\s*([<"])([^>"]+)[>"]', re.MULTILINE)


def rooms_in_order(house):
    table = (house / "docs/architecture.md").read_text()
    return re.findall(r"^\| `([a-z]+)` \|", table, re.MULTILINE)


def named_links(house, room):
    """The rooms that src/ROOM/CMakeLists.txt names."""
    text = (house / f"src/{room}/CMakeLists.txt").read_text()
    call = re.search(r"tonewalk_room\(\w+([^)]*)\)", text)
    words = call.group(1).split("OUTSIDE")[0].split() if call else []
    return {word for word in words if word != "ROOMS"}


def includes(path):
    return [(kind == "<", name) for kind, name in INCLUDE.findall(path.read_text())]


def outside_fault(name, room, public):
    if name in TOO_NEW:
        return f"<{name}> is too new for the compilers in use"
    for fence, allowed in FENCES.items():
        if re.match(fence, name):
            if public:
                return f"public header includes <{name}>"
            return None if room in allowed else f"<{name}> belongs in {', '.join(sorted(allowed))}"
    return None if SYSTEM.match(name) else f"<{name}> is known to no room"


def faults(house):
    order = rooms_in_order(house)
    found = []
    on_disk = {path.name for path in (house / "src").iterdir() if path.is_dir() and path.name != "cmake"}
    if on_disk != set(order):
        found.append(f"docs/architecture.md: its table and src differ by {sorted(on_disk ^ set(order))}")
    reach = {}  # room: itself and what CMake links it to, by name and through those
    for room in order:
        above = set(reach)
        links = above if room == "cli" else named_links(house, room)
        found += [f"src/{room}/CMakeLists.txt: links {each}, which is below" for each in sorted(links - above)]
        reach[room] = {room}.union(*(reach[each] for each in links & above))
        for public in (True, False):
            folder = house / ("include/tonewalk" if public else "src") / room
            for path in sorted(folder.glob("**/*.[hc]pp")):
                found += [f"{path.relative_to(house)}: {fault}"
                          for fault in faults_of(path, room, reach[room], public)]
    return found


def faults_of(path, room, may_enter, public):
    for outside, name in includes(path):
        entered = re.match(r"tonewalk/(\w+)/", name)
        if entered:
            if entered.group(1) not in may_enter:
                yield f"includes {name}, which {room} may not enter"
        elif outside:
            fault = outside_fault(name, room, public)
            if fault:
                yield fault
        elif public or ".." in name:
            yield f'"{name}" is not written as "tonewalk/ROOM/..."'


class Rooms(unittest.TestCase):
    def test_every_include_keeps_to_the_order(self):
        self.assertEqual(faults(HOUSE), [])

    def test_the_table_names_the_rooms(self):
        self.assertEqual(rooms_in_order(HOUSE)[:2], ["base", "maths"])


class RoomsCheckNotices(unittest.TestCase):
    """The check itself, on a house of two rooms."""

    def faults_with(self, path, text):
        with tempfile.TemporaryDirectory() as folder:
            house = pathlib.Path(folder)
            files = {
                "docs/architecture.md": "| `base` | x |\n| `maths` | y |\n",
                "src/base/CMakeLists.txt": "tonewalk_room(base)",
                "src/maths/CMakeLists.txt": "tonewalk_room(maths ROOMS base OUTSIDE Eigen)",
                "include/tonewalk/maths/a.hpp": '#include <vector>\n#include "tonewalk/base/b.hpp"\n',
                path: text,
            }
            for name, content in files.items():
                (house / name).parent.mkdir(parents=True, exist_ok=True)
                (house / name).write_text(content)
            return faults(house)

    def test_nothing_where_all_is_well(self):
        self.assertEqual(self.faults_with("src/maths/a.cpp", "#include <Eigen/Core>\n#include <unistd.h>\n"), [])

    def test_an_include_from_below(self):
        self.assertEqual(len(self.faults_with("src/base/b.cpp", '#include "tonewalk/maths/a.hpp"\n')), 1)

    def test_a_link_from_below(self):
        self.assertEqual(len(self.faults_with("src/base/CMakeLists.txt", "tonewalk_room(base ROOMS maths)")), 1)

    def test_an_include_past_the_links(self):
        self.assertEqual(len(self.faults_with("src/maths/CMakeLists.txt", "tonewalk_room(maths)")), 1)

    def test_a_heavy_header_outside_its_room(self):
        self.assertEqual(len(self.faults_with("src/base/b.cpp", "#include <Eigen/Core>\n")), 1)

    def test_a_library_in_a_public_header(self):
        self.assertEqual(len(self.faults_with("include/tonewalk/maths/c.hpp", "#include <Eigen/Core>\n")), 1)

    def test_an_unknown_library(self):
        self.assertEqual(len(self.faults_with("src/base/b.cpp", "#include <Strange/Thing>\n")), 1)

    def test_a_room_that_the_table_does_not_name(self):
        self.assertEqual(len(self.faults_with("src/attic/b.cpp", "")), 1)


if __name__ == "__main__":
    unittest.main()
