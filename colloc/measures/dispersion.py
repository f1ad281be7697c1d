"""How evenly a word is spread over the parts (documents) of a corpus.

Input is sparse: only parts that hold the word are named. ``part_sizes`` gives every part; parts without tokens are
no parts. With v the counts of a word in the n parts, f their sum, s the parts' shares of all tokens and r = v / size
the rates:

==================  ===================================  ==================================================
DP                  sum |v/f - s| / 2                    Gries 2008, Int. J. of Corpus Linguistics 13(4)
DPnorm              DP / (1 - min s)                     Lijffijt & Gries 2012, same journal 17(1)
DPnorm, original    DP / (1 - 1/n)                       Gries 2008
Juilland's D        1 - sd(r) / (mean(r) sqrt(n-1))      Juilland et al. 1970 (population sd)
Carroll's D2        H(r / sum r) / log n                 Carroll 1970
Rosengren's S       (sum sqrt(s v))^2 / f                Rosengren 1971
KL                  sum v/f log2((v/f) / s), bits        Gries 2020 (Kullback & Leibler 1951)
==================  ===================================  ==================================================

DP and KL are 0 for a word spread as the tokens are; D, D2 and S are 1. All are nan for a word that never occurs.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from colloc.errors import UsageError
from colloc.measures.contingency import FloatArray


@dataclass(frozen=True, slots=True)
class Dispersion:
    """Arrays of shape (n_words,); the module docstring has the formulas.

    ``parts`` counts the parts that hold the word (document frequency), ``largest_share`` is the share of the word's
    occurrences in the part that holds most of them. Where there is only one part, the measures that divide by n - 1,
    log n or 1 - min s are nan.
    """

    frequency: FloatArray
    parts: NDArray[np.int64]
    largest_share: FloatArray
    dp: FloatArray
    dp_norm: FloatArray
    dp_norm_original: FloatArray
    juilland_d: FloatArray
    carroll_d2: FloatArray
    rosengren_s: FloatArray
    kl: FloatArray


def dispersion(
    words: NDArray[np.integer], parts: NDArray[np.integer], counts: ArrayLike, part_sizes: ArrayLike, n_words: int
) -> Dispersion:
    """All dispersion measures of many words at once.

    Parameters
    ----------
    words, parts : int arrays, shape (m,)
        Which word (0..n_words-1) stands in which part (index into ``part_sizes``); each combination at most once.
    counts : array, shape (m,)
        How often; not negative.
    part_sizes : array, shape (n,)
        Tokens of each part. All ones gives D and D2 on raw counts and S for equal parts.

    Raises
    ------
    UsageError
        A word occurs in a part of size 0, or there is no part at all.
    """
    sizes = np.asarray(part_sizes, dtype=np.float64)
    real = sizes > 0
    n_parts = int(np.count_nonzero(real))
    if n_parts == 0:
        raise UsageError("dispersion needs at least one part with tokens")
    values = np.asarray(counts, dtype=np.float64)
    present = values > 0
    words, parts, values = words[present], parts[present], values[present]
    if not real[parts].all():
        raise UsageError("a word is counted in a part that has no tokens")

    def total(weights: FloatArray) -> FloatArray:
        return np.bincount(words, weights=weights, minlength=n_words).astype(np.float64)

    with np.errstate(divide="ignore", invalid="ignore"):
        frequency = total(values)
        smallest = float(sizes[real].min() / sizes.sum())
        share_of_part = (sizes / sizes.sum())[parts]
        share = values / frequency[words]
        largest = np.zeros(n_words)
        np.maximum.at(largest, words, share)
        # Parts without the word add their whole share to the sum of differences.
        missing = np.maximum(1.0 - total(share_of_part), 0.0)
        dp = 0.5 * (total(np.abs(share - share_of_part)) + missing)
        dp[frequency == 0] = largest[frequency == 0] = np.nan
        rate = values / sizes[parts]
        rate_sum = total(rate)
        mean = rate_sum / n_parts
        deviations = total((rate - mean[words]) ** 2) + (n_parts - total(np.ones_like(rate))) * mean * mean
        rate_share = rate / rate_sum[words]
        return Dispersion(
            frequency=frequency,
            parts=np.bincount(words, minlength=n_words).astype(np.int64),
            largest_share=largest,
            dp=dp,
            dp_norm=dp / np.float64(1.0 - smallest),
            dp_norm_original=dp / np.float64(1.0 - 1.0 / n_parts),
            juilland_d=1.0 - np.sqrt(deviations / n_parts) / mean / np.sqrt(n_parts - 1.0),
            carroll_d2=_or_nan(-total(rate_share * np.log(rate_share)), frequency) / np.log(n_parts),
            rosengren_s=total(np.sqrt(share_of_part * values)) ** 2 / frequency,
            kl=_or_nan(total(share * np.log2(share / share_of_part)), frequency),
        )


def _or_nan(values: FloatArray, frequency: FloatArray) -> FloatArray:
    return np.where(frequency > 0, values, np.nan)
