"""The methods paragraph of a store, or of one result: exact enough to repeat the analysis."""

from __future__ import annotations

import dataclasses
import hashlib
import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from colloc.answers.info import describe
from colloc.answers.methods.bibliography import entry, references_of
from colloc.answers.questions import DEFAULT_SHOWN
from colloc.settings import ReadSettings, SegmentSettings
from colloc.store.connection import Store

MARGINS = {
    "pairs": "one observation of a contingency table is a pair of tokens within reach of each other",
    "positions": "one observation of a contingency table is a token, with or without the other word in reach",
    "tokens": "word probabilities are those of tokens, the joint probability that of pairs of tokens",
}
PROCEDURES_OF = {
    "contrast": (
        "log-likelihood",
        "two-cell log-likelihood",
        "q-values",
        "rank sum test",
        "test of means",
        "jackknife",
        "log odds difference",
    ),
    "contrast by": ("q-values", "groups of documents", "log-likelihood"),
    "contrast pair by": ("pooled odds ratio", "homogeneity", "log odds difference"),
    "contrast words": ("t for differences", "log odds difference", "q-values"),
    "drift": ("trend over periods", "slope over documents", "jackknife", "homogeneity", "q-values"),
}
"""What the answers of these commands use besides the measures shown."""


@dataclass(frozen=True, slots=True)
class Methods:
    """A paragraph, and its references as BibTeX."""

    paragraph: str
    bibtex: str


def methods(
    store: Store, *, measures: Sequence[str] = DEFAULT_SHOWN, result: Mapping[str, Any] | None = None
) -> Methods:
    """What was done, from input to measures.

    Parameters
    ----------
    measures : sequence of str
        Names of the catalogue.
    result : mapping, optional
        What ``--settings-beside`` wrote beside a result: colloc, command and settings.

    Raises
    ------
    UsageError
        A measure is unknown.
    """
    facts = describe(store)
    shown = list(dict.fromkeys([*measures, *_measures_of(result)]))
    procedures = ["words and sentences", *PROCEDURES_OF.get(_kind_of(result), ())]
    cited = references_of(shown, procedures)
    sentences = [
        _input(facts),
        _segmentation(facts),
        _counting(facts),
        _measured(cited, len(shown)),
        *_procedures(cited, len(shown)),
        *_result(result),
        _versions(facts, result),
    ]
    entries = {reference.key: reference.bibtex() for references in cited.values() for reference in references}
    own = entry(
        "software",
        "colloc",
        {
            "title": "colloc: word associations from text",
            "author": "colloc contributors",
            "version": str(facts["versions"].get("colloc", "")),
        },
    )
    return Methods(" ".join(sentences), "\n\n".join([own, *(entries[key] for key in sorted(entries))]))


def _input(facts: Mapping[str, Any]) -> str:
    sources = facts["sources"]
    if len(sources) <= 5:
        listed = "; ".join(f"{one['name']} ({one['bytes']:,} bytes, BLAKE2b {one['digest']})" for one in sources)
    else:
        # One digest stands for all: that of the list of digests, in the order of the sources.
        digest = hashlib.blake2b("\n".join(str(one["digest"]) for one in sources).encode(), digest_size=16).hexdigest()
        listed = f"{sources[0]['name']} to {sources[-1]['name']} (BLAKE2b of the list of their digests {digest})"
    left = {name.replace("_", " "): count for name, count in facts["left_out"].items() if count}
    out = f" Left out were {', '.join(f'{count:,} {name}' for name, count in left.items())}." if left else ""
    read = _listed(_complete(ReadSettings, facts["settings"]["read"]))
    return (
        f"The corpus has {facts['documents']:,} documents, {facts['sentences']:,} sentences and {facts['tokens']:,} "
        f"words ({facts['types']:,} distinct forms) from {len(sources)} input file{'s' * (len(sources) != 1)}: "
        f"{listed}. Reading: {read}.{out}"
    )


