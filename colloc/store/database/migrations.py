"""Numbered, named steps that bring a store to the present schema.

The steps run through sqlite-utils, which commits each with the record of its
having been applied. That library ignores applied names that it does not know,
so :func:`check_applied` looks for those itself, with plain SQL, and reading
never imports sqlite-utils (it takes a third of a second where pandas is there).
"""

from __future__ import annotations

import sqlite3
import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from typing import TYPE_CHECKING

from colloc.errors import DataError, StoreDamagedError
from colloc.hiding import hidden
from colloc.store.database import schema

if TYPE_CHECKING:
    from sqlite_utils.db import Database

MIGRATION_SET = "colloc"


def _initial(database: Database) -> None:
    for statement in schema.INITIAL:
        database.conn.execute(statement)


def _decisions(database: Database) -> None:
    for statement in schema.DECISIONS:
        database.conn.execute(statement)


def _annotations(database: Database) -> None:
    for statement in schema.ANNOTATIONS:
        database.conn.execute(statement)


@dataclass(frozen=True, slots=True)
class Step:
    """One step; readers can do without those that only add a table which they take as empty while it is missing."""

    name: str
    apply: Callable[[Database], None]
    needed_to_read: bool = True


STEPS = (
    Step("0001_initial", _initial),
    Step("0002_decisions", _decisions, needed_to_read=False),
    Step("0003_annotations", _annotations, needed_to_read=False),
)
"""In order; a step, once released, is never changed."""


@dataclass(frozen=True, slots=True)
class Applied:
    """How far a store has come: whether nothing is missing, and whether nothing is that readers need."""

    complete: bool
    readable: bool


def check_applied(connection: sqlite3.Connection, name: str) -> Applied:
    """How far a store has come; raises DataError where a newer colloc made it."""
    version = connection.execute("PRAGMA user_version").fetchone()[0]
    known = {step.name for step in STEPS}
    try:
        rows = connection.execute("SELECT name FROM _sqlite_migrations WHERE migration_set = ?", (MIGRATION_SET,))
        applied = {row[0] for row in rows}
    except sqlite3.OperationalError as error:
        raise StoreDamagedError(f"{name}: its record of schema steps is missing ({error})") from error
    if version > schema.SCHEMA_VERSION or not applied <= known:
        newer = ", ".join(sorted(map(str, applied - known))) or f"schema {version}"
        raise DataError(f"{name}: made by a newer colloc ({newer}); install the newer version to use it")
    missing = [step for step in STEPS if step.name not in applied]
    return Applied(not missing, not any(step.needed_to_read for step in missing))


@contextmanager
def _pandas_hidden() -> Iterator[None]:
    """sqlite-utils loads pandas, where it is installed, to know its types: half a second that is no use here.

    What is imported inside is forgotten afterwards, so that whoever else imports sqlite-utils gets it whole.
    """
    if "sqlite_utils" in sys.modules:
        yield
        return
    with hidden("pandas"):
        yield
    for name in [name for name in sys.modules if name.split(".")[0] == "sqlite_utils"]:
        del sys.modules[name]


def migrate(connection: sqlite3.Connection) -> None:
    """Apply the steps that are missing."""
    with _pandas_hidden():
        from sqlite_utils import Database
        from sqlite_utils.migrations import Migrations

    migrations = Migrations(MIGRATION_SET)
    for step in STEPS:
        migrations(name=step.name)(step.apply)
    migrations.apply(Database(connection))
