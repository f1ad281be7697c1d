"""What a module imports, read from its syntax, and what the table in DEVELOPERS.md lets it import."""

from __future__ import annotations

import ast
import re
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

from .tree import ROOT, module_name, package_modules, syntax

BASE = ("errors", "hiding", "processor", "records", "settings")


@dataclass(frozen=True)
class Import:
    """One imported module; ``at_start`` when importing the importer runs it."""

    name: str
    line: int
    at_start: bool


def _modules_of(node: ast.Import | ast.ImportFrom, importer: Path) -> Iterator[str]:
    if isinstance(node, ast.Import):
        yield from (alias.name for alias in node.names)
        return
    base = node.module or ""
    if node.level:
        package = module_name(importer).split(".")
        keep = len(package) - node.level + (importer.name == "__init__.py")
        base = ".".join([*package[:keep], *([base] if base else [])])
    known = {module_name(path) for path in package_modules()}
    for alias in node.names:
        # `from colloc.store import pages` imports the module colloc.store.pages
        yield f"{base}.{alias.name}" if f"{base}.{alias.name}" in known else base


def _guards_types_only(node: ast.AST) -> bool:
    return isinstance(node, ast.If) and ast.unparse(node.test).endswith("TYPE_CHECKING")


def imports_of(path: Path) -> list[Import]:
    """All imports of a module, those inside functions included."""
    found: list[Import] = []

    def visit(node: ast.AST, at_start: bool) -> None:
        if isinstance(node, ast.Import | ast.ImportFrom):
            found.extend(Import(name, node.lineno, at_start) for name in _modules_of(node, path))
        inner = isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef | ast.Lambda) or _guards_types_only(node)
        for child in ast.iter_child_nodes(node):
            visit(child, at_start and not inner)

    visit(syntax(path), True)
    return found


@dataclass(frozen=True)
class Rule:
    """One row of the table: dotted names below ``colloc`` and names of libraries."""

    layers: tuple[str, ...]
    base: tuple[str, ...]
    inside: tuple[str, ...]
    libraries: tuple[str, ...]
    owned: tuple[str, ...]

    def allows_inside(self, name: str) -> bool:
        """Whether ``name`` (without ``colloc.``) may be imported."""
        granted = (*self.layers, *self.base, *self.inside)
        return any(name == grant or name.startswith(f"{grant}.") for grant in granted)


def read_rules(guide: str) -> dict[str, Rule]:
    """The table under ``| layer | may import`` of the guide, by layer."""
    lines = guide.splitlines()
    start = next(number for number, line in enumerate(lines) if line.startswith("| layer | may import"))
    rows = []
    for line in lines[start + 2 :]:
        if not line.startswith("|"):
            break
        rows.append([cell.strip() for cell in line.strip("|").split(" | ")])
    layers = {name for row in rows for name in re.findall(r"`(\w+)`", row[0])}
    rules = {}
    for names, may, owns in rows:
        row_layers = tuple(re.findall(r"`(\w+)`", names))
        only_base = re.match(r"`(\w+)` only", may)
        plain = re.sub(r"`\w+` only;?|the standard library,?|each other|types|–", "", may)
        parts = [f"{layer}.{module}" for layer, module in re.findall(r"(\w+) \((\w+) only\)", plain)]
        words = re.findall(r"\w+", re.sub(r"\w+ \(\w+ only\)", "", plain))
        owned = tuple(re.findall(r"`([\w.]+)`", owns))
        rule = Rule(
            layers=row_layers,
            base=(only_base[1],) if only_base else BASE,
            inside=tuple(parts + [word for word in words if word in layers]),
            libraries=tuple(word for word in words if word not in layers),
            owned=owned,
        )
        rules.update(dict.fromkeys(row_layers, rule))
    return rules


def layer_of(path: Path) -> str:
    """The layer that a module of the package belongs to: its folder, or its own name at the top."""
    return module_name(path).split(".")[1] if module_name(path) != "colloc" else "colloc"


RULES = read_rules((ROOT / "DEVELOPERS.md").read_text(encoding="utf-8"))
