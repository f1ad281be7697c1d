"""``python -m tests.bench.features``: what engineers ask for, beside a general-purpose way of doing the same.

Matrix, scores of given pairs, vectors, weighted windows and joined text, each in a process of its own; what is timed
is the computing, after libraries are loaded and before anything is written. Text as in ``python -m tests.bench``, or
``--store`` with a store that is there. Needs the extra ``bench``.
"""

from __future__ import annotations

import argparse
import json
import os
import resource
import subprocess
import sys
import tempfile
from collections.abc import Callable
from functools import partial
from pathlib import Path
from time import perf_counter, process_time
from typing import Any

import numpy as np

from .running import Run, run
from .subject import COLLOC, build
from .texts import real_sources, write_real, write_stream

WIDE = 10
"""The window whose table is exported: some 12 million pairs on the novels."""
WORDS = 30_000
DIMENSIONS = 300
PAIRS = 1_000_000
EXPRESSIONS = 50_000
HERE = Path(__file__).resolve().parents[2]

Answer = dict[str, Any]


def timed(work: Callable[[], Any]) -> tuple[Any, Answer]:
    """The result, with wall and processor seconds."""
    wall, cpu = perf_counter(), process_time()
    result = work()
    return result, {"seconds": perf_counter() - wall, "cpu": process_time() - cpu}


# Matrix


def matrix_colloc(store: Path, folder: Path) -> Answer:
    import colloc
    from colloc.answers.questions import PairOptions, ask
    from colloc.answers.spaces.matrix import MatrixOptions, matrix

    with colloc.open_store(store) as opened:
        options = PairOptions(window=WIDE)
        pairs = ask(opened, options).reader.tally.n_pairs
        made, times = timed(lambda: matrix(opened, options=options, chosen=MatrixOptions(smoothing=0.75)))
    return {**times, "cells": made.values.nnz, "pairs": pairs, "sum": float(made.values.data.sum())}


def matrix_scipy(store: Path, folder: Path) -> Answer:
    """The pairs as arrays in a file; scipy makes the symmetric CSR matrix, numpy the values."""
    from scipy.sparse import coo_array

    def work() -> Any:
        with np.load(folder / "pairs.npz") as file:
            low, high, joint = file["low"], file["high"], file["joint"]
        off = low != high
        rows, columns = np.concatenate([low, high[off]]), np.concatenate([high, low[off]])
        # Both orders of a word with itself.
        counts = np.concatenate([np.where(off, joint, 2 * joint), joint[off]]).astype(np.float64)
        size = int(high.max()) + 1
        table = coo_array((counts, (rows, columns)), shape=(size, size)).tocsr()
        totals = np.asarray(table.sum(axis=1)).ravel()
        powers = np.where(totals > 0, totals**0.75, 0)
        smoothed = powers * (totals.sum() / powers.sum())
        table = table.tocoo()
        table.data = np.maximum(np.log2(table.data * totals.sum() / (totals[table.row] * smoothed[table.col])), 0)
        table = table.tocsr()
        table.eliminate_zeros()
        return table

    made, times = timed(work)
    return {**times, "cells": made.nnz, "sum": float(made.data.sum())}


# Scores of given pairs


def drawn_pairs(folder: Path) -> tuple[np.ndarray, np.ndarray]:
    words = np.array(json.loads((folder / "words.json").read_text()), dtype=object)
    random = np.random.default_rng(1)
    places = (len(words) ** random.random((2, PAIRS))).astype(int) % len(words)
    return words[places[0]], words[places[1]]


def score_colloc(store: Path, folder: Path, show: list[str] | None = None) -> Answer:
    import colloc

    first, second = drawn_pairs(folder)
    with colloc.open_store(store) as opened:
        made, times = timed(lambda: colloc.score(opened, {"first": first, "second": second}, window=WIDE, show=show))
    return {**times, "pairs": len(made), "measures": len(made.names) - 8, "sum": float(made["joint"].sum())}


def score_three(store: Path, folder: Path) -> Answer:
    return score_colloc(store, folder, ["pmi", "npmi", "g2"])


def score_polars(store: Path, folder: Path) -> Answer:
    """Words and pairs as tables in files; two joins for the numbers of the words, one for the counts; PMI and NPMI."""
    import polars as pl

    first, second = drawn_pairs(folder)
    given = pl.DataFrame({"first": pl.Series(first.tolist()), "second": pl.Series(second.tolist())})
    made, times = timed(lambda: polars_scores(folder, given))
    return {**times, "pairs": len(made), "measures": 2, "sum": float(made["joint"].sum())}


