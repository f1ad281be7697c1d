"""The ending of the file that a result goes to, and what is said where there are no rows."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.cli.conftest import Run

TEXT = "Thick fog at dawn. The thick fog came in from the sea. Thick fog again."


@pytest.fixture
def built(run: Run, tmp_path: Path) -> Path:
    (tmp_path / "a.txt").write_text(TEXT, encoding="utf-8")
    assert run("build", tmp_path / "a.colloc", tmp_path / "a.txt", "-q").code == 0
    return tmp_path / "a.colloc"


@pytest.mark.parametrize("file_format", ["csv", "tsv", "jsonl", "json", "parquet"])
def test_the_ending_of_a_file_gives_its_format(run: Run, built: Path, tmp_path: Path, file_format: str) -> None:
    asked = ("pairs", built, "--min-count", 1, "-q", "-o")
    said, unsaid = tmp_path / f"said.{file_format}", tmp_path / f"unsaid.{file_format.upper()}"
    assert run(*asked, said, "-f", file_format).code == 0
    assert run(*asked, unsaid).code == 0
    assert unsaid.read_bytes() == said.read_bytes()
    assert run(*asked, said, "-f", "table").code == 0
    assert run(*asked, tmp_path / "plain.txt").code == 0
    assert said.read_bytes() == (tmp_path / "plain.txt").read_bytes() != unsaid.read_bytes()


def test_endings_of_lines_and_cards(run: Run, built: Path, tmp_path: Path) -> None:
    for command in (("lines", built, "fog"), ("explain", built, "thick", "fog")):
        page = tmp_path / f"{command[0]}.html"
        assert run(*command, "-o", page).code == 0
        assert page.read_text(encoding="utf-8").startswith("<!doctype html>")
    ran = run("pairs", built, "-o", tmp_path / "pairs.html")
    assert ran.code == 2
    assert "pairs writes no html; choose --format from table, csv" in ran.err
    assert not (tmp_path / "pairs.html").exists()


def test_what_left_all_rows_out_is_said(run: Run, built: Path) -> None:
    none = run("pairs", built, "--min-count", 1000, "-f", "csv")
    assert none.code == 0
    assert len(none.out.splitlines()) == 1
    assert none.err.splitlines()[1:] == ["# no rows; min count 1000; attraction only, unless --any-strength"]
    assert run("pairs", built, "--min-count", 1000, "-q").err == ""
    words = run("words", built, "--min-count", 2, "--min-docs", 9)
    assert words.err.splitlines()[1:] == ["# no rows; min count 2; min docs 9"]
    assert not run("pairs", built, "--min-count", 1, "--any-strength").err.splitlines()[1:]
