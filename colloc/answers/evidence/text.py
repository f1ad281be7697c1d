"""The evidence card as plain text for a terminal."""

from __future__ import annotations

import textwrap
from collections.abc import Mapping, Sequence
from typing import Any

from colloc.answers.columns import Columns
from colloc.answers.evidence.card import Evidence
from colloc.answers.plain import LEAST_PROBABILITY, Grid, number_text, shown_text, width

LEAST_WIDTH = 40
_BAR = 24
NO_FLOOR = "too few pairs so rarely expected met for a chance floor to be known"


def card_lines(card: Evidence, columns: int) -> list[str]:
    """The card in lines of at most ``columns`` display columns; words that are longer than that excepted."""
    columns = max(columns, LEAST_WIDTH)
    lines = [
        f"{shown_text(card.first)} + {shown_text(card.second)}",
        "",
        *textwrap.wrap(card.sentence(shown_text), columns),
    ]
    for statement in card.statements:
        lines += _wrapped(statement, columns, "- ", "  ")
    notes = card.notes()
    sections: list[tuple[str, list[str]]] = [
        ("Table (observed, expected if independent)", _cells(card) + _wrapped(notes["table"], columns - 2)),
        ("Information", _information(card, columns)),
        ("Measures", _measures(card, columns)),
        ("Intervals (95 %)", _intervals(card)),
        ("Chance", _chance(card, columns)),
        ("Spread over documents", _spread(card, columns)),
        ("Positions of the second word", _positions(card)),
        ("Relations", _relations(card, notes["relations"], columns)),
        *((f"By {shown_text(key)}", _slice(table, card.counted)) for key, table in card.slices.items()),
        ("", _wrapped(notes["slices"], columns - 2) if card.slices else []),
        ("Forms and order", _forms(card, notes["forms"], columns)),
        ("Examples", _examples(card, columns)),
    ]
    for title, body in sections:
        if body:
            lines += ["", title] if title else [""]
            lines += [f"  {line}" for line in body]
    return lines


def _wrapped(text: str, columns: int, first: str = "", rest: str = "") -> list[str]:
    return textwrap.wrap(shown_text(text), columns, initial_indent=first, subsequent_indent=rest)


def _grid(names: Sequence[str], rows: Sequence[Sequence[str]], numeric: Sequence[bool]) -> list[str]:
    grid = Grid(names, numeric)
    return grid.lines([list(column) for column in zip(*rows, strict=True)], heading=True) if rows else []


def _cells(card: Evidence) -> list[str]:
    cells = {(row["first"], row["second"]): row for row in card.cells}

    def cell(first: str, second: str) -> str:
        row = cells[(first, second)]
        return f"{_count(row['observed'])} ({_count(row['expected'])})"

    names = ("", card.second, "other")
    rows = [
        (card.first, cell("yes", "yes"), cell("yes", "no")),
        ("other", cell("no", "yes"), cell("no", "no")),
    ]
    return _grid(names, rows, (False, True, True))


def _information(card: Evidence, columns: int) -> list[str]:
    lines = []
    for row in card.information:
        of, given = shown_text(row["of"]), shown_text(row["given"])
        lines.append(
            f"P({of}) {_probability(row['prior'])} -> P({of} | {given}) {_probability(row['posterior'])}: "
            f"{_number(row['ratio'])} times, {_number(row['bits'], 2)} bits"
        )
        lines.append(
            f"  surprisal of {of}: {_number(row['surprisal_before'], 2)} bits before, "
            f"{_number(row['surprisal_after'], 2)} bits after {given}"
        )
    if card.mutual_information is not None:
        found = card.mutual_information
        lines += _wrapped(
            f"{found['share']:.2g} of the table's mutual information "
            f"({_number(found['table_bits'], 3)} bits as counted, much of it noise)",
            columns - 2,
        )
    return lines


def _measures(card: Evidence, columns: int) -> list[str]:
    places = [f"{place:,}" if place else "-" for place in card.measures["rank"].tolist()]
    rows = [
        (row["measure"], measure_text(row["value"], row["measure"]), row["unit"], place)
        for row, place in zip(card.measures, places, strict=True)
    ]
    lines = _grid(("measure", "value", "unit", "rank"), rows, (False, True, False, True))
    if not card.compared["compared"]:
        return lines
    return lines + _wrapped(card.notes()["ranks"], columns - 2)


def _intervals(card: Evidence) -> list[str]:
    rows = []
    for row in card.intervals:
        by = "documents resampled" if row["method"] == "documents" else "asymptotic, too narrow on running text"
        note = "" if row["method"] != "documents" or row["trusted"] else " (not to be trusted here)"
        rows.append(
            (row["measure"], _number(row["value"], 3), _number(row["low"], 3), _number(row["high"], 3), by + note)
        )
    return _grid(("measure", "value", "low", "high", "by"), rows, (False, True, True, True, False))


def _chance(card: Evidence, columns: int) -> list[str]:
    lines = []
    if card.tests:
        lines += _wrapped(
            f"p {p_text(card.tests)} (two-sided, {card.tests['test']}), q {q_text(card.tests)} "
            f"among {card.tests['hypotheses']:,} pairs of words",
            columns - 2,
        )
    for row in card.floors:
        what = "within documents" if row["shuffle"] == "order" else "across documents"
        if row["floor"] != row["floor"]:
            lines += _wrapped(f"{row['measure']}: {NO_FLOOR} in text shuffled {what}", columns - 2)
            continue
        place = "above" if row["above"] else "not above"
        lines.append(
            f"{row['measure']} {_number(row['value'], 3)} is {place} {_number(row['floor'], 3)}, "
            f"the floor of words shuffled {what}"
        )
    if not len(card.floors):
        lines += _wrapped(
            "No chance floor is kept in this store for this way of counting; `colloc floors` makes one.", columns - 2
        )
    return lines


