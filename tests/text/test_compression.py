"""Packed input: round trips with the packers of the standard library and zstandard, damage, bombs."""

from __future__ import annotations

import bz2
import gzip
import io
import lzma
import tarfile
import tracemalloc
import zlib
from pathlib import Path

import pytest
import zstandard

from colloc.errors import DataError
from colloc.settings import ReadSettings
from colloc.text import compression

from .samples import HOSTILE, PACKERS, count_characters, prose, read_texts

PACKED = [extension for extension in PACKERS if extension]
TEXTS = [*HOSTILE, prose(1, 300_000)]


@pytest.mark.parametrize("extension", PACKERS)
@pytest.mark.parametrize("number", range(len(TEXTS)))
def test_text_comes_back_exactly(tmp_path: Path, extension: str, number: int) -> None:
    text = TEXTS[number]
    path = tmp_path / f"a.txt{extension}"
    path.write_bytes(PACKERS[extension](text.encode()))
    (tmp_path / "other.txt").write_text("never all empty")
    assert read_texts(tmp_path)[0] == text


@pytest.mark.parametrize("extension", PACKED)
def test_content_tells_the_packing_where_the_name_does_not(tmp_path: Path, extension: str) -> None:
    path = tmp_path / "plain.txt"
    path.write_bytes(PACKERS[extension](b"quiet sea"))
    assert read_texts(path) == ["quiet sea"]


@pytest.mark.parametrize("extension", PACKED)
def test_members_follow_each_other(tmp_path: Path, extension: str) -> None:
    path = tmp_path / f"a.txt{extension}"
    path.write_bytes(b"".join(PACKERS[extension](part) for part in (b"one ", b"", b"two ", b"three")))
    assert read_texts(path) == ["one two three"]


@pytest.mark.parametrize("extension", PACKED)
@pytest.mark.parametrize("beyond", [0, 100_000])
def test_members_larger_than_a_step_follow_each_other(tmp_path: Path, extension: str, beyond: int) -> None:
    text = prose(6, compression.STEP)[: compression.STEP + beyond].encode()[: compression.STEP + beyond]
    member = PACKERS[extension](text)
    path = tmp_path / f"a.txt{extension}"
    path.write_bytes(member * 3)
    assert count_characters(path, ReadSettings(encoding="latin-1")) == 3 * len(text)


def test_zero_bytes_after_a_member_are_padding(tmp_path: Path) -> None:
    # GNU gzip ignores them (tapes); the xz format, 2.2, has padding of 4 bytes each.
    for extension in (".gz", ".xz"):
        path = tmp_path / f"a.txt{extension}"
        path.write_bytes(PACKERS[extension](b"one ") + bytes(8) + PACKERS[extension](b"two") + bytes(4))
        assert read_texts(path) == ["one two"]


def test_zstd_skippable_frames_are_skipped(tmp_path: Path) -> None:
    # RFC 8878, 3.1.2.
    skippable = b"\x53\x2a\x4d\x18" + (4).to_bytes(4, "little") + b"note"
    path = tmp_path / "a.txt.zst"
    path.write_bytes(skippable + PACKERS[".zst"](b"one ") + skippable + PACKERS[".zst"](b"two"))
    assert read_texts(path) == ["one two"]


@pytest.mark.parametrize("extension", PACKED)
def test_cut_off_anywhere_is_an_error_that_names_the_file(tmp_path: Path, extension: str) -> None:
    whole = PACKERS[extension](prose(2, 400).encode())
    path = tmp_path / f"cut.txt{extension}"
    for length in range(1, len(whole), 3):
        path.write_bytes(whole[:length])
        with pytest.raises(DataError, match=r"cut\.txt\.\w+: .*(cut off before their end|holds something else)"):
            read_texts(path)


