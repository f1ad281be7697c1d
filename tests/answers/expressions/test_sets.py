"""Sets of words in any order, against every choice of places of the same text, counted one by one."""

from __future__ import annotations

import math
from collections import Counter, defaultdict
from itertools import combinations
from pathlib import Path

import pytest

import colloc
from colloc.cli.app import main
from colloc.counts.sequences import growing
from colloc.errors import UsageError
from tests.answers.expressions.test_expressions import built, by_expression, prose

EVERYTHING = {"min_docs": 0, "names": "keep", "common": "keep", "fragments": "keep", "limit": 0, "show": "all"}
DOCUMENTS = prose(9, documents=6, sentences=60)
Words = tuple[str, ...]


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return built(tmp_path_factory.mktemp("sets"), DOCUMENTS)


class Plain:
    """Every choice of places of every sentence, at most so far apart, one by one."""

    def __init__(self, words: int, gap: int) -> None:
        self.orders: dict[Words, Counter[Words]] = defaultdict(Counter)
        self.documents: dict[Words, Counter[int]] = defaultdict(Counter)
        self.adjacent: Counter[Words] = Counter()
        self.chances = 0
        for number, sentences in enumerate(DOCUMENTS):
            for text in map(str.split, sentences):
                for places in combinations(range(len(text)), words):
                    if places[-1] - places[0] >= words + gap:
                        continue
                    order = tuple(text[place] for place in places)
                    key = tuple(sorted(order))
                    self.chances += 1
                    self.orders[key][order] += 1
                    self.documents[key][number] += 1
                    self.adjacent[key] += places[-1] - places[0] == words - 1

    def share(self, key: Words) -> float:
        """Mean share of the choices that hold the words in one order, over all orders they can have."""
        arrangements = math.factorial(len(key))
        for times in Counter(key).values():
            arrangements //= math.factorial(times)
        return self.orders[key].total() / (self.chances * arrangements) if key in self.orders else 0.0


@pytest.mark.parametrize("gap", [0, 1, 2])
def test_counts_orders_and_documents_are_those_of_every_choice_of_places(store: Path, gap: int) -> None:
    answer = colloc.expressions(store, any_order=True, gap=gap, min_count=6, max_words=4, **EVERYTHING)  # type: ignore[arg-type]
    rows = {tuple(sorted(row["expression"].split())): row for row in answer}
    assert len(rows) == len(answer)
    for words in (2, 3, 4):
        plain = Plain(words, gap)
        frequent = {key for key, orders in plain.orders.items() if orders.total() >= 6}
        assert {key for key in rows if len(key) == words} == frequent
        assert len(frequent) > 20
        for key in frequent:
            row, orders = rows[key], plain.orders[key]
            assert (row["count"], row["adjacent"]) == (orders.total(), plain.adjacent[key])
            assert row["documents"] == len(plain.documents[key])
            named = sorted(((" ".join(order), n) for order, n in orders.items()), key=lambda one: (-one[1], one[0]))
            assert row["orders"] == ", ".join(f"{text} {n}" for text, n in named[:5])
            assert (row["expression"], row["order_kinds"]) == (named[0][0], len(named))
            shares = [n / orders.total() for n in orders.values()]
            assert row["order_entropy"] == pytest.approx(-sum(one * math.log2(one) for one in shares), abs=1e-12)


@pytest.mark.parametrize("gap", [0, 2])
def test_scores_follow_their_definitions(store: Path, gap: int) -> None:
    answer = colloc.expressions(store, any_order=True, gap=gap, min_count=6, max_words=4, **EVERYTHING)  # type: ignore[arg-type]
    plain = {words: Plain(words, gap) for words in (1, 2, 3, 4)}
    checked = 0
    for row in answer:
        key = tuple(sorted(row["expression"].split()))
        if len(key) < 3 and checked > 100:
            continue
        checked += 1
        whole = plain[len(key)].share(key)
        splits = []
        for size in range(1, len(key)):
            for chosen in combinations(range(len(key)), size):
                parts = (
                    [key[place] for place in chosen],
                    [key[place] for place in range(len(key)) if place not in chosen],
                )
                one, other = (plain[len(part)].share(tuple(part)) for part in parts)
                if one * other:
                    splits.append(math.log2(whole / (one * other)))
        assert row["weakest_split"] == pytest.approx(min(splits), abs=1e-9)
        alone = math.prod(plain[1].share((word,)) for word in key)
        assert row["specific_correlation"] == pytest.approx(math.log2(whole / alone), abs=1e-9)
        if len(key) == 2:
            assert row["specific_correlation"] == pytest.approx(row["weakest_split"], abs=1e-9)
        held = plain[len(key)].documents[key]
        elsewhere = held.total() - max(held.values())
        assert row["strength"] == pytest.approx(row["weakest_split"] * math.log2(1 + elsewhere), abs=1e-9)


