"""One decision at a time, by command, by keys and from Python; several judges."""

from __future__ import annotations

import json
import os
import re
import shutil
import sys
from collections.abc import Sequence
from pathlib import Path

import pexpect
import pytest
from sklearn.metrics import cohen_kappa_score

import colloc
from colloc.cli.app import main
from colloc.cli.judging_keys import Draft, Surroundings, session
from colloc.cli.keys import END, Keys
from colloc.errors import NotSeenError, UsageError

from .conftest import harbour_lines


def test_a_decision_by_command_keeps_everything(store: Path, capsys: pytest.CaptureFixture[str]) -> None:
    line = colloc.lines(store, "thick", "fog", limit=1).to_dicts()[0]
    place = f"{line['document']}:{line['character']}"
    arguments = ["judge", str(store), "Thick", "FOG", "--accept", "--by", " Anna ", "--sense", "dense", "--note", "-x"]
    arguments += ["--label", "weather", "--label", "sea", "--example", place]
    assert main(arguments) == 0
    recorded = "a pair: the two words near each other, in any order"
    assert capsys.readouterr().err == f"thick fog: accept, by Anna; recorded as {recorded}\n"
    row = colloc.decisions(store).to_dicts()[0]
    assert {name: row[name] for name in ("words", "layer", "kind", "judge", "sense", "note", "labels")} == {
        "words": ["thick", "fog"],
        "layer": "fold",
        "kind": "pair",
        "judge": "Anna",
        "sense": "dense",
        "note": "-x",
        "labels": ["weather", "sea"],
    }
    (example,) = row["examples"]
    texts = {text["id"]: text["text"] for text in map(json.loads, harbour_lines())}
    whole = texts[example["document"]]
    assert whole[example["start"] : example["start"] + len(example["text"])] == example["text"]
    assert [example["text"][begin:end].casefold() for begin, end in example["marks"]] == ["thick", "fog"]


@pytest.mark.parametrize(
    ("arguments", "code", "message"),
    [
        (["thick", "fog", "--accept"], 2, "say who decides: --by NAME"),
        (["thick", "fog", "--by", "A"], 2, "give one of --accept, --reject, --unsure and --withdraw"),
        (["thick", "fog", "--by", "A", "--accept", "--reject"], 2, "give one of"),
        (["fog", "--by", "A", "--accept"], 2, "two words or an expression"),
        (["thick", "zebra", "--by", "A", "--accept"], 1, "'zebra' never occurs"),
        (["thick", "fog", "--by", "A", "--accept", "--layer", "colour"], 2, "no layer 'colour'"),
        (["a", "b", "c", "--by", "A", "--accept", "--kind", "pair"], 2, "a pair has two words, not 3"),
        (["thick", "fog", "--by", "A", "--accept", "--example", "log 00"], 65, "DOCUMENT:OFFSET"),
        (["thick", "fog", "--by", "A", "--accept", "--example", "nowhere:5"], 1, "does not stand in that document"),
        (["--by", "A", "--accept"], 2, "say what is decided"),
        (["--by", "A"], 2, "needs a terminal"),
        (["thick", "fog", "--from", "x.csv"], 2, "leave out words and verdicts"),
    ],
)
def test_what_cannot_be_recorded(
    store: Path, arguments: Sequence[str], code: int, message: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["judge", str(store), *arguments]) == code
    error = capsys.readouterr().err
    assert message in error
    assert error.count("\n") == 1
    assert len(colloc.decisions(store, history=True)) == 0


