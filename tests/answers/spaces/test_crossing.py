"""Matrices with rows and contexts of different layers, against counts made token by token in plain Python."""

from __future__ import annotations

import math
import random
from collections import Counter
from pathlib import Path
from typing import Any

import pytest

import colloc
from colloc.counts.scanning.crossing import count_crossed
from colloc.errors import UsageError
from colloc.settings import TallySpec

Token = tuple[str, str, str]
"""Form, lemma, word class; the last two may be missing."""
WORDS: list[Token] = [
    ("Fogs", "fog", "NOUN"), ("fog", "fog", "NOUN"), ("thick", "thick", "ADJ"), ("Thick", "thick", "ADJ"),
    ("falls", "fall", "VERB"), ("falls", "fall", "NOUN"), ("x", "", "X"), ("of", "of", ""), ("sea", "sea", "NOUN"),
]  # fmt: skip
FIRST_HALF = ",".join(f"d{number}" for number in range(20))
KINDS = ("form", "lemma", "upos")


def made_text(seed: int) -> list[list[Token]]:
    drawn = random.Random(seed)
    return [[drawn.choice(WORDS) for _ in range(drawn.randint(1, 12))] for _ in range(40)]


@pytest.fixture(scope="module")
def text() -> list[list[Token]]:
    return made_text(4)


