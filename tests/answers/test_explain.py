"""The evidence card against the texts themselves, counted word by word, and against what the program says elsewhere."""

from __future__ import annotations

import json
import math
import random
from collections import Counter
from collections.abc import Iterable, Iterator
from dataclasses import replace
from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from sklearn.metrics import mutual_info_score

import colloc
from colloc.answers.evidence import occurring
from colloc.answers.evidence.byslice import labels_of
from colloc.answers.evidence.occurring import occurrences_of
from colloc.answers.evidence.text import card_lines
from colloc.answers.questions import PairOptions, ask
from colloc.answers.sureness.documents import document_evidence
from colloc.answers.sureness.hypotheses import all_pairs
from colloc.errors import NotSeenError, UsageError
from colloc.exports.pages.card import card_page
from colloc.store import vocabulary
from colloc.store.opening import Store

from .conftest import Demo, write_documents
from .test_lines import scan


def placed(texts: dict[str, str], first: str, second: str, reach: int) -> tuple[Counter[int], Counter[str], int, int]:
    """Pairs by offset and by document, cases of the first word, and those with the second in reach: word by word."""
    offsets: Counter[int] = Counter()
    documents: Counter[str] = Counter()
    cases = met = 0
    for name, text in texts.items():
        for words in scan(text):
            for place, (word, _) in enumerate(words):
                if word != first:
                    continue
                cases += 1
                near = [
                    step
                    for step in range(-reach, reach + 1)
                    if step and 0 <= place + step < len(words) and words[place + step][0] == second
                ]
                met += bool(near)
                offsets.update(near)
                documents[name] += len(near)
    return offsets, +documents, cases, met


@pytest.mark.parametrize(("first", "second"), [("heavy", "rain"), ("the", "fog"), ("strong", "fog"), ("of", "of")])
def test_positions_cases_and_documents(demo: Demo, first: str, second: str) -> None:
    card = colloc.explain(demo.store, first, second, window=4, inside="paragraph", examples=0)
    offsets, documents, cases, met = placed(demo.texts, first, second, 4)
    assert {row["offset"]: row["count"] for row in card.positions if row["count"]} == dict(offsets)
    assert card.positions["offset"].tolist() == [-4, -3, -2, -1, 1, 2, 3, 4]
    assert card.cases == {"cases": cases, "with_second": met, "left": 4, "right": 4}
    assert card.sentence() == f"‘{second}’ stands within 4 words of ‘{first}’ in {met:,} of {cases:,} cases."
    # A word beside itself is met from both sides and counted once.
    share = 2 if first == second else 1
    found = {row["document"]: row["joint"] * share for row in card.by_document}
    assert found == dict(documents)
    assert card.spread["documents"] == len(documents)
    if documents:
        assert card.spread["largest_share"] == max(documents.values()) / sum(documents.values())


OPTIONS: list[dict[str, Any]] = [
    {},
    {"directed": True},
    {"margins": "tokens"},
    {"margins": "tokens", "spanned": False},
    {"margins": "positions", "window": 3},
    {"left": 2, "right": 6},
    {"unit": True},
    {"where": ["genre=log"], "inside": "document", "window": 7},
]


@pytest.mark.parametrize("options", OPTIONS, ids=str)
@pytest.mark.parametrize(("first", "second"), [("heavy", "rain"), ("the", "the")])
def test_the_table_is_the_one_that_is_kept(demo: Demo, options: dict[str, Any], first: str, second: str) -> None:
    """Added up document by document, the table of a pair is what the tally says."""
    question = ask(demo.store, PairOptions(**options))
    if first == second and question.spec.kind == "unit":
        second = "of"
    terms = vocabulary.term_numbers(demo.store, question.layer, [first, second])
    kept = question.reader.given(*terms.astype(np.uint32).reshape(2, 1))
    counted = occurrences_of(question, int(terms[0]), int(terms[1])).table()
    for one, other in zip(kept.arguments, counted.arguments, strict=True):
        np.testing.assert_allclose(one, other, rtol=1e-12)


@pytest.fixture(scope="module")
def notes() -> dict[str, list[list[str]]]:
    """Paragraphs of words: none, one, a few and many of them in a document."""
    draw = random.Random(7)
    return {
        f"d{number}": [draw.choices(["sea", "wind", "salt", "rope"], k=draw.choice([1, 2, 3, 9, 60])) for _ in range(n)]
        for number, n in enumerate([1, 2, 7, 1, 20, 3])
    }


