# SPDX-License-Identifier: GPL-3.0-or-later
"""Broken, short and hostile input, one table: how each is made, and what the program has to say of it.

Each case is made by hand, byte by byte, in a folder of its own. `words` are typed there; `line` is what the one line of
complaint has to match from its first letter to its last; where the program can measure all the same (status 0), it is
sought in the notes instead.
"""
import dataclasses
import gzip
import io
import json
import struct
import tarfile
import typing

import numpy

RATE = 48_000
SECONDS = 0.6


def samples(datatype="<i2"):
    """A modulated carrier at +7 kHz, interleaved I and Q."""
    t = numpy.arange(int(SECONDS * RATE)) / RATE
    z = (1.0 + 0.5 * numpy.cos(2e3 * numpy.pi * t)) * numpy.exp(14e3j * numpy.pi * t)
    pairs = numpy.stack([z.real, z.imag], 1)
    return (pairs * 0.4 * (1.0 if datatype[1] == "f" else 32767.0)).astype(datatype).tobytes()


GOOD = samples()
FRAMES = len(GOOD) // 4
NOISE = numpy.random.Generator(numpy.random.PCG64(20260818)).bytes(200_000)
RAW = "levels r.iq --format ci16_le --rate 48k"
PIPE = "levels - --format ci16_le --rate 48k"
HEAR = "hear r.iq --format ci16_le --rate 48k -o"


def metadata(remove=(), captures=None, **fields):
    """The text of a SigMF metadata file; fields are put into `global`, or changed, or taken away."""
    whole = {"core:datatype": "ci16_le", "core:sample_rate": RATE, "core:version": "1.2.5"}
    whole.update({f"core:{key}": value for key, value in fields.items()})
    for key in remove:
        del whole[f"core:{key}"]
    if captures is None:
        captures = [{"core:sample_start": 0}]
    return json.dumps({"global": whole, "captures": captures, "annotations": []})


def sigmf(text, data=GOOD):
    """r.sigmf-meta, and r.sigmf-data unless that is None."""
    def make(folder):
        (folder / "r.sigmf-meta").write_bytes(text.encode() if isinstance(text, str) else text)
        if data is not None:
            (folder / "r.sigmf-data").write_bytes(data)
    return make


def tar(*members, cut=None, form=tarfile.USTAR_FORMAT):
    """The bytes of a tar archive of (name, bytes) or ready TarInfo, optionally cut short."""
    out = io.BytesIO()
    with tarfile.open(fileobj=out, mode="w", format=form) as archive:
        for member in members:
            if isinstance(member, tarfile.TarInfo):
                archive.addfile(member)
            else:
                head = tarfile.TarInfo(member[0])
                head.size = len(member[1])
                archive.addfile(head, io.BytesIO(member[1]))
    return out.getvalue()[:cut]


def special(name, kind, target=""):
    head = tarfile.TarInfo(name)
    head.type, head.linkname = kind, target
    return head


def file(name, data):
    return lambda folder: (folder / name).write_bytes(data)


META = metadata().encode()
PAIR = (("r/r.sigmf-meta", META), ("r/r.sigmf-data", GOOD))


def lying_size(data, member, size):
    """The tar with another size in the header of the member of that number, its check sum made right."""
    data = bytearray(data)
    at = 0
    for _ in range(member):
        at += 512 + (int(data[at + 124:at + 135], 8) + 511) // 512 * 512
    data[at + 124:at + 136] = b"%011o\0" % size
    data[at + 148:at + 156] = b" " * 8
    data[at + 148:at + 156] = b"%06o\0 " % sum(data[at:at + 512])
    return bytes(data)


def with_holes():
    """The tar with data that are stored as pieces of a longer file, as GNU tar does."""
    data = bytearray(tar(*PAIR, form=tarfile.GNU_FORMAT))
    at = 1024  # of the second header: the first member takes a block
    data[at + 156:at + 157] = b"S"
    for place, number in ((386, 0), (398, len(GOOD)), (483, 10 * len(GOOD))):  # where, how long; length of the whole
        data[at + place:at + place + 12] = b"%011o\0" % number
    data[at + 148:at + 156] = b" " * 8
    data[at + 148:at + 156] = b"%06o\0 " % sum(data[at:at + 512])
    return bytes(data)


def chunk(name, content, size=None):
    return name + struct.pack("<I", len(content) if size is None else size) + content + b"\0" * (len(content) % 2)


def wav_format(tag=1, channels=2, rate=RATE, bits=16, more=b""):
    frame = channels * bits // 8
    return chunk(b"fmt ", struct.pack("<HHIIHH", tag, channels, rate, rate * frame, frame, bits) + more)


def wav(*chunks, size=None, kind=b"RIFF"):
    body = b"WAVE" + b"".join(chunks)
    return kind + struct.pack("<I", len(body) if size is None else size) + body


