"""Options in groups: typer sees each of them, and the command gets them back together."""

from __future__ import annotations

import inspect
from importlib import import_module
from typing import get_type_hints

import pytest
import typer

from colloc.cli import groups
from colloc.cli import options as opt
from colloc.cli.app import COMMAND_MODULES
from colloc.cli.groups import is_group, spread
from colloc.errors import UsageError


def test_a_group_gives_way_to_its_options_in_its_place() -> None:
    calls = []

    def command(store: opt.StoreArgument, *, counting: groups.Counted, limit: opt.LimitOption = 5) -> None:
        """Say it."""
        calls.append((store, counting.asked(), limit))

    told = spread(command)
    names = list(groups.Counted.options())
    parameters = inspect.signature(told).parameters
    assert names[:3] == ["layer", "window", "left"]
    assert names[-2:] == ["relation", "directed"]
    assert list(parameters) == ["store", *names, "limit"]
    assert (told.__name__, told.__doc__) == ("command", "Say it.")
    for name in names:
        assert parameters[name].default is groups.Counted.options()[name]
        assert parameters[name].annotation == get_type_hints(groups.Counted, include_extras=True)[name]
    given = {name: one.default for name, one in parameters.items()} | {"store": "s", "window": 3, "directed": True}
    told(**given)
    assert calls == [("s", groups.Counted(window=3, directed=True).asked(), 5)]

    def plain(store: opt.StoreArgument) -> None:
        """Nothing to spread."""

    assert spread(plain) is plain


def test_what_a_group_asks_for() -> None:
    asked = groups.Measured(no_span=True, where=["a=b"], window=2).asked()
    assert (asked["spanned"], asked["where"], asked["window"]) == (False, ["a=b"], 2)
    assert "no_span" not in asked
    assert groups.Tabled().asked()["where"] == ()
    assert groups.Resources(memory="1GB").asked() == {"jobs": None, "memory": 2**30}
    with pytest.raises(UsageError, match="--memory must be at least"):
        groups.Resources(memory="1KB").asked()
    assert groups.Result(format="csv", quiet=True).target(whole=True).whole


def test_no_command_has_an_option_twice() -> None:
    shelf = typer.Typer()
    for name in COMMAND_MODULES:
        import_module(f"colloc.cli.commands.{name}").register(shelf)
    commands = [info.callback for info in shelf.registered_commands if info.callback is not None]
    assert len(commands) > 20
    for command in commands:
        signature = inspect.signature(command)
        hints = get_type_hints(command)
        own = [name for name in signature.parameters if not is_group(hints[name])]
        grouped = [name for hint in hints.values() if is_group(hint) for name in hint.options()]
        assert len(set(own + grouped)) == len(own + grouped), command.__name__
        assert set(inspect.signature(spread(command)).parameters) == {*own, *grouped}