@pytest.fixture(scope="module")
def noted(tmp_path_factory: pytest.TempPathFactory, notes: dict[str, list[list[str]]]) -> Iterator[Store]:
    folder = tmp_path_factory.mktemp("notes")
    texts = {name: "\n\n".join(map(" ".join, paragraphs)) for name, paragraphs in notes.items()}
    colloc.build(folder / "n.colloc", [write_documents(folder / "n.jsonl", texts)], jobs=1)
    with colloc.open_store(folder / "n.colloc") as store:
        yield store


@pytest.mark.parametrize("piece", [1, 2, 7, 64, 2**17])
@pytest.mark.parametrize("reach", [1, 3, 40])
def test_totals_by_document(
    notes: dict[str, list[list[str]]], noted: Store, monkeypatch: pytest.MonkeyPatch, piece: int, reach: int
) -> None:
    """However the stream is cut: words, and pairs of words within reach, by a plain loop over every paragraph."""
    monkeypatch.setattr(occurring, "PIECE", piece)
    question = ask(noted, PairOptions(window=reach, inside="paragraph"))
    one, two = vocabulary.term_numbers(noted, question.layer, ["sea", "wind"]).tolist()
    seen = occurrences_of(question, one, two)
    found = zip(seen.total.tolist(), seen.words.sum(axis=1).tolist(), strict=True)
    assert list(found) == [
        (
            sum(min(reach, len(words) - 1 - place) for words in paragraphs for place in range(len(words))),
            sum(map(len, paragraphs)),
        )
        for paragraphs in notes.values()
    ]


def test_intervals_and_spread_are_those_of_the_lists(demo: Demo) -> None:
    """``pairs --sure`` goes another way to the same numbers."""
    question = ask(demo.store, PairOptions())
    terms = vocabulary.term_numbers(demo.store, "fold", ["thick", "fog"]).astype(np.uint32)
    table = question.reader.given(terms[:1], terms[1:])
    there = document_evidence(question, table)
    card = colloc.explain(demo.store, "thick", "fog", examples=0)
    rows = {(row["measure"], row["method"]): row for row in card.intervals}
    interval = there.interval
    assert interval is not None
    assert rows["pmi", "documents"]["low"] == pytest.approx(interval.low[0], rel=1e-9)
    assert rows["pmi", "documents"]["high"] == pytest.approx(interval.high[0], rel=1e-9)
    assert rows["pmi", "documents"]["trusted"]
    assert card.spread["dp_norm"] == pytest.approx(there.dp_norm[0], rel=1e-9)
    assert card.tests["q_is"] == "exact"
    assert card.tests["q"] == pytest.approx(all_pairs(question, 1).q_values(table)[0], rel=1e-9)


def test_information_holds_together(demo: Demo) -> None:
    """PMI = h(y) - h(y | x) = log2 of posterior over prior, both ways (Shannon 1948)."""
    card = colloc.explain(demo.store, "heavy", "rain", examples=0)
    table = card.table
    for row in card.information:
        assert row["bits"] == pytest.approx(card.value("pmi"))
        assert row["surprisal_before"] - row["surprisal_after"] == pytest.approx(row["bits"])
        assert row["ratio"] == pytest.approx(row["posterior"] / row["prior"])
    assert card.information["prior"][0] == table["second_total"] / table["total"]
    assert card.information["posterior"][0] == table["joint"] / table["first_total"]
    cells = card.cells
    assert cells["observed"].sum() == pytest.approx(table["total"])
    assert cells["expected"].sum() == pytest.approx(table["total"])
    assert cells["observed"][:2].sum() == table["first_total"]
    assert cells["expected"][0] == pytest.approx(table["expected"])


