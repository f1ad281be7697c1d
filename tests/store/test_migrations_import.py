"""What loading sqlite-utils for the schema leaves behind in the user's process."""

from __future__ import annotations

import subprocess
import sys

_SCRIPT = """
import sqlite3, sys
from colloc.store.database import migrations
migrations.migrate(sqlite3.connect(":memory:", isolation_level=None))
assert "pandas" not in sys.modules, "pandas was loaded, which takes half a second"
import sqlite_utils.db
assert sqlite_utils.db.pd is not None, "sqlite-utils was left without pandas"
"""


def test_pandas_is_neither_loaded_nor_kept_from_others() -> None:
    done = subprocess.run([sys.executable, "-c", _SCRIPT], capture_output=True, text=True, timeout=60)
    assert done.returncode == 0, done.stderr
