"""Lines of text against a plain scan of the texts, which knows nothing of stores."""

from __future__ import annotations

import os
import re
import sqlite3
import unicodedata
from contextlib import closing
from importlib import import_module
from pathlib import Path
from tempfile import TemporaryDirectory

import pytest
from hypothesis import HealthCheck, given
from hypothesis import settings as hypothesis_settings
from hypothesis import strategies as st

import colloc
from colloc.errors import DataError, NotSeenError, StoreDamagedError, UsageError
from colloc.store.opening import Store

from .conftest import SCRIPTS, Demo, write_documents

YEARS = "year=1871..1876"
"""A slice, so that a plain scan is quick."""
WORD = re.compile(r"[A-Za-z0-9]+(?:['.][A-Za-z0-9]+|-[A-Za-z0-9]+)*")
"""Words of the demo texts: plain English, so that this is all it takes (checked below against the store's count)."""


def scan(text: str) -> list[list[tuple[str, int]]]:
    """Words (folded) and where they begin, paragraph by paragraph."""
    paragraphs, begin = [], 0
    for line in text.split("\n"):
        paragraphs.append([(match[0].lower(), begin + match.start()) for match in WORD.finditer(line)])
        begin += len(line) + 1
    return paragraphs


def plain_lines(texts: dict[str, str], first: list[str], second: str | None, left: int, right: int) -> set[tuple]:
    """Document, character and distance of every line, found by looking at every word."""
    found = set()
    for name, text in texts.items():
        for words in scan(text):
            for place in range(len(words) - len(first) + 1):
                if not all(re.fullmatch(part, words[place + step][0]) for step, part in enumerate(first)):
                    continue
                if second is None:
                    found.add((name, words[place][1], None))
                    continue
                last = place + len(first) - 1
                near = [(step, step) for step in range(1, right + 1) if words[last + step : last + step + 1]]
                near += [(-step, step) for step in range(1, left + 1) if place >= step]
                near = [
                    (distance, size)
                    for distance, size in near
                    if words[(last if distance > 0 else place) + distance][0] == second
                ]
                if near:
                    distance = min(near, key=lambda entry: (entry[1], -entry[0]))[0]
                    found.add((name, words[place][1], distance))
    return found


def found_lines(answer: colloc.Columns) -> set[tuple]:
    distances = answer["distance"].tolist() if "distance" in answer else [None] * len(answer)
    return set(zip(answer["document"].tolist(), answer["character"].tolist(), distances, strict=True))


def assert_verbatim(answer: colloc.Columns, texts: dict[str, str]) -> None:
    """Every line stands in its document at the offset given, and so does its partner."""
    assert len(answer)
    for row in answer:
        text = texts[row["document"]]
        begin = row["character"] - len(row["before"])
        whole = row["before"] + row["match"] + row["after"]
        assert text[begin : begin + len(whole)] == whole
        if "partner" in row:
            start = row["partner_character"]
            assert text[start : start + len(row["partner"])] == row["partner"]


def early(demo: Demo) -> dict[str, str]:
    """The texts of the slice."""
    return {name: text for name, text in demo.texts.items() if demo.metadata[name]["year"] <= 1876}  # type: ignore[operator]


def test_the_plain_scan_divides_words_as_the_store_does(demo: Demo) -> None:
    for part in colloc.documents(demo.store):
        for row in part:
            assert sum(map(len, scan(demo.texts[row["document"]]))) == row["tokens"]


@pytest.mark.parametrize(
    ("asked", "parts"),
    [
        ("fog", ["fog"]),
        ("FOG", ["fog"]),
        ("in the teeth of", ["in", "the", "teeth", "of"]),
        ("har*", ["har.*"]),
        ("*ing * the", [".*ing", ".*", "the"]),
        ("o'clock", ["o'clock"]),
    ],
)
def test_words_phrases_and_patterns(demo: Demo, asked: str, parts: list[str]) -> None:
    answer = colloc.lines(demo.store, asked, inside="paragraph", where=YEARS, limit=0)
    assert found_lines(answer) == plain_lines(early(demo), parts, None, 0, 0)
    assert answer.settings["found"] == len(answer)
    assert_verbatim(answer[:200], demo.texts)


