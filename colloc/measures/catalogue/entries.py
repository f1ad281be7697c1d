"""The entries of the catalogue: what each measure is, what it favours, when it misleads, where it comes from."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

from numpy.typing import ArrayLike

from colloc.measures import exact, likelihood, odds, overlap, pmi
from colloc.measures.contingency import FloatArray, Rule, TableFunction


@dataclass(frozen=True, slots=True, kw_only=True)
class Measure:
    """What a measure of a pair is, and how to compute it.

    Attributes
    ----------
    formula : str
        In O (joint), R (first_total), C (second_total), N (total), E = R C / N, and the cells a = O, b = R - O,
        c = C - O, d = N - R - C + O.
    range : str
        Smallest and largest value, and what they mean.
    unit : str
        ``bits``, ``nats``, ``probability`` ... or ``none``.
    symmetric : bool
        Whether exchanging the two words leaves the value.
    needs_cells : bool
        Whether the four numbers must be one real table (all cells in the same unit, none negative). Only the PMI
        family does without: it may be given margins counted otherwise than the joint counts.
    strongest : "highest" or "lowest"
        Which end of the range is the strongest association: the end that a ranking begins with.
    tells : "strength", "chance", "condition" or "error"
        How strong the pair is; how probable such counts are by chance (p-values); a conditional probability; or how
        uncertain another measure is, which is nothing to rank by.
    over_rates, under_rates, misleads : str
        Which pairs rank too high, which too low, and when not to trust it.
    source : str
        Author, year, equation or section, DOI or anthology number.
    function : TableFunction
        The formula itself.
    """

    name: str
    title: str
    formula: str
    range: str
    unit: str
    symmetric: bool
    needs_cells: bool
    over_rates: str
    under_rates: str
    misleads: str
    source: str
    function: TableFunction = field(repr=False)
    strongest: Literal["highest", "lowest"] = "highest"
    tells: Literal["strength", "chance", "condition", "error"] = "strength"

    @property
    def rule(self) -> Rule:
        """The formula over a :class:`~colloc.measures.contingency.Table`."""
        return self.function.rule

    def compute(
        self, joint: ArrayLike, first_total: ArrayLike, second_total: ArrayLike, total: ArrayLike
    ) -> FloatArray:
        """Values for counts that broadcast together, float64 of their common shape."""
        return self.function(joint, first_total, second_total, total)


_CELL_P_MISLEADS = (
    "Windowed pair counts are not independent trials, so the p-value is too small; with thousands of pairs use "
    "q-values. In a large corpus a tiny p-value says that the count is large, not that the association is strong."
)

ENTRIES = (
    Measure(
        name="pmi",
        title="Pointwise mutual information",
        formula="log2(O / E)",
        range="-inf (never together) to min(log2 N/R, log2 N/C); 0 at independence",
        unit="bits",
        symmetric=True,
        needs_cells=False,
        over_rates="rare pairs: two words that occur once, together, reach the highest value there is",
        under_rates="frequent words, whose ceiling -log2 p(x) is low",
        misleads="At small joint counts: O = 1 against E = 0.001 is 10 bits and may be chance. Set min_count and "
        "read the interval.",
        source="Church & Hanks 1990, Computational Linguistics 16(1); ACL Anthology J90-1003",
        function=pmi.pmi,
    ),
    Measure(
        name="npmi",
        title="Normalised pointwise mutual information",
        formula="log2(O / E) / log2(N / O)",
        range="-1 (never together) to 1 (never apart); 0 at independence",
        unit="none",
        symmetric=True,
        needs_cells=False,
        over_rates="rare pairs, though less than PMI does",
        under_rates="avoidance: moderate negative values are pressed together near 0",
        misleads="The bounds hold only where joint and margins count the same observations; with window pair counts "
        "1 is out of reach, since every word has other neighbours too.",
        source="Bouma 2009, Proceedings of GSCL",
        function=pmi.npmi,
    ),
    Measure(
        name="ppmi",
        title="Positive pointwise mutual information",
        formula="max(log2(O / E), 0)",
        range="0 (independent, or less) to min(log2 N/R, log2 N/C)",
        unit="bits",
        symmetric=True,
        needs_cells=False,
        over_rates="rare pairs, as PMI does",
        under_rates="avoidance, which it does not show at all",
        misleads="As a ranking it is PMI. It is made for vectors, where zeros keep the matrix sparse.",
        source="Levy, Goldberg & Dagan 2015, TACL 3, section 2.1, doi:10.1162/tacl_a_00134",
        function=pmi.ppmi,
    ),
    Measure(
        name="pmi2",
        title="PMI squared, probability form",
        formula="log2((O/N)^2 / ((R/N) (C/N)))",
        range="-inf (never together) to 0 (never apart)",
        unit="bits",
        symmetric=True,
        needs_cells=False,
        over_rates="little: the square takes back PMI's favour for rare pairs",
        under_rates="pairs of words of very unequal frequency",
        misleads="0 is the maximum, not independence, which lies at log2 p(x,y): the sign says nothing.",
        source="Daille 1994, thesis, Universite Paris 7 (cubic and squared association ratio)",
        function=pmi.pmi2,
    ),
    Measure(
        name="pmi3",
        title="PMI cubed, probability form",
        formula="log2((O/N)^3 / ((R/N) (C/N)))",
        range="-inf (never together) to log2(O/N) (never apart), which is at most 0",
        unit="bits",
        symmetric=True,
        needs_cells=False,
        over_rates="frequent pairs",
        under_rates="rare pairs, however exclusive",
        misleads="The sign says nothing; values of corpora of different size cannot be compared.",
        source="Daille 1994, thesis, Universite Paris 7 (cubic and squared association ratio)",
        function=pmi.pmi3,
    ),
    Measure(
        name="mi_share",
        title="Contribution to the mutual information",
        formula="(O/N) log2(O / E)",
        range="negative (less often than expected) to positive; 0 at independence and where never together",
        unit="bits",
        symmetric=True,
        needs_cells=True,
        over_rates="frequent pairs, even when only loosely associated",
        under_rates="rare pairs, however exclusive",
        misleads="The sum over a sparse table is mostly bias (about (rows-1)(columns-1)/(2 N ln 2) bits without any "
        "association): read it beside the value of shuffled text.",
        source="Cover & Thomas 2006, Elements of Information Theory, equation 2.28; bias: Miller 1955",
        function=pmi.mi_share,
    ),
    Measure(
        name="g2",
        title="Log-likelihood ratio, signed",
        formula="sign(O - E) 2 sum O_ij ln(O_ij / E_ij), over the four cells",
        range="-inf to inf; 0 at independence; negative: less often than expected",
        unit="nats (twice)",
        symmetric=True,
        needs_cells=True,
        over_rates="frequent pairs: it measures evidence, which grows with the corpus",
        under_rates="rare pairs, however exclusive",
        misleads="As a strength: doubling the corpus doubles it. As a test: windowed pair counts are not independent "
        "trials.",
        source="Dunning 1993, Computational Linguistics 19(1); ACL Anthology J93-1003 (the sign is ours)",
        function=likelihood.g2,
    ),
    Measure(
        name="chi2",
        title="Pearson's chi-square, signed",
        formula="sign(O - E) sum (O_ij - E_ij)^2 / E_ij, over the four cells, no continuity correction",
        range="-N to N; 0 at independence; negative: less often than expected",
        unit="none",
        symmetric=True,
        needs_cells=True,
        over_rates="rare pairs: a pair met once whose words occur nowhere else reaches N",
        under_rates="nothing in particular",
        misleads="Where an expected count is below 5 its distribution is not chi-square: prefer g2 or fisher_p.",
        source="Pearson 1900, doi:10.1080/14786440009463897; Manning & Schuetze 1999, section 5.3.3 (the sign is ours)",
        function=likelihood.chi2,
    ),
    Measure(
        name="g2_p",
        title="p-value of the log-likelihood ratio",
        formula="P(chi-square with 1 df > |g2|)",
        range="0 to 1 (independent); two-sided",
        unit="probability",
        symmetric=True,
        needs_cells=True,
        over_rates="frequent pairs",
        under_rates="rare pairs",
        misleads=_CELL_P_MISLEADS,
        source="Dunning 1993; Wilks 1938, doi:10.1214/aoms/1177732360",
        function=likelihood.g2_p,
        strongest="lowest",
        tells="chance",
    ),
    Measure(
        name="g2_log10_p",
        title="log10 p-value of the log-likelihood ratio",
        formula="log10 P(chi-square with 1 df > |g2|)",
        range="-inf to 0 (independent); two-sided",
        unit="powers of ten",
        symmetric=True,
        needs_cells=True,
        over_rates="frequent pairs",
        under_rates="rare pairs",
        misleads=_CELL_P_MISLEADS,
        source="as g2_p; for p-values too small for a float",
        function=likelihood.g2_log10_p,
        strongest="lowest",
        tells="chance",
    ),
    Measure(
        name="chi2_p",
        title="p-value of Pearson's chi-square",
        formula="P(chi-square with 1 df > |chi2|)",
        range="0 to 1 (independent); two-sided",
        unit="probability",
        symmetric=True,
        needs_cells=True,
        over_rates="rare pairs: far too small where an expected count is below 5",
        under_rates="nothing in particular",
        misleads=_CELL_P_MISLEADS,
        source="Pearson 1900, doi:10.1080/14786440009463897",
        function=likelihood.chi2_p,
        strongest="lowest",
        tells="chance",
    ),
    Measure(
        name="chi2_log10_p",
        title="log10 p-value of Pearson's chi-square",
        formula="log10 P(chi-square with 1 df > |chi2|)",
        range="-inf to 0 (independent); two-sided",
        unit="powers of ten",
        symmetric=True,
        needs_cells=True,
        over_rates="rare pairs: far too small where an expected count is below 5",
        under_rates="nothing in particular",
        misleads=_CELL_P_MISLEADS,
        source="as chi2_p; for p-values too small for a float",
        function=likelihood.chi2_log10_p,
        strongest="lowest",
        tells="chance",
    ),
    Measure(
        name="fisher_p",
        title="p-value of Fisher's exact test",
        formula="sum of p(table) over tables with these margins that are at most as probable as the one observed",
        range="0 to 1; two-sided",
        unit="probability",
        symmetric=True,
        needs_cells=True,
        over_rates="frequent pairs",
        under_rates="rare pairs: the test is conservative on few counts",
        misleads=_CELL_P_MISLEADS,
        source="Fisher 1935, doi:10.2307/2342435; Pedersen 1996, arXiv:cmp-lg/9608010",
        function=exact.fisher_p,
        strongest="lowest",
        tells="chance",
    ),
    Measure(
        name="fisher_log10_p",
        title="log10 p-value of Fisher's exact test",
        formula="log10 of fisher_p",
        range="-inf to 0; two-sided",
        unit="powers of ten",
        symmetric=True,
        needs_cells=True,
        over_rates="frequent pairs",
        under_rates="rare pairs: the test is conservative on few counts",
        misleads=_CELL_P_MISLEADS,
        source="as fisher_p; for p-values too small for a float",
        function=exact.fisher_log10_p,
        strongest="lowest",
        tells="chance",
    ),
    Measure(
        name="t",
        title="t-score",
        formula="(O - E) / sqrt(O)",
        range="-inf (never together) to sqrt(O); 0 at independence",
        unit="none",
        symmetric=True,
        needs_cells=True,
        over_rates="frequent pairs: the ranking is nearly that of the joint count",
        under_rates="rare pairs, however exclusive",
        misleads="It is no t-distributed statistic: counts are not normal, and sqrt(O) is a poor standard deviation "
        "when O is small. Below 0 it exaggerates, as O in the denominator vanishes.",
        source="Church, Gale, Hanks & Hindle 1991, Using statistics in lexical analysis; Manning & Schuetze 1999, "
        "section 5.3.1",
        function=likelihood.t,
    ),
    Measure(
        name="z",
        title="z-score",
        formula="(O - E) / sqrt(E)",
        range="-sqrt(E) (never together) to inf; 0 at independence",
        unit="none",
        symmetric=True,
        needs_cells=True,
        over_rates="rare pairs: a tiny E in the denominator",
        under_rates="pairs of frequent words",
        misleads="Where E is below 5 it is far from normal.",
        source="Berry-Rogghe 1973, in The Computer and Literary Studies (there with sqrt(E (1 - p)))",
        function=likelihood.z,
    ),
    Measure(
        name="dice",
        title="Dice coefficient",
        formula="2 O / (R + C)",
        range="0 (never together) to 1 (never apart)",
        unit="none",
        symmetric=True,
        needs_cells=True,
        over_rates="rare words that happen to meet",
        under_rates="pairs of unequal frequency: at most 2 R / (R + C) for the rarer word",
        misleads="It knows no chance: two very frequent words have a high value without any association.",
        source="Dice 1945, doi:10.2307/1932409; Smadja, McKeown & Hatzivassiloglou 1996, ACL Anthology J96-1001",
        function=overlap.dice,
    ),
    Measure(
        name="jaccard",
        title="Jaccard index",
        formula="O / (R + C - O)",
        range="0 (never together) to 1 (never apart)",
        unit="none",
        symmetric=True,
        needs_cells=True,
        over_rates="rare words that happen to meet",
        under_rates="pairs of unequal frequency",
        misleads="It ranks exactly as Dice does, and knows no chance either.",
        source="Jaccard 1912, doi:10.1111/j.1469-8137.1912.tb05611.x",
        function=overlap.jaccard,
    ),
    Measure(
        name="min_sensitivity",
        title="Minimum sensitivity",
        formula="min(O / R, O / C)",
        range="0 (never together) to 1 (never apart)",
        unit="probability",
        symmetric=True,
        needs_cells=True,
        over_rates="rare words that happen to meet",
        under_rates="one-sided attraction: a rare word that always needs a frequent one",
        misleads="It knows no chance.",
        source="Pedersen & Bruce 1996, What to infer from a description, Southern Methodist University 96-CSE-04",
        function=overlap.min_sensitivity,
    ),
    Measure(
        name="delta_p_second_given_first",
        title="Delta-P of the second word given the first",
        formula="O / R - c / (N - R)",
        range="-1 to 1 (the second comes with the first, and only then); 0 at independence",
        unit="difference of probabilities",
        symmetric=False,
        needs_cells=True,
        over_rates="frequent second words beside rare first words",
        under_rates="rare second words: it cannot exceed O / R",
        misleads="From one direction nothing follows about the other. At small R the value is coarse.",
        source="Gries 2013, Int. J. of Corpus Linguistics 18(1), doi:10.1075/ijcl.18.1.09gri",
        function=overlap.delta_p_second_given_first,
    ),
    Measure(
        name="delta_p_first_given_second",
        title="Delta-P of the first word given the second",
        formula="O / C - b / (N - C)",
        range="-1 to 1 (the first comes with the second, and only then); 0 at independence",
        unit="difference of probabilities",
        symmetric=False,
        needs_cells=True,
        over_rates="frequent first words beside rare second words",
        under_rates="rare first words: it cannot exceed O / C",
        misleads="From one direction nothing follows about the other. At small C the value is coarse.",
        source="Gries 2013, Int. J. of Corpus Linguistics 18(1), doi:10.1075/ijcl.18.1.09gri",
        function=overlap.delta_p_first_given_second,
    ),
    Measure(
        name="log_odds",
        title="Log odds ratio",
        formula="ln(a d / (b c)), with 0.5 added to all four cells where one is zero",
        range="-inf to inf; 0 at independence; finite for any counts",
        unit="nats",
        symmetric=True,
        needs_cells=True,
        over_rates="rare pairs",
        under_rates="nothing in particular: it does not depend on how frequent the words are",
        misleads="With a zero cell the value is made by the 0.5: read it only with its standard error.",
        source="Agresti 2013, Categorical Data Analysis, sections 2.2.3 and 3.1.1; 0.5: Haldane 1956, "
        "doi:10.1111/j.1469-1809.1955.tb01285.x",
        function=odds.log_odds,
    ),
    Measure(
        name="log_odds_se",
        title="Standard error of the log odds ratio",
        formula="sqrt(1/a + 1/b + 1/c + 1/d), with 0.5 added to all four cells where one is zero",
        range="above 0 to inf",
        unit="nats",
        symmetric=True,
        needs_cells=True,
        over_rates="does not apply: it measures uncertainty, not association",
        under_rates="the uncertainty of words that cluster in documents",
        misleads="It takes observations as independent, which words in running text are not: prefer the jackknife "
        "over documents.",
        source="Woolf 1955, doi:10.1111/j.1469-1809.1955.tb01348.x",
        function=odds.log_odds_se,
        strongest="lowest",
        tells="error",
    ),
    Measure(
        name="p_second_given_first",
        title="Conditional probability of the second word given the first",
        formula="O / R",
        range="0 (never together) to 1 (the first never without the second)",
        unit="probability",
        symmetric=False,
        needs_cells=True,
        over_rates="frequent second words",
        under_rates="rare second words",
        misleads="It knows no chance: compare it with C / N, or read delta_p_second_given_first.",
        source="common practice, no single source",
        function=overlap.p_second_given_first,
        tells="condition",
    ),
    Measure(
        name="p_first_given_second",
        title="Conditional probability of the first word given the second",
        formula="O / C",
        range="0 (never together) to 1 (the second never without the first)",
        unit="probability",
        symmetric=False,
        needs_cells=True,
        over_rates="frequent first words",
        under_rates="rare first words",
        misleads="It knows no chance: compare it with R / N, or read delta_p_first_given_second.",
        source="common practice, no single source",
        function=overlap.p_first_given_second,
        tells="condition",
    ),
)
