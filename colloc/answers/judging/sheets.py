"""Sheets of candidates to fill in elsewhere, and what comes back of them.

Each row stands for itself: it names its words, and ``check`` is a checksum of what
it is about, so rows may be sorted, filtered, deleted and put together from several
sheets, and a row whose words were changed is noticed.
"""

from __future__ import annotations

import base64
import hashlib
import json
import unicodedata
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Any, cast

import numpy as np

from colloc.answers.columns import Columns
from colloc.answers.judging.candidates import Candidate, shown_scores
from colloc.answers.judging.examples import best_examples, example_at, read_place
from colloc.answers.judging.matters import Matter, make_matter, read_list, written_list
from colloc.errors import CollocError, DataError
from colloc.store.connection import Store
from colloc.store.decisions import Decision, Example, Key, Kind, Verdict, newest

WORDS, LABELS = " ", "; "
"""What stands between words, and between labels or places, in a cell."""
_VERDICTS: Mapping[str, Verdict] = {
    **dict.fromkeys(("accept", "a", "accepted"), "accept"),
    **dict.fromkeys(("reject", "r", "rejected"), "reject"),
    **dict.fromkeys(("unsure", "u"), "unsure"),
    "withdrawn": "withdrawn",
}
FILLED = ("verdict", "sense", "note", "labels", "examples")
"""Columns to fill in."""


def sheet(store: Store, rows: Sequence[Candidate], measures: Sequence[str], judge: str, lines: int) -> Columns:
    """One row for each candidate.

    Parameters
    ----------
    judge : str
        Whose decisions are filled in already; empty for nobody's.
    lines : int
        Example lines beside each row.

    Returns
    -------
    Columns
        words, verdict, sense, note, labels, examples (to be filled in), joint, documents, the measures, line_1,
        place_1, ..., layer, kind, judge, seen (number of the decision filled in, 0 for none) and check.
    """
    decisions = [row.decision for row in rows]
    names = shown_scores(rows, measures)
    columns: dict[str, Any] = {
        "words": [written_list(row.matter.words, WORDS) for row in rows],
        "verdict": [one.verdict if one else "" for one in decisions],
        "sense": [one.sense if one else "" for one in decisions],
        "note": [one.note if one else "" for one in decisions],
        "labels": [written_list(one.labels, LABELS) if one else "" for one in decisions],
        "examples": [written_list([place_of(e) for e in one.examples], LABELS) if one else "" for one in decisions],
        "joint": np.array([row.figures.joint for row in rows], np.int64),
        "documents": np.array([row.figures.documents for row in rows], np.int64),
    }
    for name in names:
        columns[name] = np.array([row.figures.scores.get(name, np.nan) for row in rows], np.float64)
    shown = [best_examples(store, row.matter, lines) for row in rows]
    for place in range(max(map(len, shown), default=0)):
        there = [examples[place] if place < len(examples) else None for examples in shown]
        columns[f"line_{place + 1}"] = [bracketed(example) if example else "" for example in there]
        columns[f"place_{place + 1}"] = [place_of(example) if example else "" for example in there]
    columns |= {
        "layer": [row.matter.layer for row in rows],
        "kind": [row.matter.kind for row in rows],
        "judge": [judge for _ in rows],
        "seen": np.array([row.number for row in rows], np.int64),
        "check": [_check(row.matter, row.number) for row in rows],
    }
    return Columns(columns, {"store": str(store.path), "judge": judge, "measures": list(measures), "lines": lines})


def place_of(example: Example) -> str:
    """``DOC:OFFSET``."""
    document, offset = example.place
    return f"{document}:{offset}"


def bracketed(example: Example) -> str:
    """The text with what is marked in square brackets."""
    text = example.text
    for begin, end in sorted(example.marks, reverse=True):
        text = f"{text[:begin]}[{text[begin:end]}]{text[end:]}"
    return text


def written_cells(answer: Columns) -> Columns:
    """A list of decisions with words, labels and examples as texts."""
    texts: dict[str, Any] = {"words": [written_list(words, WORDS) for words in answer["words"]]}
    texts["labels"] = [written_list(labels, LABELS) for labels in answer["labels"]]
    if "examples" in answer:
        places = [
            [f"{one['document']}:{one['start'] + one['marks'][0][0]}" for one in row] for row in answer["examples"]
        ]
        texts["examples"] = [written_list(row, LABELS) for row in places]
    return answer.adding(texts)


