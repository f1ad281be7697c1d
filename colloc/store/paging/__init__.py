"""Runs of a tally and their directories; :mod:`colloc.store.tallies` is the front."""