def aiff(channels=2, frames=FRAMES, rate=b"\x40\x0e\xbb\x80" + bytes(6), data=GOOD, offset=0):
    def big(name, content):
        return name + struct.pack(">I", len(content)) + content
    common = big(b"COMM", struct.pack(">hIh", channels, frames, 16) + rate)
    body = b"AIFF" + common + big(b"SSND", struct.pack(">II", offset, 0) + data)
    return b"FORM" + struct.pack(">I", len(body)) + body


def w64(size_of_data):
    riff = bytes.fromhex("726966662e91cf11a5d628db04c10000")
    wave, fmt, data = (word + bytes.fromhex("f3acd3118cd100c04f8edb8a") for word in (b"wave", b"fmt ", b"data"))
    head = fmt + struct.pack("<q", 40) + struct.pack("<HHIIHH", 1, 2, RATE, 4 * RATE, 4, 16)
    body = wave + head + data + struct.pack("<q", size_of_data) + GOOD
    return riff + struct.pack("<q", 24 + len(body)) + body


SCENE_HEAD = '[recording]\nformat = "ci16_le"\nrate_hz = 48000.0\nduration_s = 0.2\n'
CARRIER = "[[carrier]]\noffset_hz = 7000.0\n"


@dataclasses.dataclass
class Case:
    kind: str
    name: str
    make: typing.Callable
    line: str
    status: int
    words: str
    feed: typing.Optional[bytes] = None  # on standard input


META_WORDS, MAKE_WORDS = "levels r.sigmf-meta", "make s.toml -o made"


def of_metadata(name, text, line, data=GOOD, status=3, more=""):
    return Case("metadata", name, sigmf(text, data), line, status, f"{META_WORDS} {more}")


def of_archive(name, data, line, status=3, more=""):
    return Case("archive", name, file("r.sigmf", data), line, status, f"levels r.sigmf {more}")


def of_container(name, data, line, status=3, ending="wav", more=""):
    return Case("container", name, file(f"r.{ending}", data), line, status, f"levels r.{ending} {more}")


def of_raw(name, data, line, status=3, words=RAW):
    return Case("raw", name, file("r.iq", data), line, status, words)


def of_scene(name, text, line, head=SCENE_HEAD):
    return Case("scene", name, file("s.toml", (head + text).encode()), line, 3, MAKE_WORDS)


def of_pipe(name, data, line, status=3, words=PIPE):
    return Case("pipe", name, lambda folder: None, line, status, words, data)


def of_option(name, more, line, status=2, words=RAW):
    return Case("option", name, file("r.iq", GOOD), line, status, f"{words} {more}")


def of_output(name, more, line, status=4, make=lambda folder: None, words=RAW):
    def both(folder):
        (folder / "r.iq").write_bytes(GOOD)
        make(folder)
    return Case("output", name, both, line, status, f"{words} {more}")


def sparse_file(name, size):
    def make(folder):
        with open(folder / name, "wb") as out:
            out.truncate(size)
    return make


