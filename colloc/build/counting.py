"""The counting half of build, add and merge: what was read becomes visible with its counts, at once."""

from __future__ import annotations

from collections.abc import Callable

from colloc.build.reading import Progress, Resources
from colloc.counts.tallying import count_change
from colloc.records import Int64Array
from colloc.settings import TallySpec
from colloc.store import documents, facts, tallies, visibility
from colloc.store.connection import Store
from colloc.store.inputs.sources import forget_emptied
from colloc.store.vocabulary import ensure_annotated_layers


def count_new_documents(store: Store, limits: Resources, progress: Progress | None) -> None:
    """Count the documents that no tally holds yet, and show them to readers.

    Every table that was asked for (the default one and those of ``colloc
    tally``) is brought up to date in one transaction with the word frequencies
    and the mark of how far documents are counted; cached tables are dropped.
    """
    ensure_annotated_layers(store)
    _count(store, visibility.uncounted(store), 1, limits, progress, lambda: visibility.show_all(store))


def count_removed_documents(store: Store, numbers: Int64Array, limits: Resources, progress: Progress | None) -> None:
    """Count documents out of every table and take them out of the store, in one transaction."""

    def finish() -> None:
        documents.remove_documents(store, numbers.tolist())
        forget_emptied(store)
        facts.next_generation(store)

    _count(store, numbers, -1, limits, progress, finish)


def _count(
    store: Store,
    numbers: Int64Array,
    sign: int,
    limits: Resources,
    progress: Progress | None,
    finish: Callable[[], None],
) -> None:
    kept = {entry.spec for entry in tallies.tally_list(store) if entry.kept}
    kept.add(TallySpec.from_json(facts.get(store, "default_tally")))
    count_change(
        store,
        sorted(kept, key=TallySpec.to_json),
        numbers,
        sign=sign,
        jobs=limits.jobs,
        memory=limits.memory,
        temp=limits.temp,
        progress=progress,
        finish=finish,
    )
