"""The command line: its commands, and the one place where errors become a line and an exit code.

A command module has ``register(app)``, which adds light functions: whatever they
need is imported when they run, so that ``colloc --help`` loads no numpy.
"""

from __future__ import annotations

import errno
import os
import sys
from collections.abc import Sequence
from importlib import import_module
from inspect import getdoc
from typing import Any

import typer
from typer.core import TyperGroup
from typer.exceptions import Abort, TyperException
from typer.main import get_command

from colloc.cli.groups import spread
from colloc.cli.output import ReaderGone, remark
from colloc.cli.quick_values import with_quick_values
from colloc.errors import CollocError, InputOutputError, LockedError, StoreDamagedError

COMMAND_MODULES = (
    "demonstrating",
    "building",
    "keeping",
    "asking",
    "expressions",
    "annotated",
    "shuffling",
    "showing",
    "contrasting",
    "drifting",
    "measuring",
    "spaces",
    "features",
    "joining",
    "scoring",
    "judging",
    "appraising",
    "exporting",
)
"""Modules of ``colloc.cli.commands``, in the order of the help page."""

CONTEXT = {"help_option_names": ["-h", "--help"], "max_content_width": 110}

INTERRUPTED = 130
"""Exit code after control-C, as shells report it (128 + SIGINT)."""

_DISK_ERRORS = frozenset(
    (errno.EIO, errno.ENOSPC, errno.EROFS, errno.EFBIG, errno.EDQUOT, errno.EACCES, errno.EPERM, errno.EMFILE)
)
"""What the machine can do to us anywhere; any other OSError that gets here is a bug of ours."""


class CommandTable(TyperGroup):
    """The commands of all modules; the options of one are worked out only when it is run or asked about."""

    def __init__(self, **settings: Any) -> None:
        super().__init__(**settings)
        shelf = typer.Typer()
        for name in COMMAND_MODULES:
            import_module(f"colloc.cli.commands.{name}").register(shelf)
        self._functions = {
            info.name or info.callback.__name__: info.callback for info in shelf.registered_commands if info.callback
        }
        self.commands = dict.fromkeys(self._functions)  # type: ignore[assignment] # names, for suggestions

    def list_commands(self, ctx: Any) -> list[str]:
        """Names in the order of the help page."""
        return list(self._functions)

    def get_command(self, ctx: Any, cmd_name: str) -> Any:
        """One command with its options; None where there is none."""
        if cmd_name not in self._functions:
            return None
        alone = typer.Typer(add_completion=False, rich_markup_mode=None, pretty_exceptions_enable=False)
        alone.command(cmd_name, context_settings=CONTEXT)(spread(self._functions[cmd_name]))
        return with_quick_values(get_command(alone))

    def format_commands(self, ctx: Any, formatter: Any) -> None:
        """The list on the help page: the first line of each command's help."""
        with formatter.section("Commands"):
            formatter.write_dl([(name, (getdoc(run) or "").split("\n")[0]) for name, run in self._functions.items()])


def build_app() -> typer.Typer:
    """The program with all its commands."""
    app = typer.Typer(
        name="colloc",
        cls=CommandTable,
        help="Finds word associations in text and explains them. Counts are kept in one SQLite file, the STORE.",
        epilog="Begin with `colloc demo`. `colloc COMMAND --help` tells more about a command.",
        no_args_is_help=True,
        rich_markup_mode=None,
        pretty_exceptions_enable=False,
        context_settings=CONTEXT,
    )
    app.callback(invoke_without_command=True)(_root)
    return app


def _root(version: bool = typer.Option(False, "--version", help="Print the version and leave.")) -> None:
    if version:
        from importlib.metadata import version as version_of

        from colloc.cli.output import print_lines

        print_lines([f"colloc {version_of('colloc')}"])
        raise typer.Exit


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command line and return its exit code.

    Errors that a user can cause become one line on standard error, ``colloc: ...``;
    anything unexpected keeps its traceback.
    """
    try:
        code = with_quick_values(get_command(build_app())).main(
            args=None if arguments is None else list(arguments),
            prog_name="colloc",
            standalone_mode=False,
        )
    except CollocError as error:
        return _failed(error)
    except TyperException as error:
        return _wrong_usage(error)
    except (Abort, KeyboardInterrupt):
        return _interrupted()
    except ReaderGone:
        _forget_output()
        return 0
    except OSError as error:
        if error.errno not in _DISK_ERRORS:
            raise
        place = f"{error.filename}: " if error.filename else ""
        return _failed(InputOutputError(f"{place}{error.strerror}"))
    except Exception as error:
        known = _from_sqlite(error)
        if known is None:
            raise
        return _failed(known)
    return _interrupted() if code == INTERRUPTED else code if isinstance(code, int) else 0


def _failed(error: CollocError) -> int:
    remark(f"colloc: {error}")
    return error.exit_code


def _wrong_usage(error: TyperException) -> int:
    context = getattr(error, "ctx", None)
    message = " ".join(error.format_message().split())
    if type(error).__name__ == "NoArgsIsHelpError":
        remark(error.format_message())
    else:
        command = context.command_path if context is not None else "colloc"
        remark(f"colloc: {message.rstrip('.')}; see `{command} --help`")
    return error.exit_code


def _interrupted() -> int:
    remark("colloc: interrupted")
    return INTERRUPTED


def _forget_output() -> None:
    """Let the interpreter's last flush go nowhere instead of complaining about the closed pipe."""
    with open(os.devnull, "wb") as nowhere:
        os.dup2(nowhere.fileno(), sys.stdout.fileno())


def _from_sqlite(error: Exception) -> CollocError | None:
    """A failure of the disk or of locking that SQLite reports; None for anything else."""
    name = getattr(error, "sqlite_errorname", "")
    if name.startswith(("SQLITE_IOERR", "SQLITE_FULL", "SQLITE_CANTOPEN", "SQLITE_READONLY")):
        return InputOutputError(f"{error}; free some space or check the disk, then run the same command again")
    if name.startswith(("SQLITE_BUSY", "SQLITE_LOCKED")):
        return LockedError(f"{error}; another process is writing, try again")
    if name.startswith(("SQLITE_CORRUPT", "SQLITE_NOTADB")):
        return StoreDamagedError(f"{error}; run `colloc check STORE`")
    return None
