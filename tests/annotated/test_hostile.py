"""Annotated input that is wrong, by accident or on purpose: one clear line with file and line, in bounded time."""

from __future__ import annotations

import random
import time
import tracemalloc
from pathlib import Path

import pytest

import colloc
from colloc.errors import CollocError, DataError
from colloc.exports.conllu import conllu_text
from colloc.settings import ReadSettings
from colloc.store.opening import open_for_reading
from colloc.store.stream import token_count

from .treebanks import treebank

pytestmark = pytest.mark.usefixtures("loops")


def line(word: object, head: object = 0, form: str = "a", relation: str = "dep") -> str:
    """A word line."""
    return f"{word}\t{form}\t_\tX\t_\t_\t{head}\t{relation}\t_\t_\n"


def build(tmp_path: Path, text: str, name: str = "a.conllu", **read: object) -> Path:
    """A store of one file."""
    (tmp_path / name).write_bytes(text.encode("utf-8", "surrogatepass"))
    settings = ReadSettings(**read)  # type: ignore[arg-type]
    colloc.build(tmp_path / "s", [str(tmp_path / name)], read=settings, jobs=1)
    return tmp_path / "s"


GOOD = "# newdoc id = g\n" + line(1) + line(2, 1) + "\n"
WRONG = {
    "too few columns": (GOOD + "1\ta\tb\n\n", 5, "3 columns where 10 belong"),
    "too many columns": (GOOD + line(1).strip() + "\tx\n\n", 5, "11 columns where 10 belong"),
    "a million columns": (GOOD + "1" + "\t_" * 10**6 + "\n\n", 5, "1,000,001 columns"),
    "spaces for tabs": (GOOD + line(1).replace("\t", "  ") + "\n", 5, "1 column where 10 belong"),
    "a line of spaces": (GOOD + line(1) + "  \n" + line(1) + "\n", 6, "a line of spaces"),
    "identifiers out of order": (GOOD + line(1) + line(3) + "\n", 6, "ID 3 where 2 comes next"),
    "an identifier twice": (GOOD + line(1) + line(1) + "\n", 6, "ID 1 where 2 comes next"),
    "an identifier with a zero": (GOOD + line("01") + "\n", 5, "ID '01'"),
    "an identifier that is none": (GOOD + line("x") + "\n", 5, "ID 'x'"),
    "a head that is none": (GOOD + line(1, "x") + "\n", 5, "HEAD 'x'"),
    "a negative head": (GOOD + line(1, -1) + "\n", 5, "HEAD '-1'"),
    "a head beyond the sentence": (GOOD + line(1, 2) + "\n", 5, "HEAD 2 is no word"),
    "a huge head": (GOOD + line(1, "9" * 400) + "\n", 5, "HEAD '999"),
    "its own head": (GOOD + line(1, 1) + "\n", 5, "its own head"),
    "a circle": (GOOD + line(1) + line(2, 4) + line(3, 2) + line(4, 3) + "\n", 6, "circle"),
    "a range behind its words": (GOOD + line(1) + "1-2\tab" + "\t_" * 8 + "\n" + line(2, 1) + "\n", 6, "range 1-2"),
    "a range beyond the sentence": (GOOD + "1-3\tab" + "\t_" * 8 + "\n" + line(1) + line(2, 1) + "\n", 5, "range 1-3"),
    "ranges that overlap": (
        GOOD + "1-2\tab" + "\t_" * 8 + "\n" + line(1) + "2-3\tbc" + "\t_" * 8 + "\n" + line(2, 1) + line(3, 1) + "\n",
        7,
        "overlaps",
    ),
    "an empty node out of place": (GOOD + line(1) + "3.1\te" + "\t_" * 8 + "\n\n", 6, "empty node 3.1"),
    "an empty form": (GOOD + line(1, form="") + "\n", 5, "FORM is empty"),
    "an empty relation": (GOOD + line(1, relation="") + "\n", 5, "DEPREL is empty"),
    "an empty MISC": (GOOD + line(1)[:-2] + "\n\n", 5, "MISC is empty"),
    "a form of a megabyte": (GOOD + line(1, form="a" * 10**6) + "\n", 5, "1,000,000 characters"),
    "a line that is no column": (GOOD + "hello\n\n", 5, "1 column where 10 belong"),
}


@pytest.mark.parametrize("kind", WRONG)
def test_wrong_lines(tmp_path: Path, kind: str) -> None:
    text, number, message = WRONG[kind]
    with pytest.raises(DataError) as caught:
        build(tmp_path, text)
    assert str(caught.value).startswith(f"{tmp_path / 'a.conllu'}:{number}: ")
    assert message in str(caught.value)
    assert "\n" not in str(caught.value)
    assert len(str(caught.value)) < 500
    assert not (tmp_path / "s").exists()


