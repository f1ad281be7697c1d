"""Expressions of whole stores against plain counts, published examples and texts made so that the answer is known."""

from __future__ import annotations

import json
import math
import random
from collections import Counter
from collections.abc import Sequence
from itertools import product
from pathlib import Path

import numpy as np
import pytest

import colloc
from colloc.answers.expressions.settings import COLUMNS, FRAMES_ONLY, NOT_OF_SETS, PATTERNS_ONLY, SETS_ONLY
from colloc.errors import UsageError

EVERYTHING = {"min_docs": 0, "names": "keep", "common": "keep", "fragments": "keep", "limit": 0, "show": "all"}


def built(path: Path, documents: Sequence[Sequence[str]]) -> Path:
    """A store of documents, each a list of sentences, which become lines: a line end is one of a sentence too."""
    lines = [json.dumps({"id": f"d{n}", "text": "\n".join(sentences)}) for n, sentences in enumerate(documents)]
    source = path / "documents.jsonl"
    source.write_text("\n".join(lines), encoding="utf-8")
    store = path / "store.colloc"
    colloc.build(store, [str(source)], jobs=1)
    return store


def by_expression(answer: colloc.Columns) -> dict[str, dict[str, object]]:
    return {row["expression"]: row for row in answer}


def prose(seed: int, documents: int = 8, sentences: int = 120) -> list[list[str]]:
    """Documents of random sentences with some fixed phrases in them."""
    rng = random.Random(seed)
    words = ["net", "tide", "gull", "rope", "mast", "lamp", "salt", "crab", "the", "a", "of", "in", "and", "to"]
    phrases = ["by and large", "in good order", "out of the blue"]
    return [
        [
            " ".join(
                rng.choice(phrases) if rng.random() < 0.15 else rng.choice(words) for _ in range(rng.randint(2, 12))
            )
            for _ in range(sentences)
        ]
        for _ in range(documents)
    ]


@pytest.fixture(scope="module")
def documents() -> list[list[str]]:
    return prose(3)


@pytest.fixture(scope="module")
def store(documents: list[list[str]], tmp_path_factory: pytest.TempPathFactory) -> Path:
    return built(tmp_path_factory.mktemp("expressions"), documents)


def plain_counts(documents: Sequence[Sequence[str]], longest: int) -> Counter[str]:
    return Counter(
        " ".join(words[i : i + n])
        for sentences in documents
        for words in map(str.split, sentences)
        for n in range(2, longest + 1)
        for i in range(len(words) - n + 1)
    )


def test_counts_are_those_of_every_sequence(store: Path, documents: list[list[str]]) -> None:
    answer = colloc.expressions(store, min_count=4, max_words=5, **EVERYTHING)
    plain = plain_counts(documents, 5)
    assert dict(zip(answer["expression"], answer["count"].tolist(), strict=True)) == {
        text: count for text, count in plain.items() if count >= 4
    }
    assert len(answer) > 500
    in_documents = Counter(text for document in documents for text in plain_counts([document], 5))
    assert answer["documents"].tolist() == [in_documents[text] for text in answer["expression"]]


def test_scores_follow_their_definitions(store: Path, documents: list[list[str]]) -> None:
    row = by_expression(colloc.expressions(store, min_count=4, max_words=4, **EVERYTHING))["in good order"]
    tokens = sum(len(sentence.split()) for sentences in documents for sentence in sentences)
    counts = plain_counts(documents, 3)
    words = Counter(word for sentences in documents for sentence in sentences for word in sentence.split())
    whole = counts["in good order"]
    cuts = [
        math.log2(whole * tokens / (words["in"] * counts["good order"])),
        math.log2(whole * tokens / (counts["in good"] * words["order"])),
    ]
    assert row["weakest_split"] == pytest.approx(min(cuts), abs=1e-12)
    assert row["cut"] == 1 + cuts.index(min(cuts))
    alone = words["in"] * words["good"] * words["order"]
    assert row["specific_correlation"] == pytest.approx(math.log2(whole * tokens**2 / alone), abs=1e-12)
    largest = max(plain_counts([document], 3)["in good order"] for document in documents)
    ends = sum(sentence.endswith("in good order") for sentences in documents for sentence in sentences)
    usual = whole * sum(map(len, documents)) / tokens
    assert row["completeness"] == pytest.approx(min(1.0, (ends + 1) / (usual + 1)), abs=1e-12)
    expected = min(cuts) * math.log2(1 + whole - largest) * row["completeness"]
    assert row["strength"] == pytest.approx(expected, abs=1e-9)