@pytest.mark.parametrize(
    ("words", "remark"),
    [
        (["fog bay"], "fog bay: never occurs in a row in this store"),
        (["fog * bay"], "fog * bay: never occurs in a row in this store"),
        (["fog", "oil"], "fog oil: the two words never meet within reach of each other in this store"),
        (["fog", "thick", "--kind", "directed"], "fog thick: the second word never follows the first within reach"),
        (["thick fog"], ""),
        (["thick * came"], ""),
        (["fog", "bay"], ""),
        (["thick", "fog", "--kind", "directed"], ""),
    ],
)
def test_what_never_occurs_is_recorded_and_said(
    store: Path, words: list[str], remark: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["judge", str(store), *words, "--accept", "--by", "Anna"]) == 0
    _, *said = capsys.readouterr().err.splitlines()
    assert [line[: len(remark)] for line in said] == ([remark] if remark else [])
    assert len(colloc.decisions(store)) == 1
    assert main(["judge", str(store), *words, "--withdraw", "--by", "Anna"]) == 0
    assert len(capsys.readouterr().err.splitlines()) == 1


def test_a_list_of_decisions_can_be_cut(store: Path, capsys: pytest.CaptureFixture[str]) -> None:
    for words in ("thick fog", "strong wind", "clean oil"):
        colloc.judge(store, words.split(), "accept", by="Anna")
    for limit, rows, more in (("2", 2, True), ("3", 3, False), ("0", 3, False)):
        assert main(["decisions", str(store), "-n", limit, "-f", "csv"]) == 0
        out, err = capsys.readouterr()
        assert len(out.splitlines()) == rows + 1
        assert ("1 row more: --limit 0 for all" in err) == more


def test_expressions_and_open_places(store: Path) -> None:
    made = colloc.judge(store, "By and Large", "accept", by="Anna")
    assert (made.kind, made.words) == ("expression", ("by", "and", "large"))
    frame = colloc.judge(store, ["took", "the", "*", "into", "account"], "accept", by="Anna")
    assert frame.words == ("took", "the", "*", "into", "account")
    with pytest.raises(UsageError, match="not \\*"):
        colloc.judge(store, ["*", "*"], "accept", by="Anna", kind="expression")
    entries = {entry.matter.text: entry.figures for entry in colloc.entries(store).entries}
    texts = [text["text"].casefold() for text in map(json.loads, harbour_lines())]
    assert entries["by and large"].joint == sum(text.count("by and large") for text in texts)
    assert entries["by and large"].documents == sum("by and large" in text for text in texts)
    assert entries["took the * into account"].joint == sum(
        len(re.findall(r"took the \w+ into account", text)) for text in texts
    )


def test_decisions_survive_add_remove_merge_and_a_new_store(store: Path, tmp_path: Path) -> None:
    colloc.judge(store, ["thick", "fog"], "accept", by="Anna", examples=[_place(store)])
    colloc.judge(store, ["strong", "wind"], "reject", by="Ben")
    before = colloc.decisions(store, history=True).to_dicts()
    more = tmp_path / "more.jsonl"
    more.write_text(json.dumps({"id": "new", "text": "A zephyr and thick fog.", "author": "B", "year": 1890}))
    colloc.add(store, [str(more)], jobs=1)
    colloc.remove(store, identifiers=[before[0]["examples"][0]["document"]], jobs=1)
    assert colloc.decisions(store, history=True).to_dicts() == before
    (entry,) = colloc.entries(store).entries
    assert entry.senses[0].lines[0].example.text == before[0]["examples"][0]["text"], "the line outlives its document"
    assert entry.senses[0].lines[0].metadata == {}
    source = tmp_path / "again.jsonl"
    source.write_text("\n".join(reversed(harbour_lines())), encoding="utf-8")
    again = tmp_path / "again.colloc"
    colloc.build(again, [str(source)], jobs=1)
    records = [("row", row) for row in before]
    assert colloc.take_decisions(again, records) == 2
    assert colloc.take_decisions(again, records) == 0
    assert colloc.decisions(again, history=True).to_dicts() == before
    other = tmp_path / "other.colloc"
    colloc.build(other, [str(more)], jobs=1)
    colloc.merge(other, [again], jobs=1)
    assert colloc.decisions(other, history=True).to_dicts() == before


