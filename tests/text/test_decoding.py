"""Encodings: against Python's decoding of the whole, the Unicode Standard's replacements, a detector's real work."""

from __future__ import annotations

import encodings.aliases
import itertools
import random
from collections.abc import Callable
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from colloc.errors import DataError, UsageError
from colloc.settings import ReadSettings
from colloc.text.decoding import PIECE, Decoder, UndecodableError, checked_encoding

from .samples import HOSTILE, prose, read_documents, read_texts

WIDE = ["utf-8", "utf-16-le", "utf-16-be", "utf-32-le", "utf-32-be", "gb18030"]
NARROW = {
    "shift_jis": "灯台の港と風。\n",
    "euc-jp": "灯台の港と風。\n",
    "iso2022-jp": "灯台 and 港\n",
    "big5": "燈塔與港口。\n",
    "euc-kr": "등대와 항구.\n",
    "cp1252": "größe “quoted” — naïve\n",
    "koi8-r": "маяк и гавань\n",
    "cp037": "a mainframe's harbour\n",
}


def chunks_of(data: bytes, cuts: list[int]) -> list[bytes]:
    places = sorted({0, len(data), *(cut % (len(data) + 1) for cut in cuts)})
    return [data[start:stop] for start, stop in itertools.pairwise(places)]


@given(st.text(), st.sampled_from(WIDE), st.lists(st.integers(0, 10_000), max_size=30))
def test_pieces_joined_are_the_whole_wherever_it_is_cut(text: str, codec: str, cuts: list[int]) -> None:
    data = text.encode(codec)
    assert "".join(Decoder(codec, "strict").decode(iter(chunks_of(data, cuts)))) == text


@pytest.mark.parametrize("codec", NARROW)
@pytest.mark.parametrize("size", [1, 2, 3, 5, 7])
def test_every_chunk_size_for_other_encodings(codec: str, size: int) -> None:
    text = NARROW[codec] * 20
    data = text.encode(codec)
    chunks = (data[start : start + size] for start in range(0, len(data), size))
    assert "".join(Decoder(codec, "strict").decode(chunks)) == text


@given(st.binary(max_size=60), st.sampled_from([*WIDE, *NARROW]), st.lists(st.integers(0, 60), max_size=8))
def test_the_offset_is_that_of_decoding_the_whole(data: bytes, codec: str, cuts: list[int]) -> None:
    def outcome(decode: Callable[[], str]) -> str | int:
        try:
            return decode()
        except UnicodeDecodeError as error:
            return error.start
        except UndecodableError as error:
            return error.offset

    chunks = iter(chunks_of(data, cuts))
    assert outcome(lambda: "".join(Decoder(codec, "strict").decode(chunks))) == outcome(lambda: data.decode(codec))


@given(st.binary(max_size=60), st.sampled_from(WIDE), st.lists(st.integers(0, 60), max_size=8))
def test_replacing_gives_what_python_gives(data: bytes, codec: str, cuts: list[int]) -> None:
    decoder = Decoder(codec, "replace")
    text = "".join(decoder.decode(iter(chunks_of(data, cuts))))
    assert text == data.decode(codec, "replace")
    if codec == "utf-8":
        assert decoder.replaced == len(data) - len(data.decode(codec, "ignore").encode(codec))


def test_replaced_bytes_are_counted() -> None:
    # The Unicode Standard, section 3.9, table 3-11 (maximal subparts): six replacements that stand for nine bytes.
    data = bytes.fromhex("61 F1 80 80 E1 80 C2 62 80 63 80 BF 64")
    decoder = Decoder("utf-8", "replace")
    assert "".join(decoder.decode(iter([data]))) == "a\ufffd\ufffd\ufffdb\ufffdc\ufffd\ufffdd"
    assert decoder.replaced == 9


def text_codecs() -> list[str]:
    names = set()
    for name in encodings.aliases.aliases.values():
        try:
            names.add(checked_encoding(name))
        except UsageError:
            continue
    return sorted(names)


@pytest.mark.parametrize("codec", text_codecs())
def test_every_codec_gives_text_that_utf8_can_hold(codec: str) -> None:
    """No codec that is let in makes halves of surrogate pairs, or more code points than a piece may have."""
    chance = random.Random(codec)
    seen = 0
    for _ in range(200):
        data = chance.randbytes(64) if chance.random() < 0.5 else bytes(chance.choices(range(0x20, 0x100), k=64))
        if codec in ("utf-16", "utf-32"):
            continue  # never decoded under these names: the byte order is chosen first
        text = "".join(Decoder(codec, "replace").decode(iter([data])))
        text.encode()
        assert len(text) <= len(data)
        seen += len(text)
    assert seen or codec in ("utf-16", "utf-32")


