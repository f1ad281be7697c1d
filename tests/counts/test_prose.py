"""A million words of prose, every count compared with a plain count in Python.

With COLLOC_DATA (a folder that holds ``novels.jsonl.gz``: 99 English novels 1840-1920 of the ELTeC collection,
COST Action CA16204) the words are theirs; without it they are made here, Zipf-distributed.
"""

from __future__ import annotations

import gzip
import json
import os
import re
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest

from colloc.counts.tallying import obtain_tally
from colloc.settings import TallySpec
from colloc.store.connection import Store
from tests.counts import stores
from tests.counts.test_tallying import check

pytestmark = pytest.mark.usefixtures("loops")

MILLION = 1_000_000
SPECS = [
    *(
        TallySpec(right=right, inside=inside)
        for inside in ("sentence", "paragraph", "document")
        for right in (1, 2, 5, 10)
    ),
    TallySpec(kind="span", left=5, right=2),
    TallySpec(kind="positions", left=5, right=5),
    TallySpec(kind="positions", left=0, right=10, inside="document"),
    TallySpec(kind="unit", inside="sentence"),
    TallySpec(kind="unit", inside="paragraph"),
]


def novels(path: Path) -> stores.Text:
    """The first million words; words, sentence ends and line ends found as simply as can be."""
    forms: dict[str, int] = {}
    types: list[int] = []
    places: dict[str, list[int]] = {"sentence": [], "paragraph": [], "document": []}
    pattern = re.compile(r"\w+|[.!?](?=\s)|\n")
    with gzip.open(path, "rt", encoding="utf-8") as file:
        for line in file:
            places["document"].append(len(types))
            for found in pattern.findall(json.loads(line)["text"]):
                if found in ".!?":
                    places["sentence"].append(len(types))
                elif found == "\n":
                    places["paragraph"].append(len(types))
                else:
                    types.append(forms.setdefault(found, len(forms)))
            if len(types) >= MILLION:
                break
    paragraphs = np.unique(places["paragraph"] + places["document"])
    paragraphs = paragraphs[paragraphs < len(types)]
    sentences = np.union1d(np.array(places["sentence"]), paragraphs)
    documents = np.array(places["document"])
    return stores.Text(
        np.array(types, np.uint32),
        sentences[sentences < len(types)],
        paragraphs,
        documents,
        len(forms) + len(forms) % 2,
    )


@pytest.fixture(scope="module")
def text() -> stores.Text:
    folder = os.environ.get("COLLOC_DATA")
    if folder is not None:
        return novels(Path(folder) / "novels.jsonl.gz")
    return stores.random_text(seed=1, tokens=MILLION, types=30_000, n_documents=40, sentence=20.0)


@pytest.fixture(scope="module")
def store(text: stores.Text, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Store]:
    with stores.make_store(tmp_path_factory.mktemp("prose") / "s", text, [300_000, 900_001]) as store:
        yield store


@pytest.mark.long
@pytest.mark.parametrize("spec", SPECS, ids=TallySpec.to_json)
def test_every_count_of_a_million_words(store: Store, text: stores.Text, spec: TallySpec) -> None:
    check(obtain_tally(store, spec, keep=False), text)