@pytest.mark.parametrize("extension", [".gz", ".bz2", ".xz"])
def test_damage_is_an_error(tmp_path: Path, extension: str) -> None:
    """These three formats carry a checksum by default; the zstd library writes none."""
    whole = bytearray(PACKERS[extension](prose(3, 2000).encode()))
    whole[len(whole) // 2] ^= 0x55
    path = tmp_path / f"bad.txt{extension}"
    path.write_bytes(whole)
    with pytest.raises(DataError, match=r"bad\.txt\.\w+: \w+ data damaged \(.*\): get the file again, or unpack it"):
        read_texts(path)


def test_damaged_zstd_with_a_checksum_is_an_error(tmp_path: Path) -> None:
    whole = bytearray(zstandard.ZstdCompressor(write_checksum=True).compress(prose(3, 2000).encode()))
    whole[len(whole) // 2] ^= 0x55
    path = tmp_path / "bad.txt.zst"
    path.write_bytes(whole)
    with pytest.raises(DataError, match=r"bad\.txt\.zst: zstd data damaged"):
        read_texts(path)


@pytest.mark.parametrize("extension", PACKED)
def test_something_else_after_the_data_is_an_error(tmp_path: Path, extension: str) -> None:
    path = tmp_path / f"a.txt{extension}"
    path.write_bytes(PACKERS[extension](b"text") + b"and then a note")
    with pytest.raises(DataError, match=r"followed by something else"):
        read_texts(path)


def test_a_name_that_promises_what_is_not_there(tmp_path: Path) -> None:
    path = tmp_path / "a.txt.gz"
    path.write_text("just text")
    with pytest.raises(DataError, match=r"a\.txt\.gz: the name says gzip, but the file holds something else: pack it"):
        read_texts(path)
    path.write_text("")
    (tmp_path / "b.txt").write_text("text")
    with pytest.raises(DataError, match=r"a\.txt\.gz: the name says gzip, but the file is empty: pack it again"):
        read_texts(tmp_path)


def test_packed_twice(tmp_path: Path) -> None:
    path = tmp_path / "a.txt.gz"
    path.write_bytes(gzip.compress(bz2.compress(b"text")))
    with pytest.raises(DataError, match=r"a\.txt\.gz: packed twice: unpack it once"):
        read_texts(path)


def test_a_packed_archive_is_not_text(tmp_path: Path) -> None:
    buffer = io.BytesIO()
    with tarfile.open(fileobj=buffer, mode="w:gz") as archive:
        member = tarfile.TarInfo("../../etc/evil.txt")
        member.size = 4
        archive.addfile(member, io.BytesIO(b"text"))
    path = tmp_path / "a.txt.gz"
    path.write_bytes(buffer.getvalue())
    with pytest.raises(DataError, match=r"a\.txt\.gz: a binary file, not text"):
        read_texts(path)


@pytest.mark.parametrize("extension", PACKED)
def test_more_than_the_limit_is_refused(tmp_path: Path, extension: str) -> None:
    path = tmp_path / f"a.txt{extension}"
    path.write_bytes(PACKERS[extension](b"sea " * 1000))
    assert read_texts(path, ReadSettings(max_unpacked=4000)) == ["sea " * 1000]
    with pytest.raises(DataError, match=r"more than the 3,999 bytes allowed for one unpacked file"):
        read_texts(path, ReadSettings(max_unpacked=3999))


def _bomb(extension: str, size: int) -> bytes:
    block = b"a" * 2**20
    if extension == ".gz":
        engine = zlib.compressobj(9, wbits=31)
        return b"".join(engine.compress(block) for _ in range(size // len(block))) + engine.flush()
    if extension == ".xz":
        return lzma.compress(block * (size // len(block)), preset=0)
    return PACKERS[extension](block * (size // len(block)))


@pytest.mark.parametrize("extension", [".gz", ".bz2", ".xz", ".zst"])
def test_bombs_are_refused_in_little_memory(tmp_path: Path, extension: str, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(compression, "RATIO_APPLIES_FROM", 2**22)
    path = tmp_path / f"bomb.txt{extension}"
    path.write_bytes(_bomb(extension, 2**25))
    tracemalloc.start()
    try:
        with pytest.raises(DataError, match=r"bomb\.txt\.\w+: .*more than 250 times their size, as a decompression"):
            count_characters(path)
        peak = tracemalloc.get_traced_memory()[1]
    finally:
        tracemalloc.stop()
    assert peak < 2**24


def test_the_ratio_of_ordinary_repetition_is_allowed(tmp_path: Path) -> None:
    """Small files may repeat themselves as they like."""
    path = tmp_path / "a.txt.bz2"
    path.write_bytes(bz2.compress(b"a" * 2**22))
    assert compression.RATIO_APPLIES_FROM > 2**22
    assert read_texts(path) == ["a" * 2**22]


def test_an_xz_file_that_asks_for_absurd_memory(tmp_path: Path) -> None:
    # The size of the dictionary stands in the block header whatever was needed: 2^30 is written over a small one.
    whole = bytearray(lzma.compress(b"text", preset=0))
    at = whole.index(bytes((lzma.FILTER_LZMA2, 1)), 12) + 2
    whole[at] = 36  # bits 0-5: 2^(36/2+12) = 2^30 bytes (xz format, 5.3.1)
    header = 12
    size = (whole[header] + 1) * 4
    whole[header + size - 4 : header + size] = zlib.crc32(whole[header : header + size - 4]).to_bytes(4, "little")
    path = tmp_path / "a.txt.xz"
    path.write_bytes(whole)
    with pytest.raises(DataError, match=r"a\.txt\.xz: xz data damaged \(Memory usage limit exceeded\)"):
        read_texts(path)


def test_a_zstd_window_that_is_absurd(tmp_path: Path) -> None:
    # RFC 8878, 3.1.1.1.2: exponent 20 gives a window of 2^30 bytes; single segment and content size flags off.
    path = tmp_path / "a.txt.zst"
    path.write_bytes(b"\x28\xb5\x2f\xfd" + bytes((0, 20 << 3)) + b"\x01\x00\x00")
    with pytest.raises(DataError, match=r"a\.txt\.zst: zstd data damaged \(.*too much memory"):
        read_texts(path)


def test_names() -> None:
    assert compression.without_packing("a.txt.GZ") == "a.txt"
    assert compression.without_packing("a.gz.txt") == "a.gz.txt"
    assert [compression.packing_by_name(f"a.txt{extension}").name for extension in PACKED] == [  # type: ignore[union-attr]
        "gzip",
        "bzip2",
        "xz",
        "zstd",
    ]