@pytest.mark.parametrize(
    ("first", "second", "left", "right"),
    [
        ("heavy", "rain", 5, 5),
        ("rain", "heavy", 5, 5),
        ("the", "fog", 2, 7),
        ("fog", "the", 0, 3),
        ("the", "the", 4, 4),
        ("of the", "wind", 6, 6),
    ],
)
def test_second_word_within_reach(demo: Demo, first: str, second: str, left: int, right: int) -> None:
    answer = colloc.lines(demo.store, first, second, left=left, right=right, inside="paragraph", where=YEARS, limit=0)
    assert found_lines(answer) == plain_lines(early(demo), first.split(), second, left, right)
    assert_verbatim(answer[:200], demo.texts)


def test_no_line_crosses_a_sentence(demo: Demo) -> None:
    wide = colloc.lines(demo.store, "fog", "harbour", window=12, inside="document", limit=0)
    narrow = colloc.lines(demo.store, "fog", "harbour", window=12, limit=0, sentences=True)
    assert 0 < len(narrow) < len(wide)
    assert_verbatim(narrow, demo.texts)
    for row in narrow:
        assert not re.search(r"[.!?] +[A-Z]", (row["before"] + row["match"] + row["after"]).replace("Mr. ", ""))


def test_real_text(tmp_path: Path, demo: Demo) -> None:
    """Long documents: pages of novels where COLLOC_DATA has them, else the demo texts run together."""
    folder = os.environ.get("COLLOC_DATA")
    novels = Path(folder) / "novels.jsonl.gz" if folder else None
    if novels is not None and novels.is_file():
        import gzip
        import json

        with gzip.open(novels, "rt", encoding="utf-8") as lines:
            records = [json.loads(next(lines)) for _ in range(2)]
        texts = {str(number): record["text"][:300_000] for number, record in enumerate(records)}
    else:
        texts = {"all": "\n".join(demo.texts.values())}
    colloc.build(tmp_path / "real.colloc", [write_documents(tmp_path / "real.jsonl", texts)], jobs=1)
    answer = colloc.lines(tmp_path / "real.colloc", "the", sort="random", seed=3, limit=300)
    assert_verbatim(answer, texts)
    assert set(map(str.lower, answer["match"])) == {"the"}


def test_small_blocks_hide_nothing(tmp_path: Path, demo: Demo, monkeypatch: pytest.MonkeyPatch) -> None:
    """Sentences that go on from one block of the stream into the next are found and shown whole."""
    monkeypatch.setattr(import_module("colloc.build.batches"), "BATCH_CHARACTERS", 400)
    words = " ".join(f"wave{number} foam" for number in range(400))
    texts = {"long": f"The tide {words} turned at last.", **dict(list(demo.texts.items())[:5])}
    colloc.build(tmp_path / "small.colloc", [write_documents(tmp_path / "small.jsonl", texts)], jobs=1)
    with closing(sqlite3.connect(tmp_path / "small.colloc")) as connection:
        assert connection.execute("SELECT count(*) FROM blocks").fetchone()[0] > 10
    for number in range(0, 399, 7):
        answer = colloc.lines(tmp_path / "small.colloc", f"wave{number} foam", f"wave{number + 1}", window=1)
        assert len(answer) == 1
        assert_verbatim(answer, texts)
    whole = colloc.lines(tmp_path / "small.colloc", "wave200", sentences=True)
    assert whole["before"][0] + whole["match"][0] + whole["after"][0] == texts["long"]
    far = colloc.lines(tmp_path / "small.colloc", "tide", "last", window=900)
    assert far["distance"].tolist() == [800 + len(["turned", "at", "last"])]


def test_orders(demo: Demo) -> None:
    by_text = colloc.lines(demo.store, "fog", where=YEARS, limit=0)
    names = list(demo.texts)
    places = [(names.index(row["document"]), row["character"]) for row in by_text]
    assert places == sorted(places)
    by_document = colloc.lines(demo.store, "fog", sort="document", where=YEARS, limit=0)
    assert by_document["document"].tolist() == sorted(by_text["document"].tolist())
    shuffled = [colloc.lines(demo.store, "fog", sort="random", seed=seed, where=YEARS, limit=0) for seed in (1, 1, 2)]
    assert found_lines(shuffled[0]) == found_lines(by_text)
    assert shuffled[0] == shuffled[1]
    assert shuffled[0]["character"].tolist() != shuffled[2]["character"].tolist()