def test_fixed_phrases_lead_and_their_fragments_are_folded(store: Path) -> None:
    answer = colloc.expressions(store, min_count=4, limit=3)
    assert set(answer["expression"]) == {"by and large", "in good order", "out of the blue"}
    row = by_expression(answer)["out of the blue"]
    assert row["fragment"] in ("out of the", "of the blue", "the blue", "out of")
    every = by_expression(colloc.expressions(store, min_count=4, **EVERYTHING))
    assert row["fragment_count"] == every[row["fragment"]]["count"]


def test_only_the_whole_is_listed_when_the_fragment_lives_in_it(tmp_path: Path) -> None:
    filler = ["the keeper slept", "a gull took the crab", "rain fell into the boat", "we account for the salt"]
    takes = [f"{who} must take into account {what}" for who in ("we", "they", "you") for what in ("it", "this", "rain")]
    others = [f"{who} take the boat" for who in ("we", "they", "you")] + ["into the boat we went"]
    store = built(tmp_path, [filler * 3 + takes + others for _ in range(4)])
    listed = by_expression(colloc.expressions(store, min_count=4, common="keep", limit=0, show="all"))
    assert listed["must take into account"]["count"] == 36
    assert not {"into account", "take into account", "take into"} & set(listed)
    kept = by_expression(colloc.expressions(store, min_count=4, common="keep", fragments="keep", limit=0))
    assert {"into account", "take into account"} <= set(kept)


def test_accidental_neighbours_are_not_taken_in(tmp_path: Path) -> None:
    rng = random.Random(1)
    nouns = ["net", "tide", "gull", "rope", "mast", "lamp"]
    sentences = [f"{rng.choice(nouns)} by and large the {rng.choice(nouns)} holds" for _ in range(60)]
    sentences += [
        f"the {rng.choice(nouns)} of the {rng.choice(nouns)} rose by the {rng.choice(nouns)}" for _ in range(200)
    ]
    sentences += [f"{rng.choice(nouns)} {rng.choice(['sank', 'rose', 'held'])} by and large" for _ in range(60)]
    rng.shuffle(sentences)
    store = built(tmp_path, [sentences[i::5] for i in range(5)])
    listed = colloc.expressions(store, min_count=5, limit=0, show="all")
    assert listed["expression"][0] == "by and large"
    assert listed["count"][0] == 120
    rows = by_expression(listed)
    assert rows.get("by and large the", {"strength": 0.0})["strength"] < rows["by and large"]["strength"] / 2


# Frantzi & Ananiadou 1996 (ACL Anthology C96-1009): words, n, t, c and C-value, weight length - 1. The paper prints
# 37.34 and 31.34 for what is 37 1/3 and 31 1/3: it rounded 22/3 before multiplying.
STREET = {
    "staff reporter of the wall street journal": (19, 114.0),
    "of the wall street journal": (20, 4.0),
    "the wall street journal": (22, 36.0),
    "wall street journal": (26, 37 + 1 / 3),
    "the wall street": (23, 31 + 1 / 3),
    "wall street analysts": (3, 6.0),
    "wall street": (38, 33.0),
}
# The sentences that give these counts.
STREET_TEXT = {
    "staff reporter of the wall street journal": 19,
    "of the wall street journal": 1,
    "the wall street journal": 2,
    "wall street journal": 4,
    "the wall street": 1,
    "wall street analysts": 3,
    "wall street": 8,
}


