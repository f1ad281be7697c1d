"""Imports go one way: the table in DEVELOPERS.md is what the package does, no more and no less."""

from __future__ import annotations

import ast
import subprocess
import sys

import pytest

from .imports import BASE, RULES, Import, imports_of, layer_of, read_rules
from .tree import PACKAGE, module_name, package_modules, show, syntax

FRONT = {"colloc", "__main__"}
"""The front page re-exports the verbs and ``__main__`` starts the command line: outside the table."""

SLOW = ("scipy", "numba", "sqlite_utils", "matplotlib", "pandas", "polars", "pyarrow", "sklearn", "charset_normalizer")
"""Never loaded by importing a module: only by the function that needs them."""

CLASSES_OF_OTHERS = {"estimators"}
"""Layers that cannot be defined without a slow library; nothing else may import them."""


def _inside(layer: str) -> list[tuple[str, Import]]:
    """Imports of the modules of a layer, each with the place where it stands."""
    return [
        (show(path, one.line), one) for path in package_modules() if layer_of(path) == layer for one in imports_of(path)
    ]


def test_every_module_belongs_to_a_layer() -> None:
    strangers = {layer_of(path) for path in package_modules()} - set(RULES) - FRONT
    assert not strangers, f"give {', '.join(sorted(strangers))} a row in the table of DEVELOPERS.md"


@pytest.mark.parametrize("layer", sorted(RULES))
def test_imports_within_the_package(layer: str) -> None:
    rule = RULES[layer]
    wrong = [
        f"{place} imports {one.name}"
        for place, one in _inside(layer)
        if one.name.split(".")[0] == "colloc" and not rule.allows_inside(one.name.removeprefix("colloc."))
    ]
    assert not wrong, "\n".join(wrong)


@pytest.mark.parametrize("layer", sorted(RULES))
def test_libraries(layer: str) -> None:
    rule = RULES[layer]
    allowed = sys.stdlib_module_names | {"colloc", *rule.libraries, *rule.owned}
    wrong = [f"{place} imports {one.name}" for place, one in _inside(layer) if one.name.split(".")[0] not in allowed]
    assert not wrong, "not in the layer's row in DEVELOPERS.md:\n" + "\n".join(wrong)


@pytest.mark.parametrize("layer", sorted(set(RULES) - set(BASE)))
def test_no_unused_permission(layer: str) -> None:
    used = {one.name.removeprefix("colloc.") for _, one in _inside(layer)}
    granted = {*RULES[layer].inside, *RULES[layer].libraries}
    unused = {grant for grant in granted if not any(name == grant or name.startswith(f"{grant}.") for name in used)}
    assert not unused, f"{layer} never imports {', '.join(sorted(unused))}: take it out of its row in DEVELOPERS.md"


def test_owned_modules_stay_with_their_owner() -> None:
    owners = {name: rule.layers for rule in RULES.values() for name in rule.owned if "." not in name}
    wrong = []
    for path in package_modules():
        for one in imports_of(path):
            owner = owners.get(one.name.split(".")[0])
            granted = layer_of(path) in RULES and one.name.split(".")[0] in RULES[layer_of(path)].libraries
            if owner and layer_of(path) not in owner and not granted:
                wrong.append(f"{show(path, one.line)} imports {one.name}, which belongs to {', '.join(owner)}")
    assert not wrong, "\n".join(wrong)


def test_only_the_command_line_exits() -> None:
    wrong = [
        show(path, node.lineno)
        for path in package_modules()
        if layer_of(path) not in {"cli", "__main__"}
        for node in ast.walk(syntax(path))
        if isinstance(node, ast.Call | ast.Name) and ast.unparse(node).startswith(("sys.exit(", "SystemExit", "exit("))
    ]
    assert not wrong, "\n".join(wrong)


def test_slow_libraries_are_imported_where_they_are_needed() -> None:
    wrong = [
        f"{show(path, one.line)} imports {one.name}"
        for path in package_modules()
        for one in imports_of(path)
        if one.at_start and one.name.split(".")[0] in SLOW and layer_of(path) not in CLASSES_OF_OTHERS
    ]
    assert not wrong, "move into the function that needs it:\n" + "\n".join(wrong)


def _loaded_by(modules: list[str]) -> set[str]:
    code = f"import sys, importlib\nfor name in {modules!r}: importlib.import_module(name)\nprint(*sys.modules)"
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    return {name.split(".")[0] for name in run.stdout.split()}


def test_importing_everything_loads_no_slow_library() -> None:
    modules = [
        module_name(path)
        for path in package_modules()
        if path.name != "__main__.py" and layer_of(path) not in CLASSES_OF_OTHERS
    ]
    assert not _loaded_by(modules) & set(SLOW)


def test_importing_the_command_line_loads_no_numpy() -> None:
    modules = [module_name(path) for path in package_modules() if path.is_relative_to(PACKAGE / "cli")]
    assert not _loaded_by(modules) & {"numpy", *SLOW}


def test_the_table_is_read_as_written() -> None:
    """The reader of the table is itself checked, or an empty table would pass everything."""
    rules = read_rules(
        "| layer | may import (besides) | owns, nobody else |\n"
        "| --- | --- | --- |\n"
        "| `errors`, `records` | the standard library, numpy types, each other | exit codes |\n"
        "| `low` | – | `regex`, segmentation |\n"
        "| `middle` | low (folding only), numpy | `sqlite3`, SQL text |\n"
        "| `pure` | `errors` only; numpy, scipy | formulas |\n"
        "| `high` | low, middle | `typer`, `sys.exit` |\n"
        "\nafter\n"
    )
    assert rules["errors"].layers == ("errors", "records")
    assert rules["errors"].libraries == ("numpy",)
    assert rules["low"].inside == rules["low"].libraries == ()
    assert rules["low"].owned == ("regex",)
    assert rules["middle"].inside == ("low.folding",)
    assert rules["middle"].libraries == ("numpy",)
    assert rules["pure"].base == ("errors",)
    assert rules["pure"].libraries == ("numpy", "scipy")
    assert rules["high"].inside == ("low", "middle")
    assert rules["high"].allows_inside("low.anything")
    assert not rules["middle"].allows_inside("low.other")
    assert not rules["pure"].allows_inside("records")
