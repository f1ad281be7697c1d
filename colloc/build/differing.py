"""In what two stores, or a store and a command, were told to do different things: by option, with both values."""

from __future__ import annotations

import dataclasses
import json
from collections.abc import Mapping
from typing import Any

from colloc.settings import ReadSettings, SegmentSettings, TallySpec, told_reach

_OPTIONS = {"format": "--input-format", "folding": "--fold", "default_margins": "--margins", "inputs": "INPUT"}
"""Settings whose option is not the setting's own name."""
_NAMED = 3
"""Inputs that are named."""


def differences(
    kept: Mapping[str, str], wanted: Mapping[str, str], says: str = "{option} was {kept}, now {wanted}"
) -> list[str]:
    """Each option that differs between two sets of facts with the same keys (`colloc.store.facts`).

    Parameters
    ----------
    kept, wanted : mapping of str to str
        ``inputs``, ``read_settings``, ``segment_settings``, ``default_tally``, ``default_margins``, ``keep_text``, or
        some of them, as a store keeps them.
    says : str
        How a difference is written.
    """
    before, after = _told(kept), _told(wanted)
    found = []
    for name in {**before, **after}:
        one, other = before.get(name), after.get(name)
        if one != other:
            option = _OPTIONS.get(name, f"--{name.replace('_', '-')}")
            found.append(says.format(option=option, kept=_value(one), wanted=_value(other)))
    return found


def _told(facts: Mapping[str, str]) -> dict[str, Any]:
    """Facts as options of ``build`` and their values, defaults that a store does not write down included."""
    told: dict[str, Any] = {}
    for name, text in facts.items():
        if name == "inputs":
            told[name] = json.loads(text)
        elif name == "read_settings":
            told |= dataclasses.asdict(ReadSettings.from_json(text))
        elif name == "segment_settings":
            told |= dataclasses.asdict(SegmentSettings.from_json(text))
        elif name == "default_tally":
            told |= _counted(TallySpec.from_json(text))
        elif name == "keep_text":
            told["text"] = text == "1"
        else:
            told[name] = text
    return told


def _counted(spec: TallySpec) -> dict[str, Any]:
    told: dict[str, Any] = {"layer": spec.layer, **told_reach(spec.kind, spec.left, spec.right)}
    if spec.kind == "relation":
        return {**told, "relation": spec.relation or "all"}
    return {**told, "inside": spec.inside, **({"unit": True} if spec.kind == "unit" else {})}


def _value(value: Any) -> str:
    if value is None or value == "" or value == () or value is False:
        return "off" if value is False else "not given"
    if value is True:
        return "on"
    if isinstance(value, list | tuple):
        more = ", ..." if len(value) > _NAMED else ""
        return ", ".join(map(str, value[:_NAMED])) + more
    return str(value)
