"""``colloc demo``, the generated reference, and what an installed copy brings with it."""

from __future__ import annotations

import os
import re
import shutil
import tomllib
import zipfile
from pathlib import Path

import pytest
import setuptools.build_meta

from colloc.cli import reference
from colloc.cli.app import CommandTable

from .conftest import Run, process

ROOT = Path(__file__).resolve().parents[2]


def test_the_demo_runs_anywhere(run: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    ran = process("demo", folder=tmp_path)
    assert ran.code == 0, ran.err
    lines = ran.out.splitlines()
    documents = sum(path.read_bytes().count(b"\n") for path in (ROOT / "corpora_demo").glob("*.jsonl"))
    assert lines[0].startswith(f"demo.colloc: {documents} documents, ")
    pairs = lines[lines.index("The strongest pairs:") + 1 :][:11]
    assert pairs[0].split()[:7] == ["first", "second", "joint", "first_total", "second_total", "total", "expected"]
    company = [line.split()[:2] for line in lines[lines.index("What stands around 'fog':") + 2 :][:10]]
    # Planted in the corpus: fog is nearly always called thick (corpora_demo/planted.py).
    assert company[0] == ["fog", "thick"]
    for line in lines[lines.index("Next:") + 1 :]:
        command = [part.strip("'") for part in line.split()[1:]]
        suggested = run(*command)
        assert suggested.code == 0, (line, suggested.err)
        assert suggested.out.count("\n") > 2, line


def test_the_demo_again_and_elsewhere(run: Run, tmp_path: Path) -> None:
    first = run("demo", tmp_path / "new" / "folder", "--quiet")
    assert (first.code, first.err) == (0, "")
    assert (tmp_path / "new" / "folder" / "demo.colloc").exists()
    assert run("demo", tmp_path / "new" / "folder", "--quiet").out == first.out
    (tmp_path / "file").write_bytes(b"")
    refused = run("demo", tmp_path / "file")
    assert refused.code == 73
    assert "cannot make the folder" in refused.err


def test_an_installed_copy_has_the_demo_texts(tmp_path: Path) -> None:
    """What ``pip install .`` installs is the wheel: it must hold the texts and every package."""
    with zipfile.ZipFile(built_wheel(tmp_path)) as wheel:
        names = set(wheel.namelist())
    assert {"corpora_demo/logbooks.jsonl", "corpora_demo/notices.jsonl", "colloc/py.typed"} <= names
    for path in (ROOT / "colloc").rglob("*.py"):
        assert path.relative_to(ROOT).as_posix() in names
    assert not [name for name in names if name.startswith(("tests", "docs"))]


def built_wheel(folder: Path) -> Path:
    """The wheel of a copy of the sources, so that nothing is left in the repository."""
    source = folder / "source"
    source.mkdir()
    for name in ("colloc", "corpora_demo"):
        shutil.copytree(ROOT / name, source / name, ignore=shutil.ignore_patterns("__pycache__"))
    for name in ("pyproject.toml", "LICENSE"):
        shutil.copy(ROOT / name, source)
    (source / "README.md").write_text("colloc\n")
    here = os.getcwd()
    os.chdir(source)
    try:
        return folder / setuptools.build_meta.build_wheel(str(folder))
    finally:
        os.chdir(here)


def test_the_reference_page_is_the_generated_one_and_complete(run: Run) -> None:
    page = reference.markdown()
    assert (ROOT / "docs" / "cli.md").read_text(encoding="utf-8") == page
    table = CommandTable()
    for name in table.list_commands(None):
        assert f"## colloc {name}\n" in page
        for option in re.findall(r"--[a-z][a-z-]+", run(name, "--help").out):
            assert option in page.split(f"## colloc {name}\n")[1].split("\n## ")[0]


def test_the_command_is_installed_under_its_name() -> None:
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    assert project["scripts"]["colloc"] == "colloc.cli.app:main"
