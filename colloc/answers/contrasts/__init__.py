"""Sub-corpora set against each other: words, pairs, near-synonyms, lists from elsewhere, many slices."""
