"""Transformers for scikit-learn: raw texts in, association features or vectors out.

This package is the only one that needs scikit-learn when it is imported (``pip install 'colloc[sklearn]'``):
its classes are scikit-learn's.
"""

from __future__ import annotations

from colloc.errors import MissingExtraError

try:
    import sklearn  # noqa: F401  # asked for before the classes below are made
except ImportError as error:
    raise MissingExtraError("scikit-learn is not installed: pip install 'colloc[sklearn]'") from error

from colloc.estimators.pairs import PairFeatures
from colloc.estimators.vectors import PPMIVectors

__all__ = ["PPMIVectors", "PairFeatures"]
