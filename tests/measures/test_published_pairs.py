"""Association of pairs: the numbers that papers and textbooks print, from the counts that they print."""

from __future__ import annotations

import numpy as np
import pytest

from colloc.measures.catalogue import compute_all
from colloc.measures.contingency import expected
from colloc.measures.exact import fisher_log_p, fisher_p
from colloc.measures.likelihood import chi2, g2, t, z
from colloc.measures.odds import log_odds, log_odds_se, log_ratio
from colloc.measures.overlap import delta_p_first_given_second, delta_p_second_given_first
from colloc.measures.pmi import npmi, pmi, pmi_k
from colloc.measures.tails import chi_square_p

from .rounding import cuts_to, rounds_to


def from_cells(a: float, b: float, c: float, d: float) -> tuple[float, float, float, float]:
    return a, a + b, a + c, a + b + c + d


# Church & Hanks 1990, Computational Linguistics 16(1):22-29, Table 3: printed, f(x,y), f(x), f(y). The paper says
# "N = 15 million"; its rows reproduce for any N from 14,811,507 to 14,859,966.
CHURCH_HANKS_TOTAL = 14_835_000
CHURCH_HANKS = """
11.3 12 111 621
11.3 8 1105 44
10.7 30 1105 241
9.4 8 1105 154
9.0 6 275 621
8.9 11 1105 317
8.7 25 621 1407
8.7 6 621 350
8.6 19 1105 676
8.4 6 241 1105
0.96 6 621 73785
0.95 41 284690 1105
0.93 12 84716 1105
"""


@pytest.mark.parametrize("row", CHURCH_HANKS.split("\n")[1:-1])
def test_church_hanks_table_3(row: str) -> None:
    printed, joint, first, second = row.split()
    value = float(pmi(int(joint), int(first), int(second), CHURCH_HANKS_TOTAL))
    assert rounds_to(value, printed)
    # With the round total of the text the last digit may be one lower.
    assert float(pmi(int(joint), int(first), int(second), 15_000_000)) == pytest.approx(float(printed), abs=0.07)


def test_church_hanks_window_and_other_tables() -> None:
    # Same paper: dividing by w - 1 = 4 lowers the score by 2.
    args = 621, 73785, CHURCH_HANKS_TOTAL
    assert pmi(6, *args) - pmi(6 / 4, *args) == pytest.approx(2)
    # Verb-object pairs out of N = 4,112,943 triples: disconnect/telephone, drink/beer.
    assert rounds_to(float(pmi(7, 84, 481, 4_112_943)), "9.48")
    assert rounds_to(float(pmi(29, 660, 195, 4_112_943)), "9.9")
    # set ... off from rates: 70 in 7.3 million words, 250 and 556 per million.
    assert rounds_to(float(pmi(70 / 7.3e6, 250e-6, 556e-6, 1)), "6.1")
    # Table 4, N = 44,344,077, f(set) = 13,046.
    for printed, second, joint in (("6.2", 20_693, 463), ("4.4", 47_956, 301), ("1.1", 258_170, 162)):
        assert rounds_to(float(pmi(joint, 13_046, second, 44_344_077)), printed)


# Dunning 1993, Computational Linguistics 19(1):61-74, N = 31,777: printed value and the four cells.
DUNNING_TABLE_2 = """
270.72 110 2442 111 29114
263.90 29 13 123 31612
256.84 31 23 139 31584
167.23 10 0 3 31764
157.21 76 104 2476 29121
157.03 16 16 51 31694
146.80 9 0 5 31763
115.02 16 0 865 30896
104.53 10 9 41 31717
100.96 8 2 27 31740
"""
DUNNING_TABLE_3 = """
31777.00 3 0 0 31774
31777.00 1 0 0 31776
24441.54 10 0 3 31764
21184.00 2 0 1 31774
20424.86 9 0 5 31763
15888.00 1 1 0 31775
15888.00 1 0 1 31775
15887.50 2 0 2 31773
"""
DUNNING_TABLE_4 = """
525.02 110 2442 111 29114
286.52 76 104 2476 29121
51.12 26 2526 66 29159
6.03 4 148 2548 29077
4.48 1 73 2551 29152
4.31 1 71 2551 29154
0.69 4 70 2548 29155
0.42 7 62 2545 29163
0.28 4 60 2548 29165
0.12 5 2547 67 29158
0.03 18 198 2534 29027
"""