def test_mutual_information_of_the_table(tmp_path: Path) -> None:
    """Against scikit-learn, from all ordered pairs of words of a small text written out."""
    text = "the sea the fog the sea a fog a bell the bell rang the fog bell rang"
    colloc.build(tmp_path / "a.colloc", [write_documents(tmp_path / "a.jsonl", {"a": text})], jobs=1)
    words = text.split()
    after = [(words[i], words[j]) for i in range(len(words)) for j in range(i + 1, min(i + 4, len(words)))]
    both = after + [(two, one) for one, two in after]
    for directed, pairs in ((True, after), (False, both)):
        card = colloc.explain(tmp_path / "a.colloc", "fog", "bell", window=3, directed=directed, examples=0)
        assert card.mutual_information is not None
        expected = mutual_info_score(*map(list, zip(*pairs, strict=True))) / math.log(2)
        assert card.mutual_information["table_bits"] == pytest.approx(expected)
        share = pairs.count(("fog", "bell")) / len(pairs)
        mine = share * card.value("pmi") * (1 if directed else 2)
        assert card.mutual_information["pair_bits"] == pytest.approx(mine)


def test_ranks_among_pairs_met_as_often(demo: Demo) -> None:
    card = colloc.explain(demo.store, "thick", "fog", examples=0)
    joint = card.table["joint"]
    listed = colloc.pairs(
        demo.store, any_strength=True, min_count=math.ceil(joint / 2), limit=0, show=["pmi", "g2", "dice"]
    )
    like = listed.take(listed["joint"] <= 2 * joint)
    assert card.compared["pairs"] == len(like) == card.compared["compared"]
    ranks = {row["measure"]: row["rank"] for row in card.measures}
    for name in ("pmi", "g2", "dice", "npmi"):
        assert ranks[name] == 1 + int((like[name] > card.value(name) + 1e-12).sum())


def test_only_strength_is_ranked(demo: Demo) -> None:
    card = colloc.explain(demo.store, "thick", "fog", examples=0)
    ranks = {row["measure"]: row["rank"] for row in card.measures}
    unranked = {name for name, rank in ranks.items() if not rank}
    tests = {f"{test}_{form}" for test in ("g2", "chi2", "fisher") for form in ("p", "log10_p")}
    assert unranked == {"log_odds_se", "p_second_given_first", "p_first_given_second", *tests}
    for ask_for in (colloc.pairs, lambda store, **more: colloc.around(store, "fog", **more)):
        with pytest.raises(UsageError, match="log_odds_se tells how uncertain"):
            ask_for(demo.store, measure="log_odds_se")
        assert "log_odds_se" in ask_for(demo.store, show=["log_odds_se"], limit=3)


def test_slices_add_up(demo: Demo) -> None:
    card = colloc.explain(demo.store, "heavy", "luggage", examples=0)
    assert {"genre", "year"} <= set(card.slices)
    for rows in card.slices.values():
        assert rows["joint"].sum() == card.table["joint"]
    genres = {row["value"]: row for row in card.slices["genre"]}
    logs = colloc.explain(demo.store, "heavy", "luggage", where="genre=notice", examples=0)
    assert genres["notice"]["joint"] == logs.table["joint"]
    assert genres["notice"]["pmi"] == pytest.approx(logs.value("pmi"))
    assert "log" in genres


@pytest.mark.parametrize(
    ("options", "counted"),
    [
        ({}, "pairs"),
        ({"left": 3, "right": 1}, "pairs"),
        ({"margins": "positions"}, "words"),
        ({"unit": True, "inside": "sentence"}, "sentences"),
        ({"unit": True, "inside": "document"}, "documents"),
    ],
)
def test_rates_name_what_the_million_is(demo: Demo, options: dict[str, Any], counted: str) -> None:
    """Joint counts in a million words, and in a million of what the slice's own tally adds up; as contrast has it."""
    card = colloc.explain(demo.store, "heavy", "luggage", examples=0, **options)
    assert card.counted == counted
    rows = {row["value"]: row for row in card.slices["genre"]}
    compared = colloc.contrast(demo.store, "heavy", "luggage", this="genre=log", that="genre=notice", **options)
    lines = {row["item"]: row for row in compared}
    for value, side in (("log", "this"), ("notice", "that")):
        total = ask(demo.store, PairOptions(where=[f"genre={value}"], **options)).reader.tally.total
        names = [name for name, data in demo.metadata.items() if data["genre"] == value]
        words = sum(len(line) for name in names for line in scan(demo.texts[name]))
        joint = rows[value]["joint"]
        assert rows[value]["per_million_words"] == pytest.approx(joint * 1e6 / words)
        assert rows[value]["per_million_counted"] == pytest.approx(joint * 1e6 / total)
        assert lines[f"per million {counted}; log ratio"][side] == pytest.approx(rows[value]["per_million_counted"])
        if counted != "words":
            assert lines["per million words"][side] == pytest.approx(rows[value]["per_million_words"])
    shown = "\n".join(card_lines(card, 80))
    assert f"per M {counted}" in shown
    assert shown.count("per M words") == len(card.slices)
    page = card_page(card).decode()
    assert f">per M {counted}<" in page
    assert f"per M {counted}" in card.notes()["slices"].replace("Per", "per")
    assert card.spread["tokens"] == sum(len(line) for text in demo.texts.values() for line in scan(text))


