"""Judging by keys: one candidate after another with its numbers and lines, one key decides.

Every decision is in the store before the next candidate is shown.
"""

from __future__ import annotations

import os
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING

from colloc.cli import keys as terminal
from colloc.cli.kwic import terminal_width
from colloc.cli.output import print_lines, remark

if TYPE_CHECKING:
    from colloc.answers.judging.candidates import Candidate
    from colloc.answers.judging.matters import Example, Verdict

LINES = 5
"""Example lines beside a candidate: as many as there are keys for."""
VERDICTS: dict[str, Verdict] = {"a": "accept", "r": "reject", "u": "unsure"}
TEXTS = {"e": "sense", "n": "note", "l": "labels"}
HELP = (
    "a accept   r reject   u unsure   s skip   b back   q quit",
    f"1-{LINES} choose lines   e sense   n note   l labels (separated by ;)",
)
_CLEAR = "\x1b[2J\x1b[H"


@dataclass(slots=True)
class Draft:
    """What has been entered for one candidate before it is decided."""

    lines: set[int] = field(default_factory=set)
    texts: dict[str, str] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Surroundings:
    """What a session needs from outside.

    Parameters
    ----------
    key : callable
        Waits for the next key; ``keys.END`` where there are no more.
    text : callable
        Asks for a line of text, given the question.
    show : callable
        Shows the lines of a screen.
    examples : callable
        The example lines of a candidate.
    record : callable
        Keeps a decision.
    """

    key: Callable[[], str]
    text: Callable[[str], str]
    show: Callable[[Sequence[str]], None]
    examples: Callable[[Candidate], list[Example]]
    record: Callable[[Candidate, Verdict, Draft, list[Example]], None]


def check_terminal() -> None:
    """Raise UsageError where keys cannot be read."""
    terminal.check_terminal("name a pair and a verdict (X Y --accept), or fill in a sheet (colloc sheet, judge --from)")


def run(store: Path, by: str, rows: Sequence[Candidate], measures: Sequence[str]) -> None:
    """Show the candidates on this terminal until all are decided or somebody quits."""
    from colloc.answers.judging.examples import best_examples
    from colloc.answers.judging.matters import read_list
    from colloc.verbs import judging
    from colloc.verbs.opening import open_store

    keys = terminal.Keys()
    with open_store(store) as opened:

        def record(row: Candidate, verdict: Verdict, draft: Draft, lines: list[Example]) -> None:
            judging.judge(
                store,
                row.matter.words,
                verdict,
                by=by,
                sense=draft.texts.get("sense", ""),
                note=draft.texts.get("note", ""),
                labels=list(dict.fromkeys(read_list(draft.texts.get("labels", ""), "; "))),
                examples=[lines[place] for place in sorted(draft.lines)],
                kind=row.matter.kind,
                layer=row.matter.layer,
            )

        outside = Surroundings(keys.read, _ask, _show, lambda row: best_examples(opened, row.matter, LINES), record)
        decided = session(rows, measures, outside)
    remark(f"{sum(decided.values())} decided by {by}: " + ", ".join(f"{n} {name}" for name, n in decided.items()))


def _ask(question: str) -> str:
    try:
        return input(f"{question}: ")
    except EOFError:
        return ""


def _show(lines: Sequence[str]) -> None:
    plain = os.environ.get("TERM", "dumb") == "dumb"
    print_lines([("" if plain else _CLEAR) + lines[0], *lines[1:]])


def session(rows: Sequence[Candidate], measures: Sequence[str], outside: Surroundings) -> dict[Verdict, int]:
    """Go through the candidates; how many have which verdict now."""
    verdicts: dict[int, Verdict] = {}
    drafts = [_draft(row) for row in rows]
    place, message = 0, ""
    while place < len(rows):
        row, draft = rows[place], drafts[place]
        lines = outside.examples(row)
        key = ""
        while key not in VERDICTS and key not in ("s", "b"):
            head = [_progress(place, len(rows), verdicts), "", *card(row, measures)]
            earlier = verdicts.get(place) or (row.decision.verdict if row.decision else None)
            head += [f"  decided: {earlier}"] if earlier else []
            outside.show([*head, "", *_shown_lines(lines, draft), "", *_shown_texts(draft), *HELP, message])
            message = ""
            key = outside.key()
            if key in ("q", terminal.END):
                return _summary(verdicts)
            if key in TEXTS:
                draft.texts[TEXTS[key]] = outside.text(TEXTS[key])
            elif key.isdecimal() and 1 <= int(key) <= len(lines):
                draft.lines ^= {int(key) - 1}
            elif key not in VERDICTS and key not in ("s", "b"):
                message = f"{key!r} does nothing here"
        if key in VERDICTS:
            outside.record(row, VERDICTS[key], draft, lines)
            verdicts[place] = VERDICTS[key]
        place = max(place - 1, 0) if key == "b" else place + 1
    return _summary(verdicts)


def _draft(row: Candidate) -> Draft:
    """What was decided before stands there to be kept or changed; its lines are chosen anew."""
    if row.decision is None:
        return Draft()
    texts = {"sense": row.decision.sense, "note": row.decision.note, "labels": "; ".join(row.decision.labels)}
    return Draft(texts={name: value for name, value in texts.items() if value})


def _summary(verdicts: dict[int, Verdict]) -> dict[Verdict, int]:
    given = list(verdicts.values())
    return {name: given.count(name) for name in VERDICTS.values()}


def _progress(place: int, total: int, verdicts: dict[int, Verdict]) -> str:
    counts = ", ".join(f"{n} {name}" for name, n in _summary(verdicts).items())
    return f"{place + 1} of {total}   ({counts})"


def card(row: Candidate, measures: Sequence[str]) -> list[str]:
    """The candidate with its numbers, in a few lines."""
    from colloc.answers.expressions.measures import SHOWN
    from colloc.answers.plain import number_text, shown_text

    figures = row.figures
    words = [
        f"{shown_text(word)} {count:,}"
        for word, count in zip(row.matter.words, figures.word_counts, strict=True)
        if count
    ]
    expected = figures.table.get("expected")
    counted = f"{figures.joint:,} times in {figures.documents:,} documents"
    if expected is not None:
        counted += f", {number_text(float(expected))} by chance"
    shown = SHOWN if row.matter.kind == "expression" else measures
    scores = [f"{name} {number_text(figures.scores[name])}" for name in shown if name in figures.scores]
    return [f"  {shown_text(row.matter.text)}", f"  {counted}; {', '.join(words)}", f"  {'   '.join(scores)}"]


def _shown_lines(lines: Sequence[Example], draft: Draft) -> list[str]:
    from colloc.answers.evidence.text import folded
    from colloc.answers.judging.sheets import bracketed, place_of
    from colloc.answers.plain import shown_text

    if not lines:
        return ["  (no example lines)"]
    shown = []
    for place, example in enumerate(lines):
        mark = "*" if place in draft.lines else " "
        shown.append(f"{mark} {place + 1} {shown_text(place_of(example))}")
        text = " ".join(bracketed(example).split())
        shown += folded(text, max(terminal_width(), 40), "    ", "    ")
    return shown


def _shown_texts(draft: Draft) -> list[str]:
    from colloc.answers.plain import shown_text

    return [f"  {name}: {shown_text(value)}" for name, value in draft.texts.items() if value]