def _place(store: Path) -> str:
    line = colloc.lines(store, "thick", "fog", limit=1).to_dicts()[0]
    return f"{line['document']}:{line['character']}"


def test_withdrawn_decisions_do_not_count(store: Path) -> None:
    colloc.judge(store, ["thick", "fog"], "accept", by="Anna")
    colloc.judge(store, ["fog", "thick"], "withdrawn", by="Anna")
    assert len(colloc.decisions(store)) == 0
    assert len(colloc.decisions(store, history=True)) == 2
    assert colloc.entries(store).entries == ()


PAIRS = (
    *("thick fog", "strong wind", "clean oil", "one mind", "the boat", "the reef", "keeper wrote", "at dawn"),
    *("the fog", "the wind"),
)
BY_ANNA = ("accept", "accept", "accept", "reject", "reject", "unsure", "accept", "reject", "reject", "reject")
BY_BEN = ("accept", "accept", "reject", "reject", "unsure", "unsure", "accept", "accept", "reject", "reject")


def test_agreement_is_cohens_kappa(store: Path) -> None:
    for words, ours, theirs in zip(PAIRS, BY_ANNA, BY_BEN, strict=True):
        colloc.judge(store, words.split(), ours, by="Anna")  # type: ignore[arg-type]
        colloc.judge(store, words.split()[::-1], theirs, by="Ben")  # type: ignore[arg-type]
    colloc.judge(store, ["the", "lamp"], "accept", by="Cora")
    rows = colloc.judge_agreement(store).to_dicts()
    assert [(row["judge"], row["other"], row["both"], row["same"]) for row in rows] == [
        ("Anna", "Ben", 10, 7),
        ("Anna", "Cora", 0, 0),
        ("Ben", "Cora", 0, 0),
    ]
    assert rows[0]["kappa"] == pytest.approx(cohen_kappa_score(BY_ANNA, BY_BEN))
    assert rows[0]["kappa_low"] < rows[0]["kappa"] < rows[0]["kappa_high"]
    assert str(rows[1]["kappa"]) == "nan"
    assert [row["says"] for row in rows] == ["", *["too few: 0 in common, kappa needs 10"] * 2]
    differing = colloc.decisions(store, disagreements=True).to_dicts()
    found = {" ".join(sorted(row["words"])) for row in differing}
    wanted = zip(PAIRS, BY_ANNA, BY_BEN, strict=True)
    assert found == {" ".join(sorted(words.split())) for words, ours, theirs in wanted if ours != theirs}
    # Accepted by one and rejected by the other is left out; unsure beside accept is not a dispute.
    entries = colloc.entries(store)
    assert entries.disputed == 2
    texts = {entry.matter.text for entry in entries.entries}
    assert texts == {"thick fog", "strong wind", "keeper wrote", "the lamp"}
    assert {entry.matter.text for entry in colloc.entries(store, by="Ben").entries} == {
        *("fog thick", "wind strong", "wrote keeper", "dawn at"),
    }


def test_agreement_where_one_judge_accepts_everything(store: Path) -> None:
    with pytest.raises(NotSeenError, match="nobody has decided anything"):
        colloc.judge_agreement(store)
    for place, words in enumerate(PAIRS):
        colloc.judge(store, words.split(), "accept" if place else "reject", by="Anna")
        if not place:
            with pytest.raises(NotSeenError, match="only one judge, Anna, has decided"):
                colloc.judge_agreement(store)
        colloc.judge(store, words.split(), "accept", by="Ben")
        (row,) = colloc.judge_agreement(store).to_dicts()
        if place < 9:
            assert str(row["kappa"]) == "nan"
            assert row["says"] == f"too few: {place + 1} in common, kappa needs 10"
    assert (row["both"], row["same"], row["kappa"]) == (10, 9, 0.0)
    assert row["kappa"] == pytest.approx(cohen_kappa_score(["reject"] + ["accept"] * 9, ["accept"] * 10))
    assert str(row["kappa_low"]) == str(row["kappa_high"]) == "nan"
    assert row["says"] == "one of them gave one verdict throughout: no interval"
    colloc.judge(store, PAIRS[0].split(), "accept", by="Anna")
    (row,) = colloc.judge_agreement(store).to_dicts()
    assert row["same"] == 10
    assert str(row["kappa"]) == "nan", "agreement by chance is certain: kappa says nothing"


