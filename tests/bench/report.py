"""Measurements as a table for people and as JSON."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from .subject import Task

HEADINGS = ("task", "engine", "window", "seconds", "cpu s", "M tokens/s", "M pairs", "peak MB", "times colloc")


def rows_of(tasks: Sequence[Task]) -> list[dict[str, Any]]:
    """One row a task; ``times_colloc`` sets an engine's time beside ``colloc``'s at the same task and window."""
    ours = {(task.name, task.window): task.run.seconds for task in tasks if task.engine == "colloc"}
    rows = []
    for task in tasks:
        base = ours.get((task.name, task.window))
        rows.append(
            {
                "task": task.name,
                "engine": task.engine,
                "window": task.window,
                "seconds": round(task.run.seconds, 3),
                "cpu_seconds": round(task.run.cpu_seconds, 3),
                "tokens_per_second": round(task.tokens / task.run.seconds) if task.tokens else None,
                "occurrences": task.occurrences or None,
                "peak_bytes": task.run.peak_bytes or None,
                "times_colloc": round(task.run.seconds / base, 2) if base and task.engine != "colloc" else None,
            }
        )
    return rows


def _cells(row: Mapping[str, Any]) -> list[str]:
    rate, pairs, peak, ratio = (row[key] for key in ("tokens_per_second", "occurrences", "peak_bytes", "times_colloc"))
    return [
        row["task"],
        row["engine"],
        str(row["window"]),
        f"{row['seconds']:.2f}",
        f"{row['cpu_seconds']:.2f}",
        f"{rate / 1e6:.2f}" if rate else "",
        f"{pairs / 1e6:.2f}" if pairs else "",
        f"{peak / 1e6:.0f}" if peak else "",
        f"{ratio:.2f}" if ratio else "",
    ]


def table(rows: Sequence[Mapping[str, Any]]) -> str:
    """A Markdown table, ready for docs/performance.md."""
    cells = [list(HEADINGS), *map(_cells, rows)]
    widths = [max(len(row[column]) for row in cells) for column in range(len(HEADINGS))]

    def line(row: Sequence[str]) -> str:
        texts = [
            cell.ljust(width) if place < 2 else cell.rjust(width)
            for place, (cell, width) in enumerate(zip(row, widths, strict=True))
        ]
        return "| " + " | ".join(texts) + " |"

    rule = [("-" * width) if place < 2 else "-" * (width - 1) + ":" for place, width in enumerate(widths)]
    return "\n".join([line(cells[0]), line(rule), *map(line, cells[1:])])


def write_json(path: Path, content: Mapping[str, Any]) -> None:
    path.write_text(json.dumps(content, indent=2, ensure_ascii=False) + "\n", encoding="utf-8")