def test_c_value_of_nested_newspaper_names(tmp_path: Path) -> None:
    sentences = [text for text, times in STREET_TEXT.items() for _ in range(times)]
    asked = {**EVERYTHING, "max_words": 7}
    rows = by_expression(colloc.expressions(built(tmp_path, [sentences]), min_count=3, **asked))
    for text, (count, value) in STREET.items():
        assert (rows[text]["count"], rows[text]["c_value_length"]) == (count, pytest.approx(value, abs=1e-9)), text
    # both six-word parts of the longest stand nowhere else
    assert rows["staff reporter of the wall street"]["c_value_length"] == pytest.approx(0.0, abs=1e-9)


# Frantzi, Ananiadou & Mima 2000, Int. J. on Digital Libraries 3(2), 115-130, weight log2 of the length: counts and
# C-values as printed (rounded to the digits given).
CARCINOMA = {
    "adenoid cystic basal cell carcinoma": (5, 11.61),
    "cystic basal cell carcinoma": (11, 12.0),
    "ulcerated basal cell carcinoma": (7, 14.0),
    "recurrent basal cell carcinoma": (5, 10.0),
    "circumscribed basal cell carcinoma": (3, 6.0),
    "basal cell carcinoma": (984, 1551.36),
}


def test_c_value_of_nested_medical_terms(tmp_path: Path) -> None:
    alone = {"adenoid cystic": 5, "cystic": 6, "ulcerated": 7, "recurrent": 5, "circumscribed": 3, "": 958}
    sentences = [f"{text} basal cell carcinoma".strip() for text, times in alone.items() for _ in range(times)]
    rows = by_expression(colloc.expressions(built(tmp_path, [sentences]), min_count=3, **EVERYTHING))
    for text, (count, value) in CARCINOMA.items():
        assert (rows[text]["count"], rows[text]["c_value"]) == (count, pytest.approx(value, abs=0.005)), text


def bits_store(path: Path, kinds: Sequence[tuple[int, int, int]]) -> Path:
    """Sentences of three words, one for each variable, the kinds equally often."""
    sentences = [f"x{'ab'[x]} y{'ab'[y]} z{'ab'[z]}" for x, y, z in kinds for _ in range(6)]
    return built(path, [sentences])


@pytest.mark.parametrize(
    ("name", "kinds", "interaction", "correlation"),
    [
        ("exclusive or", [(x, y, x ^ y) for x, y in product((0, 1), repeat=2)], -1.0, 1.0),
        ("three equal bits", [(0, 0, 0), (1, 1, 1)], 1.0, 2.0),
    ],
)
def test_joint_generalisations_on_tables_of_bits(
    tmp_path: Path, name: str, kinds: list[tuple[int, int, int]], interaction: float, correlation: float
) -> None:
    # Van de Cruys 2011 (DiSCo workshop): SI1 and SI2 of every event of these tables, by their formulas. There a
    # sentence is the observation; here it is a token, three a sentence, which divides every probability by three:
    # SI2 gains (3 - 1) log2 3 and SI1, the signed sum over all choices, log2 3.
    answer = colloc.expressions(bits_store(tmp_path, kinds), min_count=4, min_words=3, max_words=3, **EVERYTHING)
    assert len(answer) == len(kinds), name
    np.testing.assert_allclose(answer["specific_correlation"], correlation + 2 * math.log2(3), atol=1e-12)
    np.testing.assert_allclose(answer["specific_interaction"], interaction + math.log2(3), atol=1e-12)


def test_interaction_of_two_words_is_pmi_and_it_ranks(store: Path) -> None:
    answer = colloc.expressions(store, min_count=10, max_words=3, rank="specific_interaction", **EVERYTHING)
    two = answer["words"] == 2
    np.testing.assert_allclose(answer["specific_interaction"][two], answer["weakest_split"][two], atol=1e-12)
    assert (np.diff(answer["specific_interaction"]) <= 0).all()


