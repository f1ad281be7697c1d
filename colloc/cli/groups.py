"""Options that go together, as one parameter of a command: a record whose attributes are the options.

`spread` makes of such a command what typer reads: a function with every option of its own.
"""

from __future__ import annotations

import inspect
from collections.abc import Callable
from functools import wraps
from typing import Annotated, Any, get_type_hints

import typer

from colloc.cli import options as opt
from colloc.cli.output import Target
from colloc.settings import DEFAULT_MIN_EXPECTED


class Group:
    """A record of options: annotated class attributes with their defaults, inherited ones first.

    No dataclass: making those takes longer than all else that ``colloc --help`` loads of ours.
    """

    def __init__(self, **given: Any) -> None:
        self.__dict__.update(given)

    @classmethod
    def options(cls) -> dict[str, Any]:
        """Names of the options with their defaults."""
        # One that is told anew keeps its place.
        return {name: getattr(cls, name) for kind in reversed(cls.__mro__) for name in inspect.get_annotations(kind)}

    def asked(self) -> dict[str, Any]:
        """The options as keyword arguments of the Python call with the same names."""
        values = {name: getattr(self, name) for name in self.options()}
        if "where" in values:
            values["where"] = values["where"] or ()
        if "no_span" in values:
            values["spanned"] = not values.pop("no_span")
        if "memory" in values:
            values["memory"] = opt.memory_bytes(values["memory"])
        return values


class Windowed(Group):
    """Which table of words near each other: what is not given is as the store was built."""

    layer: opt.LayerOption = None
    window: opt.WindowOption = None
    left: opt.LeftOption = None
    right: opt.RightOption = None
    unit: opt.UnitOption = False
    inside: opt.InsideOption = None
    margins: opt.MarginsOption = None
    where: opt.WhereOption = None


class Shuffled(Windowed):
    """Which of these tables, read how."""

    directed: opt.DirectedOption = False
    no_span: opt.NoSpanOption = False


class Tabled(Windowed):
    """Which table of any kind."""

    relation: opt.RelationOption = None


class Counted(Tabled):
    """Which table, and in which direction it is read."""

    directed: opt.DirectedOption = False


class Measured(Counted):
    """Which table, and how it is read for measures."""

    no_span: opt.NoSpanOption = False


class MeasuredByRelation(Measured):
    """The same where all relations can be asked for, each apart."""

    relation: Annotated[
        str | None,
        typer.Option(
            "--relation",
            metavar="NAME",
            help="Heads and dependents in this relation; all lists every relation apart, in one table.",
        ),
    ] = None


class Held(Group):
    """What rows about pairs are held to."""

    min_count: opt.MinJointOption = None
    min_word_count: opt.MinWordCountOption = 1
    sure: opt.SureOption = False
    min_docs: opt.MinDocsOfPairOption = None
    max_q: opt.MaxQOption = None
    above_chance: opt.AboveChanceOption = None
    interval_above: opt.IntervalAboveOption = None
    any_strength: opt.AnyStrengthOption = False
    avoid: opt.AvoidOption = False
    min_expected: opt.MinExpectedOption = DEFAULT_MIN_EXPECTED


class Resources(Group):
    """Processes and memory."""

    jobs: opt.JobsOption = None
    memory: opt.MemoryOption = opt.DEFAULT_MEMORY


class Result(Group):
    """Where and how the result is written."""

    format: opt.FormatOption = "table"
    output: opt.OutputOption = None
    settings_beside: opt.BesideOption = False
    quiet: opt.QuietOption = False

    def target(self, *, whole: bool = False) -> Target:
        """The same as the writers take it."""
        return Target(self.format, self.output, self.quiet, self.settings_beside, whole)


class CsvResult(Result):
    """The same where a table of data is what is wanted most."""

    format: opt.FormatOption = "csv"


def is_group(annotation: Any) -> bool:
    """Whether a parameter of this annotation is a group of options."""
    return isinstance(annotation, type) and issubclass(annotation, Group)


def spread(command: Callable[..., None]) -> Callable[..., None]:
    """A command as typer reads it: where a parameter is a group, its options stand instead."""
    hints = get_type_hints(command, include_extras=True)
    signature = inspect.signature(command)
    groups = {name: hints[name] for name in signature.parameters if is_group(hints[name])}
    if not groups:
        return command
    parameters: list[inspect.Parameter] = []
    for name, parameter in signature.parameters.items():
        if name not in groups:
            parameters.append(parameter.replace(annotation=hints[name], kind=inspect.Parameter.KEYWORD_ONLY))
            continue
        types = get_type_hints(groups[name], include_extras=True)
        parameters += [
            inspect.Parameter(option, inspect.Parameter.KEYWORD_ONLY, default=default, annotation=types[option])
            for option, default in groups[name].options().items()
        ]

    @wraps(command)
    def run(**values: Any) -> None:
        for name, group in groups.items():
            values[name] = group(**{option: values.pop(option) for option in group.options()})
        command(**values)

    run.__signature__ = signature.replace(parameters=parameters)  # type: ignore[attr-defined]
    run.__annotations__ = {parameter.name: parameter.annotation for parameter in parameters}
    return run