@pytest.mark.parametrize(
    ("table", "measure"), [(DUNNING_TABLE_2, g2), (DUNNING_TABLE_3, chi2), (DUNNING_TABLE_4, chi2)], ids=["2", "3", "4"]
)
def test_dunning(table: str, measure: object) -> None:
    for line in table.strip().split("\n"):
        printed, *cells = line.split()
        a, b, c, d = map(int, cells)
        value = float(measure(*from_cells(a, b, c, d)))  # type: ignore[operator]
        assert rounds_to(abs(value), printed), line
        assert (value > 0) == (a * d > b * c), "the sign is that of O - E"


def test_dunning_table_4_lists_avoided_pairs() -> None:
    # Unsigned in the paper; be the, months the, increased the, 1986 the ... meet less often than expected.
    low = [list(map(int, line.split()[1:])) for line in DUNNING_TABLE_4.strip().split("\n")[3:7]]
    assert all(chi2(*from_cells(*cells)) < 0 for cells in low)


def test_fung_church() -> None:
    # Fung & Church 1994, COLING: log2 5 = 2.32, t = 2.1.
    assert rounds_to(float(pmi(*from_cells(2, 0, 0, 8))), "2.32")
    assert rounds_to(float(t(*from_cells(5, 0, 1, 94))), "2.1")
    assert float(pmi(*from_cells(1, 0, 0, 9))) == pytest.approx(np.log2(10))


# Manning & Schuetze 1999, Foundations of Statistical Natural Language Processing, chapter 5 (from memory).
MS_TOTAL = 14_307_668
MS_TABLE_5_6 = """
4.4721 42 20 18.38
4.4721 41 27 17.98
4.4720 30 117 16.31
4.4720 77 59 15.94
4.4720 24 320 15.19
2.3714 14907 9017 1.09
2.2446 13484 10570 1.01
1.3685 14734 13478 0.53
1.2176 14093 14776 0.46
0.8036 15019 15629 0.29
"""


@pytest.mark.parametrize("row", MS_TABLE_5_6.strip().split("\n"))
def test_manning_schuetze_tables_5_6_and_5_14(row: str) -> None:
    printed_t, first, second, printed_pmi = row.split()
    assert cuts_to(float(t(20, int(first), int(second), MS_TOTAL)), printed_t)
    assert rounds_to(float(pmi(20, int(first), int(second), MS_TOTAL)), printed_pmi)


def test_manning_schuetze_worked_examples() -> None:
    new_companies = (8, 15_828, 4_675, MS_TOTAL)
    assert rounds_to(float(t(*new_companies)), "0.999932")
    assert rounds_to(float(chi2(*new_companies)), "1.55")
    # cow and vache in aligned sentences; printed 456,400.
    assert float(chi2(*from_cells(59, 6, 8, 570_934))) == pytest.approx(456_400, abs=0.5)


@pytest.mark.parametrize(
    "row",
    [
        "14.46 106 6 1",
        "13.06 76 22 1",
        "11.25 22 267 1",
        "8.97 43 663 1",
        "8.04 170 1917 6",
        "5.73 15828 51 3",
        "5.26 680 3846 7",
        "4.76 739 713 1",
        "1.95 3549 6276 6",
        "0.41 14093 762 1",
    ],
)
def test_manning_schuetze_table_5_16(row: str) -> None:
    printed, first, second, joint = row.split()
    assert rounds_to(float(pmi(int(joint), int(first), int(second), MS_TOTAL)), printed)


