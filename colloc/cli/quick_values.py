"""Plain values of options without typer's converter.

Typer converts with a library of its own that takes longer to load than most questions to a store take to answer. What
is plainly right (a word, a whole number in range, one of the choices) is converted here; all else, and so every
complaint, is left to typer.
"""

from __future__ import annotations

import os
import re
from pathlib import Path
from typing import Any, Literal, get_args, get_origin

_WHOLE = re.compile(r"-?(0|[1-9][0-9]{0,17})")
_DECIMAL = re.compile(r"-?(0|[1-9][0-9]{0,17})(\.[0-9]{1,17})?")
_UNSURE = object()
"""What typer must look at."""


def with_quick_values(command: Any) -> Any:
    """A command of typer's whose parameters take plain values quickly; unchanged where typer converts otherwise."""
    parameters_of = command.get_params

    def get_params(context: Any) -> Any:
        found = parameters_of(context)  # with --help, which is not among the command's own
        for parameter in found:
            known = isinstance(getattr(parameter, "get_runtime_param", None), _Quick)
            if not known and hasattr(parameter, "get_runtime_param") and hasattr(parameter, "type_descriptor"):
                parameter.get_runtime_param = _Quick(parameter)
        return found

    command.get_params = get_params
    return command


class _Quick:
    """Stands where typer has the converter of one parameter."""

    def __init__(self, parameter: Any) -> None:
        self._thorough = parameter.get_runtime_param
        self._annotation = parameter.type_descriptor.annotation
        self._about = parameter.type_descriptor.parameter_info

    def __call__(self) -> _Quick:
        return self

    def coerce(self, value: Any, param: Any, ctx: Any) -> Any:
        """The converted value, or typer's error."""
        if value is None:
            return () if param.multiple or param.nargs == -1 else None
        converted = self._plain(self._annotation, value)
        return self._thorough().coerce(value, param=param, ctx=ctx) if converted is _UNSURE else converted

    def _plain(self, annotation: Any, value: Any) -> Any:
        if get_origin(annotation) is list:
            if not isinstance(value, list | tuple):
                return _UNSURE
            (kind,) = get_args(annotation)
            converted = [self._plain(kind, one) for one in value]
            return _UNSURE if any(one is _UNSURE for one in converted) else converted
        if self._about.parser is not None or not isinstance(value, str | int | float) or isinstance(value, bool):
            return _UNSURE
        if get_origin(annotation) is Literal:
            return value if value in get_args(annotation) else _UNSURE
        if annotation is Path:
            return self._path(value)
        if annotation in (int, float):
            return self._number(annotation, value)
        return value if annotation is str and isinstance(value, str) else _UNSURE

    def _number(self, kind: type, value: str | int | float) -> Any:
        if isinstance(value, str):
            if not (_WHOLE if kind is int else _DECIMAL).fullmatch(value):
                return _UNSURE
            value = kind(value)
        low, high = self._about.min, self._about.max
        inside = type(value) is kind and (low is None or value >= low) and (high is None or value <= high)
        return value if inside else _UNSURE

    def _path(self, value: Any) -> Any:
        about = self._about
        asked = about.exists or about.resolve_path or about.writable or about.path_type is not None
        if asked or not (about.file_okay and about.dir_okay and isinstance(value, str)) or "\0" in value:
            return _UNSURE
        return Path(value) if os.access(value, os.R_OK) or not os.path.exists(value) else _UNSURE
