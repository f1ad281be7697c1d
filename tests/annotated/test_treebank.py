"""A treebank read, counted and written back."""

from __future__ import annotations

import math
import os
import re
from collections import Counter, defaultdict
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import colloc
from colloc.answers.evidence.text import card_lines
from colloc.build.building import build
from colloc.build.changing import remove
from colloc.build.merging import merge
from colloc.exports.conllu import conllu_text
from colloc.exports.pages.card import card_page
from colloc.store import documents, facts, stream, texts, vocabulary
from colloc.store.checking import check
from colloc.store.opening import Store, open_for_reading

from .treebanks import read_sentences, relation_counts, treebank

PUBLISHED = {
    # Words of the treebank: its description in the open data; verb-particle tokens: its relation statistics.
    # Sentences: its README, from memory (16,622 in all since 2.x).
    "words": 254_818,
    "compound:prt": 912,
    "sentences": 16_622,
}


def test_nothing_is_lost(store: Store, text: str) -> None:
    assert "".join(conllu_text(store)) == text


def test_tokens_and_sentences(store: Store, text: str) -> None:
    sentences = [len(words) for words in read_sentences(text)]
    starts = [stream.read_block(store, head.number).sentences + head.first_token for head in stream.block_heads(store)]
    edges = np.append(np.concatenate(starts), stream.token_count(store))
    assert np.diff(edges).tolist() == sentences
    assert int(facts.get(store, "sentences")) == len(sentences)
    if "COLLOC_DATA" in os.environ:
        assert (sum(sentences), len(sentences)) == (PUBLISHED["words"], PUBLISHED["sentences"])


def test_layers(store_path: Path, text: str, tmp_path: Path) -> None:
    expected: dict[str, Counter[str]] = defaultdict(Counter)
    for words in read_sentences(text):
        for word in words:
            lemma = word.lemma if word.lemma != "_" or word.form == "_" else ""
            upos = word.upos.replace("_", "")
            expected["lemma"][lemma] += 1
            expected["upos"][upos] += 1
            expected["lemma/upos"][f"{lemma}/{upos}" if lemma and upos else ""] += 1
    for layer, counts in expected.items():
        del counts[""]
        answer = colloc.words(store_path, layer=layer, limit=0)
        assert dict(zip(answer["word"].tolist(), answer["count"].tolist(), strict=True)) == counts


def test_relations_are_those_of_brute_force(store_path: Path, text: str) -> None:
    expected = relation_counts(text)
    by_relation: dict[str, dict[tuple[str, str], int]] = defaultdict(dict)
    for (name, head, other), n in expected.items():
        by_relation[name][head, other] = n
    for relation, own in sorted(by_relation.items()):
        answer = colloc.pairs(store_path, relation=relation, layer="lemma", min_count=1, any_strength=True, limit=0)
        assert {(row["first"], row["second"]): row["joint"] for row in answer.to_dicts()} == own
        assert set(answer["total"].tolist()) == {sum(own.values())}
    together: Counter[tuple[str, str]] = Counter()
    for (_, head, other), n in expected.items():
        together[head, other] += n
    answer = colloc.pairs(store_path, relation="", layer="lemma", min_count=1, any_strength=True, limit=0)
    assert {(row["first"], row["second"]): row["joint"] for row in answer.to_dicts()} == together


def test_verb_particles(store_path: Path, text: str) -> None:
    answer = colloc.pairs(store_path, relation="compound:prt", layer="form", min_count=1, any_strength=True, limit=0)
    counted = sum(
        word.relation == "compound:prt" and word.head not in ("0", "_")
        for words in read_sentences(text)
        for word in words
    )
    assert int(answer["joint"].sum()) == counted
    if "COLLOC_DATA" in os.environ:
        assert counted == PUBLISHED["compound:prt"]


def test_subtypes(store_path: Path, text: str) -> None:
    expected = Counter(relation for relation, _, _ in relation_counts(text).elements())
    totals = {
        name: colloc.tally(store_path, relation=name, layer="lemma")["total"]
        for name in ("nmod", "nmod:poss", "nmod:*")
    }
    assert totals["nmod"] == expected["nmod"]
    assert totals["nmod:*"] == sum(n for name, n in expected.items() if name.split(":")[0] == "nmod")


def test_all_relations_in_one_table(store_path: Path, text: str) -> None:
    counts = relation_counts(text)
    word = Counter(head for _, head, _ in counts.elements()).most_common(1)[0][0]
    answer = colloc.around(store_path, word, relation="all", layer="lemma", min_count=1, any_strength=True, limit=0)
    rows = answer.to_dicts()
    found = {(row["relation"], row["role"], row["second"]): row["joint"] for row in rows}
    expected = {(name, "head", other): n for (name, head, other), n in counts.items() if head == word}
    expected |= {(name, "dependent", head): n for (name, head, other), n in counts.items() if other == word}
    assert found == expected
    assert [row["npmi"] for row in rows] == sorted((row["npmi"] for row in rows), reverse=True)
    by_relation, heads, dependents = Counter[str](), Counter[tuple[str, str]](), Counter[tuple[str, str]]()
    for (name, head, other), n in counts.items():
        by_relation[name] += n
        heads[name, head] += n
        dependents[name, other] += n
    for row in rows:
        name = row["relation"]
        mine, others = (heads, dependents) if row["role"] == "head" else (dependents, heads)
        expected_margins = mine[name, word], others[name, row["second"]], by_relation[name]
        assert (row["first_total"], row["second_total"], row["total"]) == expected_margins