def test_counts_say_what_they_count(demo: Demo, tmp_path: Path) -> None:
    card = colloc.explain(demo.store, "heavy", "luggage")
    cases = card.cases["with_second"]
    assert card.forms["count"].sum() == cases
    assert card.notes()["forms"].endswith(f"nearest to it: {cases:,} cases.")
    shown = " ".join(" ".join(card_lines(card, 80)).split())
    page = card_page(card).decode()
    for name in ("table", "ranks", "slices", "forms"):
        assert " ".join(card.notes()[name].split()) in shown
        assert card.notes()[name] in page
    (tmp_path / "a.conllu").write_text(CONLLU, encoding="utf-8")
    colloc.build(tmp_path / "a.colloc", [str(tmp_path / "a.conllu")], jobs=1)
    widened = colloc.explain(tmp_path / "a.colloc", "sells", "shells")
    said = "All forms of the two lemmas count here, 2 cases, where the words as asked for have 1:"
    assert widened.notes()["forms"].startswith(said)


@pytest.mark.parametrize(
    ("values", "labels"),
    [
        (["a", "b", "a", None], ["a", "b", "a", None]),
        (["a", "a"], None),
        ([f"title {number}" for number in range(20)], None),
        (list(range(1871, 1891)), [f"{year // 5 * 5}..{year // 5 * 5 + 4}" for year in range(1871, 1891)]),
        (list(range(0, 1000, 7)), [f"{year // 200 * 200}..{year // 200 * 200 + 199}" for year in range(0, 1000, 7)]),
        ([1.5, 2.5, 1.5], ["1.5", "2.5", "1.5"]),
    ],
)
def test_rows_of_a_key(values: list[Any], labels: list[str | None] | None) -> None:
    assert labels_of(values) == labels


def test_forms_and_order(demo: Demo) -> None:
    card = colloc.explain(demo.store, "thick", "fog", examples=0)
    forms = {(row["first_form"], row["second_form"], row["order"]): row["count"] for row in card.forms}
    written: Counter[tuple[str, str, str]] = Counter()
    for text in demo.texts.values():
        words = text.replace(".", " . ").split()
        written.update((one, two, "after") for one, two in pairwise(words) if two == "fog")
    for form in ("thick", "Thick"):
        assert forms[form, "fog", "after"] == written[form, "fog", "after"] > 0
    assert sum(forms.values()) == card.cases["with_second"]


def test_a_pair_that_never_met(demo: Demo) -> None:
    card = colloc.explain(demo.store, "strong", "fog")
    assert card.table["joint"] == 0
    assert card.statements[0].startswith("They were never met together")
    assert len(card.examples) == len(card.forms) == len(card.by_document) == 0
    assert not card.measures["rank"].any()
    assert json.loads(card.to_json())["information"][0]["bits"] == "-inf"
    assert card.avoidance is not None
    # Rule of three (Hanley & Lippman-Hand 1983): nothing met, so at most -ln 0.05 = 3.0 expected at 95 %.
    assert card.avoidance["pmi_at_most"] == pytest.approx(math.log2(-math.log(0.05) / card.table["expected"]))
    assert card.avoidance["pmi_if_one"] == pytest.approx(math.log2(1 / card.table["expected"]))
    assert set(card.intervals["method"]) == {"asymptotic"}
    assert any(statement.startswith("There is no interval over documents") for statement in card.statements)
    seldom = colloc.explain(demo.store, "dogs", "puffins", examples=0)
    assert seldom.table["expected"] < 5
    assert any("cannot bear a claim that they avoid" in statement for statement in seldom.statements)


