"""One version: in the package's metadata, in the changelog, and as the program says it."""

from __future__ import annotations

import re
import tomllib
from importlib.metadata import version
from typing import Any

from .tree import ROOT

PROJECT: dict[str, Any] = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
CHANGELOG = (ROOT / "docs" / "changelog.md").read_text(encoding="utf-8")
HEADING = re.compile(r"^## (\d+\.\d+\.\d+) \((unreleased|\d{4}-\d{2}-\d{2})\)$", re.MULTILINE)


def test_changelog_begins_with_this_version() -> None:
    newest = HEADING.search(CHANGELOG)
    assert newest is not None
    assert newest[1] == PROJECT["version"]


def test_installed_version_is_this_version() -> None:
    assert version("colloc") == PROJECT["version"]


def test_changelog_headings() -> None:
    headings = re.findall(r"^## .*$", CHANGELOG, re.MULTILINE)
    matches = [HEADING.match(heading) for heading in headings]
    assert all(matches), f"write '## 1.2.3 (unreleased)' or '## 1.2.3 (2030-01-31)': {headings}"
    numbers = [tuple(map(int, match[1].split("."))) for match in matches if match]
    assert numbers == sorted(numbers, reverse=True)
    assert [match[2] for match in matches[1:] if match].count("unreleased") == 0


def test_every_version_tells_what_changed() -> None:
    for section in re.split(r"^## .*$", CHANGELOG, flags=re.MULTILINE)[1:]:
        assert re.search(r"^- \w", section, re.MULTILINE)
