"""Annotated text: lines of columns into arrays; :mod:`colloc.tokens.annotated.reading` is the front."""
