#!/usr/bin/env python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Makes the archives and containers that fuzzing starts from, anew and the same each time."""
import io
import json
import pathlib
import struct
import tarfile

CORPUS = pathlib.Path(__file__).resolve().parent / "corpus"
SAMPLES = struct.pack("<16h", *range(-800, 800, 100))


def keep(target, name, content):
    (CORPUS / target).mkdir(parents=True, exist_ok=True)
    (CORPUS / target / name).write_bytes(content)


# --- archives


def metadata(**fields):
    head = {"core:datatype": "ci16_le", "core:version": "1.2.5", "core:sample_rate": 48000}
    head.update({"core:" + key: value for key, value in fields.items()})
    captures = [{"core:sample_start": 0}, {"core:sample_start": 5, "core:frequency": 145e6}]
    return json.dumps({"global": head, "captures": captures, "annotations": []}).encode()


def tar(members, kind=tarfile.USTAR_FORMAT, prepare=lambda member: None):
    archive = io.BytesIO()
    with tarfile.open(fileobj=archive, mode="w", format=kind) as writer:
        for name, content in members:
            member = tarfile.TarInfo(name)
            member.size = len(content)
            prepare(member)
            writer.addfile(member, io.BytesIO(content) if member.isreg() else None)
    # Two blocks of zeros mark the end; the many that follow would only slow the search down.
    used = len(archive.getvalue().rstrip(b"\0"))
    return archive.getvalue()[: used + -used % 512 + 1024]


def as_link(member):
    if member.name.endswith("data"):
        member.type, member.linkname, member.size = tarfile.SYMTYPE, "/etc/passwd", 0


def make_archives():
    walk = [("walk/walk.sigmf-meta", metadata()), ("walk/walk.sigmf-data", SAMPLES)]
    keep("archive", "ustar", tar(walk))
    keep("archive", "gnu", tar([("x" * 120 + "/" + n, c) for n, c in walk], tarfile.GNU_FORMAT))
    keep("archive", "pax", tar([("größe/" + n, c) for n, c in walk], tarfile.PAX_FORMAT))
    keep("archive", "data-first", tar(walk[::-1]))
    keep("archive", "dataset", tar([("a.sigmf-meta", metadata(dataset="a.bin")), ("a.bin", SAMPLES)]))
    keep("archive", "two", tar(walk + [("b.sigmf-meta", metadata()), ("b.sigmf-data", SAMPLES)]))
    keep("archive", "climbing", tar([("../" + n, c) for n, c in walk]))
    keep("archive", "link", tar(walk, prepare=as_link))
    keep("archive", "cut", tar(walk)[:1600])
    keep("archive", "gzip", b"\x1f\x8b\x08\x00")


# --- containers


def chunk(name, content, order="<"):
    return name + struct.pack(order + "I", len(content)) + content + bytes(len(content) % 2)


def format_chunk(coding, bits, channels=2, rate=48000, more=b""):
    frame = channels * bits // 8
    return struct.pack("<HHIIHH", coding, channels, rate, rate * frame, frame, bits) + more


def wav(fmt, data=SAMPLES, after=b"", size=None):
    body = b"WAVE" + chunk(b"fmt ", fmt)
    size = len(data) if size is None else size
    body += b"data" + struct.pack("<I", size) + data + after
    return b"RIFF" + struct.pack("<I", len(body)) + body


def extensible(bits, valid):
    guid = bytes.fromhex("0100000000001000800000aa00389b71")
    return format_chunk(0xFFFE, bits, more=struct.pack("<HHI", 22, valid, 3) + guid)


def rf64():
    sizes = struct.pack("<QQQI", 4 + 36 + 24 + 8 + len(SAMPLES), len(SAMPLES), 8, 0)
    body = b"WAVE" + chunk(b"ds64", sizes) + chunk(b"fmt ", format_chunk(1, 16))
    return b"RF64" + b"\xff" * 4 + body + b"data" + b"\xff" * 4 + SAMPLES


def w64():
    tail = bytes.fromhex("f3acd3118cd100c04f8edb8a")
    riff = b"riff" + bytes.fromhex("2e91cf11a5d628db04c10000")
    fmt = b"fmt " + tail + struct.pack("<Q", 24 + 16) + format_chunk(1, 16)
    data = b"data" + tail + struct.pack("<Q", 24 + len(SAMPLES)) + SAMPLES
    body = b"wave" + tail + fmt + data
    return riff + struct.pack("<Q", 24 + len(body)) + body


def aiff():
    rate = struct.pack(">HQ", 0x400E, 48000 << 48)  # an 80-bit float
    common = chunk(b"COMM", struct.pack(">HIH", 2, 8, 16) + rate, ">")
    samples = chunk(b"SSND", struct.pack(">II", 0, 0) + SAMPLES, ">")
    body = b"AIFF" + common + samples
    return b"FORM" + struct.pack(">I", len(body)) + body


def au(size):
    return b".snd" + struct.pack(">IIIII", 24, size, 3, 48000, 2) + SAMPLES


def caf():
    description = struct.pack(">d4sIIIII", 48000.0, b"lpcm", 0, 4, 1, 2, 16)
    return (b"caff" + struct.pack(">HH", 1, 0) + b"desc" + struct.pack(">Q", 32) + description +
            b"data" + struct.pack(">qI", 4 + len(SAMPLES), 0) + SAMPLES)


def make_containers():
    pcm16 = format_chunk(1, 16)
    keep("container", "pcm16", wav(pcm16))
    keep("container", "real-pcm8", wav(format_chunk(1, 8, channels=1)))
    keep("container", "pcm24", wav(format_chunk(1, 24), SAMPLES[:30]))
    keep("container", "float", wav(format_chunk(3, 32)))
    keep("container", "double", wav(format_chunk(3, 64)))
    keep("container", "extensible", wav(extensible(32, 24)))
    keep("container", "u-law", wav(format_chunk(7, 8)))
    block = struct.pack("<HHIIHHHH", 0x11, 2, 48000, 53169, 72, 4, 2, 65)
    keep("container", "adpcm", wav(block, bytes(72)))
    keep("container", "chunk-after", wav(pcm16, after=chunk(b"LIST", b"INFO")))
    keep("container", "junk-after", wav(pcm16, after=b"\1\2\3\4\5\6\7\10"))
    keep("container", "streamed", wav(pcm16, size=0xFFFFFFFF))
    keep("container", "size-zero", wav(pcm16, size=0))
    keep("container", "short", wav(pcm16, size=4000))
    keep("container", "rifx", b"RIFX" + aiff()[4:])
    keep("container", "rf64", rf64())
    keep("container", "w64", w64())
    keep("container", "aiff", aiff())
    keep("container", "au", au(len(SAMPLES)))
    keep("container", "au-streamed", au(0xFFFFFFFF))
    keep("container", "caf", caf())
    keep("container", "no-container", b"\0\1\2\3" * 8)


make_archives()
make_containers()
