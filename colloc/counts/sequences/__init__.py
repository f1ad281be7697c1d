"""Sequences of words grown from frequent shorter ones, with or without open slots."""
