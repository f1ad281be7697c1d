"""Small modules with names that say what they do (the project's own rule, no outside source)."""

from __future__ import annotations

from collections import Counter

from .tree import package_modules, show, tracked_files

LONGEST_MODULE = 450
MOST_MODULES = 24
VAGUE = {"utils", "util", "helpers", "helper", "common", "core", "misc", "tools", "base"}
LARGEST_FILE = 2 * 2**20


def test_no_long_module() -> None:
    lengths = {show(path): len(path.read_text(encoding="utf-8").splitlines()) for path in package_modules()}
    long = {name: length for name, length in lengths.items() if length > LONGEST_MODULE}
    assert not long, f"split by job: {long}"


def test_no_crowded_folder() -> None:
    crowd = Counter(show(path.parent) for path in package_modules() if path.name != "__init__.py")
    crowded = {folder: count for folder, count in crowd.items() if count > MOST_MODULES}
    assert not crowded, f"more than {MOST_MODULES} modules: {crowded}"


def test_no_vague_name() -> None:
    vague = [show(path) for path in package_modules() if {path.stem.strip("_"), path.parent.name} & VAGUE]
    assert not vague, f"name the job: {vague}"


def test_every_module_says_what_it_is() -> None:
    bare = [
        show(path)
        for path in package_modules()
        if (text := path.read_text(encoding="utf-8").strip()) and not text.startswith(('"""', 'r"""'))
    ]
    assert not bare, f"no docstring: {bare}"


def test_no_large_file() -> None:
    large = {show(path): path.stat().st_size for path in tracked_files() if path.stat().st_size > LARGEST_FILE}
    assert not large, f"too large to commit: {large}"