@pytest.mark.parametrize("name", ["nonsense", "base64", "rot13", "hex", "idna", "utf-7", "unicode_escape", "", "a\0b"])
def test_what_is_no_encoding_of_text(tmp_path: Path, name: str) -> None:
    path = tmp_path / "a.txt"
    path.write_text("text")
    with pytest.raises(UsageError, match=r"is not an encoding of text: give one such as utf-8, .* or 'detect'"):
        read_texts(path, ReadSettings(encoding=name))


MARKED = [("utf-8-sig", "utf-8"), ("utf-16", "utf-16"), ("utf-32", "utf-32")]


@pytest.mark.parametrize("text", [text for text in HOSTILE if not text.startswith("\ufeff")])
@pytest.mark.parametrize(("written", "named"), MARKED)
def test_a_byte_order_mark_decides(tmp_path: Path, text: str, written: str, named: str) -> None:
    path = tmp_path / "a.txt"
    path.write_bytes(text.encode(written))
    for encoding in ("utf-8", "detect", named):
        assert read_texts(path, ReadSettings(encoding=encoding)) == [text]


@pytest.mark.parametrize("codec", ["utf-16-le", "utf-16-be", "utf-32-le", "utf-32-be"])
def test_a_mark_before_a_named_byte_order_is_taken_off(tmp_path: Path, codec: str) -> None:
    path = tmp_path / "a.txt"
    path.write_bytes("\ufefflighthouse \ufeff".encode(codec))
    for encoding in (codec, "utf-8", codec[:6]):
        assert read_texts(path, ReadSettings(encoding=encoding)) == ["lighthouse \ufeff"]
    path.write_bytes("lighthouse".encode(codec))
    assert read_texts(path, ReadSettings(encoding=codec)) == ["lighthouse"]


def test_utf16_without_mark_and_order(tmp_path: Path) -> None:
    path = tmp_path / "a.txt"
    path.write_bytes("lighthouse".encode("utf-16-le"))
    with pytest.raises(DataError, match=r"a\.txt: no byte order mark: name utf-16-le or utf-16-be as its encoding"):
        read_texts(path, ReadSettings(encoding="utf-16"))
    with pytest.raises(DataError, match=r"a\.txt: a binary file, not text \(zero byte at 1\): leave it out, or name"):
        read_texts(path)


def test_undecodable_bytes_name_file_offset_and_remedy(tmp_path: Path) -> None:
    path = tmp_path / "a.txt"
    path.write_bytes("é".encode() * 100_000 + b"\xe9 cole")
    with pytest.raises(DataError) as raised:
        read_texts(path)
    assert str(raised.value) == (
        f"{path}: byte 200000 (0xe9) is not utf-8: name the file's encoding (or 'detect'), or choose errors 'replace'"
    )
    assert raised.value.exit_code == 65


def test_the_offset_counts_the_mark(tmp_path: Path) -> None:
    path = tmp_path / "a.txt"
    path.write_bytes(b"\xef\xbb\xbfab\xff")
    with pytest.raises(DataError, match=r"byte 5 \(0xff\) is not utf-8"):
        read_texts(path)


def test_an_incomplete_character_at_the_end(tmp_path: Path) -> None:
    path = tmp_path / "a.txt"
    path.write_bytes("ab漢".encode()[:-1])
    with pytest.raises(DataError, match=r"byte 2 \(0xe6bc\) is not utf-8"):
        read_texts(path)
    assert read_texts(path, ReadSettings(errors="replace")) == ["ab\ufffd"]


def test_replacing_is_counted_by_the_source(tmp_path: Path) -> None:
    from colloc.text.sources import open_sources

    path = tmp_path / "a.txt"
    path.write_bytes(b"ab\xff\xfe cd \xc3(")
    (source,) = open_sources([str(path)], ReadSettings(errors="replace"))
    assert source.replaced == 0
    assert ["".join(document.pieces) for document in source.documents()] == ["ab\ufffd\ufffd cd \ufffd("]
    assert source.replaced == 3


def test_millions_of_bad_bytes_are_replaced_in_linear_time(tmp_path: Path) -> None:
    path = tmp_path / "a.txt"
    path.write_bytes(b"\xff" * 500_000)
    assert read_texts(path, ReadSettings(errors="replace")) == ["\ufffd" * 500_000]