def _segmentation(facts: Mapping[str, Any]) -> str:
    settings = _complete(SegmentSettings, facts["settings"]["segment"])
    rule = "Unicode Standard Annex 29"
    if settings.get("pattern"):
        rule = f"the pattern {settings['pattern']!r} for words and Unicode Standard Annex 29 for sentences"
    elif settings.get("tailored"):
        rule += " with additions"
    return f"Words and sentences were found by {rule} ({_listed(settings)})."


def _counting(facts: Mapping[str, Any]) -> str:
    tally, margins = facts["settings"]["tally"], facts["settings"]["margins"]
    return (
        f"Unless said otherwise, words are compared in the layer {tally['layer']!r}; {_reach(tally)}; "
        f"{MARGINS[margins]}. All counts are exact, and thresholds act on what is shown, never on the margins. "
        "Pairs within reach overlap, so they are not independent trials."
    )


def _complete(kind: type[SegmentSettings] | type[ReadSettings], settings: Mapping[str, Any]) -> dict[str, Any]:
    """All settings: a store does not write down those that are as they were before the option came."""
    return dataclasses.asdict(kind.from_json(json.dumps(dict(settings))))


def _reach(tally: Mapping[str, Any]) -> str:
    inside = f"inside the {tally['inside']}"
    if tally["kind"] == "unit":
        return f"two words co-occur in a {tally['inside']} that holds both"
    if tally["kind"] == "relation":
        return f"two words co-occur as head and dependent ({tally['relation'] or 'any relation'})"
    if "window" in tally:
        return f"two words co-occur within {tally['window']} words of each other {inside}"
    return f"two words co-occur up to {tally['left']} words left or {tally['right']} right of each other {inside}"


def _measured(cited: Mapping[str, Any], n_measures: int) -> str:
    titles = list(cited)[:n_measures]
    return "Measures: " + "; ".join(_with_source(title, cited[title]) for title in titles) + "."


def _procedures(cited: Mapping[str, Any], n_measures: int) -> list[str]:
    names = list(cited)[n_measures:]
    return ["Procedures: " + "; ".join(_with_source(name, cited[name]) for name in names) + "."] if names else []


def _with_source(what: str, references: Sequence[Any]) -> str:
    sources = ", ".join(reference.short for reference in references)
    return f"{what} ({sources})" if sources else what


def _result(result: Mapping[str, Any] | None) -> list[str]:
    if result is None:
        return []
    settings = {name: value for name, value in result.get("settings", {}).items() if name not in ("store", "says")}
    return [f"The result was made by `colloc {result.get('command', '')}` with these settings: {_listed(settings)}."]


def _versions(facts: Mapping[str, Any], result: Mapping[str, Any] | None) -> str:
    made = _listed(facts["versions"])
    asked = f"; asked with colloc {result['colloc']}" if result is not None and "colloc" in result else ""
    return f"Versions: {made}{asked}."


def _listed(settings: Mapping[str, Any]) -> str:
    """All settings, defaults too: what is a default now need not be one later."""
    return ", ".join(f"{name.replace('_', ' ')} {_value(value)}" for name, value in settings.items())


def _value(value: Any) -> str:
    if value is None or value in ("", [], ()):
        return "none"
    if isinstance(value, bool):
        return "yes" if value else "no"
    return "/".join(map(str, value)) if isinstance(value, list | tuple) else str(value)


def _kind_of(result: Mapping[str, Any] | None) -> str:
    if result is None:
        return ""
    command, settings = str(result.get("command", "")), result.get("settings", {})
    if command == "contrast" and "by" in settings:
        return "contrast pair by" if "first" in settings else "contrast by"
    return "contrast words" if command == "contrast" and "words" in settings else command


def _measures_of(result: Mapping[str, Any] | None) -> list[str]:
    measure = result.get("settings", {}).get("measure") if result is not None else None
    return [measure] if isinstance(measure, str) and measure != "joint" else []