def test_one_document_is_named(demo: Demo) -> None:
    """The talkative log of the demo corpora: all of a phrase from one document."""
    planted = json.loads((Path(__file__).parents[2] / "corpora_demo" / "truths.json").read_text(encoding="utf-8"))
    assert "log-0151" in json.dumps(planted)
    words = Counter(word for paragraph in scan(demo.texts["log-0151"]) for word, _ in paragraph)
    others = Counter(
        word for name, text in demo.texts.items() if name != "log-0151" for line in scan(text) for word, _ in line
    )
    own = [word for word, count in words.most_common() if count >= 10 and others[word] <= 3]
    assert own
    near = colloc.around(demo.store, own[0], any_strength=True, min_count=5, min_docs=1, limit=1)
    card = colloc.explain(demo.store, own[0], near["second"][0])
    assert card.spread["largest_document"] == "log-0151"
    assert any("log-0151" in statement for statement in card.statements)
    assert not card.intervals["trusted"].any()


def test_seldom_pairs_are_not_claimed(tmp_path: Path) -> None:
    source = write_documents(tmp_path / "a.jsonl", {str(row): "Fog and rain. The sea was calm." for row in range(2)})
    colloc.build(tmp_path / "a.colloc", [source], jobs=1)
    text = " ".join(colloc.explain(tmp_path / "a.colloc", "fog", "rain").statements)
    assert "cannot bear the claim" in text
    assert "Fewer than 5 meetings" in text
    assert "not to be trusted here" in text


def test_no_sentence_takes_back_what_another_says(demo: Demo) -> None:
    """Each pair of ``the`` that chance would explain among so many has no sentence that its attraction stands."""
    found = colloc.around(demo.store, "the", any_strength=True, min_count=10, limit=0, show=["pmi"])
    weak = [row["second"] for row in found if 0.02 < abs(row["pmi"]) < 0.5][:30]
    reworded = 0
    for word in weak:
        card = colloc.explain(demo.store, "the", word, examples=0)
        text = " ".join(card.statements)
        if card.tests["q"] > 0.05:
            assert "standing: " not in text
            reworded += "stays unproven" in text
        else:
            assert "stays unproven" not in text
    assert reworded


def test_chance_floors_are_shown_where_they_are_kept(tmp_path: Path, demo: Demo) -> None:
    path = tmp_path / "a.colloc"
    texts = dict(list(demo.texts.items())[:12])
    colloc.build(path, [write_documents(tmp_path / "a.jsonl", texts)], jobs=1)
    assert len(colloc.explain(path, "thick", "fog").floors) == 0
    colloc.floors(path)
    rows = list(colloc.explain(path, "thick", "fog").floors)
    assert {row["shuffle"] for row in rows} == {"order", "corpus"}
    known = [row for row in rows if row["floor"] == row["floor"]]
    assert known
    assert all(row["above"] == (row["value"] > row["floor"]) for row in known)
    assert all(row["above"] for row in rows if row["measure"] == "npmi")


def test_words_that_are_not_there(demo: Demo) -> None:
    with pytest.raises(NotSeenError, match=r"'xyzzy' never occurs .*colloc words"):
        colloc.explain(demo.store, "xyzzy", "fog")
    with pytest.raises(NotSeenError, match=r"single words; `colloc lines"):
        colloc.explain(demo.store, "thick fog", "bell")
    with pytest.raises(NotSeenError, match="in documents where genre=notice"):
        colloc.explain(demo.store, *only_in_logs(demo), where="genre=notice")
    with pytest.raises(UsageError):
        colloc.explain(demo.store, "thick", "fog", window=0)


def only_in_logs(demo: Demo) -> Iterable[str]:
    def of(genre: str) -> set[str]:
        texts = (text for name, text in demo.texts.items() if demo.metadata[name]["genre"] == genre)
        return {word for text in texts for line in scan(text) for word, _ in line}

    return sorted(of("log") - of("notice"))[0], "the"


def test_differences_are_told_where_they_were_planted(demo: Demo) -> None:
    """Truths of the demo corpora: *thick fog* is firmer in notices than in logs, at all times alike; *heavy rain* is
    the same everywhere."""

    def told(first: str, second: str) -> str:
        return " ".join(colloc.explain(demo.store, first, second, examples=0).statements)

    assert "where genre is notice" in told("thick", "fog")
    assert "where year is" not in told("thick", "fog")
    assert "not the same everywhere" not in told("heavy", "rain")