METADATA = [
    of_metadata("binary noise", NOISE,
        "r.sigmf-meta, byte 1: is no valid JSON; correct the text there, or copy the file again"),
    of_metadata("nested 100 000 deep", '{"global": ' + "[" * 100_000,
        "r.sigmf-meta, byte 100012: is no valid JSON; correct the text there, or copy the file again"),
    of_metadata("UTF-16", metadata().encode("utf-16"), "r.sigmf-meta: is text in UTF-16; save it as UTF-8"),
    of_metadata("a byte-order mark", b"\xef\xbb\xbf" + META, "", status=0),
    of_metadata("empty", "",
        "r.sigmf-meta, byte 1: is no valid JSON; correct the text there, or copy the file again"),
    of_metadata("a list instead of an object", "[]", "r.sigmf-meta: must be an object; correct the metadata"),
    of_metadata("no global", '{"captures": [], "annotations": []}',
        "r.sigmf-meta, global: is missing; correct the metadata"),
    of_metadata("global twice", '{"global": {}, "global": {}, "captures": [], "annotations": []}',
        'r.sigmf-meta: "global" stands twice in one object; keep one of them'),
    of_metadata("no datatype", metadata(remove=["datatype"]),
        "r.sigmf-meta, global, core:datatype: is missing; correct the metadata"),
    of_metadata("a datatype that is none", metadata(datatype="cq16_le"),
        'r.sigmf-meta, global, core:datatype: "cq16_le" is no datatype of SigMF; correct it, or give --format, '
        "such as --format ci16_le"),
    of_metadata("a rate that no double holds", metadata().replace("48000", "1e999"),
        "r.sigmf-meta: holds a number beyond all range; correct the metadata"),
    of_metadata("a negative rate", metadata(sample_rate=-48000),
        "r.sigmf-meta, global, core:sample_rate: must lie from 1 to 1e+12; correct the metadata"),
    of_metadata("a rate as text", metadata(sample_rate="48000"),
        "r.sigmf-meta, global, core:sample_rate: must be a number; correct the metadata"),
    of_metadata("no rate", metadata(remove=["sample_rate"]),
        "r.sigmf-meta: does not say its sample rate; give --rate, such as --rate 2.4M", status=2),
    of_metadata("an index beyond 64 bits", metadata(captures=[{"core:sample_start": 2**64}]),
        "r.sigmf-meta, captures[0], core:sample_start: must lie from 0 to 9.0072e+15; correct the metadata"),
    of_metadata("half an index", metadata(captures=[{"core:sample_start": 0.5}]),
        "r.sigmf-meta, captures[0], core:sample_start: must be a whole number; correct the metadata"),
    of_metadata("captures out of order", metadata(captures=[{"core:sample_start": 500}, {"core:sample_start": 100}]),
        "r.sigmf-meta, captures[1], core:sample_start: is lower than the entry's before; sort the captures by it"),
    of_metadata("a capture before the offset", metadata(offset=100, captures=[{"core:sample_start": 0}]),
        "r.sigmf-meta, captures[0], core:sample_start: lies before core:offset; correct the metadata"),
    of_metadata("a place before the end of the capture before",
        metadata(captures=[{"core:sample_start": 0, "core:global_index": 5000},
                           {"core:sample_start": 4000, "core:global_index": 5000}]),
        "r.sigmf-meta, captures[1], core:global_index: lies before the end of the entry before; correct the "
        "metadata"),
    of_metadata("headers longer than the data",
        metadata(captures=[{"core:sample_start": 0, "core:header_bytes": 2**53}]),
        "r.sigmf-meta: holds no samples; check that it was written and copied whole"),
    of_metadata("trailing bytes longer than the data", metadata(trailing_bytes=2**53),
        "r.sigmf-meta, global, core:trailing_bytes: is more than the data file holds; correct the metadata, or "
        "copy the data again"),
    of_metadata("captures that are no list", metadata().replace('[{"core:sample_start": 0}]', "7"),
        "r.sigmf-meta, captures: must be an array; correct the metadata"),
    of_metadata("no annotations", metadata().replace(', "annotations": []', ""),
        'r.sigmf-meta, annotations: is missing; add "annotations": []'),
    of_metadata("a time that is none", metadata(captures=[{"core:sample_start": 0, "core:datetime": "yesterday"}]),
        'r.sigmf-meta, captures[0], core:datetime: must read like 2026-05-04T09:30:00Z, is "yesterday"; correct '
        "the metadata"),
    of_metadata("an extension that must be understood",
        metadata(extensions=[ {"name": "packed", "version": "1.0.0", "optional": False}]),
        'r.sigmf-meta, core:extensions[0], name: the extension "packed" must be understood and is not; set its '
        "optional to true if the samples are stored as usual"),
    of_metadata("a version to come", metadata(version="2.0.0"),
        'r.sigmf-meta, global, core:version: "2.0.0" is newer than what is understood; write the metadata in '
        "version 1"),
    of_metadata("a version that is none", metadata(version="new"),
        'r.sigmf-meta, global, core:version: must read like 1.2.5, is "new"; correct the metadata'),
    of_metadata("a hash that is none", metadata(sha512="abc"),
        "r.sigmf-meta, global, core:sha512: must be 128 hex digits; correct the metadata"),
    of_metadata("another's hash", metadata(sha512="0" * 128),
        "r.sigmf-data: SHA-512 begins 6d03b4e02f415e7b, the metadata says 0000000000000000; copy the recording "
        "again: its data have changed", more="--verify"),
    of_metadata("data outside its folder", metadata(dataset="../r.sigmf-data"),
        'r.sigmf-meta, global, core:dataset: must name a file in the same folder, is "../r.sigmf-data"; correct '
        "the metadata"),
    of_metadata("metadata only", metadata(metadata_only=True),
        "r.sigmf-meta: holds metadata only, no samples; give the recording that it was made from", data=None),
    of_metadata("no data file", metadata(),
        'r.sigmf-meta: its data file "r.sigmf-data" is missing; put it in the same folder', data=None),
    of_metadata("an empty data file", metadata(),
        "r.sigmf-meta: holds no samples; check that it was written and copied whole", data=b""),
    of_metadata("a thousand and more lanes", metadata(num_channels=5000),
        "r.sigmf-meta, global, core:num_channels: must lie from 1 to 1024; correct the metadata"),
    Case("metadata", "metadata of 100 MB", sparse_file("r.sigmf-meta", 100 << 20),
        "r.sigmf-meta: is 104857600 bytes long, too long for metadata; give the recording's .sigmf-meta file", 3,
        META_WORDS),
    Case("metadata", "data without metadata", file("r.sigmf-data", GOOD),
        "r.sigmf-data: its .sigmf-meta file is missing; put it in the same folder, or give --format and --rate", 2,
        "levels r.sigmf-data"),
    Case("metadata", "a collection", file("r.sigmf-collection", b"{}"),
        "r.sigmf-collection: is a collection, which holds no samples itself; give one of the recordings that it "
        "lists", 3, "levels r.sigmf-collection"),
]

