"""HTML: what is text and what is not; expectations follow the HTML Living Standard where a rule is named."""

from __future__ import annotations

import time
from html.parser import HTMLParser
from pathlib import Path

import pytest

from colloc.errors import DataError
from colloc.settings import ReadSettings

from .samples import prose, read_documents, read_texts


def page(folder: Path, content: str | bytes, name: str = "page.html") -> Path:
    path = folder / name
    path.write_bytes(content if isinstance(content, bytes) else content.encode())
    return path


@pytest.mark.parametrize(
    ("content", "text"),
    [
        ("<p>Strong   tea\n and <b>fresh</b> bread.</p><p>Next</p>", "Strong tea and fresh bread.\n\nNext"),
        ("<p>har<i>bour</i>s", "harbours"),
        ("<ul><li>one<li>two</ul>after", "one\n\ntwo\n\nafter"),
        ("<table><tr><td>a<td>b</table>", "a\n\nb"),
        ("a<br>b", "a b"),
        ("a<br> <br/>b", "a\n\nb"),
        ("<pre>a  b\n  c</pre>", "a  b\n  c"),
        ("x<script>if (a<b) y('</p>')</script><style>p{}</style>z", "x z"),
        ("<p>a<span hidden>secret <b>x</b></span>b<template><p>t</p></template></p>", "a b"),
        ("<ruby>灯台<rp>(</rp><rt>とうだい</rt><rp>)</rp></ruby>へ", "灯台へ"),
        ("exam&shy;ple &amp; &eacute;&#x1F600;&nbsp;x", "example & é😀\u00a0x"),
        ("<p>1 < 2 & 3 > 2", "1 < 2 & 3 > 2"),
        ("<button>press</button><select><option>a</select>text", "text"),
        ("<!-- <p>comment</p> -->seen", "seen"),
        ("<p title='a > b'>quoted</p>", "quoted"),
        ("</p></div>stray<div>open", "stray\n\nopen"),
        ("", ""),
    ],
)
def test_text_of_a_page(tmp_path: Path, content: str, text: str) -> None:
    assert read_texts(page(tmp_path, f"<!DOCTYPE html><body>{content}")) == [text]


def test_metadata_of_the_head(tmp_path: Path) -> None:
    path = page(
        tmp_path,
        "<html lang=cy><head><title>The \n harbour</title><meta name=author content='A. Keeper'><meta name=viewport "
        "content=x></head><body><p>Text<svg><title>no</title></svg></body></html>",
    )
    (document,) = read_documents(path)
    assert dict(document.metadata) == {"lang": "cy", "title": "The harbour", "author": "A. Keeper"}
    assert document.identifier == "page.html"
    assert read_documents(path, skip=1) == []


@pytest.mark.parametrize(
    ("content", "text"),
    [
        # Encoding Standard: the label iso-8859-1 means windows-1252
        ("<meta charset=iso-8859-1><p>caf\xe9 \x93x\x94".encode("latin-1"), "café “x”"),
        ('<meta http-equiv="Content-Type" content="text/html; charset=koi8-r"><p>чай'.encode("koi8-r"), "чай"),
        ('<?xml version="1.0" encoding="iso-8859-15"?><html><p>\u20ac</p></html>'.encode("iso-8859-15"), "\u20ac"),
        ("\ufeff<meta charset=windows-1251><p>é".encode(), "é"),
        ("<meta charset=utf-16><p>é".encode(), "é"),
    ],
)
def test_declared_encodings(tmp_path: Path, content: bytes, text: str) -> None:
    assert read_texts(page(tmp_path, content)) == [text]


def test_the_settings_go_before_the_declaration(tmp_path: Path) -> None:
    path = page(tmp_path, "<meta charset=koi8-r><p>чай".encode("cp1251"))
    assert read_texts(path, ReadSettings(encoding="cp1251")) == ["чай"]


def test_an_unknown_declaration_is_said(tmp_path: Path) -> None:
    with pytest.raises(DataError, match=r"page\.html: it declares the encoding 'x-none', which is unknown"):
        read_texts(page(tmp_path, "<meta charset=x-none><p>a"))


def test_xhtml_elements_without_end_tags(tmp_path: Path) -> None:
    head = '<?xml version="1.0"?><html xmlns="http://www.w3.org/1999/xhtml"><head><title/><script src="a"/></head>'
    # A tag that a piece of 1 Mi characters cuts in two.
    filler = "word " * 209_690
    for shift in range(12):
        text = "x" * shift + filler + '<a id="y"/><p>end</p>'
        (found,) = read_texts(page(tmp_path, f"{head}<body><p>{text}</p></body></html>"))
        assert found.endswith("word\n\nend"), shift


def test_against_a_tree_free_oracle(tmp_path: Path) -> None:
    """Characters other than white space: as the standard library's parser gives them, outside of scripts."""

    class Oracle(HTMLParser):
        kept = ""
        inside = False

        def handle_starttag(self, tag: str, attrs: object) -> None:
            self.inside |= tag == "script"

        def handle_endtag(self, tag: str) -> None:
            self.inside &= tag != "script"

        def handle_data(self, data: str) -> None:
            if not self.inside:
                self.kept += data

    content = "".join(
        f"<div class='c{n}'><p>{prose(n, 900)}</p><script>var x = '<p>{n}';</script><em>{n} &lt; é</em></div>"
        for n in range(300)
    )
    oracle = Oracle()
    oracle.feed(content)
    (found,) = read_texts(page(tmp_path, content))
    assert "".join(found.split()) == "".join(oracle.kept.split())
    assert len(found) > 250_000


@pytest.mark.parametrize(
    "content",
    [
        "<div>" * 200_000 + "deep",
        "<a " + "b=c " * 300_000 + ">deep</a>",
        "<p>" * 200_000 + "deep",
        "<b><i>" * 50_000 + "deep",
        "&" * 1_000_000 + "deep",
        "<" * 1_000_000 + " deep",
        "<table>" * 20_000 + "deep",
        "<!--" + "a" * 3_000_000 + "-->deep",
        "<p title='" + "a" * 3_000_000 + "'>deep",
    ],
    ids=range(9),
)
def test_hostile_pages_end_soon(tmp_path: Path, content: str) -> None:
    path = page(tmp_path, content)
    start = time.process_time()
    (found,) = read_texts(path)
    assert found.endswith("deep")
    assert time.process_time() - start < 5


def test_limit_on_the_whole(tmp_path: Path) -> None:
    with pytest.raises(DataError, match=r"page\.html: more than the 2,000 characters allowed"):
        read_texts(page(tmp_path, "word " * 1000), ReadSettings(max_unpacked=2000))
