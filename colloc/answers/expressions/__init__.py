"""Expressions: sequences of words that hold together, complete and not too long."""
