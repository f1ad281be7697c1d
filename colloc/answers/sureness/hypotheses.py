"""q-values of pairs: Benjamini & Hochberg (1995) over all pairs of words, seen together or not."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from colloc.answers.questions import Question
from colloc.answers.tables import PairTable
from colloc.errors import UsageError
from colloc.measures.discoveries import log_q_values
from colloc.measures.exact import association_log_p
from colloc.records import FloatArray

Progress = Callable[[float, int, str], None]


def require_cells(question: Question, what: str) -> None:
    """Raise UsageError where the margins are no sums of cells, so that no test can be made of them."""
    if question.convention.margins == "tokens":
        raise UsageError(f"{what} needs the cells of a table, which margins tokens does not have: use margins pairs")


def two_sided(table: PairTable) -> FloatArray:
    """Natural log of the two-sided p-value of each row."""
    return association_log_p(table.joint, table.first_total, table.second_total, table.total)


class Hypotheses:
    """All pairs of words that pass the word threshold, as a family of tests.

    The threshold goes by the frequency of words alone; thresholds of joint counts, and how many rows are shown, act
    afterwards and change no q-value. Two-sided p-values: mid-p of Fisher's exact test where the expected count is below
    5, else of G2. Pairs that never met count with p = 1, which can only make q-values larger.

    Parameters
    ----------
    log_p : float64 array
        Natural logs of the p-values of those seen pairs that can matter: all that are at most ``seen / number``.
    number : int
        Hypotheses in all.
    """

    def __init__(self, log_p: FloatArray, number: int) -> None:
        self.number = number
        self._log_p = np.sort(log_p)
        self._log_q = log_q_values(self._log_p, max(number, len(log_p)))

    def q_values(self, table: PairTable) -> FloatArray:
        """The q-value of each row, which must be among the pairs of the family."""
        return self.q_of(two_sided(table))

    def q_of(self, log_p: FloatArray) -> FloatArray:
        """The q-value of each p-value of the family."""
        place = np.searchsorted(self._log_p, log_p)
        known = np.append(self._log_q, 0.0)
        q: FloatArray = np.exp(known[place])
        return q


def family_size(question: Question, min_word_count: int) -> int:
    """All pairs of words that pass the word threshold, met or not: how many hypotheses there are."""
    words = int(np.count_nonzero(question.words.tokens >= max(min_word_count, 1)))
    if question.reader.ordered:
        return words * words
    return words * (words - 1) // 2 if question.spec.kind == "unit" else words * (words + 1) // 2


def all_pairs(question: Question, min_word_count: int, progress: Progress | None = None) -> Hypotheses:
    """The family of a whole store: one pass over its table."""
    require_cells(question, "a q-value")
    passing = question.words.tokens >= max(min_word_count, 1)
    number = family_size(question, min_word_count)
    seen = max(question.reader.tally.n_pairs * (2 if question.reader.ordered else 1), 1)
    # a p-value above seen / number has a q-value of 1 and changes no other one
    matters = min(np.log(seen) - np.log(max(number, 1)), 0.0)
    found = [np.empty(0)]
    done = 0
    for table in question.reader.blocks():
        done += len(table)
        keep = passing[table.first] & passing[table.second] & (table.joint > 0)
        if matters < 0:
            keep &= _may_be_below(table, matters)
        if keep.any():
            log_p = two_sided(table.take(keep))
            found.append(log_p[log_p <= matters])
        if progress is not None:
            progress(min(done / seen, 1.0), done, "testing")
    return Hypotheses(np.concatenate(found), number)


def pairs_of_words(question: Question, tables: Sequence[PairTable], min_word_count: int) -> Hypotheses:
    """The family of some words, each with every word that passes the threshold; ``tables`` hold all they met."""
    require_cells(question, "a q-value")
    passing = question.words.tokens >= max(min_word_count, 1)
    log_p = [np.empty(0)]
    for table in tables:
        table = table.take(passing[table.second] & (table.joint > 0))
        log_p.append(two_sided(table))
    return Hypotheses(np.concatenate(log_p), len(tables) * int(np.count_nonzero(passing)))


def _may_be_below(table: PairTable, log_p: float) -> np.ndarray:
    """Which rows may have a p-value below exp(log_p): cheap, and never wrong about the others.

    The mid-p value is at least half the probability of the table itself, whose logarithm is (see
    `colloc.measures.exact`) at least -G2/2 - ln(2 pi a)/2 - 1/6 + ln(1 - C/N)/2; and since ln x <= x - 1, G2/2 is
    at most a ln(a/E) + (a - E) (d/Ed - b/Eb - c/Ec).
    """
    a, first, second, total = (column.astype(np.float64) for column in table.arguments)
    with np.errstate(divide="ignore", invalid="ignore"):
        e = first * second / total
        b, c, d = first - a, second - a, total - first - second + a
        most = a * np.log(a / e) + (a - e) * (d / (d - a + e) - b / (first - e) - c / (second - e))
        least_log_p = -most - 0.5 * np.log(2 * np.pi * a) - 1 / 6 + 0.5 * np.log1p(-second / total) - np.log(2)
    # tables with an empty cell of expected counts are tested in any case
    likely: np.ndarray = ~(least_log_p > log_p)
    return likely
