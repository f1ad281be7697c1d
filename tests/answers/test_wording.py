"""Sentences of the evidence card as people would write them."""

from __future__ import annotations

from pathlib import Path

import colloc


def test_once_is_not_told_as_a_number_of_times(tmp_path: Path) -> None:
    (tmp_path / "a.txt").write_text("Thick fog at dawn. Heavy rain at noon. Heavy rain at dawn.\n", encoding="utf-8")
    store = tmp_path / "s.colloc"
    colloc.build(store, str(tmp_path / "a.txt"), jobs=1)
    for words, often in ((("thick", "fog"), "once"), (("heavy", "rain"), "2 times")):
        said = colloc.explain(store, *words, examples=0).statements
        assert any(text.startswith(f"They are met {often} where chance alone") for text in said)
