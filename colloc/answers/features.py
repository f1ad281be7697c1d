"""Words and pairs that tell the labels of documents apart."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Literal, get_args

import numpy as np
from numpy.typing import NDArray

from colloc.answers.columns import Columns
from colloc.answers.contrasts.gathering import pair_counts_by_group
from colloc.answers.contrasts.grouped import Groups, groups_by_value
from colloc.answers.pairs import text_ranks
from colloc.answers.questions import PairOptions, Question, ask, built_spec
from colloc.answers.ranking import TopRows
from colloc.counts.selection import documents_selection
from colloc.counts.words import count_words
from colloc.errors import NotSeenError, UsageError
from colloc.measures.discoveries import log_q_values
from colloc.measures.labels import label_tables
from colloc.records import Int64Array
from colloc.settings import DEFAULT_MEMORY
from colloc.store import slices, vocabulary
from colloc.store.connection import Store

FeatureOrder = Literal["mutual_information", "chi2", "contribution"]
DEFAULT_MIN_DOCS = 3
DEFAULT_MOST_PAIRS = 20_000


def label_features(
    store: Store,
    label: str,
    *,
    what: Literal["words", "pairs"] = "words",
    options: PairOptions | None = None,
    min_docs: int = DEFAULT_MIN_DOCS,
    most_pairs: int = DEFAULT_MOST_PAIRS,
    sort: FeatureOrder = "mutual_information",
    each_label: bool = False,
    limit: int = 50,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> Columns:
    """Words, or pairs, whose presence in a document tells most about its label.

    Parameters
    ----------
    label : str
        Metadata key; documents without it are left out.
    what : {"words", "pairs"}
        A document has a pair where the pair is met in it at least once, as the tally counts.
    options : PairOptions
        Layer and slice for words; for pairs everything.
    min_docs : int
        Features of fewer documents, and of all but fewer, are not tested.
    most_pairs : int
        So many pairs, those met most often, are looked at.
    sort : {"mutual_information", "chi2", "contribution"}
    each_label : bool
        Also the documents and the contribution of every label.

    Returns
    -------
    Columns
        word (or first, second), documents, label (the one it speaks for most), documents_in (of that label),
        contribution (of that label, bits), mutual_information (bits), chi2, chi2_present, p, q. Ties stand by
        chi2, then by word. Its setting ``caution`` warns where there are more labels than half of the documents.

    Raises
    ------
    UsageError
        Where the key has fewer than two values.
    NotSeenError
        Where nothing is in enough documents.
    """
    if sort not in get_args(FeatureOrder):
        raise UsageError(f"features are sorted by one of {', '.join(get_args(FeatureOrder))}, not {sort!r}")
    chosen = options or PairOptions()
    groups = groups_by_value(store, label, chosen.where)
    settings: dict[str, Any]
    if what == "words":
        layer = chosen.layer or built_spec(store).layer
        terms, present = _words(store, layer, groups)
        settings = {"store": str(store.path), "layer": layer, "where": slices.canonical(chosen.where)}
        texts: dict[str, NDArray[Any]] = {"word": terms}
    else:
        question = ask(store, chosen, jobs=jobs, memory=memory, progress=progress)
        layer = question.layer
        first, second, present = _pairs(question, groups, most_pairs, min_docs)
        settings = question.settings(most_pairs=most_pairs)
        texts = {"first": first, "second": second}
    documents = present.sum(axis=1)
    tested = np.flatnonzero((documents >= min_docs) & (int(groups.sizes.sum()) - documents >= min_docs))
    if not len(tested):
        raise NotSeenError(f"{store.path}: none of the {what} is in {min_docs} documents and absent from as many")
    present = present[tested]
    tables = label_tables(present, groups.sizes)
    log_q = log_q_values(tables.log_p)
    best = tables.contributions.argmax(axis=1)
    places = np.arange(len(tested))
    contribution = tables.contributions[places, best]
    scores = {"mutual_information": tables.mutual_information, "chi2": tables.chi2, "contribution": contribution}
    names = {key: np.array(_texts(store, layer, column[tested]), dtype=object) for key, column in texts.items()}
    by_text = np.lexsort([_codes(column) for column in reversed(names.values())])
    rank = np.empty(len(tested), np.int64)
    rank[by_text] = places
    rows = np.lexsort((rank, -tables.chi2, -scores[sort]))[: limit or None]
    columns: dict[str, Any] = {
        **{key: column[rows] for key, column in names.items()},
        "documents": documents[tested][rows],
        "label": [groups.names[place] for place in best[rows]],
        "documents_in": present[places, best][rows],
        "contribution": contribution[rows],
        "mutual_information": tables.mutual_information[rows],
        "chi2": tables.chi2[rows],
        "chi2_present": tables.chi2_present[rows],
        "p": np.exp(tables.log_p[rows]),
        "q": np.exp(log_q[rows]),
    }
    if each_label:
        for place, name in enumerate(groups.names):
            columns[f"documents:{name}"] = present[rows, place]
            columns[f"contribution:{name}"] = tables.contributions[rows, place]
    return Columns(
        columns,
        {**settings, "label": label, "what": what, "min_docs": min_docs, "sort": sort, "limit": limit,
         "labels": len(groups), "documents": int(groups.sizes.sum()), "tested": len(tested), **_caution(groups)},
    )  # fmt: skip


def _caution(groups: Groups) -> dict[str, str]:
    """What the settings say where labels are nearly names of documents."""
    n_documents = int(groups.sizes.sum())
    if 2 * len(groups) <= n_documents:
        return {}
    told = f"{len(groups)} labels for {n_documents} documents: mutual information says little of labels so small"
    return {"caution": told}


def _words(store: Store, layer: str, groups: Groups) -> tuple[Int64Array, Int64Array]:
    """All terms, and the documents of each group that hold them, shape (n, k)."""
    present = np.stack(
        [
            count_words(store, layer, documents_selection(store, groups.numbers[groups.group == place])).documents
            for place in range(len(groups))
        ],
        axis=1,
    )
    return np.arange(len(present)), present


def _pairs(question: Question, groups: Groups, most: int, min_docs: int) -> tuple[Int64Array, Int64Array, Int64Array]:
    """The pairs met most often, and the documents of each group that have them."""
    top = TopRows(most, lambda: text_ranks(question))
    for table in question.reader.blocks():
        frequent = table.take(table.joint >= max(min_docs, 1))
        if len(frequent):
            top.add(frequent, frequent.joint.astype(np.float64))
    table, *_ = top.best(lambda terms: vocabulary.term_texts(question.store, question.layer, terms))
    counts = pair_counts_by_group(question, table.first, table.second, groups)
    cells = counts.items * len(groups) + counts.side[counts.documents]
    present = np.bincount(cells, minlength=len(table) * len(groups)).reshape(len(table), len(groups))
    return table.first.astype(np.int64), table.second.astype(np.int64), present


def _texts(store: Store, layer: str, terms: Int64Array) -> list[str]:
    return vocabulary.term_texts(store, layer, terms)


def _codes(texts: NDArray[Any]) -> Int64Array:
    """Numbers in the order of the texts: arrays of objects cannot be sorted by several keys."""
    distinct: Sequence[str] = sorted(set(texts.tolist()))
    places = {text: place for place, text in enumerate(distinct)}
    return np.array([places[text] for text in texts.tolist()], dtype=np.int64)
