"""Plain values of options are converted as typer converts them, and no others are."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest
import typer
from typer.main import get_command

from colloc.cli.app import CommandTable, main
from colloc.cli.quick_values import with_quick_values

VALUES: list[Any] = [
    *(
        "",
        "tea",
        "5",
        "-3",
        "+5",
        "007",
        "1_000",
        " 7",
        "3.0",
        "-0.5",
        "1e3",
        "nan",
        "inf",
        "0x1f",
        "９",
        "5" * 25,
        "-0",
    ),
    *("table", "TABLE", "html", "strict", "sentence", "text", "both", "order", "nowhere/at/all", ".", "a\x00b", "true"),
    *("-0", 0, 1, 5, -3, 0.5, 2.0, True, None, b"tea"),
    *([], ["tea"], ["a", "b"], ("x",), ["."], [1], [None]),
]
TABLE = CommandTable(name="colloc")


def outcome(parameter: Any, context: Any, value: Any) -> Any:
    """What a value becomes, or what is said against it."""
    try:
        found = parameter.get_runtime_param().coerce(value, param=parameter, ctx=context)
    except typer.BadParameter as error:
        return error.format_message()
    except ValueError as error:
        return repr(error)
    return type(found), repr(found)


@pytest.mark.parametrize("name", TABLE.list_commands(None))
def test_every_option_of_every_command_as_typer_has_it(name: str) -> None:
    """Source: typer's own conversion of the same value."""
    alone = typer.Typer()
    alone.command(name)(TABLE._functions[name])
    thorough, quick = get_command(alone), with_quick_values(get_command(alone))
    with thorough.make_context(name, [], resilient_parsing=True) as context:
        for own, other in zip(quick.get_params(context), thorough.get_params(context), strict=True):
            for value in VALUES:
                assert outcome(own, context, value) == outcome(other, context, value), (own.name, value)


@pytest.fixture(scope="module")
def tea(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("tea")
    text = "A cup of tea. The salt of the sea. No boat, no rope."
    records = [json.dumps({"id": str(number), "text": text}) for number in range(6)]
    (folder / "tea.jsonl").write_text("\n".join(records), encoding="utf-8")
    assert main(["build", str(folder / "tea.colloc"), str(folder / "tea.jsonl"), "--quiet"]) == 0
    return folder / "tea.colloc"


@pytest.mark.parametrize(
    "asked", ["info", "words -f csv", "lines tea", "lines tea cup --best", "around tea -f json", "explain tea cup"]
)
def test_short_questions_load_nothing_heavy(tea: Path, asked: str) -> None:
    """What the module is for, and the tails of distributions written out: loading took longer than answering."""
    name, *others = asked.split()
    code = (
        "import sys; from colloc.cli.app import main; "
        f"code = main([{name!r}, {str(tea)!r}, *{others!r}, '--quiet']); "
        "print(code, [name for name in ('pydantic', 'scipy', 'numba', 'rich', 'pyarrow') if name in sys.modules])"
    )
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert run.returncode == 0, run.stderr
    assert run.stdout.splitlines()[-1] == "0 []"
