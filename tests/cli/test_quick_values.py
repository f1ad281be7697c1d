"""Plain values of options are converted as typer converts them, and no others are."""

from __future__ import annotations

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


def test_a_question_loads_no_converter(tmp_path: Path) -> None:
    """What the module is for: an ordinary question leaves the converter's library alone."""
    text, store = tmp_path / "text.txt", tmp_path / "text.colloc"
    text.write_text("A cup of tea. A cup of coffee.\n" * 3, encoding="utf-8")
    assert main(["build", str(store), str(text), "--quiet"]) == 0
    code = (
        "import sys; from colloc.cli.app import main; "
        f"code = main(['words', {str(store)!r}, 'tea', '-n', '5', '--quiet', '--format', 'csv']); "
        "sys.exit(code or ('pydantic' in sys.modules))"
    )
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert run.returncode == 0, run.stderr
    assert run.stdout.splitlines()[1].startswith("tea,3,")
