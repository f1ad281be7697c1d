"""Hostile inputs by the seed: truncated, mutated, random, crafted; and the one way they are all read."""

from __future__ import annotations

import random
import struct
import zlib
from pathlib import Path
from xml.sax.saxutils import escape

from colloc.errors import CollocError
from colloc.settings import ReadSettings

from .samples import HOSTILE, PACKERS, count_characters, json_line, prose

NAMES = ("a.txt", "a.jsonl", "a.csv", "a.tsv", "a.html", "a.xml")
ENCODINGS = ("utf-8", "utf-8", "utf-8", "detect", "utf-16", "latin-1", "shift_jis", "gb18030")


def read_or_refuse(path: Path, settings: ReadSettings) -> int:
    """Characters read, or -1 where the input was refused with one clear line that names the file.

    Any other exception goes through: it is the bug that is looked for.
    """
    try:
        return count_characters(path, settings)
    except CollocError as error:
        message = str(error)
        if path.name not in message or not message.isprintable():
            raise AssertionError(f"not one clear line that names {path.name}: {message!r}") from error
        return -1


def _sound(chance: random.Random, name: str) -> bytes:
    texts = [*HOSTILE, prose(chance.randrange(1000), chance.randrange(3000))]
    chosen = chance.sample(texts, 4)
    if name == "a.txt":
        content = "".join(chosen)
    elif name == "a.jsonl":
        content = "".join(json_line(text=text, year=1990, deep={"a": [text]}) for text in chosen)
    elif name == "a.csv":
        content = "text,year\r\n" + "".join('"{}",1990\r\n'.format(text.replace('"', '""')) for text in chosen)
    elif name == "a.html":
        content = "<!DOCTYPE html><title>t</title>" + "".join(f"<p class=x>{text}<br><b>y</b></p>" for text in chosen)
    elif name == "a.xml":
        content = "<TEI><text><body>{}</body></text></TEI>".format(
            "".join(f"<p><s><w lemma='x'>{escape(_printable(text))}</w></s></p>" for text in chosen)
        )
    else:
        content = "text\tyear\n" + "".join(" ".join(text.split()) + "\t1990\n" for text in chosen)
    return content.encode(chance.choice(["utf-8"] * 5 + ["utf-8-sig", "utf-16", "utf-32", "gb18030"]))


def _printable(text: str) -> str:
    """Without what XML 1.0 has no place for."""
    return "".join(character for character in text if character.isprintable())


def _mutated(chance: random.Random, data: bytes) -> bytes:
    changed = bytearray(data)
    for _ in range(chance.randint(1, 8)):
        at = chance.randrange(len(changed) + 1)
        how = chance.randrange(5)
        if how == 0:
            changed[at : at + 1] = bytes((chance.randrange(256),))
        elif how == 1:
            del changed[at : at + chance.randint(1, 16)]
        elif how == 2:
            changed[at:at] = chance.randbytes(chance.randint(1, 16))
        elif how == 3:
            changed[at:at] = chance.choice(TROUBLE)
        else:
            start = chance.randrange(len(changed) + 1)
            changed[at:at] = changed[start : start + chance.randint(1, 500)]
    return bytes(changed)


TROUBLE = (
    b"\0",
    b'"',
    b"\\u",
    b"\\ud800",
    b"\xed\xa0\x80",
    b"\xf4\x90\x80\x80",
    b"\xc0\x80",
    b"\xff\xfe\0\0",
    b"\r",
    b"\n",
    b"\t",
    b"[" * 3000,
    b'{"a":' * 3000,
    b"9" * 6000,
    b"1e999",
    b"-Infinity",
    b'"text":"x",',
    b"\x1b$B\xff",
    b"<![CDATA[",
    b"<!DOCTYPE a [<!ENTITY b 'c'>]>",
    b"<p>" * 3000,
    b"&#xD800;",
)
"""Pieces put into sound input: zero bytes, halves of pairs, overlong forms, line ends, deep nesting, huge numbers."""


def _crafted_archive(chance: random.Random) -> bytes:
    """Headers with lying sizes, reserved flags and endless fields."""
    kind = chance.randrange(6)
    if kind == 0:  # RFC 1952: flags with extra field and name that never end
        return b"\x1f\x8b\x08" + bytes((chance.randrange(256),)) + chance.randbytes(chance.randrange(400))
    if kind == 1:  # a gzip member whose length and checksum lie
        engine = zlib.compressobj(9, zlib.DEFLATED, -15)
        body = engine.compress(b"sea " * 500) + engine.flush()
        return b"\x1f\x8b\x08\0\0\0\0\0\0\3" + body + struct.pack("<II", chance.getrandbits(32), 1)
    if kind == 2:  # RFC 8878: frame header descriptor, window, sizes at random, then blocks of one repeated byte
        blocks = b"".join(struct.pack("<I", (2**17 << 3) | 2)[:3] + b"a" for _ in range(chance.randrange(200)))
        return b"\x28\xb5\x2f\xfd" + bytes((chance.choice([0, 4, 0x20, 0xE0]), chance.randrange(256))) + blocks
    if kind == 3:  # xz: stream header with random flags, random block header
        return b"\xfd7zXZ\0" + chance.randbytes(chance.randrange(200))
    if kind == 4:
        return b"BZh91AY&SY" + chance.randbytes(chance.randrange(300))
    # thousands of empty members
    return PACKERS[chance.choice([".gz", ".bz2", ".xz", ".zst"])](b"") * chance.randrange(3000)


def hostile_case(seed: int) -> tuple[str, bytes, ReadSettings]:
    """File name, content and settings of one case."""
    chance = random.Random(seed)
    name = chance.choice(NAMES)
    extension = chance.choice(list(PACKERS))
    how = chance.randrange(8)  # 6 and 7: nothing is done to it, the settings alone may not fit
    data = _sound(chance, name)
    if how == 0:
        data = data[: chance.randrange(len(data) + 1)]
    elif how <= 2:
        data = _mutated(chance, data)
    elif how == 3:
        data = chance.randbytes(chance.randrange(2000))
    data = PACKERS[extension](data)
    if how == 4:
        data = _mutated(chance, data) if chance.random() < 0.7 else data[: chance.randrange(len(data) + 1)]
    elif how == 5:
        data = _crafted_archive(chance)
        extension = extension if chance.random() < 0.5 else ""
    settings = ReadSettings(
        max_record=chance.choice([1024, 2**16, 2**16, 2**16]),
        max_unpacked=2**24,
        encoding=chance.choice(ENCODINGS),
        errors=chance.choice(["strict", "replace"]),  # type: ignore[arg-type]
    )
    return name + extension, data, settings
