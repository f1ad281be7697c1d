"""Abbreviations after which a sentence goes on, although a full stop and a capital stand there.

UAX #29, section 5.1, leaves such lists to implementations. This one is small on
purpose: only abbreviations that hardly ever end a sentence, or that are told from
a sentence end by the number after them. Collected from common practice (style
manuals' lists of titles, references and months); no single source. Case counts.
An abbreviation at the end of a paragraph ends the sentence there all the same.
"""

from __future__ import annotations

from functools import cache

import numpy as np

from colloc.records import Int64Array, UInt64Array
from colloc.tokens.classes import Mask, Points, classes, code_points
from colloc.tokens.keytable import KeyTable

# Written without the last full stop.
ALWAYS = {
    "English": "Mr Mrs Ms Dr Prof Rev Hon Gen Col Capt Cpt Lt Sgt Cmdr Adm Gov Sen Rep Pres Supt St Mt Messrs Mmes "
    "Esq Bros vs viz cf e.g i.e Ph.D",
    "German": "Hr Fr Frl Hrn Dipl Ing Nr Abs Abb Bd Kap Tel Str bzw ca z d z.B d.h u.a z.T s.o s.u vgl Vgl sog Sog",
    "French": "M MM Mme Mmes Mlle Mlles Mgr Vve c.-à-d p.ex av",
    "Spanish": "Sr Sra Srta Sres Dra Dña D Ud Uds Vd Vds Excmo Ilmo Gral núm Núm pág págs p.ej Av Avda",
    "Italian": "Sig Sigg Dott Prof Ing Avv Egr Gent pag pagg p.es",
    "Portuguese": "Sr Sra Srs Dr Dra Prof Profa Exmo Exma pág págs p.ex",
    "Dutch": "dhr mevr drs ir mr prof bijv d.w.z o.a m.b.t t.o.v",
    "Russian": "г-н г-жа им ул пр проф акад т.е т.к ср см напр гр",
}
BEFORE_NUMBERS = {
    "English": "No Nos no nos p pp vol Vol vols ch Ch chap Chap sec Sec fig Fig figs Figs eq Eq art Art c ca v vv "
    "Jan Feb Mar Apr Jun Jul Aug Sept Sep Oct Nov Dec",
    "German": "S Seite Bd Aufl Anm Art geb gest",
    "French": "n nos p pp t chap fig art vol env",
    "Spanish": "n p pp t cap fig art vol",
    "Russian": "с стр т рис гл ст п",
}
INITIALS = "ABCDEFGHJKLMNOPQRSTUVWXYZ"
"""Single capitals stand for given names (J. R. Smith); "I" is a word of its own too often."""

_WORDS = 4
_LETTERS_A_WORD = 3
_LONGEST = _WORDS * _LETTERS_A_WORD
"""Abbreviations are shorter, so that no part of a longer word is taken for one."""
_ALWAYS, _BEFORE_NUMBERS = 2, 1


@cache
def _table() -> tuple[UInt64Array, KeyTable]:
    """Keys of the last three letters, sorted; and a table of whole abbreviations, spelled as keys."""
    kinds: dict[str, int] = dict.fromkeys(" ".join(BEFORE_NUMBERS.values()).split(), _BEFORE_NUMBERS)
    kinds |= dict.fromkeys([*" ".join(ALWAYS.values()).split(), *INITIALS], _ALWAYS)
    points = code_points(" " * _LONGEST + " ".join(kinds) + " ")
    stops = np.cumsum([len(word) + 1 for word in kinds]) + _LONGEST - 1
    keys = _spelled(points, stops, _WORDS)
    table = KeyTable(_WORDS)
    table.add(keys, np.array(list(kinds.values()), np.uint32))
    return np.unique(keys[0]), table


def _spelled(points: Points, stops: Int64Array, words: int) -> list[UInt64Array]:
    """The run of letters, digits, full stops and hyphens before each place: three characters a word, the last first."""
    tables = classes()
    keys = [np.zeros(len(stops), np.uint64) for _ in range(words)]
    going = np.ones(len(stops), np.bool_)
    for back in range(words * _LETTERS_A_WORD):
        found = points[np.maximum(stops - 1 - back, 0)].astype(np.uint64)
        going &= tables.spoken[tables.kind_of[found]] | (found == ord(".")) | (found == ord("-"))
        going &= stops > back
        if not going.any():
            break
        found[~going] = 0
        keys[back // _LETTERS_A_WORD] |= found << np.uint64(21 * (back % _LETTERS_A_WORD))
    return keys


def after_abbreviation(points: Points, stops: Int64Array, numeric: Mask) -> Mask:
    """Whether each full stop ends an abbreviation after which the sentence goes on.

    Parameters
    ----------
    points : array of code points, shape (n,)
    stops : int64 array, shape (m,)
        Positions of the full stops.
    numeric : bool array, shape (m,)
        Whether a digit comes next, after spaces and closing marks.
    """
    endings, table = _table()
    result = np.zeros(len(stops), np.bool_)
    # Most words are ruled out by their last letters.
    key = _spelled(points, stops, 1)[0]
    likely = np.flatnonzero(endings[np.minimum(np.searchsorted(endings, key), len(endings) - 1)] == key)
    if not len(likely):
        return result
    kinds = table.find(_spelled(points, stops[likely], _WORDS))
    result[likely] = (kinds == _ALWAYS) | ((kinds == _BEFORE_NUMBERS) & numeric[likely])
    return result
