"""Where results and remarks go: data to standard output or a file, everything else to standard error."""

from __future__ import annotations

import contextlib
import json
import sys
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from itertools import chain
from pathlib import Path
from textwrap import wrap
from typing import TYPE_CHECKING, Any, BinaryIO, get_args

from colloc.cli.fitting import fitting, left_out_line, terminal_width
from colloc.cli.render import make_writer
from colloc.errors import UsageError
from colloc.exports.replacing import check_folder, replacing
from colloc.settings import TallyKind, told_reach

if TYPE_CHECKING:
    from colloc.answers.columns import Columns


LEAST_COUNTS = ("min_count", "min_word_count", "min_docs")
THRESHOLDS = (
    *LEAST_COUNTS,
    "max_q",
    "above_chance",
    "interval_above",
    "min_expected",
    "upos",
    "pattern",
    "stop",
    "no_self",
)
"""Settings that can leave rows out of an answer."""


class ReaderGone(Exception):
    """Whoever read our standard output has closed it (``| head``): nothing more is wanted."""


@dataclass(frozen=True, slots=True)
class Target:
    """Where and how one command's result is written.

    Parameters
    ----------
    format : str
        One of the formats of ``render.make_writer``.
    path : Path or None
        ``None`` or ``-``: standard output.
    quiet : bool
        No remarks on standard error.
    settings_beside : bool
        Also write the settings as JSON to ``PATH.settings.json``.
    whole : bool
        All columns of a table, even where the terminal is too narrow for them.
    """

    format: str = "table"
    path: Path | None = None
    quiet: bool = False
    settings_beside: bool = False
    whole: bool = False

    def __post_init__(self) -> None:
        if self.settings_beside and not self.to_file:
            raise UsageError("--settings-beside writes next to a file: name one with -o")
        if self.format == "parquet" and not self.to_file and sys.stdout.isatty():
            raise UsageError("parquet is not for a terminal: name a file with -o")
        if self.path is not None and self.to_file:
            check_folder(self.path)

    @property
    def to_file(self) -> bool:
        return self.path is not None and str(self.path) != "-"


@contextlib.contextmanager
def opened(path: Path | None) -> Iterator[BinaryIO]:
    """The file (whole or not there), or standard output for ``None`` and ``-``."""
    if path is not None and str(path) != "-":
        with replacing(path) as stream:
            yield stream
        return
    try:
        sys.stdout.flush()
        yield sys.stdout.buffer
        sys.stdout.buffer.flush()
    except BrokenPipeError as error:
        raise ReaderGone from error


def deliver(answer: Columns, target: Target, command: str) -> None:
    """Write an answer, its settings line on standard error first."""
    deliver_parts([answer], answer.settings, target, command)


def deliver_parts(parts: Iterable[Columns], settings: Mapping[str, Any], target: Target, command: str) -> None:
    """Write an answer that comes in parts with the same columns, holding one part at a time.

    Nothing is written before the first part is there, so that most errors leave no trace.
    """
    rest = iter(parts)
    first = next(rest)
    remark(settings_line(command, settings), quiet=target.quiet)
    room = terminal_width() if target.format == "table" and not target.to_file and not target.whole else None
    shown = first.names if room is None else fitting(first, room)
    with opened(target.path) as stream:
        writer = make_writer(target.format, stream, settings)
        n_rows = 0
        for part in chain([first], rest):
            writer.write(part if shown == first.names else part.select(shown))
            n_rows += len(part)
        writer.close()
    if shown != first.names:
        # Belongs to the table, whose reader sees what is missing even where no remarks are wanted.
        print_lines(wrap(left_out_line(first, shown), room or 0))
    if not n_rows:
        remark(no_rows_line(settings), quiet=target.quiet)
    if target.settings_beside and target.path is not None:
        write_settings(target.path, settings, command)


def deliver_bytes(data: bytes, settings: Mapping[str, Any], target: Target, command: str) -> None:
    """Write an answer that is made already (a page, a card), its settings line on standard error first."""
    remark(settings_line(command, settings), quiet=target.quiet)
    with opened(target.path) as stream:
        stream.write(data)
    if target.settings_beside and target.path is not None:
        write_settings(target.path, settings, command)