ARCHIVE = [
    of_archive("binary noise", NOISE, "r.sigmf, byte 0: is no whole tar archive (*); copy the archive again"),
    of_archive("empty", b"", "r.sigmf, byte 0: is no whole tar archive (*); copy the archive again"),
    of_archive("compressed", gzip.compress(tar(*PAIR)),
        "r.sigmf: is compressed (gzip); unpack it first: samples are read in place from a plain tar archive"),
    of_archive("a climbing name", tar(("../r.sigmf-meta", META), ("../r.sigmf-data", GOOD)),
        'r.sigmf, member "../r.sigmf-meta": has a name that leads out of the archive; pack the recording again '
        "as plain files"),
    of_archive("a rooted name", tar(("/etc/r.sigmf-meta", META), ("/etc/r.sigmf-data", GOOD)),
        'r.sigmf, member "/etc/r.sigmf-meta": has a name that leads out of the archive; pack the recording again '
        "as plain files"),
    of_archive("metadata that are a link", tar(special("r/r.sigmf-meta", tarfile.SYMTYPE, "/etc/passwd"), PAIR[1]),
        'r.sigmf, member "r/r.sigmf-meta": is a link; pack the recording again as plain files'),
    of_archive("data that are a hard link",
        tar(PAIR[0], special("r/r.sigmf-data", tarfile.LNKTYPE, "r/r.sigmf-meta")),
        'r.sigmf, member "r/r.sigmf-data": is a link; pack the recording again as plain files'),
    of_archive("data that are a folder", tar(PAIR[0], special("r/r.sigmf-data", tarfile.DIRTYPE)),
        'r.sigmf, member "r/r.sigmf-meta": the archive has no file "r/r.sigmf-data"; pack the recording again '
        "with its data"),
    of_archive("cut in the data", tar(*PAIR, cut=20_000),
        'r.sigmf, byte 20000: the archive ends before its member "r/r.sigmf-data" does; copy the archive again'),
    of_archive("cut in a header", tar(*PAIR, cut=1300),
        "r.sigmf, byte 1024: is no whole tar archive (*); copy the archive again"),
    of_archive("no recording inside", tar(("readme.txt", b"hello")),
        "r.sigmf: holds no recording (no member ends in .sigmf-meta); check that it is the right archive"),
    of_archive("two recordings", tar(*PAIR, ("s/s.sigmf-meta", META), ("s/s.sigmf-data", GOOD)),
        "r.sigmf: holds 2 recordings; give --member with one of: r/r, s/s", status=2),
    of_archive("a member that is not there", tar(*PAIR),
        'r.sigmf: holds no recording "q"; give --member with one of: r/r', status=2, more="--member q"),
    of_archive("metadata twice", tar(PAIR[0], *PAIR), 'r.sigmf: holds "r/r.sigmf-meta" twice; keep one of them'),
    of_archive("data twice", tar(*PAIR, PAIR[1]), 'r.sigmf: holds "r/r.sigmf-data" twice; keep one of them'),
    of_archive("no data", tar(PAIR[0]),
        'r.sigmf, member "r/r.sigmf-meta": the archive has no file "r/r.sigmf-data"; pack the recording again '
        "with its data"),
    of_archive("data with holes", with_holes(),
        'r.sigmf, member "r/r.sigmf-data": is stored with holes; pack the recording again as plain files'),
]