def test_gries_delta_p() -> None:
    # Gries 2013, Int. J. of Corpus Linguistics 18(1):137-166: "of course".
    table = from_cells(5_610, 168_938, 2_257, 10_233_063)
    assert rounds_to(float(delta_p_second_given_first(*table)), "0.032")
    assert rounds_to(float(delta_p_first_given_second(*table)), "0.697")
    # The product of both directions is the squared phi coefficient, X2 / N (identity, textbook).
    product = float(delta_p_second_given_first(*table) * delta_p_first_given_second(*table))
    assert product == pytest.approx(float(chi2(*table)) / table[3], rel=1e-9)


def test_bouma_npmi() -> None:
    # Bouma 2009, Proceedings of GSCL: the three fixed points; the values between recomputed independently.
    assert float(npmi(*from_cells(0, 5, 6, 100))) == -1
    assert float(npmi(*from_cells(3, 0, 0, 31_774))) == 1
    assert float(npmi(*from_cells(4, 16, 16, 64))) == 0
    assert rounds_to(float(npmi(*from_cells(110, 2442, 111, 29114))), "0.32195")
    assert rounds_to(float(npmi(*from_cells(5_610, 168_938, 2_257, 10_233_063))), "0.49830")


def test_stefanowitsch_gries_fisher() -> None:
    # Stefanowitsch & Gries 2003, IJCL 8(2) (from memory): [N waiting to happen], accident; one-sided 2.12E-34.
    p = np.exp(fisher_log_p(*from_cells(14, 21, 8606, 10_197_659), alternative="greater"))
    assert rounds_to(float(p) * 1e34, "2.12")
    # Gries & Stefanowitsch 2004, IJCL 9(1) (from memory): give, ditransitive against to-dative; one-sided 1.84E-120.
    give = from_cells(461, 574, 146, 1773)
    assert rounds_to(float(np.exp(fisher_log_p(*give, alternative="greater"))) * 1e120, "1.84")
    assert rounds_to(float(fisher_p(*give)) * 1e120, "2.52")
    assert rounds_to(float(expected(*give)), "213")


def test_fisher_tea_and_twins() -> None:
    # Fisher 1935: the tea-tasting table (3, 1, 1, 3), and convictions of twins (2, 15, 10, 3) (values from memory).
    tea = from_cells(3, 1, 1, 3)
    assert rounds_to(float(np.exp(fisher_log_p(*tea, alternative="greater"))), "0.243")
    assert rounds_to(float(fisher_p(*tea)), "0.486")
    assert rounds_to(float(np.exp(fisher_log_p(*tea, alternative="greater", mid=True))), "0.129")
    assert rounds_to(float(chi2(*tea)), "2.0")
    # The null probabilities .014 .229 .514 .229 .014 are differences of the tails.
    tails = np.exp(fisher_log_p(np.arange(5), 4, 4, 8, alternative="greater"))
    np.testing.assert_allclose(-np.diff([*tails, 0]), [1 / 70, 16 / 70, 36 / 70, 16 / 70, 1 / 70], rtol=1e-12)
    twins = from_cells(2, 15, 10, 3)
    assert rounds_to(float(np.exp(fisher_log_p(*twins, alternative="less"))), "0.0004652")
    assert rounds_to(float(fisher_p(*twins)), "0.0005367")


def test_agresti_two_by_two() -> None:
    # Agresti, Categorical Data Analysis: aspirin and heart attacks; belief in afterlife by sex.
    aspirin = from_cells(189, 10_845, 104, 10_933)
    assert rounds_to(float(np.exp(log_odds(*aspirin))), "1.832")
    assert rounds_to(float(log_odds(*aspirin)), "0.605")
    assert rounds_to(float(log_odds_se(*aspirin)), "0.123")
    assert rounds_to(2.0 ** float(log_ratio(*aspirin)), "1.818")
    assert rounds_to(float(chi2(*aspirin)), "25.01")
    afterlife = from_cells(435, 147, 375, 134)
    assert rounds_to(float(chi2(*afterlife)), "0.162")
    assert rounds_to(float(g2(*afterlife)), "0.162")
    assert rounds_to(float(chi_square_p(chi2(*afterlife))), "0.69")


