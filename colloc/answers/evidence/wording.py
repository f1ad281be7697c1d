"""In plain words: what a sample can bear about a pair, and what it cannot."""

from __future__ import annotations

import math
from typing import Any

from colloc.answers.columns import Columns
from colloc.answers.questions import Question
from colloc.answers.sureness.documents import SOUND_DOCUMENTS, SOUND_JOINT
from colloc.counts.grouping import GROUPS
from colloc.measures.intervals import normal_quantile

SURE = 0.05
"""q-value from which down chance is called an unlikely explanation."""
FEW = 5
"""Below this many meetings, or this expected count, a claim is not made."""
APART = 4.0
"""Standard errors between two parts from which on they are said to differ: the asymptotic ones are too small on
running text, and the two parts are the most different of several."""
LEAST_HOLDING = 3
"""Documents of a part that must hold both words for it to be named: fewer tell of documents, not of the part."""
ONE_AUTHOR = 0.5
"""From this share on a single document is named as the possible cause."""


def statements(question: Question, parts: dict[str, Any]) -> tuple[str, ...]:
    """Sentences about strength, chance, documents and limits, in that order."""
    joint, often = parts["table"]["joint"], parts["table"]["expected"]
    found = [_strength(parts, joint, often), *_chance(parts, joint, often), *_documents(parts, joint)]
    found += _limits(question, parts, joint)
    return tuple(found)


def _strength(parts: dict[str, Any], joint: float, often: float) -> str:
    if not joint:
        return f"They were never met together in this text; chance alone would give about {_count(often)}."
    ratio = joint / often if often else math.inf
    how = f"{_times(ratio)} as often" if ratio >= 1 else f"{ratio:.0%} of that"
    often_met = "once" if joint == 1 else f"{joint:,} times"
    return f"They are met {often_met} where chance alone would give about {_count(often)}: {how}."


def _chance(parts: dict[str, Any], joint: float, often: float) -> list[str]:
    tests = parts["tests"]
    if not tests:
        return ["Margins of tokens make no table of cells, so nothing is tested."]
    if joint < often < FEW:
        return [
            f"With an expected count of {_count(often)} even a complete absence would say nothing: "
            "the sample cannot bear a claim that they avoid each other."
        ]
    found = []
    if tests["q"] <= SURE:
        q = "below 0.0001" if tests["q"] < 0.0001 else f"{tests['q']:.2g}"
        bound = "at most " if tests["q_is"] == "at most" and tests["q"] >= 0.0001 else ""
        found.append(
            f"Chance is an unlikely explanation: among all {tests['hypotheses']:,} pairs of words the q-value "
            f"is {bound}{q} ({tests['test']}). Words of running text are not independent trials, so hold this "
            "against the documents."
        )
    elif tests["q_is"] == "at most":
        found.append(
            f"The p-value ({tests['test']}) is {tests['p']:.2g}; "
            f"among {tests['hypotheses']:,} pairs of words that alone is no proof."
        )
    else:
        found.append(
            f"Among {tests['hypotheses']:,} pairs of words chance would bring forth some like this one "
            f"(q-value {tests['q']:.2g}, {tests['test']}): the sample cannot bear the claim."
        )
    if joint > often:
        return found + _floors(parts["floors"])
    limits = parts["avoidance"]
    if limits is not None:
        found.append(
            f"Such a count speaks against any PMI above {limits['pmi_at_most']:.2f} bits; the smallest association "
            f"that this sample could have shown, a single meeting, has PMI {limits['pmi_if_one']:.2f}."
        )
    return found


def _floors(floors: Columns) -> list[str]:
    rows = {row["shuffle"]: row for row in floors if row["measure"] == "npmi"}
    if not rows:
        return []
    corpus, order = rows.get("corpus"), rows.get("order")
    found = []
    if order is not None and order["above"]:
        found.append(
            "The pair is stronger than 99 % of equally expected pairs in text shuffled within its documents: "
            "their standing near each other is more than a shared topic."
        )
    elif order is not None and order["value"] <= order["floor"] and corpus is not None and corpus["above"]:
        found.append(
            "The pair is above the floor of text shuffled across documents, not above that of text shuffled "
            "within them: that they share a topic explains it."
        )
    elif corpus is not None and corpus["value"] <= corpus["floor"]:
        found.append("Shuffled text has pairs as strong as this one: it is not above the chance floor.")
    return found


