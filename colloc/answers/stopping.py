"""Stop words: which terms are left out of what is shown, by language, from a file, or by frequency.

They act on what is shown, like thresholds, never on the counts. Lists by
language come from the library stopwordsiso (extra ``stop``), which gathers
published lists of 58 languages; they are generous (1,298 words of English), and
a list of one's own or the most frequent words of the store may serve better.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from colloc.answers.questions import Question
from colloc.answers.tables import PairTable
from colloc.errors import DataError, MissingExtraError, NoInputError, UsageError
from colloc.store import vocabulary
from colloc.store.lexicon.forms import store_forms

_TOP = "top:"
_NUMBERS = "numbers"
_WRITTEN = ("form", "fold", "lemma", "lemma_fold")
"""Layers, or parts of them, that hold words."""


class StopWords:
    """Terms that are not to be shown.

    Parameters
    ----------
    stop : sequence of str
        Each a language (``en``), a file of words (one a line), ``top:N`` for the N most frequent words of the
        documents asked about, or ``numbers`` for all without a letter. Words of lists stand for all that fold alike.

    Raises
    ------
    UsageError
        For what is neither of them, or a layer without words.
    NoInputError, DataError
        For a file that is missing or no UTF-8.
    MissingExtraError
        For a language without stopwordsiso.
    """

    def __init__(self, question: Question, stop: Sequence[str]) -> None:
        self._stopped = np.zeros(vocabulary.term_count(question.store, question.layer), np.bool_)
        listed: set[str] = set()
        for one in stop:
            if one.startswith(_TOP):
                self._stop_most_frequent(question, one)
            elif one == _NUMBERS:
                self._stop_words(question, lambda word: not any(map(str.isalpha, word)))
            else:
                listed.update(_listed(one))
        if listed:
            fold = store_forms(question.store).fold
            unwanted = {*map(fold, listed)}
            self._stop_words(question, lambda word: fold(word) in unwanted)

    def _stop_most_frequent(self, question: Question, given: str) -> None:
        number = given.removeprefix(_TOP)
        if not number.isascii() or not number.isdigit() or int(number) < 1:
            raise UsageError(f"{given!r}: write top:N, such as top:100")
        tokens = question.words.tokens
        wanted = min(int(number), int(np.count_nonzero(tokens)))
        if not wanted:
            return
        last = np.partition(tokens, len(tokens) - wanted)[len(tokens) - wanted]
        self._stopped |= tokens > last
        # Words that are equally frequent stand by their text, as in the list of words.
        tied = np.flatnonzero(tokens == last)
        texts = vocabulary.term_texts(question.store, question.layer, tied)
        order = sorted(range(len(tied)), key=texts.__getitem__)
        self._stopped[tied[order[: wanted - int(np.count_nonzero(tokens > last))]]] = True

    def _stop_words(self, question: Question, unwanted: Callable[[str], bool]) -> None:
        names = question.layer.split("/")
        place = next((place for place, name in enumerate(names) if name in _WRITTEN), None)
        if place is None:
            raise UsageError(f"the layer {question.layer!r} holds no words to stop; leave stop out")
        for term, text in enumerate(vocabulary.term_texts(question.store, question.layer)):
            # A word may hold a slash itself: the last parts belong to the last names.
            word = text.rsplit("/", len(names) - 1)[place] if len(names) > 1 else text
            if unwanted(word):
                self._stopped[term] = True

    def shown(self, table: PairTable, *, first: bool = True) -> NDArray[np.bool_]:
        """Mask of the rows to show: those whose words (with ``first=False``: whose second word) are no stop words."""
        keep = ~self._stopped[table.second]
        return keep & ~self._stopped[table.first] if first else keep


def _listed(given: str) -> Iterable[str]:
    """The words of a language or a file."""
    path = Path(given)
    if path.is_file():
        try:
            lines = path.read_text(encoding="utf-8-sig").splitlines()
        except UnicodeDecodeError as error:
            raise DataError(f"{given}: not UTF-8; save the list of words as UTF-8") from error
        except OSError as error:
            raise NoInputError(f"{given}: cannot be read: {error.strerror}") from error
        return [line.strip() for line in lines if line.strip()]
    if len(given) > 3:
        raise NoInputError(f"{given}: no such file; give a language such as en, a file of words, top:N, or numbers")
    try:
        import stopwordsiso
    except ImportError as error:
        raise MissingExtraError("stop words by language need stopwordsiso: pip install 'colloc[stop]'") from error
    if not stopwordsiso.has_lang(given):
        languages = " ".join(sorted(stopwordsiso.langs()))
        raise UsageError(f"no stop words for the language {given!r}: there are {languages}; or give a file, or top:N")
    words: Iterable[str] = stopwordsiso.stopwords(given)
    return words
