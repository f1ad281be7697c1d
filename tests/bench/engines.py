"""Pair counts by general-purpose engines, each run in a process of its own: what ``colloc build`` is set beside.

``python -m tests.bench.engines ENGINE TEXT --window W --threads T`` prints what was counted as JSON.

The task is the same for all: a text file with one sentence a line in, the number of times that one word follows another
at distance 1..W within the line out. Words are runs of letters and digits with inner apostrophes and hyphens, in lower
case, found by each engine's own regular expressions. No engine finds sentences, writes a store or keeps the text. Each
formulation is the fastest of several that were tried; the others are named beside it.
"""

from __future__ import annotations

import argparse
import json
import os
import subprocess
import tempfile
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path

WORD = r"[\p{L}\p{N}]+(?:['’-][\p{L}\p{N}]+)*"
PYTHON_WORD = r"[^\W_]+(?:['’-][^\W_]+)*"
"""The same for Python's ``re``, which knows no ``\\p``."""

PairCounts = Iterator[tuple[str, str, int]]


@dataclass(frozen=True)
class Counted:
    """``rows`` gives the table itself, for comparing small ones."""

    pairs: int
    occurrences: int
    rows: Callable[[], PairCounts]


def duckdb(text: Path, window: int, threads: int) -> Counted:
    """Words as an enumeration, lists shifted and unnested.

    Slower here: the same with strings (1.1 to 2 times), with numbers joined to the words, with both words in one key.
    A join of the token table with itself is slower still and explodes on long lines.
    """
    import duckdb as library

    base = library.connect()
    base.execute(f"SET threads = {threads}")
    base.execute("SET preserve_insertion_order = false")
    base.execute(
        "CREATE TEMP TABLE lines AS SELECT regexp_extract_all(lower(line), $word) AS words FROM read_csv($text, "
        "columns = {'line': 'VARCHAR'}, delim = '\x01', header = false, quote = '', escape = '', auto_detect = false)",
        {"word": WORD, "text": str(text)},
    )
    base.execute("CREATE TYPE word AS ENUM (SELECT DISTINCT unnest(words) FROM lines)")
    base.execute("CREATE TEMP TABLE numbered AS SELECT words::word[] AS words FROM lines")
    shifted = " UNION ALL ".join(
        f"SELECT unnest(words[:len(words) - {d}]) AS first, unnest(words[{d + 1}:]) AS second "
        f"FROM numbered WHERE len(words) > {d}"
        for d in range(1, window + 1)
    )
    base.execute(f"CREATE TEMP TABLE pairs AS SELECT first, second, count(*) AS joint FROM ({shifted}) GROUP BY ALL")
    pairs, occurrences = base.execute("SELECT count(*), sum(joint) FROM pairs").fetchall()[0]
    return Counted(pairs, int(occurrences or 0), lambda: iter(base.execute("FROM pairs").fetchall()))


def polars(text: Path, window: int, threads: int) -> Counted:
    """Both words' numbers in one key, shifted columns stacked and grouped lazily.

    Slower here: the same eagerly, with the streaming engine, and by sorting and run lengths.
    """
    os.environ["POLARS_MAX_THREADS"] = str(threads)
    import polars as library

    col = library.col
    lines = library.read_csv(
        text, has_header=False, separator="\x01", quote_char=None, schema={"line": library.String}, glob=False
    )
    words = (
        lines.with_row_index("line_number")
        .select("line_number", col("line").str.to_lowercase().str.extract_all(WORD).alias("word"))
        .explode("word")
        .drop_nulls("word")
    )
    vocabulary = words["word"].unique(maintain_order=True)
    numbered = words.select(
        "line_number", col("word").cast(library.Enum(vocabulary)).to_physical().cast(library.UInt64)
    ).lazy()
    shifted = [
        numbered.select(
            ((col("word") * 2**32) + col("word").shift(-d)).alias("key"),
            (col("line_number") == col("line_number").shift(-d)).alias("inside"),
        )
        .filter("inside")
        .select("key")
        for d in range(1, window + 1)
    ]
    table = library.concat(shifted).group_by("key").len("joint").collect()
    table = table.select(
        vocabulary.gather(table["key"] // 2**32).alias("first"),
        vocabulary.gather(table["key"] % 2**32).alias("second"),
        "joint",
    )
    return Counted(table.height, int(table["joint"].sum()), table.iter_rows)


def sklearn(text: Path, window: int, threads: int) -> Counted:
    """``CountVectorizer`` with two-word grams: adjacent pairs only, one thread whatever is asked for."""
    from sklearn.feature_extraction.text import CountVectorizer

    if window != 1:
        raise ValueError("CountVectorizer counts adjacent pairs only: window 1")
    del threads
    vectorizer = CountVectorizer(ngram_range=(2, 2), token_pattern=PYTHON_WORD)
    with text.open(encoding="utf-8") as lines:
        counts = vectorizer.fit_transform(lines).sum(axis=0).A1
    names = vectorizer.get_feature_names_out()

    def rows() -> PairCounts:
        for name, count in zip(names, counts, strict=True):
            first, second = name.split(" ")
            yield first, second, int(count)

    return Counted(len(names), int(counts.sum()), rows)


def coreutils(text: Path, window: int, threads: int) -> Counted:
    """``tr``, ``grep`` and ``awk`` write the pairs, ``sort | uniq -c`` counts them;ASCII case only."""
    result = Path(tempfile.mkdtemp(prefix="pairs-", dir=text.parent)) / "counts"
    pairs = (
        'BEGIN { FS = ":" } $1 != line { line = $1; held = 0 } '
        "{ for (d = 1; d <= window && d <= held; d++) print last[(held - d) % window], $2; last[held++ % window] = $2 }"
    )
    command = (
        'tr A-Z a-z < "$TEXT" | LC_ALL=C.UTF-8 grep -onP "$WORD" | awk -v window=$WINDOW "$PAIRS"'
        ' | LC_ALL=C sort --parallel=$THREADS -S 1G -T "$FOLDER" | LC_ALL=C uniq -c > "$RESULT"'
    )
    settings = {
        "TEXT": str(text),
        "WORD": WORD,
        "WINDOW": str(window),
        "PAIRS": pairs,
        "THREADS": str(threads),
        "FOLDER": str(result.parent),
        "RESULT": str(result),
    }
    subprocess.run(["bash", "-o", "pipefail", "-c", command], check=True, env={**os.environ, **settings})

    def rows() -> PairCounts:
        with result.open(encoding="utf-8") as lines:
            for line in lines:
                count, first, second = line.split()
                yield first, second, int(count)

    summary = subprocess.run(
        ["awk", "{ n += $1 } END { print NR, n + 0 }", str(result)], check=True, capture_output=True, text=True
    ).stdout.split()
    return Counted(int(summary[0]), int(summary[1]), rows)


ENGINES: dict[str, Callable[[Path, int, int], Counted]] = {
    "polars": polars,
    "duckdb": duckdb,
    "sklearn": sklearn,
    "coreutils": coreutils,
}


def main() -> None:
    parser = argparse.ArgumentParser(prog="python -m tests.bench.engines", description=__doc__)
    parser.add_argument("engine", choices=ENGINES)
    parser.add_argument("text", type=Path)
    parser.add_argument("--window", type=int, default=5)
    parser.add_argument("--threads", type=int, default=2)
    chosen = parser.parse_args()
    counted = ENGINES[chosen.engine](chosen.text, chosen.window, chosen.threads)
    print(json.dumps({"pairs": counted.pairs, "occurrences": counted.occurrences}))


if __name__ == "__main__":
    main()