def test_relations_between_two_words(store_path: Path, text: str) -> None:
    """The card of a pair, by a plain count of the treebank: each relation, each direction, NPMI within the relation."""
    counts = relation_counts(text)
    totals, heads, dependents = Counter[str](), Counter[tuple[str, str]](), Counter[tuple[str, str]]()
    for (name, head, other), n in counts.items():
        totals[name] += n
        heads[name, head] += n
        dependents[name, other] += n
    met = Counter[tuple[str, str]]()
    for (_, head, other), n in counts.items():
        met[min(head, other), max(head, other)] += n
    both_ways = sorted(
        {(head, other) for _, head, other in counts if head < other}, key=lambda pair: (-met[pair], pair)
    )[:3]
    same = Counter({(head, other): n for (_, head, other), n in counts.items() if head == other}).most_common(1)
    for first, second in [*both_ways, *(pair for pair, _ in same)]:
        card = colloc.explain(store_path, first, second, layer="lemma", examples=0)
        found = {(row["relation"], row["head"], row["dependent"]): row for row in card.relations}
        ends = {(first, second), (second, first)}
        assert {key: row["joint"] for key, row in found.items()} == {
            key: n for key, n in counts.items() if key[1:] in ends
        }
        assert [row["joint"] for row in card.relations] == sorted(card.relations["joint"], reverse=True)
        for (name, head, other), row in found.items():
            n, total = counts[name, head, other], totals[name]
            of_head, of_other = heads[name, head], dependents[name, other]
            assert (row["head_total"], row["dependent_total"], row["total"]) == (of_head, of_other, total)
            assert row["expected"] == pytest.approx(of_head * of_other / total)
            if n < total:
                assert row["npmi"] == pytest.approx(math.log(n * total / (of_head * of_other)) / -math.log(n / total))
        rows = card.to_dict()["relations"]
        assert [row["relation"] for row in rows] == card.relations["relation"].tolist()
        shown, page = "\n".join(card_lines(card, 120)), card_page(card).decode()
        assert "\nRelations\n" in shown
        assert "<h2>Relations</h2>" in page
        for row in rows:
            assert re.search(rf"^  {re.escape(row['relation'])} .* {row['joint']:,} ", shown, re.MULTILINE)


def test_relations_of_a_slice_and_of_words_apart(tmp_path: Path) -> None:
    """Only the documents asked for; words that never depend on each other are said to; plain text has no such part."""
    word = "{0}\t{1}\t{1}\tNOUN\t_\t_\t{2}\t{3}\t_\t_\n"
    one = word.format(1, "rope", 2, "nsubj") + word.format(2, "hold", 0, "root") + word.format(3, "ship", 2, "obj")
    other = word.format(1, "rope", 0, "root") + word.format(2, "hold", 1, "acl") + word.format(3, "ship", 2, "obj")
    parts = [f"# newdoc id = d{n}\n# meta::genre = {n}\n{lines}\n" for n, lines in enumerate([one, other, one])]
    (tmp_path / "a.conllu").write_text("".join(parts), encoding="utf-8")
    store = tmp_path / "a.colloc"
    colloc.build(store, [str(tmp_path / "a.conllu")], jobs=1)

    def rows(**asked: Any) -> list[tuple[str, str, str, int]]:
        found = colloc.explain(store, "rope", "hold", examples=0, **asked).relations
        return [(row["relation"], row["head"], row["dependent"], row["joint"]) for row in found]

    assert rows() == [("nsubj", "hold", "rope", 2), ("acl", "rope", "hold", 1)]
    assert rows(where="genre=1") == [("acl", "rope", "hold", 1)]
    assert rows(where="genre=0,2") == [("nsubj", "hold", "rope", 2)]
    apart = colloc.explain(store, "rope", "ship", examples=0)
    assert len(apart.relations) == 0
    assert "  neither word is ever the head of the other" in card_lines(apart, 80)
    assert "Neither word is ever the head of the other." in card_page(apart).decode()
    (tmp_path / "b.txt").write_text("Rope and ship. A rope, a ship.", encoding="utf-8")
    colloc.build(tmp_path / "b.colloc", [str(tmp_path / "b.txt")], jobs=1)
    plain = colloc.explain(tmp_path / "b.colloc", "rope", "ship", examples=0)
    assert plain.relations is None
    assert plain.to_dict()["relations"] is None
    assert "Relations" not in card_lines(plain, 80)
    assert "<h2>Relations</h2>" not in card_page(plain).decode()


