"""Entries as JSON Lines: one object an entry, everything that is known of it."""

from __future__ import annotations

import json
import math
from typing import Any

from colloc.answers.judging.entries import Entries, Entry


def json_lines(entries: Entries) -> bytes:
    """UTF-8, one object a line; a number that JSON does not have is null."""
    lines = [json.dumps(_record(entry), ensure_ascii=False, allow_nan=False) for entry in entries.entries]
    return "".join(f"{line}\n" for line in lines).encode()


def _record(entry: Entry) -> dict[str, Any]:
    figures = entry.figures
    return {
        "id": entry.identifier,
        "layer": entry.matter.layer,
        "kind": entry.matter.kind,
        "words": list(entry.matter.words),
        "joint": figures.joint,
        "documents": figures.documents,
        "word_counts": list(figures.word_counts),
        "table": {name: _number(value) for name, value in figures.table.items()},
        "scores": {name: _number(value) for name, value in figures.scores.items()},
        "senses": [
            {
                "sense": sense.text,
                "labels": list(sense.labels),
                "notes": list(sense.notes),
                "examples": [{**line.example.to_dict(), "metadata": dict(line.metadata)} for line in sense.lines],
            }
            for sense in entry.senses
        ],
        "judges": [{"judge": judge, "decided": decided} for judge, decided in entry.judges],
    }


def _number(value: float | None) -> float | None:
    return value if value is not None and math.isfinite(value) else None