def test_daille_forms_of_the_swiss() -> None:
    # Daille 1994 (from memory); counts form log2(a^k / E), from which (k - 1) log2 N gives the probability form.
    table = from_cells(110, 2442, 111, 29114)
    for k, counts_form in ((1, 2.63174), (2, 9.41310), (3, 16.19446)):
        assert float(pmi_k(*table, k=k)) == pytest.approx(counts_form - (k - 1) * np.log2(31_777), abs=5e-6)


def test_everything_about_the_swiss() -> None:
    # Cells: Dunning 1993, Table 2. Values recomputed with general statistics libraries, not with this program.
    table = from_cells(110, 2442, 111, 29114)
    values = compute_all(["pmi", "t", "z", "dice", "jaccard", "log_odds", "log_odds_se", "g2", "mi_share"], *table)
    printed = {
        "pmi": "2.631740",
        "t": "8.795842",
        "z": "21.897459",
        "dice": "0.0793365",
        "jaccard": "0.0413068",
        "log_odds": "2.469352",
        "log_odds_se": "0.136175",
        "g2": "270.7219",
    }
    for name, text in printed.items():
        assert rounds_to(float(values[name]), text), name
    assert rounds_to(float(expected(*table)), "17.748434")
    assert rounds_to(float(values["mi_share"]) * table[3], "289.491383")
    assert rounds_to(float(delta_p_second_given_first(*table)), "0.0393053")
    assert rounds_to(float(delta_p_first_given_second(*table)), "0.4203513")
    assert rounds_to(float(log_ratio(*table)), "3.504447")
    one_sided = float(fisher_log_p(*table, alternative="greater"))
    assert rounds_to(one_sided, "-138.179041")
    assert rounds_to(np.exp(one_sided) * 1e61, "9.76348")
    new_companies = (8, 15_828, 4_675, MS_TOTAL)
    assert rounds_to(float(expected(*new_companies)), "5.171765")
    assert rounds_to(float(z(*new_companies)), "1.243644")
    assert rounds_to(float(g2(*new_companies)), "1.325389")
    assert rounds_to(float(pmi(*new_companies)), "0.629343")


def test_church_adaptation() -> None:
    # Church 2000, COLING: hostages in the halves of AP documents; prior .015, +adapt .56, -adapt .0072.
    table = from_cells(638, 505, 557, 76_787)
    values = compute_all(["p_second_given_first", "delta_p_second_given_first"], *table)
    assert rounds_to(table[2] / table[3], "0.015")
    assert rounds_to(float(values["p_second_given_first"]), "0.56")
    assert rounds_to(float(values["p_second_given_first"] - values["delta_p_second_given_first"]), "0.0072")


def test_manning_schuetze_table_5_17_has_one_total() -> None:
    # PMI, f1, f2 with O = 1 out of a 1,000-document subset whose N is not printed: there must be one that suits all.
    rows = "16.95 5 1|15.02 1 19|13.78 5 9|12.00 5 31|9.82 26 27|9.21 13 82|7.37 24 159|6.68 687 9|6.00 661 15"
    totals = np.arange(600_000, 660_000, 10)
    suits = np.ones(totals.size, dtype=np.bool)
    for row in rows.split("|"):
        printed, first, second = row.split()
        suits &= np.abs(pmi(1, int(first), int(second), totals) - float(printed)) <= 0.00501
    assert suits.any()
    assert totals[suits] == pytest.approx(633_000, rel=0.005)