DETECTED = {
    "cp1252": "Der Leuchtturmwärter schrieb über die Größe der Wellen, und für Gäste öffnete er früh die Tür. ",
    "cp1251": "Смотритель маяка записал в журнал, что ветер усилился и паром опоздал на два часа. ",
    "shift_jis": (
        "きょうは朝から霧が深く、船はみな港にとどまっています。灯台の光は遠くまで届かないので、"
        "わたしたちは鐘を鳴らしました。夕方になってようやく晴れ、さいごの船が出ていきました。"
    ),
    "utf-8": "Der Leuchtturmwärter schrieb über die Größe der Wellen. 灯台守 ",
}


WESTERN = {
    "fr": "J'ai été à l'école où les élèves étaient déjà là. ",
    "es": "El niño llegó mañana al faro con el capitán. ",
    "pt": "O faroleiro não viu o navio, mas ouviu o sino da estação à noite. São três irmãos. ",
    "sv": "Fyrvaktaren såg båten på väg över sjön när dimman lättade för en stund. ",
}
EASTERN = {
    "cs": ("cp1250", "Příliš žluťoučký kůň úpěl ďábelské ódy. Řekl že přijde později, když bude mít čas. "),
    "pl": ("cp1250", "Zażółć gęślą jaźń. Późną nocą łódź wróciła do portu, ponieważ wiatr był mocny. "),
    "el": ("cp1253", "Ο φαροφύλακας έγραψε ότι ο άνεμος ήταν δυνατός και το πλοίο άργησε. "),
}


@pytest.mark.parametrize("text", WESTERN.values(), ids=WESTERN)
def test_western_text_is_not_taken_for_another_region(tmp_path: Path, text: str) -> None:
    path = tmp_path / "a.txt"
    path.write_bytes((text * 40).encode("latin-1"))
    assert read_texts(path, ReadSettings(encoding="detect")) == [text * 40]


@pytest.mark.parametrize(("codec", "text"), EASTERN.values(), ids=EASTERN)
def test_nor_another_region_for_western_text(tmp_path: Path, codec: str, text: str) -> None:
    path = tmp_path / "a.txt"
    path.write_bytes((text * 40).encode(codec))
    assert read_texts(path, ReadSettings(encoding="detect")) == [text * 40]


@pytest.mark.parametrize("codec", DETECTED)
def test_detecting(tmp_path: Path, codec: str) -> None:
    text = (DETECTED[codec] * 3 + "\n") * 40
    path = tmp_path / "a.txt"
    path.write_bytes(text.encode(codec))
    assert read_texts(path, ReadSettings(encoding="detect")) == [text]


def test_detecting_looks_at_the_beginning_only_and_says_where_it_was_wrong(tmp_path: Path) -> None:
    path = tmp_path / "a.txt"
    path.write_bytes(b"harbour " * 20_000 + "Größe".encode("cp1252"))
    with pytest.raises(DataError, match=r"byte 160002 \(0xf6\) is not utf-8"):
        read_texts(path, ReadSettings(encoding="detect"))


def test_nothing_detected(tmp_path: Path) -> None:
    path = tmp_path / "a.txt"
    path.write_bytes(bytes(random.Random(5).choices([*range(1, 9), *range(0x80, 0xA0)], k=3000)))
    with pytest.raises(DataError, match=r"a\.txt: its encoding could not be detected: name it"):
        read_texts(path, ReadSettings(encoding="detect"))


@pytest.mark.parametrize(
    ("head", "kind"),
    [
        (b"%PDF-1.7\n", "a PDF file"),
        (b"PK\x03\x04", "a ZIP archive or office document"),
        (b"\x89PNG\r\n\x1a\n", "a PNG picture"),
        (b"SQLite format 3\0", "an SQLite database"),
        (b"\x7fELF", "a program"),
        (b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1", "an office document"),
    ],
)
def test_binary_files_are_named(tmp_path: Path, head: bytes, kind: str) -> None:
    path = tmp_path / "a.txt"
    path.write_bytes(head + bytes(100))
    with pytest.raises(DataError, match=rf"a\.txt: {kind}, not text: convert it to text first"):
        read_texts(path)


def test_a_zero_character_far_from_the_start_stays(tmp_path: Path) -> None:
    text = "sea " * 20_000 + "\0 end"
    path = tmp_path / "a.txt"
    path.write_text(text)
    assert read_texts(path) == [text]


def test_pieces_are_bounded_and_text_is_kept(tmp_path: Path) -> None:
    text = prose(4, 3 * PIECE)
    path = tmp_path / "a.txt"
    path.write_bytes(text.encode())
    (document,) = read_documents(path)
    assert "".join(document.pieces) == text
    assert max(map(len, document.pieces)) <= PIECE
