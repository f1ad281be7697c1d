"""``docs/measures.md``, made from the catalogue: ``python -m colloc.measures.catalogue.page > docs/measures.md``."""

# ruff: noqa: E501  (rows of a Markdown table cannot be wrapped)
from __future__ import annotations

import sys
from collections.abc import Iterator

from colloc.measures.catalogue import MEASURES
from colloc.measures.catalogue.measure import Measure

_OPENING = """\
# Measures of association

<!-- Made from the catalogue: python -m colloc.measures.catalogue.page > docs/measures.md -->

Every measure is a function of four numbers: how often the two words meet (O, `joint`), how often each occurs (R,
`first_total`, and C, `second_total`), and how many observations there are (N, `total`). E = R C / N is the joint count
that chance alone predicts. The table behind them:

| | second word | not second | |
| --- | --- | --- | --- |
| **first word** | a = O | b = R - O | R |
| **not first** | c = C - O | d = N - R - C + O | N - R |
| | C | N - C | N |

"log2" values are in bits: one bit more is twice as much. "ln" values are in nats.

**Windowed pair counts are not independent trials.** One token takes part in several pairs of a window, words come in
bursts, and documents have topics. Every p-value, asymptotic interval and standard error below takes the observations
as independent, and therefore claims more certainty than there is. Use them to order and to screen; for a claim, use the
jackknife over documents, the dispersion, and the floors of shuffled text.
"""

_LIMITS = """\
## Limits at zero cells

No measure fails on a zero; each has the value that its formula tends to, or says that there is none.

| table | value |
| --- | --- |
| never together (O = 0, both words occur) | PMI, PMI^k: -inf. NPMI: -1. PPMI, share of mutual information: 0. t: -inf. z: -sqrt(E). Dice, Jaccard, minimum sensitivity, conditional probabilities: 0 |
| never apart (O = R = C) | NPMI: exactly 1. PMI^2: 0. Dice, Jaccard, minimum sensitivity: 1 |
| one cell zero | log odds and its standard error: 0.5 is added to all four cells. G2: 0 ln 0 = 0 |
| a word that never occurs (R or C = 0) | PMI family, t, z: nan (0/0). G2, chi-square: 0, p-values: 1. Shares of that word: nan |
| a word that is always there (R or C = N) | G2, chi-square: 0, p-values: 1. Delta-P from that word: nan |

A table that cannot be (a negative cell, O above R or C) is refused where counts come in from outside.
"""

_INTERVALS = """\
## Intervals

| interval | formula | when |
| --- | --- | --- |
| PMI, asymptotic | PMI -/+ z sqrt(V), V = (1/O - 1/R - 1/C + 2 O/(R C) - 1/N) / ln^2 2 (delta method) | independent observations; O not tiny |
| log odds, asymptotic | ln(ad/bc) -/+ z sqrt(1/a + 1/b + 1/c + 1/d) (Woolf 1955) | as above |
| log ratio, asymptotic | log2 ratio -/+ z sqrt(1/O1 - 1/N1 + 1/O2 - 1/N2) / ln 2 (Agresti 2013, chapter 3) | two sub-corpora, independent tokens |
| any measure, jackknife | value -/+ t(g - 1) sqrt((g - 1)/g sum (v_i - mean v)^2), v_i without document group i of g = 20 | running text: documents, not tokens, are the sample |

The jackknife interval is unbounded where the value without some group is not finite: the association then hangs on a
single group of documents.
"""

_DISCOVERIES = """\
## p-values and q-values

The p-value of one pair says how often chance alone would give so much. Among a million pairs chance gives a thousand
p-values below 0.001. The q-value (Benjamini & Hochberg 1995) answers the question that is asked: if all pairs with
q at most 0.05 are taken, about 5 in 100 of them are false. It is p m / rank, made monotone, where m counts *all* pairs
of words that pass the word threshold, seen together or not; counting only the pairs seen makes random text look
significant.

Where E is below 5, as for most pairs of any text, the chi-square distribution of G2 does not hold, and the exact test
takes its place, with its mid-p value (the observed table counted by half: Lancaster 1961).

p-values below about 1e-308 are 0 in a float; the `log10_p` measures go on.
"""