def polars_scores(folder: Path, given: Any) -> Any:
    import polars as pl

    words = pl.read_parquet(folder / "words.parquet")
    pairs = pl.read_parquet(folder / "pairs.parquet")
    total = int(words["margin"].sum())
    found = (
        given.lazy()
        .join(words.lazy().rename({"word": "first", "term": "a", "margin": "r"}), on="first", how="left")
        .join(words.lazy().rename({"word": "second", "term": "b", "margin": "c"}), on="second", how="left")
        .with_columns(low=pl.min_horizontal("a", "b"), high=pl.max_horizontal("a", "b"))
        .join(pairs.lazy(), on=["low", "high"], how="left", maintain_order="left")
        .with_columns(joint=pl.col("joint").fill_null(0))
        .with_columns(pmi=(pl.col("joint") * total / (pl.col("r") * pl.col("c"))).log(2))
        .with_columns(npmi=pl.col("pmi") / -(pl.col("joint") / total).log(2))
    )
    return found.collect()


# The same from one file to another


def of_children(command: list[str]) -> Answer:
    """Wall and processor seconds of a command from start to exit."""
    wall, before = perf_counter(), resource.getrusage(resource.RUSAGE_CHILDREN)
    subprocess.run(command, check=True, stdin=subprocess.DEVNULL)
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    cpu = after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime
    return {"seconds": perf_counter() - wall, "cpu": cpu}


def score_command(store: Path, folder: Path, *show: str) -> Answer:
    given, scored = folder / "given.csv", folder / "scored.csv"
    return {
        **of_children([COLLOC, "score", str(store), str(given), "-w", str(WIDE), *show, "-o", str(scored), "--quiet"]),
        "bytes": scored.stat().st_size,
    }


def score_polars_files(store: Path, folder: Path) -> Answer:
    import polars as pl

    def work() -> int:
        polars_scores(folder, pl.read_csv(folder / "given.csv")).write_csv(folder / "scored.csv")
        return (folder / "scored.csv").stat().st_size

    size, times = timed(work)
    return {**times, "bytes": size}


# Vectors


def ppmi(folder: Path) -> Any:
    from scipy.sparse import load_npz

    return load_npz(folder / "ppmi.npz")


def kept(matrix: Any, right: np.ndarray) -> float:
    """Share of the matrix' squared sum that the space of the right vectors keeps: how good they are."""
    basis, _ = np.linalg.qr(right.T.astype(np.float64))
    return float(((matrix @ basis) ** 2).sum() / (matrix.data**2).sum())


def vectors_colloc(store: Path, folder: Path) -> Answer:
    from colloc.answers.spaces.reducing import leading_vectors

    matrix = ppmi(folder)
    made, times = timed(lambda: leading_vectors(matrix, DIMENSIONS))
    return {**times, "quality": kept(matrix, made[2])}


def vectors_sklearn(store: Path, folder: Path, **options: Any) -> Answer:
    from sklearn.utils.extmath import randomized_svd

    matrix = ppmi(folder)
    made, times = timed(lambda: randomized_svd(matrix, DIMENSIONS, random_state=0, **options))
    return {**times, "quality": kept(matrix, made[2])}


def vectors_sklearn_single(store: Path, folder: Path) -> Answer:
    """In single precision and with as many iterations as it takes to keep as much."""
    from sklearn.utils.extmath import randomized_svd

    matrix = ppmi(folder)
    single = matrix.astype(np.float32)
    made, times = timed(lambda: randomized_svd(single, DIMENSIONS, n_iter=10, n_oversamples=30, random_state=0))
    return {**times, "quality": kept(matrix, made[2])}


def vectors_scipy(store: Path, folder: Path, **options: Any) -> Answer:
    from scipy.sparse.linalg import svds

    matrix = ppmi(folder)
    made, times = timed(lambda: svds(matrix, k=DIMENSIONS, rng=np.random.default_rng(0), **options))
    return {**times, "quality": kept(matrix, made[2])}


# Weighted windows


def weighted_colloc(store: Path, folder: Path) -> Answer:
    """Five tables counted anew, from a copy of the stream without any, then added up."""
    import colloc
    from colloc.answers.questions import PairOptions
    from colloc.answers.spaces.matrix import MatrixOptions, matrix

    chosen = MatrixOptions(value="count", weighting="harmonic")
    with colloc.open_store(store) as opened:
        made, times = timed(
            lambda: matrix(opened, options=PairOptions(window=5, inside="paragraph"), chosen=chosen, jobs=1)
        )
    return {**times, "cells": made.values.nnz, "sum": float(made.values.data.sum())}


