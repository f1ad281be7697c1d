"""The evidence card of a pair as a page that prints on one sheet."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from colloc.answers.columns import Columns
from colloc.answers.evidence.card import Evidence
from colloc.answers.evidence.text import NO_FLOOR, measure_text, p_text, q_text
from colloc.exports.pages.frame import Markup, number, page, settings_footer, table, text
from colloc.exports.pages.lines import marked

MOST_DOCUMENTS = 5
MOST_FORMS = 6
MOST_KEYS = 3


def card_page(card: Evidence) -> bytes:
    """The whole page."""
    notes = card.notes()
    body = [
        f"<h1><bdi>{text(card.first)}</bdi> + <bdi>{text(card.second)}</bdi></h1>",
        f'<p class="lead">{text(card.sentence())}</p>',
        _bearing(card),
        '<div class="grid">',
        _section("Best example lines", _examples(card), wide=True),
        _section("Observed and expected counts", _cells(card) + _note(notes["table"]) + _information(card)),
        '<div class="stack">',
        _section(f"Positions of ‘{card.second}’ around ‘{card.first}’", _positions(card)),
        _section("Relations", _relations(card, notes["relations"])),
        "</div>",
        '<div class="stack">',
        _section("Measures", _measures(card)),
        _section("Forms and order", _forms(card) + _note(notes["forms"]) if len(card.forms) else ""),
        "</div>",
        '<div class="stack">',
        _section("Intervals, 95 %", _intervals(card) + _chance(card)),
        _section("Spread over documents", _spread(card)),
        *(_section(f"By {key}", _slice(rows, card.counted)) for key, rows in list(card.slices.items())[:MOST_KEYS]),
        _note(notes["slices"]) if card.slices else "",
        "</div>",
        "</div>",
        settings_footer(card.settings),
    ]
    return page(f"{card.first} + {card.second}: evidence", body)


def _section(title: str, body: Markup, *, wide: bool = False) -> Markup:
    if not body:
        return ""
    style = ' class="wide"' if wide else ""
    return f"<section{style}><h2>{text(title)}</h2>\n{body}</section>"


def _note(said: str) -> Markup:
    return f'<p class="soft">{text(said)}</p>'


def _bearing(card: Evidence) -> Markup:
    items = "".join(f"<li>{text(statement)}</li>" for statement in card.statements)
    return f'<div class="bearing"><ul>{items}</ul></div>'


def _cells(card: Evidence) -> Markup:
    cells = {(row["first"], row["second"]): row for row in card.cells}

    def cell(first: str, second: str) -> Markup:
        row = cells[(first, second)]
        observed = "–" if row["observed"] != row["observed"] else number(int(row["observed"]))
        if not float(row["observed"]).is_integer() and row["observed"] == row["observed"]:
            observed = number(row["observed"], 1)
        return f'{observed} <span class="soft">({_expected(row["expected"])})</span>'

    rows = [
        (f"<bdi>{text(card.first)}</bdi>", cell("yes", "yes"), cell("yes", "no")),
        ("other", cell("no", "yes"), cell("no", "no")),
    ]
    label = "Observed counts, expected ones in brackets"
    return table(("", card.second, "other"), rows, classes=("", "n", "n"), label=label)


def _information(card: Evidence) -> Markup:
    rows = [
        (
            f"<bdi>{text(row['of'])}</bdi>, given <bdi>{text(row['given'])}</bdi>",
            _small(row["prior"]),
            _small(row["posterior"]),
            number(row["ratio"], 1),
            number(row["bits"], 2),
            f"{number(row['surprisal_before'], 2)} → {number(row['surprisal_after'], 2)}",
        )
        for row in card.information
    ]
    found = table(
        ("probability of", "prior", "posterior", "ratio", "bits", "surprisal, bits"),
        rows,
        classes=("", "n", "n", "n", "n", "n"),
        label="Prior and posterior probabilities and surprisal, both directions",
    )
    if card.mutual_information is not None:
        share, bits = card.mutual_information["share"], card.mutual_information["table_bits"]
        found += (
            f'<p class="soft">Share of the table’s mutual information: {_small(share)} of {number(bits, 3)} bits as '
            "counted, much of which is noise in any sparse table.</p>"
        )
    return found


def _measures(card: Evidence) -> Markup:
    rows = [
        (
            text(row["title"]),
            text(measure_text(row["value"], row["measure"]).replace("-", "−") if row["value"] == row["value"] else "–"),
            text("" if row["unit"] == "none" else row["unit"]),
            number(row["rank"]) if row["rank"] else "–",
        )
        for row in card.measures
    ]
    found = table(("measure", "value", "unit", "rank"), rows, classes=("", "n", "", "n"), label="All measures")
    return found + _note(card.notes()["ranks"]) if card.compared["compared"] else found


def _intervals(card: Evidence) -> Markup:
    rows = []
    for row in card.intervals:
        by = "asymptotic (too narrow on running text)"
        if row["method"] == "documents":
            by = "documents resampled" + ("" if row["trusted"] else " (not to be trusted here)")
        span = f"{number(row['low'], 2)} to {number(row['high'], 2)}"
        name = {"pmi": "PMI, bits", "log_odds": "log odds, nats"}[row["measure"]]
        rows.append((text(name), number(row["value"], 2), span, text(by)))
    return table(("", "value", "interval", "by"), rows, classes=("", "n", "n", ""), label="Intervals")


def _chance(card: Evidence) -> Markup:
    found = ""
    if card.tests:
        found += (
            f"<p>p {text(p_text(card.tests).replace('-', '−'))} (two-sided, {text(card.tests['test'])}); "
            f"q {text(q_text(card.tests).replace('-', '−'))} among "
            f"{number(card.tests['hypotheses'])} pairs of words.</p>"
        )
    for row in card.floors:
        if row["measure"] != "npmi":
            continue
        what = "within" if row["shuffle"] == "order" else "across"
        if row["floor"] != row["floor"]:
            found += f"<p>NPMI: {NO_FLOOR} in text shuffled {what} documents.</p>"
            continue
        place = "above" if row["above"] else "not above"
        found += (
            f"<p>NPMI {number(row['value'], 3)} is <strong>{place}</strong> the chance floor "
            f"{number(row['floor'], 3)} of words shuffled {what} documents.</p>"
        )
    if not len(card.floors):
        found += '<p class="soft">The store keeps no chance floor for this way of counting.</p>'
    return found


def _spread(card: Evidence) -> Markup:
    spread = card.spread
    if not spread["documents"]:
        return f"<p>In none of {number(spread['of_documents'])} documents.</p>"
    rows = [
        (f"<bdi>{text(row['document'])}</bdi>", number(row["joint"]), number(row["tokens"]))
        for row in card.by_document[:MOST_DOCUMENTS]
    ]
    return (
        f"<p>{number(spread['documents'])} of {number(spread['of_documents'])} documents; DPnorm "
        f"{number(spread['dp_norm'], 3)} (0 even, 1 clumped); the largest share is {spread['largest_share']:.0%}.</p>"
    ) + table(
        ("documents with most", "joint", "words"), rows, classes=("", "n", "n"), label="Documents with most of it"
    )


def _positions(card: Evidence) -> Markup:
    """Bars by offset: an SVG drawing with its numbers written in it."""
    counts, offsets = card.positions["count"].tolist(), card.positions["offset"].tolist()
    places = sorted({*offsets, 0})
    if len(places) > 42:
        return _position_table(card)
    by_offset = dict(zip(offsets, counts, strict=True))
    step, height, top = 400 / len(places), 96, 16
    most = max([*counts, 1])
    bars = []
    for index, offset in enumerate(places):
        middle = step * (index + 0.5)
        if offset == 0:
            bars.append(f'<line x1="{middle:.1f}" x2="{middle:.1f}" y1="{top}" y2="{top + height}" class="axis"/>')
            label = "0"
        else:
            count = by_offset[offset]
            tall = height * count / most
            label = f"{offset:+d}".replace("-", "−")
            bars.append(
                f'<rect x="{middle - step * 0.38:.1f}" y="{top + height - tall:.1f}" width="{step * 0.76:.1f}" '
                f'height="{tall:.1f}" class="fill"/>'
            )
            if len(places) <= 21:
                bars.append(f'<text x="{middle:.1f}" y="{top + height - tall - 4:.1f}">{number(count)}</text>')
        if len(places) <= 21 or offset % 5 == 0:
            bars.append(f'<text x="{middle:.1f}" y="{top + height + 14}">{label}</text>')
    base = f'<line x1="0" x2="400" y1="{top + height}" y2="{top + height}" class="axis"/>'
    described = ", ".join(f"{offset:+d}: {count}" for offset, count in zip(offsets, counts, strict=True))
    head = f'<svg viewBox="0 0 400 {top + height + 32}" class="chart" role="img" '
    caption = f'<text x="200" y="{top + height + 29}">words from the first word (bars: number of pairs)</text>'
    return f'{head}aria-label="Pairs by position: {text(described)}">{base}{"".join(bars)}{caption}</svg>'


def _position_table(card: Evidence) -> Markup:
    rows = [(number(row["offset"]), number(row["count"])) for row in card.positions if row["count"]]
    return table(("words away", "pairs"), rows, classes=("n", "n"), label="Pairs by position")


def _relations(card: Evidence, note: str) -> Markup:
    if card.relations is None:
        return ""
    if not len(card.relations):
        return _note("Neither word is ever the head of the other.")
    rows = [
        (
            text(row["relation"]),
            f"<bdi>{text(row['head'])}</bdi>",
            f"<bdi>{text(row['dependent'])}</bdi>",
            number(row["joint"]),
            _expected(row["expected"]),
            number(row["npmi"], 3),
        )
        for row in card.relations
    ]
    heads = ("relation", "head", "dependent", "count", "expected", "NPMI")
    return table(heads, rows, classes=("", "", "", "n", "n", "n"), label="Syntactic relations") + _note(note)


def _slice(rows: Columns, counted: str) -> Markup:
    # Where words are what is counted, both rates are one.
    rates = {f"per M {counted}": "per_million_counted", "per M words": "per_million_words"}
    shown = [
        (
            text(row["value"]),
            number(row["documents"]),
            number(int(row["joint"])),
            _expected(row["expected"]),
            *(number(row[rate], 1) for rate in rates.values()),
            number(row["pmi"], 2),
            f"{number(row['pmi_low'], 2)} to {number(row['pmi_high'], 2)}" if row["joint"] else "–",
        )
        for row in rows
    ]
    heads = ("", "documents", "joint", "expected", *rates, "PMI, bits", "asymptotic interval")
    return table(heads, shown, classes=("", *["n"] * (len(heads) - 1)), label="The pair in parts of the text")


def _forms(card: Evidence) -> Markup:
    rows: list[Sequence[Markup]] = []
    for row in card.forms[:MOST_FORMS]:
        one, two = f"<bdi>{text(row['first_form'])}</bdi>", f"<bdi>{text(row['second_form'])}</bdi>"
        rows.append((f"{two} … {one}" if row["order"] == "before" else f"{one} … {two}", number(row["count"])))
    return table(("form and order", "cases"), rows, classes=("", "n"), label="Forms and order") if rows else ""


def _examples(card: Evidence) -> Markup:
    items = [_example(row) for row in card.examples]
    return f'<ul class="examples">{"".join(items)}</ul>' if items else ""


def _example(row: dict[str, Any]) -> Markup:
    before, match, after = marked(row)
    return (
        f'<li><bdi>{before}{match}{after}</bdi> <span class="soft">(<bdi>{text(row["document"])}</bdi>, '
        f"word {number(row['token'] + 1)})</span></li>"
    )


def _expected(value: float) -> Markup:
    return number(round(value)) if value >= 100 else text(f"{value:.3g}")


def _small(value: float) -> Markup:
    return "–" if value != value else text(f"{value:.3g}".replace("-", "−"))
