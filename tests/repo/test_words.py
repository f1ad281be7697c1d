"""Nothing in the repository speaks of the place where it was written, of package servers, or of work left undone."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from .tree import show, tracked_files

# A bracket around one letter keeps each pattern from finding itself.
PLACES = (
    r"/[w]ork/",
    r"/[f]arm/",
    r"\.\./[s]hared",
    r"/opt/[v]env",
    r"/[r]oot/",
    r"/[h]ome/\w",
    r"bash_[j]obs",
    r"\.[l]ibrary",
    r"/[t]mp/brief",
    r"\b[h]elper sessions?\b",
)
SERVERS = (
    r"\b[p]ypi\.org",
    r"pythonhosted\.[o]rg",
    r"registry\.[n]pmjs",
    r"crates\.[i]o\b",
    r"proxy\.[g]olang",
    r"deb\.[d]ebian\.org",
    r"\b[i]ndex-url",
    r"anaconda\.[o]rg",
)
UNDONE = (
    r"\b[T]ODO\b",
    r"\b[F]IXME\b",
    r"\b[X]XX\b",
    r"\bNot[I]mplementedError\b",
    r"pytest\.(mark\.)?[s]kip",
    r"pytest\.(mark\.)?[x]fail",
    r"\bimport[o]rskip\b",
    r"unittest\.[s]kip",
    r"assert [T]rue$",
)


def _text(path: Path) -> str | None:
    try:
        return path.read_text(encoding="utf-8")
    except UnicodeDecodeError:
        return None


@pytest.mark.parametrize("patterns", [PLACES, SERVERS, UNDONE], ids=["places", "servers", "undone"])
def test_words_that_do_not_belong(patterns: tuple[str, ...]) -> None:
    finder = re.compile("|".join(patterns), re.MULTILINE)
    found = [
        f"{show(path, text.count(chr(10), 0, match.start()) + 1)}: {match[0]}"
        for path in tracked_files()
        if path.name != ".gitignore" and (text := _text(path)) is not None
        for match in finder.finditer(text)
    ]
    assert not found, "\n".join(found)


@pytest.mark.parametrize(
    ("patterns", "sample"),
    [
        (PLACES, "see /" + "work/main for it"),
        (SERVERS, "pip --index-" + "url somewhere"),
        (UNDONE, "# TO" + "DO later"),
        (UNDONE, "@pytest.mark." + "skipif(x)"),
    ],
)
def test_the_patterns_find_what_they_are_for(patterns: tuple[str, ...], sample: str) -> None:
    assert re.search("|".join(patterns), sample, re.MULTILINE)


def test_paths_are_portable() -> None:
    odd = [show(path) for path in tracked_files() if not re.fullmatch(r"[\w.@/+-]+", show(path), re.ASCII)]
    assert not odd
