"""EPUB: pages in the order of reading, and archives that lie."""

from __future__ import annotations

import io
import os
import warnings
import zipfile
from collections.abc import Sequence
from pathlib import Path

import pytest

from colloc.errors import DataError
from colloc.settings import ReadSettings
from colloc.text.markup import archive

from .samples import read_documents, read_texts

CONTAINER = (
    '<container xmlns="urn:oasis:names:tc:opendocument:xmlns:container"><rootfiles>'
    '<rootfile full-path="OEBPS/book.opf"/></rootfiles></container>'
)
PAGE = '<?xml version="1.0"?><html xmlns="http://www.w3.org/1999/xhtml"><head><title/></head><body>{}</body></html>'


def package(hrefs: Sequence[str]) -> str:
    items = "".join(
        f'<item id="p{n}" href="{href}" media-type="application/xhtml+xml"/>' for n, href in enumerate(hrefs)
    )
    spine = "".join(f'<itemref idref="p{n}"/>' for n in reversed(range(len(hrefs))))
    return (
        '<package xmlns="http://www.idpf.org/2007/opf" xmlns:dc="http://purl.org/dc/elements/1.1/"><metadata>'
        "<dc:title>The Log</dc:title><dc:creator>A. Keeper</dc:creator><dc:language>en</dc:language></metadata>"
        '<manifest><item id="nav" href="nav.xhtml" media-type="application/xhtml+xml" properties="nav"/>'
        f'<item id="pic" href="a.png" media-type="image/png"/>{items}</manifest>'
        f'<spine><itemref idref="nav"/><itemref idref="pic"/>{spine}</spine></package>'
    )


def book(path: Path, pages: Sequence[tuple[str, str]], **more: str) -> Path:
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as made:
        made.writestr("mimetype", "application/epub+zip")
        made.writestr("META-INF/container.xml", CONTAINER)
        made.writestr("OEBPS/book.opf", package([href for href, _ in pages]))
        made.writestr("OEBPS/nav.xhtml", "<p>contents</p>")
        for href, content in pages:
            made.writestr(f"OEBPS/{href}", content)
        for name, content in more.items():
            made.writestr(name.replace("__", "/").replace("_xml", ".xml"), content)
    return path


def test_pages_in_the_order_of_the_spine(tmp_path: Path) -> None:
    path = book(
        tmp_path / "log.epub",
        [
            ("two.xhtml", PAGE.format("<p>Second.</p>")),
            ("one x.xhtml", PAGE.format("<p>First&nbsp;<a id='x'/>page.</p>")),
        ],
    )
    (document,) = read_documents(path)
    assert "".join(document.pieces).split("\n\n") == ["First\u00a0page.", "Second.", ""]
    assert dict(document.metadata) == {"title": "The Log", "author": "A. Keeper", "lang": "en"}
    assert document.identifier == "log.epub"


def test_nothing_is_written_and_no_name_leads_out(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    folder = tmp_path / "deep" / "deeper"
    folder.mkdir(parents=True)
    monkeypatch.chdir(folder)
    path = book(folder / "bad.epub", [("../../../secret.xhtml", "<p>x</p>")])
    (tmp_path / "secret.xhtml").write_text("<p>secret</p>")
    before = sorted(os.walk(tmp_path))
    # Inside the archive the name leads above its root: no member is called so.
    with pytest.raises(DataError, match=r"bad\.epub: \.\./\.\./secret\.xhtml: not in the archive"):
        read_texts(path)
    assert sorted(os.walk(tmp_path)) == before


def test_bombs_are_refused_early(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(archive, "RATIO_APPLIES_FROM", 2**22)
    path = book(tmp_path / "bomb.epub", [("one.xhtml", "<p>" + "sea " * 5_000_000)])
    assert path.stat().st_size < 50_000
    with pytest.raises(DataError, match=r"bomb\.epub: OEBPS/one\.xhtml: unpacks to more than 250 times its size"):
        read_texts(path)
    with pytest.raises(DataError, match=r"bomb\.epub: more than the 1,000,000 bytes allowed"):
        read_texts(path, ReadSettings(max_unpacked=1_000_000))


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"META-INF__container_xml": ""}, "two files of the same name"),
        ({"META-INF__encryption_xml": '<e><CipherReference URI="OEBPS/one.xhtml"/></e>'}, "encrypted"),
    ],
)
def test_strange_books(tmp_path: Path, change: dict[str, str], message: str) -> None:
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", UserWarning)  # zipfile warns of the second file of one name
        path = book(tmp_path / "odd.epub", [("one.xhtml", "<p>x</p>")], **change)
    with pytest.raises(DataError, match=rf"odd\.epub: .*{message}"):
        read_texts(path)


def test_no_book(tmp_path: Path) -> None:
    path = tmp_path / "no.epub"
    path.write_bytes(b"PK\3\4 nonsense")
    with pytest.raises(DataError, match=r"no\.epub: not a ZIP archive"):
        read_texts(path)
    content = io.BytesIO()
    with zipfile.ZipFile(content, "w") as made:
        made.writestr("a.txt", "x")
    path.write_bytes(content.getvalue())
    with pytest.raises(DataError, match=r"no\.epub: no EPUB"):
        read_texts(path)


def test_entities_in_the_package_are_refused(tmp_path: Path) -> None:
    path = tmp_path / "x.epub"
    with zipfile.ZipFile(path, "w") as made:
        made.writestr("META-INF/container.xml", '<!DOCTYPE c [<!ENTITY a "x">]>' + CONTAINER)
    with pytest.raises(DataError, match=r"x\.epub:1: META-INF/container\.xml: the file declares the entity 'a'"):
        read_texts(path)


def test_damaged_pages(tmp_path: Path) -> None:
    path = book(tmp_path / "cut.epub", [("one.xhtml", "<p>" + "".join(chr(97 + n * 7 % 26) for n in range(5000)))])
    data = bytearray(path.read_bytes())
    at = data.index(b"OEBPS/one.xhtml") + 25
    data[at : at + 8] = b"\xff" * 8
    path.write_bytes(bytes(data))
    with pytest.raises(DataError, match=r"cut\.epub: OEBPS/one\.xhtml: damaged"):
        read_texts(path)
