"""The documentation tells what the program does: examples run, links lead somewhere, nothing is left out."""

from __future__ import annotations

import re
import shutil
from pathlib import Path

import pytest

from .blocks import run_blocks
from .tree import ROOT, show, tracked_files

PAGES = sorted(path for path in tracked_files() if path.suffix == ".md")
WITH_BLOCKS = [page for page in PAGES if show(page) == "README.md" or page.parent.name == "docs"]
TEST_COMMAND = "python -m venv .venv && .venv/bin/pip install -q -e '.[test]' && .venv/bin/python -m pytest"
MAIN_COMMAND = "python -m venv .venv && .venv/bin/pip install -q . && .venv/bin/colloc demo"
LINK = re.compile(r"(?<!\!)\[[^\]]*\]\(([^)\s]+)\)|!\[[^\]]*\]\(([^)\s]+)\)")


def _anchor(heading: str) -> str:
    """The anchor that the usual renderers of CommonMark give a heading (common practice, no single source)."""
    plain = re.sub(r"[`*_]|\[|\]\([^)]*\)", "", heading.strip().lower())
    return re.sub(r"[^\w\- ]", "", plain).replace(" ", "-")


def _anchors(page: Path) -> set[str]:
    text = re.sub(r"^```.*?^```", "", page.read_text(encoding="utf-8"), flags=re.MULTILINE | re.DOTALL)
    return {_anchor(heading) for heading in re.findall(r"^#+ (.*)$", text, re.MULTILINE)}


def test_the_pages_are_there() -> None:
    names = {show(page) for page in PAGES}
    assert names >= {
        "README.md",
        "DEVELOPERS.md",
        "docs/changelog.md",
        "docs/cli.md",
        "docs/decisions.md",
        "docs/file-format.md",
        "docs/measures.md",
        "docs/performance.md",
    }


@pytest.mark.parametrize("page", PAGES, ids=show)
def test_links_lead_somewhere(page: Path) -> None:
    broken = []
    text = re.sub(r"`[^`\n]*`", "", page.read_text(encoding="utf-8"))
    for match in LINK.finditer(re.sub(r"^```.*?^```", "", text, flags=re.MULTILINE | re.DOTALL)):
        target, _, anchor = (match[1] or match[2]).partition("#")
        if "://" in target or target.startswith("mailto:"):
            continue
        goal = (page.parent / target).resolve() if target else page
        if not goal.exists() or (anchor and goal.suffix == ".md" and anchor not in _anchors(goal)):
            broken.append(match[0])
    assert not broken


@pytest.mark.parametrize("page", WITH_BLOCKS, ids=show)
def test_examples_do_what_they_say(page: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    shutil.copytree(ROOT / "corpora_demo", tmp_path / "corpora_demo", ignore=shutil.ignore_patterns("__pycache__"))
    monkeypatch.chdir(tmp_path)
    problems = run_blocks(page.read_text(encoding="utf-8"), tmp_path)
    assert not problems, "\n\n".join(problems)


def test_readme_has_the_two_commands() -> None:
    readme = (ROOT / "README.md").read_text(encoding="utf-8")
    assert TEST_COMMAND in readme
    assert MAIN_COMMAND in readme
    assert "```console" in readme
    assert "```python" in readme


def test_continuous_integration_runs_both_commands() -> None:
    script = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    for command in (TEST_COMMAND, MAIN_COMMAND):
        for step in command.split(" && "):
            words = step.split("/bin/")[-1] if "/bin/" in step else "-m venv"
            assert words in script


def test_the_command_reference_is_the_generated_one() -> None:
    from colloc.cli.reference import markdown

    assert (ROOT / "docs" / "cli.md").read_text(encoding="utf-8") == markdown()


def test_every_measure_is_documented() -> None:
    from colloc.measures.catalogue import MEASURES

    text = (ROOT / "docs" / "measures.md").read_text(encoding="utf-8")
    missing = [
        f"{name}: {field}"
        for name, measure in MEASURES.items()
        for field in ("name", "title", "formula", "range", "unit", "misleads", "source")
        if str(getattr(measure, field)) not in text
    ]
    assert not missing, "\n".join(missing)


def test_decisions_have_date_choice_reason_and_cost() -> None:
    text = (ROOT / "docs" / "decisions.md").read_text(encoding="utf-8")
    sections = re.split(r"^## ", text, flags=re.MULTILINE)[1:]
    assert sections
    for section in sections:
        title = section.splitlines()[0]
        for label in (r"\*Date\.\* \d{4}-\d{2}-\d{2}", r"\*Choice\.\* \w", r"\*Reason\.\* \w", r"\*Cost\.\* \w"):
            assert re.search(label, section), f"{title}: no {label}"
