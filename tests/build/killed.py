"""One change of a store in a process of its own, made to be killed: ``python -m tests.build.killed WHAT FOLDER``."""

from __future__ import annotations

import sys
from pathlib import Path

from colloc.build import batches
from colloc.build.building import build
from colloc.build.changing import add, remove
from colloc.build.merging import merge
from colloc.counts.tallying import obtain_tally
from colloc.settings import TallySpec
from colloc.store.opening import open_for_writing

OTHER_TALLY = TallySpec(right=2, inside="document", layer="form")


def change(what: str, folder: Path) -> None:
    """Do ``what`` to the store in ``folder``; two processes, many small commits."""
    batches.BATCH_CHARACTERS = 6000
    store = folder / "store"
    if what == "build":
        build(store, [str(folder / "a.jsonl"), str(folder / "long.txt")], jobs=2)
    elif what == "add":
        add(store, [str(folder / "b.jsonl")], jobs=2)
    elif what == "remove":
        remove(store, where=["year=1902..1904"], jobs=1)
    elif what == "merge":
        merge(store, [folder / "other"], jobs=1)
    elif what == "tally":
        with open_for_writing(store, "tally") as opened:
            obtain_tally(opened, OTHER_TALLY, jobs=1)
    else:
        raise SystemExit(f"no such change: {what}")


if __name__ == "__main__":
    change(sys.argv[1], Path(sys.argv[2]))
