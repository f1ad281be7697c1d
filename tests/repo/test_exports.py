"""``colloc.__all__`` is what is public, sorted, however lazily it is loaded."""

from __future__ import annotations

import json
import subprocess
import sys

# In a fresh process: modules that other tests imported would show up as attributes of the package.
PROBE = """
import json, sys, types
import colloc
before = sorted(name for name in sys.modules if name.split(".")[0] in {"numpy", "scipy", "typer", "sqlite_utils"})
listed = dir(colloc)
loaded = {name: getattr(colloc, name) for name in colloc.__all__}
space = {}
exec("from colloc import *", space)
missing = ""
try:
    colloc.no_such_name
except AttributeError as error:
    missing = str(error)
print(json.dumps({
    "all": list(colloc.__all__),
    "dir": [name for name in listed if not name.startswith("_")],
    "star": sorted(set(space) - {"__builtins__"}),
    "before": before,
    "missing": missing,
    "held": [
        name for name, value in vars(colloc).items()
        if not name.startswith("_") and not isinstance(value, types.ModuleType)
        and type(value).__module__ != "__future__"
    ],
    "undocumented": [
        name for name, value in loaded.items() if callable(value) and not (getattr(value, "__doc__", "") or "").strip()
    ],
    "foreign": [
        name for name, value in loaded.items()
        if callable(value) and not getattr(value, "__module__", "").startswith("colloc")
    ],
}))
"""


def _probe() -> dict[str, list[str]]:
    run = subprocess.run([sys.executable, "-c", PROBE], capture_output=True, text=True, check=True)
    result: dict[str, list[str]] = json.loads(run.stdout)
    return result


def test_public_names() -> None:
    found = _probe()
    assert found["all"] == sorted(set(found["all"]))
    assert "build" in found["all"]
    assert set(found["all"]) <= set(found["dir"])
    assert found["star"] == sorted(found["all"])
    assert set(found["held"]) <= set(found["all"]), "public by accident"
    assert found["undocumented"] == []
    assert found["foreign"] == []
    assert "no_such_name" in found["missing"]
    assert found["before"] == [], "importing colloc alone loads a heavy library"