@pytest.mark.parametrize("sort", ["before", "after"])
def test_order_by_neighbours(demo: Demo, sort: str) -> None:
    answer = colloc.lines(demo.store, "fog", sort=sort, where=YEARS, limit=0)
    keys = []
    for row in answer:
        text = demo.texts[row["document"]]
        words = [match[0].lower() for match in WORD.finditer(text[: row["character"]])][::-1]
        if sort == "after":
            words = [match[0].lower() for match in WORD.finditer(text[row["character"] + len(row["match"]) :])]
        keys.append([*words, ""][:5])
    assert keys == sorted(keys)
    for limit in (1, 7, 40):
        assert colloc.lines(demo.store, "fog", sort=sort, where=YEARS, limit=limit) == answer_of(answer, limit)


def answer_of(answer: colloc.Columns, limit: int) -> colloc.Columns:
    """The first lines of an answer, as if no more had been asked for."""
    return colloc.Columns(answer[:limit].data, {**answer.settings, "shown": limit})


def test_one_line_per_document_and_slices(demo: Demo) -> None:
    answer = colloc.lines(demo.store, "fog", one_per_document=True, where=["genre=log", YEARS], limit=0)
    logs = {name for name, data in demo.metadata.items() if data["genre"] == "log"}
    holding = {name for name, _, _ in plain_lines(early(demo), ["fog"], None, 0, 0)}
    assert sorted(answer["document"].tolist()) == sorted(logs & holding)
    assert set(answer["genre"].tolist()) == {"log"}
    assert answer.settings["found"] > len(answer) == answer.settings["in_documents"]
    assert len(colloc.lines(demo.store, "fog", limit=3)) == 3


def test_scripts_and_forms(scripts: Store) -> None:
    for asked, document, count in [("البحر", "ar", 3), ("הים", "he", 2), ("海", "ja", 3), ("θάλασσα", "el", 2)]:
        answer = colloc.lines(scripts, asked)
        assert answer["document"].tolist() == [document] * count
        assert_verbatim(answer, SCRIPTS)
    # Composed letters find those that are written with combining marks: both are the same word.
    assert colloc.lines(scripts, "\u00e9t\u00e9")["match"].tolist() == ["e\u0301te\u0301"]
    quoted = colloc.lines(scripts, "行", sentences=True)
    assert quoted["before"][0] + quoted["match"][0] + quoted["after"][0] == "「海へ行こう」と彼は言った。"


def test_what_is_not_there(demo: Demo) -> None:
    with pytest.raises(NotSeenError, match=r"'xyzzy' never occurs.*colloc words"):
        colloc.lines(demo.store, "xyzzy")
    with pytest.raises(NotSeenError, match=r"no word .* fits 'qq\*'"):
        colloc.lines(demo.store, "qq*")
    with pytest.raises(NotSeenError, match="wider window"):
        colloc.lines(demo.store, "strong", "fog")
    for wrong in ({"context": -1}, {"sort": "length"}):
        with pytest.raises(UsageError):
            colloc.lines(demo.store, "fog", **wrong)
    with pytest.raises(UsageError, match="holds no word"):
        colloc.lines(demo.store, " -- ")


def test_a_store_without_text_says_so(tmp_path: Path) -> None:
    source = write_documents(tmp_path / "a.jsonl", {"a": "Fog and rain. Fog again."})
    colloc.build(tmp_path / "a.colloc", [source], keep_text=False, jobs=1)
    with pytest.raises(UsageError, match=r"built without its text .*nothing to show"):
        colloc.lines(tmp_path / "a.colloc", "fog")
    card = colloc.explain(tmp_path / "a.colloc", "fog", "rain")
    assert len(card.examples) == 0
    assert card.cases["with_second"] == 1


def test_removed_and_added_documents(tmp_path: Path, demo: Demo) -> None:
    """Places stay right when documents before and between have gone, and when others came."""
    names = list(demo.texts)[:9]
    texts = {name: demo.texts[name] for name in names}
    path = tmp_path / "a.colloc"
    colloc.build(path, [write_documents(tmp_path / "a.jsonl", texts)], jobs=1)
    colloc.remove(path, identifiers=[names[0], names[4]])
    later = {name: demo.texts[name] for name in list(demo.texts)[9:12]}
    colloc.add(path, [write_documents(tmp_path / "b.jsonl", later)], jobs=1)
    kept = {name: text for name, text in (texts | later).items() if name not in (names[0], names[4])}
    answer = colloc.lines(path, "the", inside="paragraph", limit=0, sort="random")
    assert found_lines(answer) == plain_lines(kept, ["the"], None, 0, 0)
    assert_verbatim(answer, kept)
    card = colloc.explain(path, "the", "of")
    assert card.spread["of_documents"] == len(kept)
    assert_verbatim(card.examples, kept)