CONTAINER = [
    of_container("binary noise", NOISE,
        "r.wav: is no container that can be read (*); give --format and --rate if it is a raw recording"),
    of_container("a header alone", wav(),
        "r.wav: is no container that can be read (*); copy it again, or correct its header"),
    of_container("three channels", wav(wav_format(channels=3), chunk(b"data", GOOD)),
        "r.wav: has 3 channels, neither one (real) nor two (I and Q); keep the channels of one signal"),
    of_container("an empty samples chunk", wav(wav_format(), chunk(b"data", b"")),
        "r.wav: holds no samples; check that it was written and copied whole"),
    of_container("a header that says more than there is", wav(wav_format(), chunk(b"data", GOOD, size=10_000_000)),
        "container-short: the header says 2500000 samples, the file holds 28800", status=0),
    of_container("a size of zero", wav(wav_format(), chunk(b"data", GOOD, size=0), size=0), "", status=0),
    of_container("a size left open", wav(wav_format(), chunk(b"data", GOOD, size=0xFFFFFFFF), size=0xFFFFFFFF), "",
        status=0),
    of_container("samples that go on after their end", wav(wav_format(), chunk(b"data", GOOD, size=1000)),
        "r.wav, byte 1044: the header ends the samples here, but 114200 bytes follow that are no chunk of it; "
        "correct the size in the header: 0xFFFFFFFF means up to the end"),
    of_container("a size beyond 63 bits", w64(2**63 - 1), "the file holds 28800", ending="w64", status=0),
    of_container("a negative size", w64(-2**63), "", status=0, ending="w64"),
    of_container("big-endian with three channels", aiff(channels=3),
        "r.aiff: has 3 channels, neither one (real) nor two (I and Q); keep the channels of one signal",
        ending="aiff"),
    of_container("an offset beyond the file", aiff(offset=2**31),
        "r.aiff: holds no samples; check that it was written and copied whole", ending="aiff"),
    of_container("a stream cut in its header", b"fLaC\0\0\0\x22" + b"\0" * 10,
        "r.flac: is no container that can be read (*); copy it again, or correct its header", ending="flac"),
    of_container("a format of its own and another", wav(wav_format(), chunk(b"data", GOOD)),
        "r.wav: says its format itself; leave --format out", status=2, more="--format ci16_le --rate 48k"),
]

RAW_FILES = [
    of_raw("empty", b"", "r.iq: holds no samples; check that it was written and copied whole"),
    of_raw("less than a sample", b"abc", "r.iq: holds no samples; check that it was written and copied whole"),
    of_raw("binary noise", NOISE,
        "r.iq: no carrier stands out of the noise; give --carrier, as an offset with a sign or as a frequency; "
        "check --format and --rate where the recording does not say them"),
    of_raw("floats that are all NaN", b"\0\0\xc0\x7f" * 2 * 30_000,
        "r.iq: no carrier stands out of the noise; give --carrier, as an offset with a sign or as a frequency; "
        "check --format and --rate where the recording does not say them",
        words="levels r.iq --format cf32_le --rate 48k"),
    of_raw("a few samples", GOOD[:400],
        "--window 200ms: is longer than every gapless stretch of the recording; give a shorter --window"),
    of_raw("shorter than a window", GOOD[:4 * 6000],
        "--window 200ms: is longer than every gapless stretch of the recording; give a shorter --window"),
    of_raw("nothing said of it", GOOD,
        "r.iq: does not say how its samples are stored; give --format and --rate, such as --format ci16_le --rate "
        "2.4M", status=2, words="levels r.iq"),
    of_raw("no rate said", GOOD, "r.iq: does not say its sample rate; give --rate, such as --rate 2.4M", status=2,
        words="levels r.iq --format ci16_le"),
    of_raw("compressed", gzip.compress(GOOD), "r.iq: is compressed (gzip); unpack it first", words="levels r.iq"),
    of_raw("from beyond its end", GOOD, "r.iq: --from 3600 s lies past the end at 0.6 s; give an earlier --from",
        words=RAW + " --from 1h"),
    of_raw("until before its beginning", GOOD,
        "r.iq: --until does not lie after --from; exchange them, or leave one out", status=2,
        words=RAW + " --from 0.3 --until 0.2"),
    of_raw("a lane that is not there", GOOD, "r.iq: has 1 lane, there is no lane 1; leave --lane out",
        words=RAW + " --lane 1"),
    of_raw("a member of what is no archive", GOOD, "r.iq: is no archive, so it has no members; leave --member out",
        status=2, words=RAW + " --member q"),
    of_raw("a rate at which it lasts a moment", GOOD,
        "r.iq: lasts 2.88e-08 s, too short to find a signal in; give a longer recording, or correct --rate",
        words="levels r.iq --format ci16_le --rate 1e12"),
    Case("raw", "a folder", lambda folder: (folder / "r.iq").mkdir(), "r.iq: is a folder; give a recording inside it",
        3, RAW),
    Case("raw", "not there", lambda folder: None,
        "r.iq: cannot be read (No such file or directory); check the name and who may read it", 3, RAW),
    Case("raw", "a device without end", lambda folder: None,
        "/dev/zero: no carrier stands out of the noise; give --carrier, as an offset with a sign or as a "
        "frequency; check --format and --rate where the recording does not say them", 3,
        "levels /dev/zero --format ci16_le --rate 48k"),
]

