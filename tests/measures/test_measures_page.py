"""The page of measures is the catalogue, in words."""

from __future__ import annotations

from pathlib import Path

from colloc.measures.catalogue import MEASURES
from colloc.measures.catalogue.page import markdown

PAGE = Path(__file__).parents[2] / "docs" / "measures.md"


def test_page_is_up_to_date() -> None:
    assert PAGE.read_text(encoding="utf-8") == markdown(), "python -m colloc.measures.catalogue.page > docs/measures.md"


def test_page_names_only_functions_that_are_there() -> None:
    import importlib
    import re

    section = markdown().split("## Beside the score")[1]
    names = re.findall(r"`(\w+)\.(\w+)`", section)
    assert len(names) > 20
    for module, function in names:
        assert callable(getattr(importlib.import_module(f"colloc.measures.{module}"), function))


def test_every_section_has_every_heading() -> None:
    text = markdown()
    for heading in ("Range", "Unit", "Ranks first", "Overrates", "Underrates", "Misleads", "Source"):
        assert text.count(f"- **{heading}**: ") == len(MEASURES)
    for part in ("Limits at zero cells", "Intervals", "p-values and q-values"):
        assert f"\n## {part}\n" in text
    assert "not independent trials" in text