def test_a_word_with_itself_has_one_row_for_both_orders(demo: Demo) -> None:
    card = colloc.explain(demo.store, "the", "the", examples=0)
    forms = [(row["first_form"], row["second_form"]) for row in card.forms]
    assert forms
    assert len(forms) == len(set(forms))
    assert "before" not in card.forms["order"].tolist()
    assert card.forms["count"].sum() == card.cases["with_second"]


def test_the_test_is_named_and_no_q_is_nought(demo: Demo) -> None:
    card = colloc.explain(demo.store, "thick", "fog", examples=0)
    assert card.tests["test"] == ("G2" if card.table["expected"] >= 5 else "mid-p of Fisher's exact test")
    assert card.tests["test"] in " ".join(card.statements)
    tiny = replace(card, tests={**card.tests, "p": 0.0, "log10_p": -404.2, "q": 0.0, "q_is": "at most"})
    said = f"p 10^-404 (two-sided, {card.tests['test']}), q below 1e-300 among"
    assert said in " ".join(card_lines(tiny, 200))
    assert "q below 1e−300 among" in card_page(tiny).decode()


def test_no_part_of_few_documents_is_named(tmp_path: Path) -> None:
    """A part is told apart by three documents that hold both words, not by what one says over and over."""
    plain = "The old mill stood by the river. " * 4 + "The river was old. A mill was there. "
    loud = "Old mill, old mill, old mill, old mill. " * 12 + "She went by the river and sat down there. " * 30

    def told(louds: int) -> str:
        texts = [(plain + f"Filler number {n} says that. " * 9, 1850) for n in range(12)] + [(loud, 1920)] * louds
        rows = [{"id": f"d{n}", "text": text, "year": year} for n, (text, year) in enumerate(texts)]
        name = tmp_path / f"{louds}.jsonl"
        name.write_text("".join(json.dumps(row) + "\n" for row in rows), encoding="utf-8")
        colloc.build(tmp_path / f"{louds}.colloc", [str(name)], jobs=1)
        card = colloc.explain(tmp_path / f"{louds}.colloc", "old", "mill", examples=0)
        assert card.slices["year"]["holding"].tolist() == [12, louds]
        return " ".join(card.statements)

    assert "not the same everywhere" not in told(2)
    assert "not the same everywhere: PMI" in told(3)


CONLLU = """# newdoc id = one
1\tShe\tshe\tPRON\t_\t_\t2\tnsubj\t_\t_
2\tsells\tsell\tVERB\t_\t_\t0\troot\t_\t_
3\tshells\tshell\tNOUN\t_\t_\t2\tobj\t_\tSpaceAfter=No
4\t.\t.\tPUNCT\t_\t_\t2\tpunct\t_\t_

1\tThey\tthey\tPRON\t_\t_\t2\tnsubj\t_\t_
2\tsold\tsell\tVERB\t_\t_\t0\troot\t_\t_
3\ta\ta\tDET\t_\t_\t4\tdet\t_\t_
4\tshell\tshell\tNOUN\t_\t_\t2\tobj\t_\tSpaceAfter=No
5\t.\t.\tPUNCT\t_\t_\t2\tpunct\t_\t_

"""
"""An invented sample in CoNLL-U (https://universaldependencies.org/format.html)."""


def test_inflected_forms_where_there_are_lemmas(tmp_path: Path) -> None:
    (tmp_path / "a.conllu").write_text(CONLLU, encoding="utf-8")
    path = tmp_path / "a.colloc"
    colloc.build(path, [str(tmp_path / "a.conllu")], jobs=1)

    colloc.tally(path, layer="lemma")
    card = colloc.explain(path, "sells", "shells")
    forms = [(row["first_form"], row["second_form"]) for row in card.forms]
    assert forms == [("sells", "shells"), ("sold", "shell")]
    assert card.cases["with_second"] == 1
    lines = colloc.lines(path, "sell", "shell", layer="lemma", sentences=True)
    assert (lines["before"] + lines["match"] + lines["after"]).tolist() == ["She sells shells.", "They sold a shell."]
