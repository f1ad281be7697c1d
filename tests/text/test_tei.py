"""TEI P5: body text, marked words, metadata by XPath, and hostile XML.

The samples are invented; element names and attributes are those of the TEI P5
Guidelines (chapters 3, 5 and 17).
"""

from __future__ import annotations

import time
from pathlib import Path

import pytest

from colloc.errors import DataError, UsageError
from colloc.settings import ReadSettings

from .samples import read_documents, read_texts

HEADER = (
    "<teiHeader><fileDesc><titleStmt><title>The Log</title><author>A</author><author>B</author></titleStmt>"
    "<publicationStmt><date when='1890'/></publicationStmt></fileDesc></teiHeader>"
)


def tei(folder: Path, body: str, header: str = HEADER, name: str = "log.xml") -> Path:
    path = folder / name
    path.write_text(
        f'<TEI xmlns="http://www.tei-c.org/ns/1.0">{header}<text><front><p>Front.</p></front><body>{body}</body></text>'
        "</TEI>",
        encoding="utf-8",
    )
    return path


@pytest.mark.parametrize(
    ("body", "text"),
    [
        ("<div><head>One</head><p>Strong <hi>tea</hi>.</p><p>Next</p></div>", "One\n\nStrong tea.\n\nNext"),
        ("<p>a<note>A note.</note> b</p><p>c</p>", "a b\n\nA note.\n\nc"),
        ("<p>fresh <choice><sic>bred</sic><corr>bread</corr></choice></p>", "fresh bread"),
        ("<p>a <sic>bred</sic> man</p>", "a bred man"),
        ("<p>re<lb break='no'/>turned<lb/>home</p>", "returned home"),
        (
            "<p>one<pb n='2'/>word <fw>12</fw>and <del>not</del> <app><lem>this</lem><rdg>that</rdg></app></p>",
            "oneword and this",
        ),
        ("<lg><l>Line one</l><l>line two</l></lg><lg><l>three</l></lg>", "Line one line two\n\nthree"),
        ("<sp><speaker>Keeper</speaker><p>Who goes?</p></sp>", "Keeper\n\nWho goes?"),
        ("<p><s>One.</s><s>Two.</s></p>", "One. Two."),
        ("<list><item>a</item><item>b</item></list>", "a\n\nb"),
        ("<p>a &amp; b &#233; <![CDATA[<c>]]></p>", "a & b é <c>"),
    ],
)
def test_text_of_a_body(tmp_path: Path, body: str, text: str) -> None:
    (document,) = read_documents(tei(tmp_path, body))
    assert "".join(document.pieces) == text
    assert document.annotation is None


def test_marked_words(tmp_path: Path) -> None:
    path = tei(
        tmp_path,
        "<p><s><w lemma='ship' pos='NOUN'>Ships</w> <w lemma='sail' pos='VERB'>sai<hi>led</hi></w><pc>.</pc></s> "
        "<s><w>Hello</w> loose words <w part='I' lemma='today'>to</w><w part='F'>day</w> <pc join='left'>!</pc></s></p>"
        "<p><w>End</w></p>",
    )
    (document,) = read_documents(path)
    assert document.annotation is not None
    assert document.annotation.columns == ("form", "lemma", "upos", "misc")
    lines = b"".join(document.sentences).decode().split("\n")
    assert lines == [
        "Ships\tship\tNOUN\t_",
        "sailed\tsail\tVERB\tSpaceAfter=No",
        ".\t_\tPUNCT\t_",
        "",
        "Hello\t_\t_\t_",
        "loose\t_\t_\t_",
        "words\t_\t_\t_",
        "today\ttoday\t_\tSpaceAfter=No",
        "!\t_\tPUNCT\t_",
        "",
        "# newpar",
        "End\t_\t_\t_",
        "",
        "",
    ]


def test_many_marked_words_come_in_whole_sentences(tmp_path: Path) -> None:
    sentence = "<s>" + "".join(f"<w lemma='l{n}'>f{n}</w> " for n in range(20)) + "</s>"
    (document,) = read_documents(tei(tmp_path, f"<p>{sentence * 30}</p>" * 200))
    assert len(document.sentences) > 1  # type: ignore[arg-type]
    assert all(piece.endswith(b"\n\n") for piece in document.sentences)
    lines = [line for line in b"".join(document.sentences).split(b"\n") if line and not line.startswith(b"#")]
    assert len(lines) == 20 * 30 * 200