def test_both_orders_are_one_set_and_fragments_are_folded(tmp_path: Path) -> None:
    turns = ["women and men", "men and women", "men and their women", "women, and also men"]
    filler = ["the crab and the gull rose", "a gull saw men", "the women sang and slept", "rope and salt and tar"]
    ends = ["came", "went home", "slept", "sang on", "rowed", "fell"]
    documents = [[f"{turn} {ends[(n + k) % 6]}" for k, turn in enumerate(turns)] + filler * 3 for n in range(6)]
    store = built(tmp_path, documents)
    found = by_expression(colloc.expressions(store, any_order=True, gap=1, common="keep", limit=0, show="all"))
    row = found["men and women"]
    assert row["count"] == 24
    assert row["adjacent"] == 12
    assert row["orders"] == "men and women 12, women and men 12"
    assert row["order_entropy"] == 1.0
    assert row["fragments"] > 0
    assert row["fragment"] in ("men women", "women men")
    assert row["fragment_count"] == 12
    assert "men women" not in found
    kept = colloc.expressions(store, any_order=True, gap=1, common="keep", fragments="keep", limit=0, min_words=3)
    assert "men and women" in kept["expression"]
    assert set(kept.settings) >= {"any_order", "gap"}


def test_a_word_twice_and_processes(tmp_path: Path, store: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    store_two = built(tmp_path, [["side by side they rowed", "by the side side rope"], ["they stood side by side"]] * 3)
    answer = colloc.expressions(store_two, any_order=True, gap=1, min_count=3, max_words=3, **EVERYTHING)  # type: ignore[arg-type]
    rows = {tuple(sorted(row["expression"].split())): row for row in answer}
    # twice "side by side", once "by the side side", in each of three pairs of documents
    assert rows["by", "side", "side"]["orders"] == "side by side 6, by side side 3"
    # a word that stands between two of another meets it twice: the set is more frequent than the word
    (tmp_path / "between").mkdir()
    between = built(tmp_path / "between", [["a side crab side sank", "side crab side"]])
    answer = colloc.expressions(between, any_order=True, min_count=4, **EVERYTHING)  # type: ignore[arg-type]
    assert dict(zip(answer["expression"], answer["orders"], strict=True)) == {"crab side": "crab side 2, side crab 2"}
    one = colloc.expressions(store, any_order=True, gap=1, min_count=6, jobs=1, **EVERYTHING)  # type: ignore[arg-type]
    monkeypatch.setattr(growing, "_WORTH_A_PROCESS", 100)
    two = colloc.expressions(store, any_order=True, gap=1, min_count=6, jobs=2, memory=2**27, **EVERYTHING)  # type: ignore[arg-type]
    assert one == two


def test_limits_and_ties(store: Path) -> None:
    whole = colloc.expressions(store, any_order=True, min_count=6, common="keep", limit=0, rank="count")
    for limit in (1, 7, 30):
        some = colloc.expressions(store, any_order=True, min_count=6, common="keep", limit=limit, rank="count")
        assert some["expression"].tolist() == whole["expression"].tolist()[:limit]


def test_what_makes_no_sense(store: Path, capsys: pytest.CaptureFixture[str]) -> None:
    for options, message in (
        ({"slots": 1}, "neither open slots nor a pattern"),
        ({"rank": "c_value"}, "not defined for sets in any order"),
        ({"gap": 5}, "a gap has 0 to 4 words"),
        ({"show": ["cut"]}, "no column 'cut'"),
    ):
        with pytest.raises(UsageError, match=message):
            colloc.expressions(store, any_order=True, **options)  # type: ignore[arg-type]
    with pytest.raises(UsageError, match="a gap is for what stands in any order"):
        colloc.expressions(store, gap=1)
    assert main(["expressions", str(store), "--any-order", "--gap", "1", "-n", "2", "-f", "csv", "-q"]) == 0
    head, *rows = capsys.readouterr().out.splitlines()
    assert head == "expression,count,adjacent,documents,strength,order_kinds,orders"
    assert len(rows) == 2