def write_settings(path: Path, settings: Mapping[str, Any], command: str) -> None:
    """The settings of the result ``path`` as JSON in ``PATH.settings.json``, a table's reach as options give it."""
    from importlib.metadata import version

    told = _told_table(dict(settings)) if settings.get("kind") in get_args(TallyKind) else dict(settings)
    record = {"colloc": version("colloc"), "command": command, "settings": told}
    with replacing(path.with_name(f"{path.name}.settings.json")) as stream:
        stream.write((json.dumps(record, ensure_ascii=False, indent=2) + "\n").encode())


def print_lines(lines: Iterable[str]) -> None:
    """Plain lines to standard output, for commands whose result is not a table."""
    with opened(None) as stream:
        stream.write("".join(f"{line}\n" for line in lines).encode())


def remark(text: str, *, quiet: bool = False) -> None:
    """One line on standard error, unless quiet."""
    if not quiet:
        print(text, file=sys.stderr, flush=True)


def remark_picture(path: Path, lacking: str | None = None, *, quiet: bool = False) -> None:
    """Say which picture was written, and what it lacks."""
    remark(f"# {path}: picture written" + (f"; {lacking}" if lacking else ""), quiet=quiet)


def counted(n: int, one: str, several: str) -> str:
    """A number with what it counts.

    >>> counted(1, "expression", "expressions"), counted(1200, "expression", "expressions")
    ('1 expression', '1200 expressions')
    """
    return f"{n} {one if n == 1 else several}"


def remark_unknown(settings: Mapping[str, Any], *, quiet: bool = False) -> None:
    """Name the words asked for that the store does not know, the first ten of them."""
    unknown = settings.get("unknown", [])
    if unknown:
        from colloc.answers.spelling import NAMED, named_unknown

        more = ", ..." if len(unknown) > NAMED else ""
        listed = ", ".join(named_unknown(unknown, settings.get("near", {}))) + more
        remark(f"# {len(unknown)} unknown in layer {settings['layer']!r}, left out: {listed}", quiet=quiet)


def settings_line(command: str, settings: Mapping[str, Any]) -> str:
    """The header line: what was asked, in words that are options of the command.

    >>> settings_line("pairs", {"layer": "fold", "kind": "window", "left": 0, "right": 5, "where": "", "min_count": 5})
    '# pairs: layer fold; window 5; min count 5'
    """
    shown = {key: value for key, value in settings.items() if key not in ("unknown", "near")}
    if shown.get("kind") in get_args(TallyKind):
        shown = _told_table(shown)
    else:
        shown.pop("kind", None)
    if not shown.pop("spanned", True):
        shown["no_span"] = True
    if shown.pop("min_docs_by_default", False):
        shown["min_docs"] = f"{shown['min_docs']} by default (--min-docs 1 shows all)"
    phrases = [_phrase(key.replace("_", " "), value) for key, value in shown.items()]
    return f"# {command}: " + "; ".join(phrase for phrase in phrases if phrase)


def _told_table(settings: dict[str, Any]) -> dict[str, Any]:
    """Settings in which the kind and the reach of a table have given way to the options that ask for it."""
    kind = settings["kind"]
    asked: dict[str, Any] = told_reach(kind, settings["left"], settings["right"]) or {kind: settings.get(kind) or True}
    told: dict[str, Any] = {}
    for name, value in settings.items():
        if name == "kind":
            told |= asked
        elif name not in ("left", "right", "relation"):
            told[name] = value
    return told


def no_rows_line(settings: Mapping[str, Any]) -> str:
    """What is said where an answer has no rows: the thresholds that may have left them out.

    >>> no_rows_line({"min_count": 5, "min_docs": 1, "max_q": None, "any_strength": False})
    '# no rows; min count 5; attraction only, unless --any-strength'
    """
    from colloc.answers.spelling import meant

    phrases = [
        _phrase(key.replace("_", " "), settings.get(key))
        for key in ("where", *THRESHOLDS)
        # a least count of 0 or 1 leaves out nothing
        if key not in LEAST_COUNTS or (settings.get(key) or 0) > 1
    ]
    if settings.get("any_strength") is False and not settings.get("avoid"):
        phrases.append("attraction only, unless --any-strength")
    if settings.get("min_docs_by_default"):
        phrases.append("--min-docs 1 shows what fewer hold")
    if "unknown" not in settings:
        phrases += map(meant, settings.get("near", {}).values())
    return "; ".join(["# no rows", *(phrase for phrase in phrases if phrase)])


def _phrase(key: str, value: Any) -> str:
    if value is None or value is False or value in ("", [], ()):
        return ""
    if value is True:
        return key
    if isinstance(value, list | tuple):
        return f"{key} {', '.join(map(str, value))}"
    return f"{key} {value}"