PIECES = st.sampled_from(
    [*"aBé.,!?'\"-–\n\r\t (ß)", "\u0301", "\u200d", "\u202e", "ﬁ", "İ", "海", "の", "カ", "ม", "ا", "ل", "\u0640", "א",
     "3", "5.5", "http://a.b/c", "x@y.zz", "👩\u200d🚀", "🇸🇪", "Mr. ", ". A ", "\u2029", "\x85"]
)  # fmt: skip
"""Letters, marks, controls and stretches that segmenters stumble over."""


@hypothesis_settings(max_examples=10, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.lists(st.lists(PIECES, max_size=60).map("".join), min_size=1, max_size=3))
def test_every_word_of_any_text_is_found_where_it_stands(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, written: list[str]
) -> None:
    # Segmenting begins again in the middle of these short texts, as it does every thousand words of long ones.
    monkeypatch.setattr(import_module("colloc.build.segmenting"), "ANCHOR_EVERY", 3)
    texts = {str(number): text for number, text in enumerate(written)}
    with TemporaryDirectory(dir=tmp_path) as folder:
        path = Path(folder) / "a.colloc"
        colloc.build(path, [write_documents(Path(folder) / "a.jsonl", {**texts, "last": "end"})], jobs=1)
        for row in colloc.words(path, layer="form", limit=0):
            answer = colloc.lines(path, row["word"], layer="form", inside="document", limit=0)
            if " " not in row["word"]:
                assert len(answer) == row["count"]
            assert {unicodedata.normalize("NFC", match) for match in answer["match"]} == {row["word"]}
            assert_verbatim(answer, {**texts, "last": "end"})


def altered(path: Path, sql: str, *values: object) -> None:
    with closing(sqlite3.connect(path)) as connection, connection:
        connection.execute(sql, values)


def other_text(path: Path, text: str) -> None:
    """Put another text of the same length in the place of what the store keeps."""
    from colloc.store.texts import pack_text

    ((_, length, data),) = pack_text(text)
    altered(path, "UPDATE text_blocks SET data = ? WHERE n_characters = ?", data, length)


def test_text_that_is_not_what_was_counted(tmp_path: Path) -> None:
    text = "Thick fog came over the bay."
    colloc.build(tmp_path / "a.colloc", [write_documents(tmp_path / "a.jsonl", {"a": text})], jobs=1)
    with closing(sqlite3.connect(tmp_path / "a.colloc")) as connection:
        length = connection.execute("SELECT n_characters FROM text_blocks").fetchone()[0]
    changed = "Thick smog goes over a bay.."
    other_text(tmp_path / "a.colloc", changed.ljust(length, "\n")[:length])
    with pytest.raises(StoreDamagedError, match="does not hold the tokens counted from it"):
        colloc.lines(tmp_path / "a.colloc", "fog")
    # Counted by another version: a line that cannot be found again is an error, never another line.
    altered(tmp_path / "a.colloc", "UPDATE facts SET value = ? WHERE key = 'versions'", '{"colloc": "0.0.1"}')
    with pytest.raises(DataError, match="another version"):
        colloc.lines(tmp_path / "a.colloc", "fog")


def test_words_divided_otherwise_by_another_version_are_aligned(tmp_path: Path) -> None:
    text = "A sea-bird and well-kept nets lay in thick fog over the bay."
    colloc.build(tmp_path / "a.colloc", [write_documents(tmp_path / "a.jsonl", {"a": text})], jobs=1)
    with closing(sqlite3.connect(tmp_path / "a.colloc")) as connection:
        kept = connection.execute("SELECT value FROM facts WHERE key = 'segment_settings'").fetchone()[0]
    # As if the program that made the store had kept hyphens and this one split them.
    altered(
        tmp_path / "a.colloc",
        "UPDATE facts SET value = ? WHERE key = 'segment_settings'",
        kept.replace('"hyphens": "keep"', '"hyphens": "split"'),
    )
    with pytest.raises(StoreDamagedError):
        colloc.lines(tmp_path / "a.colloc", "fog", context=2)
    altered(tmp_path / "a.colloc", "UPDATE facts SET value = ? WHERE key = 'versions'", '{"colloc": "0.0.1"}')
    answer = colloc.lines(tmp_path / "a.colloc", "fog", context=2)
    assert_verbatim(answer, {"a": text})
    assert answer["match"].tolist() == ["fog"]
    with pytest.raises(DataError, match="another version"):
        colloc.lines(tmp_path / "a.colloc", "nets", context=2)
