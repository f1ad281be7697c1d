"""The evidence card: everything that bears on one pair, as plain values and columns."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from colloc.answers.columns import Columns


@dataclass(frozen=True, slots=True, eq=False)
class Evidence:
    """What the store says of the pair (``first``, ``second``).

    Attributes
    ----------
    first, second : str
    settings : mapping
        Everything that decided the numbers.
    table : mapping
        joint, first_total, second_total, total, expected.
    cells : Columns
        The 2x2 table: cell (``first`` and ``second`` as yes or no), observed, expected.
    cases : mapping
        cases (tokens of ``first``), with_second, left, right: "second stands near first in m of n cases".
    information : Columns
        given, of, prior, posterior, ratio, bits, surprisal_before, surprisal_after; a row for each direction.
    mutual_information : mapping or None
        pair_bits, table_bits, share; None where the table is no distribution of pairs.
    measures : Columns
        measure, title, value, unit, rank, compared; rank 1 is the strongest, 0 for what tells no strength.
    compared : mapping
        low, high (joint counts of the pairs compared), pairs (of the table), compared.
    intervals : Columns
        measure, method, value, low, high, trusted.
    tests : mapping
        test (its name), p (two-sided), log10_p, q, q_is (``exact`` or ``at most``), hypotheses; empty where margins
        have no cells.
    avoidance : mapping or None
        For pairs met less often than expected: pmi_if_one (PMI of a single meeting, the smallest association that
        the sample could have shown) and pmi_at_most (what such a count speaks against at 95 %).
    floors : Columns
        shuffle, measure, value, floor, above (nan and None where none is known for so small an expected count); no rows
        where the store keeps none.
    spread : mapping
        documents, of_documents, tokens (of all), dp, dp_norm, largest_share, largest_document.
    by_document : Columns
        document, joint, tokens, for every document that holds the pair, most first.
    positions : Columns
        offset (of ``second`` from ``first``), count.
    relations : Columns or None
        relation, head, dependent, joint, head_total, dependent_total, total, expected, npmi: the pairs in which one
        word is the syntactic head of the other, however far apart, within each relation. None where the store holds
        no text with heads.
    slices : mapping of str to Columns
        By metadata key: value, documents, holding (documents with both words), joint, expected, per_million_words
        (joint in a million words of the text), per_million_counted (in a million of what is ``counted``), pmi,
        pmi_low, pmi_high.
    forms : Columns
        first_form, second_form, order, count: of cases, each with the nearest second word. Where the store has
        lemmas, cases of all forms of the two lemmas.
    examples : Columns
        As ``lines`` gives them; no rows where the store keeps no text.
    statements : tuple of str
        In plain words: what the sample can bear, and what it cannot.
    """

    first: str
    second: str
    settings: Mapping[str, Any]
    table: Mapping[str, int | float]
    cells: Columns
    cases: Mapping[str, int]
    information: Columns
    mutual_information: Mapping[str, float] | None
    measures: Columns
    compared: Mapping[str, int]
    intervals: Columns
    tests: Mapping[str, Any]
    avoidance: Mapping[str, float] | None
    floors: Columns
    spread: Mapping[str, Any]
    by_document: Columns
    positions: Columns
    relations: Columns | None
    slices: Mapping[str, Columns]
    forms: Columns
    examples: Columns
    statements: tuple[str, ...]

    def value(self, measure: str) -> float:
        """The value of a measure."""
        rows = self.measures["measure"].tolist()
        return float(self.measures["value"][rows.index(measure)])

    def sentence(self, shown: Callable[[str], str] = str) -> str:
        """The sentence of a dictionary maker: in how many cases the second word stands near the first.

        Parameters
        ----------
        shown : callable
            What is done to the two words, for instance to keep their direction apart from that of the sentence.
        """
        left, right = self.cases["left"], self.cases["right"]
        if left == right:
            where = f"within {left} word{'s' if left != 1 else ''} of"
        elif not left:
            where = f"within {right} word{'s' if right != 1 else ''} after"
        elif not right:
            where = f"within {left} word{'s' if left != 1 else ''} before"
        else:
            where = f"within {left} words before or {right} after"
        with_second, cases = self.cases["with_second"], self.cases["cases"]
        return f"‘{shown(self.second)}’ stands {where} ‘{shown(self.first)}’ in {with_second:,} of {cases:,} cases."

    @property
    def counted(self) -> str:
        """What ``joint`` counts, in the plural."""
        return observations(self.settings["kind"], self.settings["inside"])

    def notes(self) -> dict[str, str]:
        """What the numbers of the sections ``table``, ``ranks``, ``relations``, ``slices`` and ``forms`` count."""
        first, second, cases = self.first, self.second, self.cases["with_second"]
        of_forms = int(self.forms["count"].sum())
        nearest = f"a case of ‘{first}’ counts once, with the ‘{second}’ nearest to it"
        compared = self.compared
        joint = {
            "pairs": "pairs of words within reach, "
            + ("each once" if first == second else f"two where a ‘{first}’ has two ‘{second}’ near it"),
            "words": f"places of ‘{first}’ that have ‘{second}’ within reach",
        }.get(self.counted, f"{self.counted} that hold both words")
        ranked = f"Rank 1 is the strongest of {compared['compared']:,} pairs of words"
        if compared["compared"] < compared["pairs"]:
            ranked += f", evenly taken from the {compared['pairs']:,}"
        within = " of words within reach" if self.counted == "pairs" else ""
        per = (
            "Per M words: the joint count in a million words of the text."
            if self.counted == "words"
            else f"Per M words, per M {self.counted}: the joint count in a million words of the text, and in a million "
            f"{self.counted}{within}."
        )
        return {
            "table": f"Joint counts are {joint}.",
            "ranks": f"{ranked} that are met {compared['low']:,} to {compared['high']:,} times.",
            "relations": (
                "Counted wherever one word is the head of the other, however far apart; "
                "expected counts and NPMI are within the relation."
            ),
            "slices": per,
            "forms": (
                f"Here {nearest}: {cases:,} cases."
                if of_forms == cases
                else f"All forms of the two lemmas count here, {of_forms:,} cases, where the words as asked for have "
                f"{cases:,}: {nearest}."
            ),
        }

    def to_dict(self) -> dict[str, Any]:
        """Plain values for JSON: columns as lists of rows; what is not a number is None, infinities are "inf"."""
        return {
            "first": self.first,
            "second": self.second,
            "sentence": self.sentence(),
            **{
                name: _plain(getattr(self, name))
                for name in self.__dataclass_fields__
                if name not in ("first", "second")
            },
        }

    def to_json(self) -> str:
        """The card as JSON, indented."""
        return json.dumps(self.to_dict(), ensure_ascii=False, indent=2, allow_nan=False)

    def __repr__(self) -> str:
        return f"Evidence({self.first!r}, {self.second!r}): {self.sentence()}"


def observations(kind: str, inside: str) -> str:
    """What a tally of a kind adds up, and its total counts, in the plural: pairs, words or units of text."""
    return {"unit": f"{inside}s", "positions": "words"}.get(kind, "pairs")


def _plain(value: Any) -> Any:
    if isinstance(value, Columns):
        return [_plain(row) for row in value]
    if isinstance(value, Mapping):
        return {key: _plain(one) for key, one in value.items()}
    if isinstance(value, tuple | list):
        return [_plain(one) for one in value]
    if isinstance(value, float) and value != value:
        return None
    if isinstance(value, float) and value in (float("inf"), float("-inf")):
        return "inf" if value > 0 else "-inf"
    return value
