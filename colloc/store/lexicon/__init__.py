"""Layers, their terms and how frequent they are; :mod:`colloc.store.vocabulary` is the front."""