def _check(matter: Matter, seen: int) -> str:
    """A checksum that no spreadsheet takes for a number or a date."""
    data = json.dumps([matter.layer, matter.kind, matter.words, seen], ensure_ascii=False)
    digest = hashlib.blake2b(data.encode("utf-8", "surrogatepass"), digest_size=10).digest()
    return "k" + base64.b32encode(digest).decode().lower()


@dataclass(frozen=True, slots=True)
class SheetRow:
    """One row that came back: where it stands (``FILE:LINE``), and its cells by column, without spreadsheet guards."""

    place: str
    cells: Mapping[str, str]


@dataclass(slots=True)
class Filled:
    """What a sheet says.

    Attributes
    ----------
    decisions : list of Decision
        New ones.
    unchanged, empty : int
        Rows that say what the store says already (or mean it, where it was decided since the sheet was written), and
        rows that nobody filled in.
    problems : list of str
        Rows that cannot be taken; each begins with its place.
    conflicts : list of str
        Rows that contradict a decision of the same judge made after the sheet was written, or made before where the
        row does not know of it; each names the cells that differ.
    """

    decisions: list[Decision] = field(default_factory=list)
    unchanged: int = 0
    empty: int = 0
    problems: list[str] = field(default_factory=list)
    conflicts: list[str] = field(default_factory=list)


def read_sheet(store: Store, rows: Iterable[SheetRow], judge: str, now: str) -> Filled:
    """Turn filled-in rows into decisions; nothing is written.

    Parameters
    ----------
    judge : str
        Who decided, where the rows do not say; empty if nobody is known.
    now : str
        Time of the decisions.
    """
    filled = Filled()
    kept = newest(store)
    first_places: dict[tuple[Key, str], tuple[str, Decision]] = {}
    for row in rows:
        try:
            read = _Row(store, row, judge, kept)
            decision = read.decision(now)
        except CollocError as error:
            filled.problems.append(f"{row.place}: {error}")
            continue
        if decision is None:
            filled.empty += 1
            continue
        key = (decision.key, decision.judge)
        if key in first_places:
            place, other = first_places[key]
            if _means(other) != _means(decision):
                filled.problems.append(
                    f"{row.place}: {read.matter.text!r} stands in {place} too, decided differently; keep one"
                )
            continue
        first_places[key] = row.place, decision
        number, before = kept.get(key, (0, None))
        if before is not None and number != read.seen:
            differing = _differing(decision, before)
            if differing:
                filled.conflicts.append(
                    f"{row.place}: {read.matter.text!r} is {before.verdict} by {before.judge} since {before.decided}; "
                    + ", ".join(differing)
                )
            else:
                decision = _completed(before, decision)
        if before is not None and _says(before) == _says(decision):
            filled.unchanged += 1
            continue
        filled.decisions.append(decision)
    return filled


def _means(decision: Decision) -> tuple[Any, ...]:
    """What is decided, whatever the blanks, the line ends and the order of labels and places."""
    verdict, sense, note, labels, places = _says(decision)
    texts = (" ".join(unicodedata.normalize("NFC", text).split()) for text in (sense, note))
    return verdict, *texts, frozenset(" ".join(label.split()) for label in labels), frozenset(places)


def _differing(row: Decision, before: Decision) -> list[str]:
    """Cells that contradict what was decided; where one side is empty there is nothing to contradict."""
    sides = zip(FILLED, _means(row), _means(before), _written(row), _written(before), strict=True)
    return [
        f"{name}: the store says {kept!r}, the row says {said!r}"
        for name, here, there, said, kept in sides
        if here and there and here != there
    ]


def _completed(before: Decision, row: Decision) -> Decision:
    """What was decided, with what the row says where nothing was said before; the row contradicts nothing."""
    return replace(
        before,
        decided=row.decided,
        sense=before.sense if before.sense.strip() else row.sense,
        note=before.note if before.note.strip() else row.note,
        labels=before.labels or row.labels,
        examples=before.examples or row.examples,
    )