SCENES = [
    of_scene("no recording", "[[carrier]]\n", "s.toml, line 1, recording: is missing; add a table [recording]",
        head=""),
    of_scene("not TOML", "[[carrier]\n", "s.toml, line 5: is not TOML (*); mend that line"),
    of_scene("an unknown key", CARRIER + "levle_dbfs = -20.0\n",
        "s.toml, line 7, carrier[0].levle_dbfs: is not known here; did you mean level_dbfs?"),
    of_scene("an unknown table", "[reciever]\n",
        "s.toml, line 5, reciever: is not known here; did you mean receiver?"),
    of_scene("text for a number", CARRIER + 'level_dbfs = "loud"\n',
        "s.toml, line 7, carrier[0].level_dbfs: is not a number; write it like level_dbfs = 1.5"),
    of_scene("a number for text", "description = 7\n",
        's.toml, line 5, recording.description: is not text; write it like description = "..."'),
    of_scene("a number for a table", "path = 5\n[recording]\nrate_hz = 48000.0\nduration_s = 0.2\n",
        "s.toml, line 1, path: is not a table; write [path]", head=""),
    of_scene("a number for a list of tables", "carrier = 5\n[recording]\nrate_hz = 48000.0\nduration_s = 0.2\n",
        "s.toml, line 1, carrier: is not a list of tables; write [[carrier]]", head=""),
    of_scene("half a seed", "seed = 1.5\n",
        "s.toml, line 5, recording.seed: is not a whole number; write it like seed = 10"),
    of_scene("a negative seed", "seed = -1\n",
        "s.toml, line 5, recording.seed: is negative; give a whole number from 0 on"),
    of_scene("infinity", CARRIER + "level_dbfs = inf\n",
        "s.toml, line 7, carrier[0].level_dbfs: is not a finite number; write a plain number"),
    of_scene("not a number", CARRIER + "phase_deg = nan\n",
        "s.toml, line 7, carrier[0].phase_deg: is not a finite number; write a plain number"),
    of_scene("a format that is none", "[recording]\nformat = \"ci12\"\nrate_hz = 1.0\n",
        's.toml, line 2, recording.format: is "ci12"; write one such as ci16_le, cf32_le, cu8 or ri16_le', head=""),
    of_scene("a rate below its range", "[recording]\nrate_hz = 0.0\n",
        "s.toml, line 2, recording.rate_hz: is 0; give 1 to 1e+12", head=""),
    of_scene("longer than any disk", "[recording]\nrate_hz = 1e6\nduration_s = 1e18\n",
        "s.toml, line 3, recording.duration_s: is 1e+18; give 0 to 1e+09", head=""),
    of_scene("a carrier out of the band", "[[carrier]]\noffset_hz = 30000.0\n",
        "s.toml, line 6, carrier[0].offset_hz: is 30000: the carrier and its sidebands leave the band of -24000 "
        "to 24000 Hz; move the carrier, lower the tones or raise rate_hz"),
    of_scene("a tone that ends before it begins",
        CARRIER + "[[carrier.tone]]\nfrequency_hz = 1000.0\nstart_s = 0.1\nstop_s = 0.05\n",
        "s.toml, line 10, carrier[0].tone[0].stop_s: is not after start_s; give a later stop_s"),
    of_scene("two lengths", "samples = 100\n",
        "s.toml, line 5, recording.samples: stands beside duration_s; keep one of them"),
    of_scene("a gap beyond the end", "[[receiver.gap]]\nstart_s = 5.0\nduration_s = 1.0\n",
        "s.toml, line 6, receiver.gap[0].start_s: reaches beyond the end of the recording; place it earlier"),
    of_scene("NaN in whole numbers", "[[receiver.non_finite]]\nfirst = 5\n",
        "s.toml, line 6, receiver.non_finite[0].first: has no code in integer samples; choose a format such as "
        "cf32_le"),
    of_scene("a word that is no choice", CARRIER + 'overmodulation = "clip"\n',
        's.toml, line 7, carrier[0].overmodulation: is "clip"; known are: fold, pinch-off'),
    of_scene("a time that is none", 'start_utc = "tomorrow"\n',
        "s.toml, line 5, recording.start_utc: is not a date and time with its zone; write it like start_utc = "
        "2026-05-04T09:30:00Z"),
    Case("scene", "UTF-16", file("s.toml", "[recording]\nrate_hz = 1.0\n".encode("utf-16")),
        "s.toml: is text in UTF-16; save it as UTF-8", 3, MAKE_WORDS),
    Case("scene", "a folder", lambda folder: (folder / "s.toml").mkdir(),
        "s.toml: cannot be read (Is a directory); check the name and who may read it", 3, MAKE_WORDS),
    Case("scene", "a device without end", lambda folder: (folder / "s.toml").symlink_to("/dev/zero"),
        "s.toml: is too long for a text file; check that it is the right file", 3, MAKE_WORDS),
    Case("scene", "not there", lambda folder: None,
        "s.toml: cannot be read (No such file or directory); check the name and who may read it", 3, MAKE_WORDS),
]