def weighted_pass(store: Path, folder: Path) -> Answer:
    """One pass over the stream with weights: pairs of all distances sorted together, weights added up."""
    import colloc
    from colloc.counts.selection import slice_selection
    from colloc.counts.spans import read_stretches
    from colloc.store.vocabulary import layer_map

    def work() -> Any:
        keys, weights = [], []
        with colloc.open_store(store) as opened:
            stretches = read_stretches(opened, layer_map(opened, "fold"), slice_selection(opened, ""), "paragraph")
            for stretch in stretches:
                marks = np.zeros(len(stretch.terms), np.int32)
                marks[stretch.units - stretch.first] = 1
                units, terms = np.cumsum(marks), stretch.terms.astype(np.uint64)
                found = []
                for distance in range(1, 6):
                    same = units[distance:] == units[:-distance]
                    one, other = terms[:-distance][same], terms[distance:][same]
                    low, high = np.minimum(one, other), np.maximum(one, other)
                    found.append(low << np.uint64(35) | high << np.uint64(3) | np.uint64(distance))
                together = np.sort(np.concatenate(found))
                pairs = together >> np.uint64(3)
                starts = np.flatnonzero(np.concatenate([[True], pairs[1:] != pairs[:-1]]))
                keys.append(pairs[starts])
                weights.append(np.add.reduceat(1.0 / (together & np.uint64(7)).astype(np.float64), starts))
        together, values = np.concatenate(keys), np.concatenate(weights)
        order = np.argsort(together, kind="stable")
        together, values = together[order], values[order]
        starts = np.flatnonzero(np.concatenate([[True], together[1:] != together[:-1]]))
        return together[starts], np.add.reduceat(values, starts)

    made, times = timed(work)
    return {**times, "cells": 2 * len(made[0]), "sum": 2 * float(made[1].sum())}


# Joined text


def expressions(folder: Path) -> list[str]:
    return list(json.loads((folder / "expressions.json").read_text()))


def join_colloc(store: Path, folder: Path) -> Answer:
    import colloc

    text = (folder / "sample.txt").read_text(encoding="utf-8")
    ready = colloc.make_joiner(store, expressions(folder))
    count, times = timed(lambda: sum(len(part.numbers) for part in ready.join_stream([text])))
    return {**times, "bytes": len(text.encode()), "joined": count}


def join_python(store: Path, folder: Path) -> Answer:
    """Word by word: a regular expression finds them, a dictionary says which go on; the longest from the left."""
    import re

    text = (folder / "sample.txt").read_text(encoding="utf-8")
    known = {tuple(one.split("\t")[0].split()) for one in expressions(folder)}
    firsts = {words[0] for words in known}
    longest = max(map(len, known))

    def work() -> int:
        count = 0
        for line in text.split("\n"):
            words = [found.casefold() for found in re.findall(r"\w+(?:['’-]\w+)*", line)]
            place = 0
            while place < len(words):
                size = 0
                if words[place] in firsts:
                    size = next((n for n in range(longest, 1, -1) if tuple(words[place : place + n]) in known), 0)
                count += size > 0
                place += max(size, 1)
        return count

    count, times = timed(work)
    return {**times, "bytes": len(text.encode()), "joined": count}


TASKS: dict[str, dict[str, Callable[[Path, Path], Answer]]] = {
    "PPMI matrix": {"colloc": matrix_colloc, "scipy and numpy": matrix_scipy},
    "a million pairs": {
        "colloc, all measures": score_colloc,
        "colloc, 3 measures": score_three,
        "polars": score_polars,
    },
    "the same by CSV": {
        "colloc score, all measures": score_command,
        "colloc score, 3 measures": lambda store, folder: score_command(store, folder, "--show", "pmi,npmi,g2"),
        "polars": score_polars_files,
    },
    "vectors": {
        "colloc": vectors_colloc,
        "randomized_svd": vectors_sklearn,
        "randomized_svd, 8 iterations": partial(vectors_sklearn, n_iter=8),
        "randomized_svd, float32, 10 it.": vectors_sklearn_single,
        "svds, arpack": partial(vectors_scipy, solver="arpack"),
        "svds, lobpcg, 5 iterations": partial(vectors_scipy, solver="lobpcg", tol=0.01, maxiter=5),
        "svds, propack, tol 0.01": partial(vectors_scipy, solver="propack", tol=0.01),
    },
    "harmonic window": {"colloc": weighted_colloc, "one weighted pass": weighted_pass},
    "join": {"colloc": join_colloc, "plain Python": join_python},
}