def test_a_session_by_keys(store: Path) -> None:
    rows, measures = colloc.candidates(store, limit=4)
    pressed = iter(["1", "n", "a", "r", "b", "x", "u", "s", "a", "a"])
    texts = iter(["a note"])
    screens: list[Sequence[str]] = []
    recorded: list[tuple[str, str, set[int], dict[str, str]]] = []

    def record(row: object, verdict: str, draft: Draft, lines: object) -> None:
        recorded.append((row.matter.text, verdict, set(draft.lines), dict(draft.texts)))  # type: ignore[attr-defined]

    from colloc.answers.judging.examples import best_examples
    from colloc.verbs.opening import open_store

    with open_store(store) as opened:
        outside = Surroundings(
            lambda: next(pressed, END),
            lambda question: next(texts),
            screens.append,
            lambda row: best_examples(opened, row.matter, 5),
            record,
        )
        decided = session(rows, measures, outside)
    names = [row.matter.text for row in rows]
    assert recorded == [
        (names[0], "accept", {0}, {"note": "a note"}),
        (names[1], "reject", set(), {}),
        (names[1], "unsure", set(), {}),
        (names[3], "accept", set(), {}),
    ]
    assert decided == {"accept": 2, "reject": 0, "unsure": 1}
    assert any(line == "'x' does nothing here" for screen in screens for line in screen)
    assert any("  decided: reject" in screen for screen in screens)
    assert any(line.startswith("* 1 ") for line in screens[1])


def test_keys_pass_over_arrows(monkeypatch: pytest.MonkeyPatch) -> None:
    pressed = iter(["\x1b[A\x1bOB\x1b[1;5Ca", "é", "\x1b", "r\x04", ""])
    monkeypatch.setattr("colloc.cli.keys._pressed", lambda: next(pressed))
    keys = Keys()
    assert [keys.read() for _ in range(5)] == ["a", "é", "r", END, END]


def test_keys_in_a_terminal(store: Path) -> None:
    """A real pseudo-terminal: one key decides, text is asked for, what was decided is in the store at once."""
    environment = os.environ | {"TERM": "xterm", "COLUMNS": "90"}
    command = ["-m", "colloc", "judge", str(store), "--by", "Cora", "-n", "3"]
    child = pexpect.spawn(sys.executable, command, env=environment, dimensions=(40, 90), encoding="utf-8", timeout=60)
    try:
        child.expect("1 of 3")
        child.expect("q quit.*labels")
        child.send("e")
        child.expect("sense: ")
        child.sendline("=Sinn ü")
        child.expect("sense: =Sinn ü.*labels")
        child.send("a")
        child.expect("2 of 3.*labels")
        assert [row["sense"] for row in colloc.decisions(store).to_dicts()] == ["=Sinn ü"]
        child.send("q")
        child.expect("1 decided by Cora: 1 accept, 0 reject, 0 unsure")
        child.expect(pexpect.EOF)
    finally:
        child.close()
    assert child.exitstatus == 0
    left, _ = colloc.candidates(store, limit=3, by="Cora", again=False)
    assert len(left) == 2


def test_candidates_of_words_and_unknown_words(store: Path, tmp_path: Path) -> None:
    rows, _ = colloc.candidates(store, words=["fog"], limit=3)
    assert all("fog" in row.matter.words for row in rows)
    with pytest.raises(NotSeenError):
        colloc.candidates(store, given=[["fog", "zebra"]])
    given = tmp_path / "one.txt"
    given.write_text("fog\n", encoding="utf-8")
    assert main(["sheet", str(store), "--given", str(given)]) == 65