def _written(decision: Decision) -> tuple[str, ...]:
    """The cells of a decision, in the order of `FILLED`."""
    examples = written_list([place_of(one) for one in decision.examples], LABELS)
    return decision.verdict, decision.sense, decision.note, written_list(decision.labels, LABELS), examples


def _says(decision: Decision) -> tuple[Any, ...]:
    places = tuple(example.place for example in decision.examples)
    return decision.verdict, decision.sense, decision.note, decision.labels, places


class _Row:
    """One row while it is read."""

    def __init__(
        self, store: Store, row: SheetRow, judge: str, kept: Mapping[tuple[Key, str], tuple[int, Decision]]
    ) -> None:
        self._store = store
        self._cells = row.cells
        self.judge = self._cell("judge") or judge
        if judge and self.judge != judge:
            raise DataError(
                f"the row is {self.judge}'s, not {judge}'s: leave --by out, or clear the cell `judge` "
                f"if {judge} decides what stands in the row"
            )
        self.matter = self._matter()
        self.seen = self._seen()
        self._checked()
        number, before = kept.get((self.matter.key, self.judge), (0, None))
        self._chosen = before.examples if before else ()
        # With the cell `judge` cleared, the decision that was filled in may be another judge's.
        self._knows = self.seen > 0 and (bool(self._cell("judge")) or self.seen == number)

    def _cell(self, name: str) -> str:
        return (self._cells.get(name) or "").strip()

    def _matter(self) -> Matter:
        kind = self._cell("kind").casefold() or None
        if kind not in (None, "pair", "directed", "expression"):
            raise DataError(f"the kind {kind!r} is none: pair, directed or expression")
        words = read_list(self._cells.get("words") or "", WORDS)
        if not words:
            raise DataError("no words")
        if len(words) == 1:
            raise DataError(f"one word only ({words[0]!r}): a pair has two, an expression two or more")
        # A row of an older sheet may have words that have left the store since.
        known = not self._cell("check")
        return make_matter(self._store, words, cast("Kind | None", kind), self._cell("layer") or None, known=known)

    def _seen(self) -> int:
        text = self._cell("seen").removesuffix(".0")
        if not text:
            return 0
        if not text.isascii() or not text.isdigit():
            raise DataError(f"the cell `seen` was changed: {text!r} is no number")
        return int(text)

    def _checked(self) -> None:
        check = self._cell("check")
        if check and check != _check(self.matter, self.seen):
            raise DataError(
                f"{self.matter.text!r}: words, layer, kind or seen were changed since the sheet was written; "
                "write the sheet again, or clear the cell `check` if the row is meant so"
            )

    def decision(self, now: str) -> Decision | None:
        """What the row decides; None where nothing is filled in."""
        text = self._cell("verdict")
        if not text:
            remarks = [name for name in FILLED[1:] if self._cell(name)]
            if self._knows:
                raise DataError("the verdict was emptied: write withdrawn to take the decision back")
            if remarks:
                raise DataError(f"{', '.join(remarks)} without a verdict: write accept, reject or unsure")
            return None
        if text.casefold() not in _VERDICTS:
            raise DataError(f"the verdict {text!r} is none: accept, reject, unsure or withdrawn")
        return Decision(
            self.matter.layer,
            self.matter.kind,
            self.matter.words,
            _VERDICTS[text.casefold()],
            self.judge,
            now,
            sense=self._cells.get("sense") or "",
            note=self._cells.get("note") or "",
            labels=tuple(dict.fromkeys(read_list(self._cells.get("labels") or "", LABELS))),
            examples=tuple(self._example(text) for text in read_list(self._cells.get("examples") or "", LABELS)),
        )

    def _example(self, text: str) -> Example:
        number = text.removesuffix(".0")  # as spreadsheets that take it for a number write it
        if number.isascii() and number.isdigit():
            place = self._cell(f"place_{int(number)}")
            if not place:
                raise DataError(f"the row has no line {number}")
            text = place
        document, offset = read_place(text)
        for example in self._chosen:
            if example.place == (document, offset):
                return example
        return example_at(self._store, self.matter, document, offset)