def _documents(parts: dict[str, Any], joint: float) -> list[str]:
    spread = parts["spread"]
    if not joint:
        return []
    documents, of_documents, share = spread["documents"], spread["of_documents"], spread["largest_share"]
    if of_documents < 2:
        return ["There is only one document: whether others would show the same cannot be said."]
    if documents == 1:
        return [f"All of it comes from one document, {spread['largest_document']!r}: it may be one author's habit."]
    found = f"It is met in {documents:,} of {of_documents:,} documents"
    if share >= ONE_AUTHOR:
        return [
            f"{found}, but {share:.0%} of it in one, {spread['largest_document']!r}: that document may have made it."
        ]
    return [f"{found}; the one with most of it holds {share:.0%}."]


def _limits(question: Question, parts: dict[str, Any], joint: float) -> list[str]:
    found = []
    rows = {(row["measure"], row["method"]): row for row in parts["intervals"]}
    resampled = rows.get(("pmi", "documents"))
    # What the many pairs looked at make unsure is not made sure again by an interval of this pair alone.
    unsure = bool(parts["tests"]) and parts["tests"]["q"] > SURE
    if not joint:
        found.append(
            "There is no interval over documents: whichever are left out, they were never met, and nothing would vary "
            "but what is added to the empty cell."
        )
    elif resampled is None:
        found.append("Without several documents there is no interval that resamples them.")
    elif not resampled["trusted"]:
        found.append(
            "The interval over documents is shown but not to be trusted here: it was found reliable from "
            f"{SOUND_JOINT} meetings in {SOUND_DOCUMENTS} documents on, with at least {GROUPS} documents in all."
        )
    elif unsure and (resampled["low"] > 0 or resampled["high"] < 0):
        found.append(
            f"The interval of PMI over documents, {resampled['low']:.2f} to {resampled['high']:.2f} bits, leaves out "
            "0, but it is that of one pair: among so many, some do by chance, and the claim stays unproven."
        )
    elif resampled["low"] > 0:
        found.append(
            "Resampling whole documents leaves the attraction standing: "
            f"PMI is at least {resampled['low']:.2f} bits with 95 % confidence."
        )
    elif resampled["high"] < 0:
        found.append(
            "Resampling whole documents leaves the avoidance standing: "
            f"PMI is at most {resampled['high']:.2f} bits with 95 % confidence."
        )
    else:
        found.append("Over documents the interval of PMI includes 0: other documents might show no association.")
    if 0 < joint < FEW:
        found.append(f"Fewer than {FEW} meetings: a single misprint or quotation changes every number on this card.")
    changed = _changing(parts["slices"])
    if changed:
        found.append(changed)
    return found


def _changing(slices: dict[str, Columns]) -> str | None:
    """The key whose parts differ most, where they differ by far more than the best of many pairs would by chance."""
    best = (APART, "")
    for key, table in slices.items():
        rows = [row for row in table if row["joint"] >= FEW and row["holding"] >= LEAST_HOLDING]
        if len(rows) < 2:
            continue
        low = min(rows, key=lambda row: row["pmi"])
        high = max(rows, key=lambda row: row["pmi"])
        apart = (high["pmi"] - low["pmi"]) / math.hypot(_standard_error(low), _standard_error(high))
        best = max(
            best,
            (
                apart,
                f"It is not the same everywhere: PMI {high['pmi']:.2f} where {key} is {high['value']}, "
                f"{low['pmi']:.2f} where it is {low['value']}.",
            ),
        )
    return best[1] or None


def _standard_error(row: dict[str, Any]) -> float:
    return max(float(row["pmi_high"] - row["pmi_low"]) / (2 * normal_quantile(0.95)), 1e-9)


def _count(value: float) -> str:
    return f"{value:,.0f}" if value >= 100 else f"{value:.3g}"


def _times(ratio: float) -> str:
    return f"{ratio:,.0f} times" if ratio >= 10 else f"{ratio:.1f} times"