def test_candidates_from_the_ranking_of_expressions(store: Path, demo: Path, tmp_path: Path) -> None:
    rows, _ = colloc.candidates(demo, expressions=True, limit=5)
    ranked = colloc.expressions(demo, limit=5)
    assert len(ranked) == 5
    assert [row.matter.text for row in rows] == ranked["expression"].tolist()
    assert [row.figures.joint for row in rows] == ranked["count"].tolist()
    assert [row.figures.documents for row in rows] == ranked["documents"].tolist()
    assert {row.matter.kind for row in rows} == {"expression"}
    with pytest.raises(UsageError, match="ranking of their own"):
        colloc.candidates(demo, expressions=True, measure="npmi")
    given = tmp_path / "frames.txt"
    given.write_text("took the _ into account\nby_and_large\n", encoding="utf-8")
    sheet = tmp_path / "s.csv"
    assert main(["sheet", str(store), "--given", str(given), "--lines", "0", "-o", str(sheet), "-q"]) == 0
    assert "took the * into account" in sheet.read_text(encoding="utf-8")
    assert main(["sheet", str(demo), "--expressions", "-n", "2", "--lines", "1", "-o", str(sheet), "-q"]) == 0
    assert "specific_correlation" in sheet.read_text(encoding="utf-8")


def test_a_store_that_cannot_be_written_keeps_its_decisions(store: Path, tmp_path: Path) -> None:
    colloc.judge(store, ["thick", "fog"], "accept", by="Anna")
    copy = Path(shutil.copy(store, tmp_path / "copy"))
    copy.chmod(0o444)
    assert len(colloc.decisions(copy)) == 1


@pytest.mark.parametrize(
    ("words", "more", "told"),
    [
        (["thick", "fog"], [], "a pair: the two words near each other, in any order"),
        (["thick", "fog"], ["--kind", "directed"], "a directed pair: the second word after the first"),
        (["thick fog"], [], "an expression: the words in a row"),
        (["by", "and", "large"], [], "an expression: the words in a row"),
        (["thick fog"], ["--kind", "pair"], "a pair: the two words near each other, in any order"),
    ],
)
def test_what_was_recorded_is_told(
    store: Path, capsys: pytest.CaptureFixture[str], words: list[str], more: list[str], told: str
) -> None:
    assert main(["judge", str(store), *words, "--accept", "--by", "Anna", *more]) == 0
    assert capsys.readouterr().err == f"{' '.join(words)}: accept, by Anna; recorded as {told}\n"
    [one] = colloc.decisions(store)
    assert (
        one["kind"]
        == {"a pair": "pair", "a directed pair": "directed", "an expression": "expression"}[told.split(":")[0]]
    )


def test_expressions_that_are_found_in_the_text_have_counts(store: Path) -> None:
    """Too long to be grown, or open at an end: looked for place by place; counted here by a plain search."""
    texts = {
        "* tide into account": ["the tide into account"],
        "the thick fog *": ["the thick fog came", "the thick fog stayed"],
        "the lamp burned clean oil by and large all night": ["the lamp burned clean oil by and large all night"],
    }
    documents = [json.loads(line)["text"].lower() for line in harbour_lines()]
    for words in texts:
        colloc.judge(store, words, "accept", by="Anna")
    found = {entry.matter.text: entry.figures for entry in colloc.entries(store).entries}
    for words, spelled in texts.items():
        assert found[words].joint == sum(text.count(one) for text in documents for one in spelled)
        assert found[words].documents == sum(any(one in text for one in spelled) for text in documents)
        assert found[words].scores["specific_correlation"] > 0
        assert ("c_value" in found[words].scores) == ("*" not in words)