def _spread(card: Evidence, columns: int) -> list[str]:
    spread = card.spread
    if not spread["documents"]:
        return [f"in none of {spread['of_documents']:,} documents"]
    largest = shown_text(str(spread["largest_document"]))
    return _wrapped(
        f"{spread['documents']:,} of {spread['of_documents']:,} documents; DPnorm {_number(spread['dp_norm'], 3)} "
        f"(0 even, 1 clumped); the largest share is {spread['largest_share']:.0%}, in {largest}",
        columns - 2,
    )


def _positions(card: Evidence) -> list[str]:
    most = max(card.positions["count"].max(initial=0), 1)
    return [
        f"{row['offset']:+4d}  {row['count']:7,}  {'#' * round(_BAR * row['count'] / most)}".rstrip()
        for row in card.positions
    ]


def _relations(card: Evidence, note: str, columns: int) -> list[str]:
    if card.relations is None:
        return []
    if not len(card.relations):
        return ["neither word is ever the head of the other"]
    rows = [
        (
            row["relation"],
            row["head"],
            row["dependent"],
            f"{row['joint']:,}",
            _count(row["expected"]),
            _number(row["npmi"], 3),
        )
        for row in card.relations
    ]
    names = ("relation", "head", "dependent", "count", "expected", "npmi")
    return _grid(names, rows, (False, False, False, True, True, True)) + _wrapped(note, columns - 2)


def _slice(table: Columns, counted: str) -> list[str]:
    # Where words are what is counted, both rates are one.
    rates = {f"per M {counted}": "per_million_counted", "per M words": "per_million_words"}
    rows = [
        (
            row["value"],
            f"{row['documents']:,}",
            _count(row["joint"]),
            _count(row["expected"]),
            *(_number(row[rate], 1) for rate in rates.values()),
            _number(row["pmi"], 2),
            f"{_number(row['pmi_low'], 2)}..{_number(row['pmi_high'], 2)}" if row["joint"] else "-",
        )
        for row in table
    ]
    names = ("", "docs", "joint", "expected", *rates, "pmi", "asymptotic")
    return _grid(names, rows, (False, *[True] * (len(names) - 2), False))


def _forms(card: Evidence, note: str, columns: int) -> list[str]:
    rows = []
    for row in card.forms:
        one, two = row["first_form"], row["second_form"]
        shown = f"{two} .. {one}" if row["order"] == "before" else f"{one} .. {two}"
        rows.append((shown, f"{row['count']:,}"))
    return _grid(("form and order", "cases"), rows, (False, True)) + _wrapped(note, columns - 2) if rows else []


def _examples(card: Evidence, columns: int) -> list[str]:
    lines = []
    for row in card.examples:
        text = " ".join(bracketed(row).split())
        lines += folded(f"{text} ({row['document']})", columns - 4, "- ", "  ")
    return lines


def bracketed(row: dict[str, Any]) -> str:
    """The text of a row of ``lines`` with the match, and its partner, in square brackets."""
    begin = row["character"] - len(row["before"])
    whole: str = row["before"] + row["match"] + row["after"]
    spans = [(row["character"] - begin, len(row["match"]))]
    if "partner" in row:
        spans.append((row["partner_character"] - begin, len(row["partner"])))
    for start, length in sorted(spans, reverse=True):
        whole = f"{whole[:start]}[{whole[start : start + length]}]{whole[start + length :]}"
    return whole


def folded(text: str, columns: int, first: str = "", rest: str = "") -> list[str]:
    """A text in lines of so many display columns, broken at spaces, or anywhere where there are none in reach."""
    lines: list[str] = []
    while text:
        kept, used = 0, 0
        while kept < len(text) and used + width(text[kept]) <= columns:
            used += width(text[kept])
            kept += 1
        if kept < len(text):
            space = text.rfind(" ", 1, kept + 1)
            kept = space if space > 0 else max(kept, 1)
        lines.append((rest if lines else first) + shown_text(text[:kept]))
        text = text[kept:].lstrip(" ")
    return lines


def _count(value: float) -> str:
    if value != value:
        return "-"
    return f"{value:,.0f}" if float(value).is_integer() else f"{value:,.1f}" if value >= 10 else f"{value:.3g}"


def _number(value: float, decimals: int = 4) -> str:
    return "-" if value != value else number_text(float(value), decimals)


def measure_text(value: float, name: str) -> str:
    """The value of a measure: four decimals, and four digits where those would be zeros."""
    if value == 0 and name.endswith("_p"):
        return LEAST_PROBABILITY
    return f"{value:.4g}" if 0 < abs(value) < 0.1 else _number(value)


def p_text(tests: Mapping[str, Any]) -> str:
    """A p-value, also one too small for a float."""
    return _probability(tests["p"]) if tests["p"] > 0 else f"10^{tests['log10_p']:.0f}"


def q_text(tests: Mapping[str, Any]) -> str:
    """A q-value or its bound, also one too small for a float."""
    if not tests["q"]:
        return f"below {LEAST_PROBABILITY.removeprefix('<')}"
    return f"{'at most ' if tests['q_is'] == 'at most' else ''}{_probability(tests['q'])}"


def _probability(value: float) -> str:
    return "-" if value != value else f"{value:.3g}"
