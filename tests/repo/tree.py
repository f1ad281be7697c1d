"""The files of the repository as its checks see them."""

from __future__ import annotations

import ast
import subprocess
from functools import cache
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]
PACKAGE = ROOT / "colloc"


@cache
def tracked_files() -> tuple[Path, ...]:
    """Every file that git tracks and that is there, and every new one that git would not ignore."""
    listing = subprocess.run(
        ["git", "ls-files", "-z", "--cached", "--others", "--exclude-standard"],
        cwd=ROOT,
        check=True,
        capture_output=True,
        text=True,
    ).stdout
    return tuple(path for name in sorted(set(listing.split("\0")) - {""}) if (path := ROOT / name).is_file())


@cache
def package_modules() -> tuple[Path, ...]:
    """Every Python module of the package."""
    return tuple(path for path in tracked_files() if path.is_relative_to(PACKAGE) and path.suffix == ".py")


def module_name(path: Path) -> str:
    """``colloc/store/pages.py`` -> ``colloc.store.pages``."""
    parts = path.relative_to(ROOT).with_suffix("").parts
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


@cache
def syntax(path: Path) -> ast.Module:
    return ast.parse(path.read_text(encoding="utf-8"), filename=str(path))


def show(path: Path, line: int | None = None) -> str:
    name = str(path.relative_to(ROOT))
    return name if line is None else f"{name}:{line}"