def test_metadata_by_xpath(tmp_path: Path) -> None:
    paths = ("title=//titleStmt/title", "author=//author", "year=//date/@when", "n=count(//author)", "none=//edition")
    (document,) = read_documents(tei(tmp_path, "<p>x</p>"), ReadSettings(meta_xpath=paths))
    assert dict(document.metadata) == {"title": "The Log", "author": "A; B", "year": 1890, "n": 2}


def test_a_corpus_has_many_documents(tmp_path: Path) -> None:
    path = tmp_path / "corpus.xml"
    documents = "".join(
        f"<TEI xml:id='d{n}'><teiHeader><title>T{n}</title></teiHeader><text><body><p>text {n}</p></body></text></TEI>"
        for n in range(5)
    )
    path.write_text(f"<teiCorpus><teiHeader><title>C</title><date>1900</date></teiHeader>{documents}</teiCorpus>")
    settings = ReadSettings(meta_xpath=("title=//title", "date=//date"))
    found = read_documents(path, settings)
    assert [document.identifier for document in found] == [f"d{n}" for n in range(5)]
    assert dict(found[3].metadata) == {"title": "T3", "date": 1900}
    assert read_documents(path, settings, skip=3) == found[3:]


@pytest.mark.parametrize(("path", "message"), [("year", "is not name=XPath"), ("a=//[", "is not XPath 1.0")])
def test_wrong_paths(tmp_path: Path, path: str, message: str) -> None:
    with pytest.raises(UsageError, match=message):
        read_texts(tei(tmp_path, "<p>x</p>"), ReadSettings(meta_xpath=(path,)))


def test_the_encoding_is_the_declared_one(tmp_path: Path) -> None:
    path = tmp_path / "old.xml"
    path.write_bytes(
        "<?xml version='1.0' encoding='ISO-8859-1'?><TEI><text><body><p>café</p></body></text></TEI>".encode("latin-1")
    )
    assert read_texts(path) == ["café"]


BODY = "<TEI><text><body><p>{}</p></body></text></TEI>"
LAUGHS = "".join(f'<!ENTITY l{n} "{f"&l{n - 1};" * 10}">' for n in range(1, 12))


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (f'<!DOCTYPE TEI [<!ENTITY l0 "ha">{LAUGHS}]>' + BODY.format("&l11;"), "declares the entity 'l0'"),
        ('<!DOCTYPE TEI [<!ENTITY x SYSTEM "file:///etc/hostname">]>' + BODY.format("&x;"), "declares the entity 'x'"),
        (
            '<!DOCTYPE TEI [<!ENTITY % p SYSTEM "http://localhost:9/p">%p;]>' + BODY.format("a"),
            "declares the entity 'p'",
        ),
        ('<!DOCTYPE TEI SYSTEM "http://localhost:9/tei.dtd">' + BODY.format("a&nbsp;b"), "uses the entity 'nbsp'"),
        (BODY.format("a&nbsp;b"), "uses an entity that XML does not know"),
        ("<TEI><text><body>" + "<p>" * 100_000, "more than 256 elements inside each other"),
        ("<TEI " + " ".join(f'a{n}="b"' for n in range(1_000_000)) + "/>", "one tag, comment or declaration of more"),
        ("<TEI><!--" + "a" * 2_000_000 + "--></TEI>", "one tag, comment or declaration of more"),
        ("<TEI " + 'a="' + "b" * 2_000_000 + '"/>', "one tag, comment or declaration of more"),
        ("<html><p>x</p></html>", "no TEI: its outermost element is 'html'"),
        ("<TEI><text><body><p>x</p>", "cut off"),
        ("<TEI></text>", "mismatched tag"),
        ("plain text", "not XML"),
        ("<TEI><teiHeader>" + "<p>a</p>" * 30_000 + "</teiHeader></TEI>", "a header of more than"),
        (BODY.format("<w>a</w>" * 100_000), "a sentence or note of more than"),
    ],
    ids=range(15),
)
def test_hostile_xml_is_refused(tmp_path: Path, content: str, message: str) -> None:
    path = tmp_path / "hostile.xml"
    path.write_text(content)
    start = time.process_time()
    with pytest.raises(DataError, match=rf"hostile\.xml:\d+: .*{message}"):
        read_texts(path, ReadSettings(max_record=50_000))
    assert time.process_time() - start < 5


def test_a_doctype_alone_is_no_harm(tmp_path: Path) -> None:
    path = tmp_path / "a.xml"
    path.write_text('<!DOCTYPE TEI SYSTEM "http://localhost:9/tei.dtd">' + BODY.format("fine"))
    assert read_texts(path) == ["fine"]