def test_evidence_of_relations(store_path: Path) -> None:
    answer = colloc.pairs(store_path, relation="obj", layer="lemma", min_count=2, sure=True, limit=20)
    assert (answer["documents"] >= 1).all()
    assert (answer["documents"] <= answer["joint"]).all()
    assert "order_floor" not in answer.names
    with pytest.raises(colloc.errors.UsageError, match="shuffled text"):
        colloc.pairs(store_path, relation="obj", above_chance="order")


def test_the_store_is_sound(store: Store) -> None:
    assert check(store) == []


def test_text_is_readable(store: Store, text: str) -> None:
    """The text of the treebank's own ``# text`` comments, where they can be trusted: in the open data."""
    rows = list(documents.iterate_documents(store))
    whole = [texts.read_text(store, row.first_character, row.first_character + row.n_characters) for row in rows]
    assert all("\t" not in one for one in whole)
    if "COLLOC_DATA" in os.environ:
        wanted = [line.removeprefix("# text = ") for line in text.split("\n") if line.startswith("# text = ")]
        joined = " ".join(" ".join(whole).split())
        place = 0
        for sentence in wanted:
            found = joined.find(" ".join(sentence.split()), place)
            assert found >= 0, sentence
            place = found


def test_jobs_make_no_difference(files: list[Path], store: Store, tmp_path: Path) -> None:
    build(tmp_path / "one", [str(file) for file in files], jobs=1)
    with open_for_reading(tmp_path / "one") as one:
        for name in ("types", "blocks", "block_columns", "annotation_values", "annotation_rests", "text_blocks"):
            sql = f"SELECT * FROM {name} ORDER BY 1, 2"
            assert one.rows(sql) == store.rows(sql), name


def test_removed_documents_leave_nothing(tmp_path: Path) -> None:
    (tmp_path / "a.conllu").write_text(treebank(5), encoding="utf-8")
    build(tmp_path / "s", [str(tmp_path / "a.conllu")])
    remove(tmp_path / "s", identifiers=["d5-2"])
    with open_for_reading(tmp_path / "s") as store:
        assert check(store) == []
        left = "".join(conllu_text(store))
        assert "d5-2" not in left
        first, rest = treebank(5).split("# newdoc id = d5-2")
        assert left == first + "# newdoc id = d5-3" + rest.split("# newdoc id = d5-3")[1]
        counts = relation_counts(left)
    answer = colloc.pairs(tmp_path / "s", relation="obj", layer="lemma", min_count=1, any_strength=True, limit=0)
    own = {(head, other): n for (name, head, other), n in counts.items() if name == "obj"}
    assert {(row["first"], row["second"]): row["joint"] for row in answer.to_dicts()} == own


def test_merged_and_added_stores(tmp_path: Path) -> None:
    for seed in (7, 8):
        (tmp_path / f"{seed}.conllu").write_text(treebank(seed), encoding="utf-8")
        build(tmp_path / f"{seed}", [str(tmp_path / f"{seed}.conllu")])
    (tmp_path / "plain.txt").write_text("The sea rings bells. Fog at sea.", encoding="utf-8")
    colloc.add(tmp_path / "7", [str(tmp_path / "plain.txt")])
    merge(tmp_path / "7", [tmp_path / "8"])
    with open_for_reading(tmp_path / "7") as store:
        assert check(store) == []
        assert "".join(conllu_text(store)) == treebank(7) + treebank(8)
        assert vocabulary.term_numbers(store, "form", ["rings"])[0] >= 0
    counts = relation_counts(treebank(7) + treebank(8))
    answer = colloc.pairs(tmp_path / "7", relation="nmod", layer="lemma", min_count=1, any_strength=True, limit=0)
    own = {(head, other): n for (name, head, other), n in counts.items() if name == "nmod"}
    assert {(row["first"], row["second"]): row["joint"] for row in answer.to_dicts()} == own


def test_without_text(tmp_path: Path) -> None:
    (tmp_path / "a.conllu").write_text(treebank(3), encoding="utf-8")
    build(tmp_path / "s", [str(tmp_path / "a.conllu")], keep_text=False)
    with open_for_reading(tmp_path / "s") as store:
        assert check(store) == []
        assert store.value("SELECT count(*) FROM annotation_rests") == 0
        with pytest.raises(colloc.errors.UsageError, match="without its text"):
            list(conllu_text(store))
    assert len(colloc.pairs(tmp_path / "s", relation="obj", layer="lemma", min_count=1, any_strength=True))


def test_slices_by_metadata_comments(tmp_path: Path) -> None:
    (tmp_path / "a.conllu").write_text(treebank(4), encoding="utf-8")
    build(tmp_path / "s", [str(tmp_path / "a.conllu")])
    written = colloc.conllu(tmp_path / "s", tmp_path / "out.conllu", where="genre=press")
    text = (tmp_path / "out.conllu").read_text(encoding="utf-8")
    assert text.count("# meta::genre = press") == written > 0
    assert "genre = mail" not in text
