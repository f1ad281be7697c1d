"""Formulas of word association: arrays of counts in, float64 arrays out; no words, no files.

``catalogue.MEASURES`` lists the measures of a pair; the other modules hold what is asked beside a score:
intervals, q-values, dispersion, contrasts, strata, trends and measures of more than two words.
"""
