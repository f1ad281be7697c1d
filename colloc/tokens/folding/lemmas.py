"""Lemmas by dictionary, for words that carry none: a function of the form alone.

The dictionaries are those of the library simplemma (extra ``lemma``): one
lemma for each form, so an ambiguous form gets what the dictionary holds most
likely, wherever it stands (``left`` stays ``left``, ``saw`` becomes ``see``).
A form that is not in the dictionary is its own lemma, in the case that the
library gives it. Rules that guess beyond the dictionary are not used.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import cache

from colloc.errors import MissingExtraError, UsageError


@cache
def lemmatizer(language: str) -> Callable[[str], str]:
    """The function from form to lemma of a language (ISO 639 code, as ``en``).

    Raises
    ------
    MissingExtraError
        Without simplemma.
    UsageError
        For a language without a dictionary.
    """
    try:
        from simplemma import lemmatize
    except ImportError as error:
        raise MissingExtraError("lemmas by dictionary need simplemma: pip install 'colloc[lemma]'") from error
    try:
        lemmatize("a", lang=language)
    except ValueError as error:
        raise UsageError(f"no dictionary of lemmas for the language {language!r}: {error}") from error
    return lambda form: lemmatize(form, lang=language)