def prepare(folder: Path, store: Path | None) -> Path:
    """The store, and what the tasks read: pairs as arrays and tables, words, a PPMI matrix, expressions, a text."""
    import polars as pl

    import colloc
    from colloc.answers.questions import PairOptions, ask
    from colloc.answers.spaces.choosing import Choice
    from colloc.answers.spaces.matrix import MatrixOptions, matrix
    from colloc.store.vocabulary import term_texts

    if store is None:
        text, store = folder / "text.txt", folder / "bench.colloc"
        with text.open("wb") as out:
            sources = real_sources()
            if sources:
                write_real(out, sources)
            else:
                write_stream(out, tokens=12_000_000, seed=1)
        build(store, [text], 2, 2)
    colloc.tally(store, window=WIDE)
    with colloc.open_store(store) as opened:
        question = ask(opened, PairOptions(window=WIDE))
        blocks = list(question.reader.tally.blocks())
        low, high = (np.concatenate([getattr(b, name) for b in blocks]).astype(np.int64) for name in ("low", "high"))
        joint = np.concatenate([block.forward + block.backward for block in blocks])
        texts = term_texts(opened, question.layer)
        order = np.argsort(-question.words.tokens, kind="stable")
        most = Choice(most=WORDS)
        small = matrix(
            opened,
            options=PairOptions(window=2),
            chosen=MatrixOptions(smoothing=0.75, rows=most, contexts=most),
        )
    from scipy.sparse import save_npz

    save_npz(folder / "ppmi.npz", small.values, compressed=False)
    np.savez(folder / "pairs.npz", low=low, high=high, joint=joint)
    pl.DataFrame({"low": low, "high": high, "joint": joint}).write_parquet(folder / "pairs.parquet")
    margins = np.asarray(question.reader.second_totals())
    pl.DataFrame({"word": texts, "term": np.arange(len(texts)), "margin": margins}).write_parquet(
        folder / "words.parquet"
    )
    (folder / "words.json").write_text(json.dumps([texts[place] for place in order[:WORDS].tolist()]))
    first, second = drawn_pairs(folder)
    pl.DataFrame({"first": first.tolist(), "second": second.tolist()}).write_csv(folder / "given.csv")
    strong = colloc.pairs(store, window=1, directed=True, min_count=5, measure="npmi", limit=EXPRESSIONS)
    lines = [f"{row['first']} {row['second']}\t{row['npmi']}" for row in strong]
    (folder / "expressions.json").write_text(json.dumps(lines))
    (folder / "sample.txt").write_text(sample(store), encoding="utf-8")
    return store


def sample(store: Path, characters: int = 10_000_000) -> str:
    """The beginning of the text that the store keeps."""
    import colloc
    from colloc.store.texts import character_count, read_text

    with colloc.open_store(store) as opened:
        return read_text(opened, 0, min(characters, character_count(opened)))


def measure(name: str, way: str, store: Path, folder: Path) -> tuple[Answer, Run]:
    command = [sys.executable, "-m", "tests.bench.features", "--one", name, way, "--store", str(store)]
    done = run([*command, "--folder", str(folder)], {**os.environ, "PYTHONPATH": str(HERE)})
    answer: Answer = json.loads(done.output)
    return answer, done


def main() -> None:
    parser = argparse.ArgumentParser(prog="python -m tests.bench.features", description=__doc__)
    parser.add_argument("--store", type=Path, help="a store that is there; its tables are added to")
    parser.add_argument("--folder", type=Path, help="where texts and tables go for the time being (3 GB)")
    parser.add_argument("--tasks", nargs="+", choices=list(TASKS), default=list(TASKS))
    parser.add_argument("--repeat", type=int, default=2, help="runs of each; the one with least processor time counts")
    parser.add_argument("--one", nargs=2, help=argparse.SUPPRESS)
    chosen = parser.parse_args()
    if chosen.one:
        print(json.dumps(TASKS[chosen.one[0]][chosen.one[1]](chosen.store, chosen.folder)))
        return
    with tempfile.TemporaryDirectory(dir=chosen.folder) as scratch:
        folder = Path(scratch)
        store = prepare(folder, chosen.store)
        for name in chosen.tasks:
            first = 0.0
            for way in TASKS[name]:
                runs = [measure(name, way, store, folder) for _ in range(chosen.repeat)]
                answer, done = min(runs, key=lambda pair: pair[0]["cpu"])
                first = first or answer["cpu"]
                facts = ", ".join(
                    f"{key} {value:,.6g}" for key, value in answer.items() if key not in ("cpu", "seconds")
                )
                print(
                    f"{name:16} {way:28} {answer['seconds']:7.2f} s {answer['cpu']:7.2f} s cpu "
                    f"{answer['cpu'] / first:6.2f} x {done.peak_bytes / 1e6:7.0f} MB  {facts}",
                    flush=True,
                )


if __name__ == "__main__":
    main()
