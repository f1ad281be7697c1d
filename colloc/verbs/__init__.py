"""The public verbs: what ``import colloc`` gives and what each command calls.

Every verb that asks takes the path of a store or a store opened with
:func:`open_store`; where a path is given it is opened for the call. Options about
pairs mean the same everywhere; ``None`` means as the store was built:

layer
    ``form``, ``fold`` and what annotated text adds.
window, or left and right
    Words of reach on both sides, or unequal reach.
unit
    Count the units (``inside``) that hold both words, not windows.
inside
    ``sentence``, ``paragraph`` or ``document``: what no window reaches beyond.
margins
    What one observation is: ``pairs``, ``positions`` or ``tokens``.
directed
    (x, y) only where y follows x.
spanned
    With margins ``tokens``: divide by the number of pairs (True) or of tokens.
where
    Slices such as ``genre=log`` or ``year=1990..1999``, joined by "and".
relation
    Syntactic pairs in this relation; an empty name takes all.
"""
