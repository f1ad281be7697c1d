"""The table of planted truths, as Markdown for the README of this folder."""

from __future__ import annotations

from collections.abc import Callable, Mapping

Item = Mapping[str, object]

BEGIN, END = "<!-- table of truths: written by generate.py -->", "<!-- end of table -->"


def _number(value: object, digits: int = 2) -> str:
    return f"{value:.{digits}f}" if isinstance(value, float) else "never together"


def _ends(values: object, digits: int = 2) -> str:
    assert isinstance(values, Mapping)
    numbers = list(values.values())
    return f"{_number(numbers[0], digits)} to {_number(numbers[-1], digits)}"


def _by_genre(values: object, digits: int) -> str:
    assert isinstance(values, Mapping)
    return ", ".join(f"{genre} {_number(value, digits)}" for genre, value in values.items())


def _pair(item: Item) -> str:
    return (
        f"P(next) {_number(item['next_given_first'], 3)}, "
        f"within 5 after {_number(item['within_5_after_each_first'], 3)}; "
        f"PMI next {_number(item['pmi_next'])}, window 5 {_number(item['pmi_window_5'])}"
    )


def _avoided(item: Item) -> str:
    return (
        f"{_number(item['pairs_window_5_per_million_words'], 0)} pairs a million words within 5, "
        f"{_number(item['pairs_window_5_if_independent'], 0)} if independent"
    )


def _discontinuous(item: Item) -> str:
    distances = item["per_million_by_distance"]
    assert isinstance(distances, Mapping)
    far = ", ".join(f"{distance}: {_number(rate, 0)}" for distance, rate in distances.items())
    return f"a million words, by distance of '{' … '.join(map(str, _words(item, 'measured_by')))}': {far}"


def _words(item: Item, key: str = "words") -> list[object]:
    words = item[key]
    assert isinstance(words, list)
    return words


STRENGTHS: dict[str, Callable[[Item], str]] = {
    "adjacent": _pair,
    "windowed": _pair,
    "company": _pair,
    "avoided": _avoided,
    "expression": lambda item: f"{_number(item['per_million'], 0)} a million words",
    "discontinuous": _discontinuous,
    "drift_word": lambda item: f"share of the second word {_ends(item['share_by_year'])}",
    "drift_pair": lambda item: (
        f"P(pair, given the {item['given']} word) {_ends(item['conditional_by_year'])}; "
        f"PMI next {_ends(item['pmi_next_by_year'])}"
    ),
    "genre_word": lambda item: f"a million words: {_by_genre(item['per_million'], 0)}",
    "genre_pair": lambda item: f"P(next): {_by_genre(item['next_given_first'], 3)}",
    "topic": lambda item: (
        f"PMI window 5 {_number(item['pmi_window_5'])}, but {_number(item['pmi_window_5_inside_topic'])} "
        "inside documents on the topic"
    ),
    "habit": lambda item: f"{_number(item['per_million'], 0)} a million words, all by {item['author']}",
    "burst": lambda item: f"without that document: P(lamp after green) {_number(item['next_given_first'], 3)}",
}


def truth_table(items: list[Item]) -> str:
    """One row for each planted item: kind, words, true strength."""
    rows = [
        f"| {str(item['kind']).replace('_', ' ')} | {' '.join(map(str, _words(item)))} | "
        f"{STRENGTHS[str(item['kind'])](item)} |"
        for item in items
    ]
    return "\n".join(["| kind | words | true strength |", "| --- | --- | --- |", *rows])


def with_table(readme: str, items: list[Item]) -> str:
    """The README with its table replaced; raises ValueError where its two marks are missing."""
    before, begin, rest = readme.partition(BEGIN)
    _, end, after = rest.partition(END)
    if not begin or not end:
        raise ValueError(f"the README needs the lines {BEGIN!r} and {END!r}")
    return f"{before}{BEGIN}\n{truth_table(items)}\n{END}{after}"