def test_lines_are_counted_through_long_files(tmp_path: Path) -> None:
    """The error lies in the third document of a later stretch, behind a header that names the columns."""
    header = "# global.columns = ID FORM LEMMA UPOS XPOS FEATS HEAD DEPREL DEPS MISC\n"
    body = "".join(f"# newdoc id = d{n}\n" + (line(1) + line(2, 1) + "\n") * 2000 for n in range(5))
    text = header + body + line(1, 5) + "\n"
    with pytest.raises(DataError, match=rf"a\.conllu:{text.count(chr(10)) - 1}: HEAD 5"):
        build(tmp_path, text)


@pytest.mark.parametrize(
    ("name", "text", "message"),
    [
        ("a.conllu", "# global.columns = ID LEMMA\n", "no column 'form'"),
        ("a.conllu", "# global.columns = ID FORM FORM\n", "occurs 2 times"),
        ("a.tokens", "form\tlemma\tform\n", "occurs 2 times"),
        ("a.tokens", "form\t\tlemma\n", "no name"),
        ("a.tokens", "word\tlemma\n", "no column 'form'"),
        ("a.tokens", "form" + "\tx" * 10**6 + "\n", "more than 64 columns"),
        ("a.tokens", "form\tlemma\nsea\tsea\nfog\n\n", "a.tokens:3: 1 column where 2 belong"),
        ("a.tokens", "form\tlemma\nsea\t\n\n", "LEMMA is empty"),
    ],
)
def test_wrong_headers(tmp_path: Path, name: str, text: str, message: str) -> None:
    with pytest.raises(DataError, match=message):
        build(tmp_path, text, name)


def test_sentences_without_end(tmp_path: Path) -> None:
    with pytest.raises(DataError, match=r"a\.conllu:1: a record of more than"):
        build(tmp_path, "".join(line(n, n - 1) for n in range(1, 5000)), max_record=2**15)


def test_deep_and_long_sentences(tmp_path: Path) -> None:
    """A chain of 50,000 words is a tree; closed to a circle it is refused as fast."""
    chain = "".join(line(n, n - 1) for n in range(1, 50_001)) + "\n"
    began = time.process_time()
    with open_for_reading(build(tmp_path, chain)) as store:
        assert token_count(store) == 50_000
        assert "".join(conllu_text(store)) == chain
    other = tmp_path / "other"
    other.mkdir()
    with pytest.raises(DataError, match="circle"):
        build(other, line(1, 50_000) + chain.partition("\n")[2])
    assert time.process_time() - began < 60  # measured 1 s


def test_memory_stays_bounded(tmp_path: Path) -> None:
    """Reading does not hold the file: twenty times the text takes hardly more memory."""
    peaks = []
    for times in (4, 80):
        folder = tmp_path / str(times)
        folder.mkdir()
        (folder / "a.conllu").write_text("".join(GOOD.replace("= g", f"= {n}") for n in range(times * 500)))
        tracemalloc.start()
        documents = next(iter(colloc_sources(folder / "a.conllu"))).documents()
        for document in documents:
            for _ in document.sentences:
                pass
        peaks.append(tracemalloc.get_traced_memory()[1])
        tracemalloc.stop()
    assert peaks[1] < 3 * max(peaks[0], 2**20)


def colloc_sources(path: Path):  # type: ignore[no-untyped-def]
    """The sources of one file."""
    from colloc.text.sources import open_sources

    return open_sources([str(path)], ReadSettings())


def built_or_refused(tmp_path: Path, text: str) -> Path | None:
    """The store, or None where the text was refused with one clear line."""
    try:
        return build(tmp_path, text)
    except CollocError as error:
        message = str(error)
        if not message.isprintable() or not ("a.conllu" in message or "surrogate" in message):
            raise AssertionError(f"not one clear line that names a.conllu: {message!r}") from error
        return None


@pytest.mark.parametrize("seed", range(30))
def test_mutated_treebanks_are_read_or_refused(tmp_path: Path, seed: int) -> None:
    chance = random.Random(seed)
    text = treebank(seed, documents=2, sentences=4)
    for _ in range(chance.randint(1, 4)):
        place = chance.randrange(len(text))
        new = chance.choice(["", "\t", "\n", "\n\n", "\r", "_", "0", "9", "#", "\0", "1-2", "\u2028", "\ud800", "|"])
        text = text[:place] + new + text[place + chance.randint(0, 2) :]
    path = built_or_refused(tmp_path, text)
    if path is None:
        return
    with open_for_reading(path) as store:
        written = "".join(conllu_text(store))
    # blank lines are the format's own
    wanted = [part for part in text.replace("\r\n", "\n").split("\n") if part]
    assert [part for part in written.split("\n") if part] == wanted
