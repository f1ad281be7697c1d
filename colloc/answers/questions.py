"""What the questions about pairs have in common: from the user's options to a table reader."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict, dataclass
from typing import Any, cast, get_args

from colloc.answers.tables import Convention, TableReader
from colloc.counts.words import slice_word_counts
from colloc.errors import DataError, UsageError
from colloc.measures.catalogue import MEASURES, find_ranking
from colloc.records import WordCounts
from colloc.settings import DEFAULT_MEASURE, DEFAULT_MEMORY, Inside, Margins, TallySpec
from colloc.store import facts, slices
from colloc.store.connection import Store

DEFAULT_SHOWN = ("pmi", "npmi", "g2")
"""Measures shown beside the one that ranks."""


@dataclass(frozen=True, slots=True, kw_only=True)
class PairOptions:
    """Options shared by all questions about pairs; ``None`` means as the store was built.

    Parameters
    ----------
    window : int
        Same reach on both sides.
    left, right : int
        Unequal reach; both or neither.
    unit : bool
        Count the units (``inside``) that hold both words, not windows.
    directed : bool
        (x, y) only where y follows x.
    where : sequence of str
        Slices, joined by "and".
    """

    layer: str | None = None
    window: int | None = None
    left: int | None = None
    right: int | None = None
    unit: bool = False
    inside: Inside | None = None
    margins: Margins | None = None
    directed: bool = False
    spanned: bool = True
    where: Sequence[str] = ()
    relation: str | None = None


@dataclass(frozen=True, slots=True)
class Question:
    """A resolved question: which tally, read how, with which word frequencies."""

    store: Store
    spec: TallySpec
    convention: Convention
    reader: TableReader
    words: WordCounts

    @property
    def layer(self) -> str:
        return self.spec.layer

    def settings(self, **more: Any) -> dict[str, Any]:
        """Everything that decides the numbers, for the header line and the file beside a result."""
        return settings_of(self.store, self.spec, self.convention, **more)


def settings_of(store: Store, spec: TallySpec, convention: Convention, **more: Any) -> dict[str, Any]:
    """Everything that decides the numbers of an answer."""
    return {
        "store": str(store.path),
        **asdict(spec),
        "margins": convention.margins,
        "directed": convention.directed,
        "spanned": convention.spanned,
        **more,
    }


def built_spec(store: Store) -> TallySpec:
    """The tally the store was built with.

    Raises
    ------
    DataError
        While the first build is not finished: there is nothing to ask yet.
    """
    if facts.get(store, "state") == "building":
        raise DataError(f"{store.path}: its build is not finished; run the same `colloc build` again to go on with it")
    return TallySpec.from_json(facts.get(store, "default_tally"))


def built_margins(store: Store) -> Margins:
    """The margins convention the store was built with."""
    return cast(Margins, facts.get(store, "default_margins"))


def resolve_spec(store: Store, options: PairOptions) -> tuple[TallySpec, Margins]:
    """The tally and the margins that the options ask of a store.

    Raises
    ------
    UsageError
        Where options contradict each other.
    """
    margins = options.margins or built_margins(store)
    return chosen_spec(options, built_spec(store), margins), margins


def chosen_spec(options: PairOptions, built: TallySpec, margins: Margins) -> TallySpec:
    """The tally that the options ask for; what they leave open is as in ``built``.

    Raises
    ------
    UsageError
        Where options contradict each other.
    """
    if margins not in get_args(Margins):
        raise UsageError(f"margins must be one of {', '.join(get_args(Margins))}, not {margins!r}")
    layer = options.layer or built.layer
    where = slices.canonical(options.where)
    inside = options.inside or built.inside
    if (options.left is None) != (options.right is None):
        raise UsageError("left and right go together: give both, or window for the same reach on both sides")
    if options.window is not None and options.left is not None:
        raise UsageError("window and left/right contradict each other: give one of them")
    reaches = options.window is not None or options.left is not None
    if options.relation is not None and (reaches or options.unit):
        raise UsageError("relation counts heads and dependents: it takes no window, left, right or unit")
    if options.unit and reaches:
        raise UsageError("unit counts sentences or documents: it takes no window, left or right")
    if options.relation is not None:
        return TallySpec(layer=layer, kind="relation", right=0, relation=options.relation, where=where)
    if options.unit or (built.kind == "unit" and not reaches):
        return TallySpec(layer=layer, kind="unit", right=0, inside=inside, where=where)
    if built.kind == "relation" and not reaches:
        return TallySpec(layer=layer, kind="relation", right=0, relation=built.relation, where=where)
    left, right = _reach(options, built)
    if margins == "positions":
        return TallySpec(layer=layer, kind="positions", left=left, right=right, inside=inside, where=where)
    if left == right:
        return TallySpec(layer=layer, kind="window", right=right, inside=inside, where=where)
    return TallySpec(layer=layer, kind="span", left=left, right=right, inside=inside, where=where)


def _reach(options: PairOptions, built: TallySpec) -> tuple[int, int]:
    if options.window is not None:
        if options.window < 1:
            raise UsageError(f"window must be at least 1, not {options.window}")
        return options.window, options.window
    if options.left is not None and options.right is not None:
        return options.left, options.right
    return (built.right if built.kind == "window" else built.left), built.right


def ask(
    store: Store,
    options: PairOptions,
    measures: Sequence[str] = (),
    *,
    jobs: int | None = None,
    memory: int = DEFAULT_MEMORY,
    progress: Any = None,
) -> Question:
    """Resolve the options, find or count the tally, and check the measures against the convention."""
    from colloc.counts.tallying import cached_tally  # lines resolve options too, and need no machinery of counting

    spec, margins = resolve_spec(store, options)
    convention = Convention(margins=margins, directed=options.directed, spanned=options.spanned)
    convention.check(spec.kind)
    convention.check_measures(tuple(measures))
    tally = cached_tally(store, spec, jobs=jobs, memory=memory, progress=progress)
    words = slice_word_counts(store, spec.layer, spec.where)
    return Question(store, spec, convention, TableReader(tally, convention, words), words)


def measure_names(measure: str | None, show: Sequence[str] | None, margins: str) -> tuple[str, tuple[str, ...]]:
    """The ranking measure and all measures shown, checked against the catalogue.

    ``joint`` ranks by frequency.
    """
    ranking = measure or DEFAULT_MEASURE
    if show is None:
        shown = tuple(name for name in DEFAULT_SHOWN if margins != "tokens" or not MEASURES[name].needs_cells)
    else:
        shown = tuple(show)
    names = dict.fromkeys([*shown, ranking])
    names.pop("joint", None)
    for name in names:
        if name not in MEASURES:
            raise UsageError(f"unknown measure {name!r}: choose from joint, {', '.join(MEASURES)}")
    if ranking != "joint":
        find_ranking(ranking)
    return ranking, tuple(names)