@pytest.fixture(scope="module")
def store(text: list[list[Token]], tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Each sentence is a document of its own; every word depends on the one before it."""
    folder = tmp_path_factory.mktemp("crossing")
    lines = []
    for number, sentence in enumerate(text):
        lines.append(f"# newdoc id = d{number}")
        for place, (form, lemma, upos) in enumerate(sentence, 1):
            relation = "root" if place == 1 else "obj"
            columns = [str(place), form, lemma or "_", upos or "_", "_", "_", str(place - 1), relation, "_", "_"]
            lines.append("\t".join(columns))
        lines.append("")
    (folder / "t.conllu").write_text("\n".join(lines) + "\n", encoding="utf-8")
    colloc.build(folder / "s.colloc", str(folder / "t.conllu"), tally=TallySpec(layer="lemma", right=3), jobs=1)
    return folder / "s.colloc"


def slow(text: list[list[Token]], row: str, context: str, left: list[float], right: list[float]) -> Counter[Any]:
    """Weights by distance on either side; a token without a word in a layer has no cell, but keeps its place."""
    cells: Counter[Any] = Counter()
    a, b = KINDS.index(row), KINDS.index(context)
    for sentence in text:
        for i, token in enumerate(sentence):
            for j, other in enumerate(sentence):
                side = right if j > i else left
                distance = abs(j - i)
                if token[a] and other[b] and 1 <= distance <= len(side):
                    cells[token[a], other[b]] += side[distance - 1]  # type: ignore[assignment]
    return cells


def as_cells(made: Any) -> dict[tuple[str, str], float]:
    cells = made.values.tocoo()
    return {(made.rows[r], made.columns[c]): v for r, c, v in zip(*cells.coords, cells.data.tolist(), strict=True)}


@pytest.mark.parametrize(("row", "context"), [("lemma", "form"), ("form", "upos"), ("upos", "lemma")])
def test_counts_by_window(store: Path, text: list[list[Token]], row: str, context: str) -> None:
    three = [1.0, 1.0, 1.0]
    options = {"layer": row, "context_layer": context, "value": "count"}
    assert as_cells(colloc.matrix(store, **options)) == slow(text, row, context, three, three)
    assert as_cells(colloc.matrix(store, directed=True, **options)) == slow(text, row, context, [], three)
    assert as_cells(colloc.matrix(store, left=2, right=1, **options)) == slow(text, row, context, [1, 1], [1])
    half = as_cells(colloc.matrix(store, where=f"id={FIRST_HALF}", **options))
    assert half == slow(text[:20], row, context, three, three)
    harmonic = [1.0, 1 / 2, 1 / 3]
    found = as_cells(colloc.matrix(store, weighting="harmonic", **options))
    assert found == pytest.approx(slow(text, row, context, harmonic, harmonic), abs=1e-12)


def test_counts_by_relation(store: Path, text: list[list[Token]]) -> None:
    """Heads as rows, dependents as contexts: here the word before."""
    found = as_cells(colloc.matrix(store, relation="", layer="lemma", context_layer="upos", value="count"))
    assert found == slow(text, "lemma", "upos", [], [1.0])


def test_values_and_choices(store: Path, text: list[list[Token]]) -> None:
    counts = slow(text, "lemma", "upos", [1.0] * 3, [1.0] * 3)
    total = sum(counts.values())
    rows, columns = Counter[str](), Counter[str]()
    for (x, y), count in counts.items():
        rows[x] += count
        columns[y] += count
    mass = sum(count**0.75 for count in columns.values())
    expected = {
        (x, y): math.log2(n / total / (rows[x] / total * columns[y] ** 0.75 / mass)) for (x, y), n in counts.items()
    }
    made = as_cells(colloc.matrix(store, context_layer="upos", smoothing=0.75))
    assert made == pytest.approx({cell: value for cell, value in expected.items() if value > 0}, abs=1e-12)
    npmi = as_cells(colloc.matrix(store, context_layer="upos", value="npmi"))
    for (x, y), n in counts.items():
        pmi = math.log2(n * total / (rows[x] * columns[y]))
        assert npmi[x, y] == pytest.approx(pmi / -math.log2(n / total), abs=1e-12)
    seen = Counter(token[1] for sentence in text for token in sentence)
    least = sorted(seen.values())[3]
    chosen = colloc.matrix(store, context_layer="upos", value="count", min_row_count=least, contexts=["VERB", "NOUN"])
    assert chosen.columns == ["VERB", "NOUN"]
    assert as_cells(chosen) == {(x, y): n for (x, y), n in counts.items() if seen[x] >= least and y in ("VERB", "NOUN")}
    assert chosen.settings["layer"] == "lemma"
    assert chosen.settings["context_layer"] == "upos"


def test_the_same_layer_is_the_ordinary_matrix(store: Path) -> None:
    one, other = colloc.matrix(store), colloc.matrix(store, context_layer="lemma")
    assert (one.rows, as_cells(one)) == (other.rows, as_cells(other))
    with colloc.open_store(store) as opened:
        crossed = count_crossed(opened, TallySpec(layer="lemma", right=3), "lemma", directed=False, pending=7)
    assert crossed.run.counts.sum() == colloc.matrix(store, value="count").values.data.sum()
    assert sorted(crossed.run.counts.tolist()) == sorted(colloc.matrix(store, value="count").values.data.tolist())


def test_vectors_and_likeness(store: Path) -> None:
    options = {"layer": "form", "context_layer": "upos", "min_row_count": 1, "min_context_count": 1}
    space = colloc.vectors(store, dimensions=2, **options)
    assert len(space) == len(space.words) > 2
    answer = colloc.similar(store, "fog", **options)
    assert answer.settings["context_layer"] == "upos"
    assert {context for shared in answer["shared"] for context in shared.split(", ") if context} <= {
        "NOUN",
        "ADJ",
        "VERB",
        "X",
    }
    with pytest.raises(UsageError, match="is a row but no context"):
        colloc.vectors(store, dimensions=2, join_contexts=True, **options)


def test_a_layer_that_is_not_there_yet_is_made(text: list[list[Token]], store: Path) -> None:
    folded = [[(form.lower(), lemma, upos) for form, lemma, upos in sentence] for sentence in text]
    made = colloc.matrix(store, layer="lemma", context_layer="fold", value="count")
    assert as_cells(made) == slow(folded, "lemma", "form", [1.0] * 3, [1.0] * 3)


def test_what_does_not_go_together(store: Path) -> None:
    for options in ({"unit": True}, {"margins": "tokens"}, {"margins": "positions"}):
        with pytest.raises(UsageError, match="rows and contexts of different layers are counted by window or relation"):
            colloc.matrix(store, context_layer="upos", **options)
    with pytest.raises(UsageError, match="no layer 'genre'"):
        colloc.matrix(store, context_layer="genre")