def test_any_order(store: Path, documents: list[list[str]]) -> None:
    answer = colloc.expressions(store, min_count=6, max_words=3, **EVERYTHING)
    bags = Counter[tuple[str, ...]]()
    for text, count in plain_counts(documents, 3).items():
        bags[tuple(sorted(text.split()))] += count
    expected = [bags[tuple(sorted(text.split()))] for text in answer["expression"]]
    assert answer["any_order"].tolist() == expected
    assert (answer["any_order"] > answer["count"]).sum() > 50


def test_names_and_headings_are_left_out(tmp_path: Path) -> None:
    rng = random.Random(2)
    sentences = [f"then Ada Byrne took the {rng.choice(['net', 'rope', 'lamp'])} by and large" for _ in range(30)]
    sentences += ["Chapter I"] * 20
    store = built(tmp_path, [sentences[i::4] for i in range(4)])
    asked = {"min_count": 5, "common": "keep", "fragments": "keep", "limit": 0, "show": "all"}
    kept = by_expression(colloc.expressions(store, names="keep", **asked))
    assert kept["ada byrne"]["capitals"] == 1.0
    assert kept["then ada"]["capitals"] == 1.0  # the first word of a sentence cannot tell
    assert kept["by and large"]["capitals"] == 0.0
    assert math.isnan(kept["chapter i"]["capitals"])
    listed = set(colloc.expressions(store, **asked)["expression"])
    assert not {"ada byrne", "then ada", "byrne took", "chapter i"} & listed
    assert {"by and large", "took the"} <= listed


def test_what_one_document_repeats_weighs_nothing(tmp_path: Path) -> None:
    common = ["it went by and large", "by and large it held", "nets dry in salt wind", "a gull took it"] * 3
    store = built(tmp_path, [common, common, common, [*common, *["merry old crab"] * 40]])
    listed = colloc.expressions(store, min_count=5, common="keep", limit=0)["expression"].tolist()
    assert "merry old crab" not in listed
    rows = by_expression(colloc.expressions(store, min_count=5, min_docs=1, common="keep", limit=0))
    assert rows["merry old crab"]["strength"] == 0.0


def test_frames_and_their_fillers(tmp_path: Path) -> None:
    rng = random.Random(4)
    good = [f"{who} keep {what} in good order" for who in ("we", "they") for what in ("nets", "ropes", "boats", "it")]
    places = ["in", "on", "by"]
    others = [f"a {rng.choice(['gull', 'crab', 'lamp'])} fell {rng.choice(places)} the tide" for _ in range(40)]
    store = built(tmp_path, [good + others for _ in range(3)])
    answer = colloc.expressions(store, min_count=5, slots=1, max_words=4, limit=1, show="all")
    row = next(iter(answer))
    assert row["expression"] == "keep _ in good order"
    assert (row["count"], row["documents"], row["filler_kinds"]) == (24, 3, 4)
    assert sorted(row["fillers"].split(", ")) == ["boats 6", "it 6", "nets 6", "ropes 6"]
    assert row["filler_entropy"] == pytest.approx(2.0, abs=1e-12)
    two = by_expression(colloc.expressions(store, min_count=5, slots=2, max_words=4, common="keep", limit=0))
    assert two["a _ fell _ the tide"]["fillers"].count("|") == 1
    assert not any(text.startswith("we _ nets") for text in two)


def test_a_slot_that_one_word_fills_is_no_slot(tmp_path: Path) -> None:
    store = built(tmp_path, [["salt by and large holds"] * 9 + ["salt by or large holds"] for _ in range(3)])
    assert len(colloc.expressions(store, min_count=3, slots=1, common="keep", limit=0)) == 0
    kept = by_expression(colloc.expressions(store, min_count=3, slots=1, common="keep", fragments="keep", limit=0))
    assert kept["by _ large"]["fillers"] == "and 27, or 3"


TAGGED = {"the": "DET", "old": "ADJ", "lamp": "NOUN", "burns": "VERB", "brightly": "ADV", "new": "ADJ"}


