"""``python -m tests.bench.growth``: time and memory of ``colloc build`` from a million to a hundred million tokens.

The text is real as far as it goes and then a stream drawn from a Zipf-Mandelbrot law, whose independent words make far
more distinct pairs than real text does. Writes JSON and, with ``--picture``, a drawing for docs/performance.md.
"""

from __future__ import annotations

import argparse
import tempfile
from collections.abc import Sequence
from dataclasses import asdict, dataclass
from pathlib import Path

import numpy as np

from . import subject
from .machine import describe
from .report import write_json
from .texts import real_sources, write_real, write_stream

SIZES = (1_000_000, 3_000_000, 10_000_000, 30_000_000, 100_000_000)


@dataclass(frozen=True)
class Point:
    tokens: int
    seconds: float
    peak_bytes: int
    store_bytes: int


def exponent(sizes: Sequence[float], seconds: Sequence[float]) -> float:
    """Slope of log seconds over log size by least squares: 1 is linear. ValueError where a time is not positive."""
    if min(seconds) <= 0:
        raise ValueError("a text that builds as fast as three words do is too small to measure growth with")
    slope: float = np.polyfit(np.log(sizes), np.log(seconds), 1)[0]
    return float(slope)


def write_text(path: Path, tokens: int) -> int:
    """Real text up to ``tokens`` words, the stream for the rest; return how many of them are real."""
    with path.open("wb") as out:
        real = min(write_real(out, real_sources(), tokens=tokens), tokens)
        write_stream(out, tokens=tokens - real, seed=1)
    return real


def grow(sizes: Sequence[int], folder: Path, jobs: int, repeat: int) -> tuple[list[Point], float, int]:
    """Points by size, the seconds that building a few words takes, and how many words were real text."""
    text, store = folder / "text.txt", folder / "growth.colloc"
    text.write_text("A few words.\n", encoding="utf-8")
    start = min(subject.build(store, [text], 5, jobs).seconds for _ in range(3))
    points, real = [], 0
    for size in sizes:
        real = max(real, write_text(text, size))
        runs = [subject.build(store, [text], 5, jobs) for _ in range(repeat)]
        best = min(runs, key=lambda one: one.seconds)
        peak = max(one.peak_bytes for one in runs)
        point = Point(subject.tokens_in(store), best.seconds, peak, store.stat().st_size)
        print(f"{point.tokens:>12,} tokens {point.seconds:8.2f} s {point.peak_bytes / 1e6:8.0f} MB", flush=True)
        points.append(point)
    return points, start, real


def draw(points: Sequence[Point], slope: float, real: int, path: Path) -> None:
    """Time and peak memory over tokens, both axes logarithmic, a linear law beside the time."""
    import matplotlib as mpl

    mpl.use("svg")
    from matplotlib import pyplot

    sizes = np.array([point.tokens for point in points], float)
    seconds = np.array([point.seconds for point in points])
    settings = {"svg.hashsalt": "colloc", "svg.fonttype": "none", "font.size": 10, "font.family": "sans-serif"}
    with pyplot.rc_context(settings):
        figure, (left, right) = pyplot.subplots(1, 2, figsize=(8.5, 3.4), layout="constrained")
        left.loglog(sizes, seconds, "o-", color="#1f5a7a", label=f"measured, exponent {slope:.2f}")
        left.loglog(sizes, seconds[-1] * sizes / sizes[-1], "--", color="#777777", label="linear, exponent 1")
        left.set(xlabel="tokens", ylabel="seconds", title="colloc build, window 5")
        right.semilogx(sizes, [point.peak_bytes / 1e6 for point in points], "o-", color="#1f5a7a")
        right.set(xlabel="tokens", ylabel="MB", title="peak memory of all processes")
        right.set_ylim(bottom=0)
        for axes in (left, right):
            axes.grid(visible=True, color="#dddddd", linewidth=0.6)
            if real:
                axes.axvline(real, color="#bbbbbb", linewidth=0.8, label="real text ends")
        left.legend(frameon=False)
        figure.savefig(path, metadata={"Date": None})
        pyplot.close(figure)


def main() -> None:
    parser = argparse.ArgumentParser(prog="python -m tests.bench.growth", description=__doc__)
    parser.add_argument("--sizes", nargs="+", type=int, default=SIZES, help="words")
    parser.add_argument("--jobs", type=int, default=2)
    parser.add_argument("--repeat", type=int, default=1, help="runs of each size; the fastest counts")
    parser.add_argument("--folder", type=Path, help="where text and stores go for the time being (10 GB)")
    parser.add_argument("--json", type=Path, metavar="FILE")
    parser.add_argument("--picture", type=Path, metavar="FILE.svg")
    chosen = parser.parse_args()
    with tempfile.TemporaryDirectory(dir=chosen.folder) as scratch:
        points, start, real = grow(sorted(chosen.sizes), Path(scratch), chosen.jobs, chosen.repeat)
    slope = exponent([point.tokens for point in points], [point.seconds - start for point in points])
    print(f"exponent {slope:.3f} after taking off {start:.2f} s that a few words take")
    if chosen.json:
        content = {"machine": describe(), "real_words": real, "start_seconds": start, "exponent": slope}
        write_json(chosen.json, {**content, "points": [asdict(point) for point in points]})
    if chosen.picture:
        draw(points, slope, real, chosen.picture)


if __name__ == "__main__":
    main()
