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
from numpy.typing import NDArray

from colloc.records import Int64Array
from colloc.tokens.classes import Points, classes

Mask = NDArray[np.bool_]

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
    "Russian": "с стр т рис гл ст № п",
}
INITIALS = "ABCDEFGHJKLMNOPQRSTUVWXYZ"
"""Single capitals stand for given names (J. R. Smith); "I" is a word of its own too often."""

_LONGEST = 12


@cache
def _lists() -> tuple[frozenset[str], frozenset[str], NDArray[np.uint64]]:
    always = frozenset(" ".join(ALWAYS.values()).split()) | frozenset(INITIALS)
    numbered = frozenset(" ".join(BEFORE_NUMBERS.values()).split())
    keys = {_ending_key(word) for word in always | numbered}
    return always, numbered, np.array(sorted(keys), np.uint64)


def _ending_key(word: str) -> int:
    """The last three characters as one number."""
    key = 0
    for character in word[-3:]:
        key = key << 21 | ord(character)
    return key


def _word_masks(points: Points, places: Int64Array) -> tuple[Mask, NDArray[np.uint64]]:
    """Whether a letter, digit, full stop or hyphen stands at each place, and the code point there (else 0)."""
    inside = places >= 0
    found = points[np.maximum(places, 0)].astype(np.uint64)
    kinds = classes().kind_of[found]
    inside &= classes().spoken[kinds] | (found == ord(".")) | (found == ord("-"))
    found[~inside] = 0
    return inside, found


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
    always, numbered, keys = _lists()
    key = np.zeros(len(stops), np.uint64)
    going = np.ones(len(stops), np.bool_)
    for back in range(3):
        inside, found = _word_masks(points, stops - 1 - back)
        going &= inside
        key |= np.where(going, found << np.uint64(21 * back), np.uint64(0))
    result = np.zeros(len(stops), np.bool_)
    # Most words are ruled out by their last letters; the few left are looked up whole.
    nearest = keys[np.minimum(np.searchsorted(keys, key), len(keys) - 1)]
    for index in np.flatnonzero(nearest == key):
        stop = int(stops[index])
        first = max(stop - _LONGEST - 1, 0)
        inside, found = _word_masks(points, np.arange(first, stop))
        outside = np.flatnonzero(~inside)
        word = "".join(map(chr, found[outside[-1] + 1 if len(outside) else 0 :]))
        result[index] = word in always or (bool(numeric[index]) and word in numbered)
    return result
