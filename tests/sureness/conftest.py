"""Small stores whose stream is known."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from tests.counts.placed import Placed, random_documents, write_store

N_TERMS = 24


def planted(documents: list[Placed]) -> list[Placed]:
    """Random documents in which 7 mostly follows 3, and 1 never follows 0."""
    random = np.random.default_rng(2)
    changed = []
    for document in documents:
        terms = document.terms.copy()
        for place in range(1, len(terms)):
            if terms[place - 1] == 3 and random.random() < 0.6:
                terms[place] = 7
            elif terms[place - 1] == 0 and terms[place] == 1:
                terms[place] = 2
        changed.append(Placed(terms, document.sentences, document.genre))
    return changed


MADE = planted(random_documents(seed=8, n=46, n_terms=N_TERMS, longest=160))


@pytest.fixture(scope="session")
def made() -> list[Placed]:
    return MADE


@pytest.fixture(scope="session")
def made_store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """46 documents of random words; blocks end inside documents."""
    path = tmp_path_factory.mktemp("sureness") / "made.colloc"
    write_store(path, MADE, N_TERMS, block=700)
    return path
