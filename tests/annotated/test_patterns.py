"""Patterns of word classes against a regular expression over one letter a class, as Python's `re` runs it."""

from __future__ import annotations

import re
import time
import unicodedata
from collections import Counter
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest

import colloc
from colloc.answers.patterns import in_span, matches
from colloc.answers.tagpatterns import LONGEST, compile_pattern
from colloc.errors import UsageError
from colloc.records import TokenSpan
from colloc.store.opening import Store

from .treebanks import read_sentences

PATTERNS = [
    "ADJ NOUN",
    "NOUN (ADP NOUN)?",
    "ADJ|NOUN NOUN",
    "(ADJ|NOUN)* NOUN",
    "NOUN ANY? VERB",
    "(NOUN ADP)+ NOUN|ADJ",
    "((ADJ NOUN)|VERB) ADP*",
]
LETTERS = {"ADJ": "A", "NOUN": "N", "ADP": "P", "VERB": "V", "PUNCT": "U"}


def as_expression(pattern: str) -> re.Pattern[str]:
    """The same in Python's own notation, where | binds loosest."""
    either = re.compile(r"(\([^()]*\)|[A-Z]+)\|(\([^()]*\)|[A-Z]+)")
    previous = ""
    written = re.sub(r"[A-Z]+", lambda found: {**LETTERS, "ANY": "."}[found[0]], pattern)
    while previous != written:
        previous = written
        written = either.sub(lambda found: f"(?:{found[1]}/{found[2]})", written)
    return re.compile(written.replace("/", "|").replace(" ", ""))


def brute_force(text: str, pattern: str) -> set[tuple[int, int]]:
    """Every start and length that the whole of a stretch fits; words without a class fit nothing."""
    expression = as_expression(pattern)
    found = set()
    place = 0
    for words in read_sentences(text):
        letters = "".join("\n" if word.upos == "_" else LETTERS.get(word.upos, "x") for word in words)
        for start in range(len(letters)):
            for stop in range(start + 1, min(len(letters), start + LONGEST) + 1):
                if expression.fullmatch(letters, start, stop):
                    found.add((place + start, stop - start))
        place += len(words)
    return found


@pytest.mark.parametrize("pattern", PATTERNS)
def test_against_regular_expressions(store: Store, text: str, pattern: str) -> None:
    expected = brute_force(text, pattern)
    parts = [zip(starts.tolist(), lengths.tolist(), strict=True) for starts, lengths in matches(store, pattern)]
    found = [pair for part in parts for pair in part]
    assert found == sorted(expected)
    assert len(found) > 0
    best = dict(sorted(expected))  # the last one of a start is its longest
    parts = [zip(s.tolist(), n.tolist(), strict=True) for s, n in matches(store, pattern, longest=True)]
    assert [pair for part in parts for pair in part] == sorted(best.items())


@pytest.mark.parametrize(
    ("pattern", "message"),
    [
        ("", "too early"),
        ("NOUN (", "too early"),
        ("(NOUN", "not closed"),
        ("NOUN )", "word class was expected"),
        ("| NOUN", "word class was expected"),
        ("NOUN?", "no words"),
        ("NOUN [a]", "means nothing"),
        ("(" * 30 + "NOUN" + ")" * 30, "nested"),
        ("NOUN " * 500, "characters"),
        ("(ANY? NOUN)" + " ANY" * 60, "involved"),
    ],
)
def test_wrong_patterns(pattern: str, message: str) -> None:
    if message == "involved":
        # as many states as subsets: (ANY* NOUN ANY ANY ...) doubles them with each ANY
        pattern = "(ANY|NOUN)* NOUN" + " ANY" * 14
    with pytest.raises(UsageError, match=message):
        compile_pattern(pattern)


def test_time_is_bounded() -> None:
    automaton = compile_pattern("((NOUN? NOUN?)* NOUN?)+ ADJ")
    span = TokenSpan(np.ones(200_000, np.uint32), np.zeros(1, np.int64))
    began = time.process_time()
    starts, _ = in_span(span, automaton)
    assert len(starts) == 0
    # measured 0.1 s; an engine that tries each way to divide the nouns would not come to an end
    assert time.process_time() - began < 20


def test_unknown_classes_and_plain_text(store: Store, tmp_path: Path) -> None:
    with pytest.raises(UsageError, match="no word class"):
        list(matches(store, "NOUN GERUND"))
    (tmp_path / "a.txt").write_text("plain words only", encoding="utf-8")
    colloc.build(tmp_path / "s", [str(tmp_path / "a.txt")])
    with pytest.raises(UsageError, match="annotated"):
        colloc.sequences(tmp_path / "s", "NOUN NOUN", layer="fold")


def test_sequences_are_counted(store_path: Path, text: str) -> None:
    expected: Counter[tuple[str, int]] = Counter()
    for words in read_sentences(text):
        for start in range(len(words)):
            for length in (1, 3):
                part = words[start : start + length]
                if [word.upos for word in part] == ["NOUN", "ADP", "NOUN"][:length]:
                    expected[unicodedata.normalize("NFC", " ".join(word.form for word in part)), length] += 1
    answer = colloc.sequences(store_path, "NOUN (ADP NOUN)?", layer="form", limit=0)
    assert {(row["sequence"], row["length"]): row["joint"] for row in answer.to_dicts()} == expected
    counts = answer["joint"].tolist()
    assert counts == sorted(counts, reverse=True)
    top = colloc.sequences(store_path, "NOUN (ADP NOUN)?", layer="form", limit=5)
    assert top.to_dicts() == answer.to_dicts()[:5]


def test_pairs_by_pattern(store_path: Path, text: str) -> None:
    expected: dict[tuple[str, str], int] = {}
    for words in read_sentences(text):
        for one, two in pairwise(words):
            if one.upos in ("ADJ", "NOUN") and two.upos == "NOUN" and "_" not in (one.lemma, two.lemma):
                key = f"{one.lemma}/{one.upos}", f"{two.lemma}/{two.upos}"
                expected[key] = expected.get(key, 0) + 1
    answer = colloc.pairs(store_path, upos="ADJ|NOUN NOUN", min_count=1, any_strength=True, limit=0)
    found = {(row["first"], row["second"]): row["joint"] for row in answer.to_dicts() if "_/" not in row["first"]}
    assert {key: n for key, n in found.items() if not key[1].startswith("_/")} == expected
    with pytest.raises(UsageError, match="two words"):
        colloc.pairs(store_path, upos="NOUN")
    with pytest.raises(UsageError, match="does not tell"):
        colloc.pairs(store_path, upos="NOUN NOUN", layer="fold")