PIPES = [
    of_pipe("empty", b"", "standard input: holds no samples; check what writes to it"),
    of_pipe("closed within its first sample", b"abc", "standard input: holds no samples; check what writes to it"),
    of_pipe("closed within a sample", GOOD + b"abc", "odd-tail: the last 3 of 4 bytes of a sample are left out",
        status=0),
    of_pipe("binary noise", NOISE,
        "standard input: no carrier stands out of the noise; give --carrier, as an offset with a sign or as a "
        "frequency; check --format and --rate where the recording does not say them"),
    of_pipe("nothing said of it", GOOD,
        "standard input: does not say how its samples are stored; give --format and --rate, such as --format "
        "ci16_le --rate 2.4M", status=2, words="levels -"),
    of_pipe("to be verified", GOOD,
        "standard input: a pipe cannot be verified before it is measured; leave --verify out, or give a file",
        status=2, words=PIPE + " --verify"),
    of_pipe("from beyond its end", GOOD, "standard input: ended before --from 3600 s; give an earlier --from",
        words=PIPE + " --from 1h"),
    of_pipe("shorter than a window", GOOD[:4 * 6000],
        "--window 200ms: is longer than every gapless stretch of the recording; give a shorter --window"),
    of_pipe("from a time of day without a start", GOOD,
        "standard input: --from is a time of day, and the recording does not say when it starts; give "
        "--start-utc, or seconds from the first sample", status=2, words=PIPE + " --from 2026-05-04T09:30:00Z"),
    of_pipe("from a time of day before the start", GOOD,
        "standard input: --from lies before the recording's first sample; give a later time",
        words=PIPE + " --start-utc 2026-05-04T09:30:00Z --from 2026-05-04T09:00:00Z"),
]

OPTIONS = [
    of_option("a word for a number", "--rate fast",
        line='--rate: "fast" is not a frequency; type it like 1000, 12.5k or 145.2M',
        words="levels r.iq --format ci16_le"),
    of_option("a decimal comma", "--window 0,2",
        line='--window: "0,2" is not a time; use a decimal point, type it like 1.5, 200ms, 3min or 01:02:03.5'),
    of_option("metres or minutes", "--every 5m",
        line='--every: "5m" could mean metres or minutes; type min for minutes, s for seconds'),
    of_option("a number that no double holds", "--carrier +1e999",
        line='--carrier: "+1e999" is not a frequency; type it like 1000, 12.5k or 145.2M'),
    of_option("no rate at all", "--rate 0",
        line="--rate 0: has to be above 0 Hz; give a positive frequency such as 20k",
        words="levels r.iq --format ci16_le"),
    of_option("a format that is none", "",
        line="--format ci12: is not a sample format; give c or r, the type and its byte order, such as ci16_le, "
             "cf32_le, cu8 or ri16_le", words="levels r.iq --format ci12 --rate 48k"),
    of_option("a lane beyond counting", "--lane 99999999999999999999",
        line='--lane: "99999999999999999999" is out of range; type a whole number from 0 to 65535'),
    of_option("a choice that is none", "--quantity noise",
        line="--quantity noise: is not one of its choices; give tone or carrier"),
    of_option("records far denser than their window", "--every 1ms --window 1s",
        line="--every 1ms: is less than a hundredth of the window; give a longer one, or a shorter --window"),
    of_option("a window too short for the tone", "--window 1ms",
        line="--window 1ms: is too short to part the tone of 1 kHz from the carrier; give --window 4ms or longer",
        status=3),
    of_option("a carrier out of the band", "--carrier +30k",
        line="--carrier +30k: lies outside the recording's band of 48 kHz; give a carrier inside it", status=3),
    of_option("a carrier without a centre", "--carrier 145M",
        line="--carrier 145M: needs to know what lies at the recording's centre; give --centre, or the carrier's "
             "offset with a sign"),
    of_option("a tone out of the band", "--tone 23.9k",
        line="--tone 23.9k: lies outside the recording's band at this carrier; give a lower tone", status=3),
    of_option("a width that does not fit", "--width 90k",
        line="--width 90k: does not fit: the band holds 34 kHz about the carrier; give a smaller one", status=3),
    of_option("audio of an unknown kind", "a.mp3", line="a.mp3: names no kind of audio file; end the name in .wav or .flac",
        words=HEAR),
    of_option("gain where loudness is steady", "a.wav --loudness steady --gain 3",
        line="--gain 3: goes with --loudness field only; leave one of them out: steady loudness comes from the "
             "carrier", words=HEAR),
    of_option("a band upside down", "a.wav --band 3k:300",
        line="--band 3k:300: no such audio band at this audio rate; give LOW:HIGH in Hz, LOW 5 or more, HIGH "
             "above it and 21600 or less", words=HEAR),
    of_option("a date that is none", "--start-utc 2026-02-30T00:00:00Z",
        line="--start-utc 2026-02-30T00:00:00Z: is not a UTC time; write it like 2026-05-04T09:30:00Z"),
]

