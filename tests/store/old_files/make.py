"""Writes the small store that later versions must still read: ``cd tests; python -m store.old_files.make``.

Run once for each released schema, with that release; the files are never made again. Beside each store stands what it
must answer, computed here from the texts by the plain definitions, without the package's counting.
"""

from __future__ import annotations

import gzip
import json
import tempfile
from collections import Counter
from pathlib import Path

from colloc.store.database import schema
from store.making import DOCUMENTS, small_store, window_cells, words_of

HERE = Path(__file__).parent


def answers() -> dict[str, object]:
    """Words, pairs and texts, by the definitions."""
    sequences = [[word.casefold() for word in words_of(text)] for text, _ in DOCUMENTS.values()]
    words = list(dict.fromkeys(word for sequence in sequences for word in sequence))
    numbers = {word: number for number, word in enumerate(words)}
    cells = window_cells([[numbers[word] for word in sequence] for sequence in sequences], 2)
    return {
        "words": dict(Counter(word for sequence in sequences for word in sequence)),
        "pairs": sorted([words[x], words[y], count] for (x, y), count in cells.items()),
        "texts": {identifier: text for identifier, (text, _) in DOCUMENTS.items()},
        "metadata": {identifier: metadata for identifier, (_, metadata) in DOCUMENTS.items()},
    }


if __name__ == "__main__":
    name = f"schema_{schema.SCHEMA_VERSION}"
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "store"
        small_store(path).close()
        (HERE / f"{name}.gz").write_bytes(gzip.compress(path.read_bytes(), mtime=0))
    (HERE / f"{name}.json").write_text(json.dumps(answers(), ensure_ascii=False, indent=1) + "\n", encoding="utf-8")