def test_patterns_of_word_classes(tmp_path: Path) -> None:
    rows = []
    for sentence in ["the old lamp burns brightly", "the new lamp burns", "old lamp burns brightly"] * 5:
        words = sentence.split()
        rows += [f"{i}\t{w}\t{w}\t{TAGGED[w]}\t_\t_\t0\t_\t_\t_" for i, w in enumerate(words, 1)] + [""]
    source = tmp_path / "tagged.conllu"
    source.write_text("\n".join(rows) + "\n", encoding="utf-8")
    colloc.build(tmp_path / "tagged.colloc", [str(source)], jobs=1)
    asked = {**EVERYTHING, "min_count": 4, "pattern": "ADJ NOUN"}
    answer = colloc.expressions(tmp_path / "tagged.colloc", **asked)
    assert {row["expression"]: row["pattern_count"] for row in answer} == {"old lamp": 10, "new lamp": 5}


def test_plain_text_has_no_word_classes(store: Path) -> None:
    with pytest.raises(UsageError, match="no word classes"):
        colloc.expressions(store, pattern="ADJ NOUN")


def test_slice(store: Path, documents: list[list[str]]) -> None:
    answer = colloc.expressions(store, where="id=d1,d4", min_count=3, max_words=3, **EVERYTHING)
    plain = plain_counts([documents[1], documents[4]], 3)
    assert by_expression(answer).keys() == {text for text, count in plain.items() if count >= 3}


def test_order_ties_and_limit(store: Path) -> None:
    every = colloc.expressions(store, min_count=4, rank="count", **EVERYTHING)
    keys = [(-row["count"], row["expression"]) for row in every]
    assert keys == sorted(keys)
    tied = int(np.flatnonzero(np.diff(every["count"]) == 0)[0]) + 1
    some = colloc.expressions(store, min_count=4, rank="count", **{**EVERYTHING, "limit": tied})
    assert some["expression"].tolist() == every["expression"][:tied].tolist()


@pytest.mark.parametrize(
    ("asked", "message"),
    [
        ({"min_words": 1}, "2 to 8 words"),
        ({"max_words": 9}, "2 to 8 words"),
        ({"min_words": 4, "max_words": 3}, "4 to 3"),
        ({"min_count": 1}, "occurs once"),
        ({"slots": 9}, "0 to 4 open slots"),
        ({"slots": 1, "rank": "c_value"}, "not defined"),
        ({"slots": 1, "pattern": "ADJ NOUN"}, "either a pattern or slots"),
        ({"rank": "beauty"}, "rank must be one of strength"),
        ({"names": "perhaps"}, "names must be one of drop, keep"),
        ({"show": ["fillers"]}, "no column 'fillers' here"),
        ({"where": "nonsense"}, "cannot read the slice"),
        ({"layer": "lemma"}, "layer"),
    ],
)
def test_what_makes_no_sense_is_refused(store: Path, asked: dict[str, object], message: str) -> None:
    with pytest.raises(UsageError, match=message):
        colloc.expressions(store, **asked)


def test_all_columns_have_a_place(store: Path) -> None:
    plain = colloc.expressions(store, min_count=4, show="all", limit=1)
    frames = colloc.expressions(store, min_count=4, show="all", slots=1, limit=1)
    sets = colloc.expressions(store, min_count=4, show="all", any_order=True, limit=1)
    assert {*plain.names, *frames.names, *sets.names, *PATTERNS_ONLY} == set(COLUMNS)
    assert set(sets.names) - set(plain.names) == set(SETS_ONLY)
    assert set(plain.names) - set(sets.names) == set(NOT_OF_SETS) - {*PATTERNS_ONLY, *FRAMES_ONLY}
    assert set(frames.names) - set(plain.names) == set(FRAMES_ONLY)


def test_nothing_to_find(tmp_path: Path) -> None:
    store = built(tmp_path, [["one two three"]])
    for kind in ({}, {"slots": 1}, {"any_order": True, "gap": 1}):
        answer = colloc.expressions(store, show="all", **kind)  # type: ignore[arg-type]
        assert len(answer) == 0
        assert "expression" in answer