OUTPUTS = [
    of_output("a folder that is not there", "--csv no/a.csv",
        line="no/a.csv: is in a folder that does not exist; make the folder first"),
    of_output("a folder", "--json sub", line="sub: is a folder; choose another name or folder",
        make=lambda folder: (folder / "sub").mkdir()),
    of_output("a file that is there", "--csv kept",
        line="kept: exists already; choose another name or add --force",
        make=lambda folder: (folder / "kept").write_text("mine")),
    of_output("in a file", "--csv r.iq/a", line="r.iq/a: is in what is no folder; choose another name or folder"),
    of_output("a full device", "--csv /dev/full",
        line="/dev/full: cannot be written (No space left on device); make room or choose another folder"),
    of_output("a name that is too long", "--csv " + "x" * 300,
        line="x" * 300 + ": cannot be written (File name too long); choose another name or folder"),
    of_output("two in one", "--csv a --json a",
        line="a: is named for two outputs; give each output a name of its own", status=2),
    of_output("the recording itself", "--csv r.iq --force",
        line="r.iq: is the recording itself; give the output another name", status=2),
    of_output("whole numbers for floats", "a.flac --sample float",
        line="a.flac: FLAC holds no floating-point samples; choose pcm16 or pcm24, or a name that ends in .wav",
        status=2, words=HEAR),
    of_output("no base name", "",
        line="..: is no base name; give one such as walk, which makes walk.sigmf-data and its companions", status=2,
        make=file("s.toml", (SCENE_HEAD + CARRIER).encode()), words="make s.toml -o .."),
]

# What a library or one rule refuses in many shapes: the same way through our own lines, other ways through the library's.
VARIANTS = [
    of_metadata("a whole text nested 100 000 deep",
        metadata(author="x").replace('"x"', "[" * 100_000 + "]" * 100_000), "", status=0),
    of_metadata("a rate that is NaN", metadata().replace("48000", "NaN"),
        "r.sigmf-meta, byte 61: is no valid JSON; correct the text there, or copy the file again"),
    of_metadata("a negative index", metadata(captures=[{"core:sample_start": -1}]),
        "r.sigmf-meta, captures[0], core:sample_start: must lie from 0 to 9.0072e+15; correct the metadata"),
    Case("metadata", "the data file is a folder",
        lambda folder: (sigmf(metadata(), None)(folder), (folder / "r.sigmf-data").mkdir()),
        'r.sigmf-meta: its data file "r.sigmf-data" is no plain file; put it in the same folder', 3, META_WORDS),
    of_archive("a size beyond the end", lying_size(tar(*PAIR), 1, 8**11 - 1),
        'r.sigmf, byte 122880: the archive ends before its member "r/r.sigmf-data" does; copy the archive again'),
    of_container("no samples chunk", wav(wav_format()),
        "r.wav: is no container that can be read (*); copy it again, or correct its header"),
    of_container("samples before their format", wav(chunk(b"data", GOOD), wav_format()),
        "r.wav: is no container that can be read (*); copy it again, or correct its header"),
    of_container("no rate", wav(wav_format(rate=0), chunk(b"data", GOOD)),
        "r.wav: is no container that can be read (*); copy it again, or correct its header"),
    of_container("no bits", wav(wav_format(bits=0), chunk(b"data", GOOD)),
        "r.wav: is no container that can be read (*); copy it again, or correct its header"),
    of_container("an unknown coding", wav(wav_format(tag=0x4242), chunk(b"data", GOOD)),
        "r.wav: is no container that can be read (*); copy it again, or correct its header"),
    of_container("a coding cut off",
        wav(wav_format(tag=0x11, bits=4, more=struct.pack("<HH", 2, 1017)), chunk(b"data", b"\0" * 9)),
        "r.wav: is no container that can be read (*); copy it again, or correct its header"),
    of_container("long sizes without their chunk",
        wav(wav_format(), chunk(b"data", GOOD, size=0xFFFFFFFF), kind=b"RF64"),
        "r.wav: is no container that can be read (*); copy it again, or correct its header"),
    Case("scene", "binary noise", file("s.toml", NOISE), "s.toml, line 1: is not TOML (*); mend that line", 3,
        MAKE_WORDS),
    of_scene("a key twice", "seed = 1\nseed = 2\n", "s.toml, line 6: is not TOML (*); mend that line"),
    of_scene("a whole number beyond 64 bits", "seed = 99999999999999999999\n",
        "s.toml, line 5: is not TOML (*); mend that line"),
    of_scene("lists in lists, 100 000 deep", "seed = " + "[" * 100_000 + "]" * 100_000 + "\n",
        "s.toml, line 5: is not TOML (*); mend that line"),
]

CASES = [*METADATA, *ARCHIVE, *CONTAINER, *RAW_FILES, *SCENES, *PIPES, *OPTIONS, *OUTPUTS]
