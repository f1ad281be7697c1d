"""Verb for engineers: what tells the labels of documents apart."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Literal

from colloc.settings import DEFAULT_MEMORY, Inside, Margins
from colloc.verbs.opening import ProgressCall, StorePath, pair_options, reading

if TYPE_CHECKING:
    from colloc.answers.columns import Columns
    from colloc.store.opening import Store


def features(
    store: StorePath | Store,
    label: str,
    *,
    pairs: bool = False,
    layer: str | None = None,
    window: int | None = None,
    left: int | None = None,
    right: int | None = None,
    unit: bool = False,
    inside: Inside | None = None,
    margins: Margins | None = None,
    directed: bool = False,
    where: Sequence[str] | str = (),
    relation: str | None = None,
    min_docs: int = 3,
    most_pairs: int = 20_000,
    sort: Literal["mutual_information", "chi2", "contribution"] = "mutual_information",
    each_label: bool = False,
    limit: int = 50,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: ProgressCall | None = None,
) -> Columns:
    """Words, or with ``pairs`` pairs, whose presence in a document tells most about its label.

    Parameters
    ----------
    label : str
        Metadata key.
    min_docs : int
        Features of fewer documents, and of all but fewer, are not tested.
    most_pairs : int
        So many pairs, those met most often, are looked at.
    each_label : bool
        Also the documents and the contribution of every label.
    """
    from colloc.answers.features import label_features

    options = pair_options(layer, window, left, right, unit, inside, margins, directed, True, where, relation)
    with reading(store) as opened:
        return label_features(
            opened,
            label,
            what="pairs" if pairs else "words",
            options=options,
            min_docs=min_docs,
            most_pairs=most_pairs,
            sort=sort,
            each_label=each_label,
            limit=limit,
            jobs=jobs,
            memory=memory,
            progress=progress,
        )