_BESIDE = """\
## Beside the score

| idea | functions | source |
| --- | --- | --- |
| shifted PPMI, context smoothing | `pmi.shifted_ppmi`, `pmi.smoothed_totals` | Levy, Goldberg & Dagan 2015, doi:10.1162/tacl_a_00134 |
| mutual information of a table, surprisal | `pmi.mutual_information`, `pmi.surprisal` | Cover & Thomas 2006, chapter 2 |
| dispersion: document frequency, DP, DPnorm, Juilland's D, Carroll's D2, Rosengren's S, KL | `dispersion.dispersion` | Gries 2008; Lijffijt & Gries 2012; Gries 2020 |
| contrast of two sub-corpora | `contrast.log_ratio_interval`, `contrast.keyness_g2`, `contrast.keyness_g2_two_cells`, `contrast.relative_frequency_ratio`, `contrast.difference`, `contrast.welch_test` | Dunning 1993; Rayson & Garside 2000; Woolf 1955; Welch 1947 |
| the same pair in several strata | `strata.mantel_haenszel`, `strata.mantel_haenszel_test`, `strata.breslow_day`, `strata.woolf` | Mantel & Haenszel 1959; Robins, Breslow & Greenland 1986; Breslow & Day 1980; Tarone 1985 |
| trend over periods | `trend.mann_kendall`, `trend.theil_sen`, `trend.weighted_slope`, `trend.log_linear_slope` | Mann 1945; Kendall 1975; Sen 1968 |
| three words and more | `multivariate.specific_correlation`, `multivariate.specific_interaction`, `multivariate.total_correlation`, `multivariate.co_information` | Van de Cruys 2011; Watanabe 1960; McGill 1954 |
| expressions inside longer ones | `multivariate.c_value`, `multivariate.weakest_split` | Frantzi & Ananiadou 1996; Frantzi, Ananiadou & Mima 2000 |
"""


def markdown() -> str:
    """The whole page."""
    parts = [_OPENING, "## Overview\n\n" + "\n".join(_overview()) + "\n"]
    parts += ["\n".join(_section(measure)) + "\n" for measure in MEASURES.values()]
    return "\n".join([*parts, _LIMITS, _INTERVALS, _DISCOVERIES, _BESIDE])


def _overview() -> Iterator[str]:
    yield "| name | measure | unit | both directions alike | needs a real table |"
    yield "| --- | --- | --- | --- | --- |"
    for measure in MEASURES.values():
        alike, cells = _yes(measure.symmetric), _yes(measure.needs_cells)
        yield f"| `{measure.name}` | [{measure.title}](#{_anchor(measure.title)}) | {measure.unit} | {alike} | {cells} |"
    yield ""
    yield (
        'Measures that "need a real table" are refused where the margins count something else than the joint count '
        "does (`--margins tokens`)."
    )


def _section(measure: Measure) -> Iterator[str]:
    yield f"## {measure.title}"
    yield ""
    yield f"`{measure.name}` = `{measure.formula}`"
    yield ""
    yield f"- **Range**: {measure.range}"
    yield f"- **Unit**: {measure.unit}"
    first = "nothing: refused as a ranking" if measure.tells == "error" else f"the {measure.strongest} value"
    yield f"- **Ranks first**: {first}"
    yield f"- **Overrates**: {measure.over_rates}"
    yield f"- **Underrates**: {measure.under_rates}"
    yield f"- **Misleads**: {measure.misleads}"
    yield f"- **Source**: {measure.source}"


def _anchor(heading: str) -> str:
    kept = "".join(character for character in heading.lower() if character.isalnum() or character in " -")
    return kept.replace(" ", "-")


def _yes(fact: bool) -> str:
    return "yes" if fact else "no"


if __name__ == "__main__":
    sys.stdout.write(markdown())
