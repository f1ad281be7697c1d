"""Slices against conditions written as plain Python; and what cannot be read."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from colloc.errors import UsageError
from colloc.records import DocumentRow, MetaValue
from colloc.store import documents, slices, visibility
from colloc.store.opening import Store, create

METADATA: list[dict[str, MetaValue]] = [
    {"genre": "log", "year": 1881, "title": "A, B & C", "deep": True},
    {"genre": "log", "year": 1882, "title": "x..y"},
    {"genre": "notice", "year": "1883", "title": "=x", "deep": False},
    {"genre": "notice", "year": 1884.5, "title": 'say "fog"'},
    {"genre": "letter", "year": None, "title": "", "a.b": 1, "$": 2, 'q"r': 3, "x = y": 4},
    {"genre": "Log", "year": "about 1885", "title": "1880..1890"},
]


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Store:
    store = create(tmp_path_factory.mktemp("slices") / "a.colloc", {})
    rows = [DocumentRow(n, f"doc {n}", 0, n, 0, 0, 0, 0, metadata) for n, metadata in enumerate(METADATA)]
    documents.append_documents(store, rows)
    visibility.show_all(store)
    return store


def _number(value: MetaValue) -> float:
    try:
        return float(value)  # type: ignore[arg-type]
    except (TypeError, ValueError):
        return float("nan")


@pytest.mark.parametrize(
    ("where", "condition"),
    [
        ("", lambda d: True),
        ("genre=log", lambda d: d["genre"] == "log"),
        (" genre = log ", lambda d: d["genre"] == "log"),
        ("genre=log,letter", lambda d: d["genre"] in ("log", "letter")),
        ("genre=none", lambda d: False),
        ("year=1882", lambda d: d["year"] == 1882),
        ("year=1883", lambda d: d["year"] == "1883"),
        ("year=1882..1884", lambda d: 1882 <= _number(d["year"]) <= 1884),
        ("year=1882..", lambda d: _number(d["year"]) >= 1882),
        ("year=..1882", lambda d: _number(d["year"]) <= 1882),
        ("year=1884.5..1884.5", lambda d: _number(d["year"]) == 1884.5),
        ("year=..1881,1884..", lambda d: _number(d["year"]) <= 1881 or _number(d["year"]) >= 1884),
        ("genre=log & year=1882..", lambda d: d["genre"] == "log" and _number(d["year"]) >= 1882),
        ("genre=log&year=1881&genre=notice", lambda d: False),
        ("not (genre=log)", lambda d: d["genre"] != "log"),
        ("not (genre=log & year=1881)", lambda d: not (d["genre"] == "log" and d["year"] == 1881)),
        ("genre=log & not (year=1881)", lambda d: d["genre"] == "log" and d["year"] != 1881),
        ('not (title="A, B & C") & year=1881..', lambda d: d["title"] != "A, B & C" and _number(d["year"]) >= 1881),
        ("not(not (genre=log))", lambda d: d["genre"] == "log"),
        ('title="A, B & C"', lambda d: d["title"] == "A, B & C"),
        ('title="say ""fog"""', lambda d: d["title"] == 'say "fog"'),
        ('title="x..y","=x"', lambda d: d["title"] in ("x..y", "=x")),
        ('title="1880..1890"', lambda d: d["title"] == "1880..1890"),
        ('title=""', lambda d: d["title"] == ""),
        ("deep=true", lambda d: d.get("deep") is True),
        ("deep=false,true", lambda d: "deep" in d),
        ("a.b=1", lambda d: "a.b" in d),
        ("$=2", lambda d: "$" in d),
        ('"q""r"=3', lambda d: 'q"r' in d),
        ('"x = y"=4', lambda d: "x = y" in d),
    ],
)
def test_select(store: Store, where: str, condition: Callable[[dict[str, MetaValue]], bool]) -> None:
    expected = [number for number, metadata in enumerate(METADATA) if condition(metadata)]
    assert slices.select(store, where).tolist() == expected
    assert slices.select(store, slices.canonical([where])).tolist() == expected


def test_identifiers(store: Store) -> None:
    assert slices.select(store, "id=doc 3,doc 1,nobody").tolist() == [1, 3]
    assert slices.select(store, "id=doc 3 & genre=notice").tolist() == [3]


@pytest.mark.parametrize(
    ("written", "canonical"),
    [
        (["genre=log"], "genre=log"),
        (["year=1990..1999", "genre=press"], "genre=press & year=1990..1999"),
        (["year = 1990..1999&genre=press"], "genre=press & year=1990..1999"),
        (["genre=b, a ,b"], "genre=a,b"),
        (["genre=a", "genre=a"], "genre=a"),
        (["year=1990.0..1.999e3"], "year=1990..1999"),
        (["year=1990.."], "year=1990.."),
        (['genre="a"'], "genre=a"),
        (['t="a b"'], 't="a b"'),
        ([], ""),
        (["", " "], ""),
    ],
)
def test_canonical(written: list[str], canonical: str) -> None:
    assert slices.canonical(written) == canonical


@given(st.text(min_size=1, max_size=6), st.text(max_size=8))
def test_quoted_values_stand_for_themselves(key: str, value: str) -> None:
    where = slices.canonical([f"{slices.quoted(key)}={slices.quoted(value)}"])
    assert slices.canonical([where]) == where
    (condition,) = slices._parsed(where)
    assert (condition.key, condition.texts, condition.ranges) == (key, (value,), ())


@given(st.text('ab=,&" .1', max_size=12))
def test_any_text_is_read_or_refused(where: str) -> None:
    try:
        canonical = slices.canonical([where])
    except UsageError:
        return
    assert slices.canonical([canonical]) == canonical


@pytest.mark.parametrize(
    "where", ["genre", "=x", "a=", "a=b,", "a=,b", "a=b &", "& a=b", "a=b & & c=d", 'a="b', 'a=b"c']
)
def test_nonsense(where: str) -> None:
    with pytest.raises(UsageError, match=r"cannot read the slice .*write key=value"):
        slices.canonical([where])


def test_empty_range_and_unknown_key(store: Store) -> None:
    with pytest.raises(UsageError, match=r"range 5..3 in 'year=5..3' is empty"):
        slices.canonical(["year=5..3"])
    with pytest.raises(UsageError, match=r"no document has the key 'gerne'; keys: id, .*genre, .*title, x = y, year"):
        slices.select(store, "gerne=log")


def test_nothing_that_is_written_becomes_sql(store: Store) -> None:
    with pytest.raises(UsageError, match="no document has the key"):
        slices.select(store, '"x\'); DROP TABLE documents; --"=1')
    assert slices.select(store, "genre=\"' OR '1'='1\"").tolist() == []
    assert documents.document_count(store) == len(METADATA)


def test_keys_and_values(store: Store) -> None:
    assert slices.metadata_keys(store) == ["$", "a.b", "deep", "genre", 'q"r', "title", "x = y", "year"]
    assert list(slices.values_of(store, "genre").items()) == [("Log", 1), ("letter", 1), ("log", 2), ("notice", 2)]
    assert list(slices.values_of(store, "year")) == ["1881", "1882", "1883", "1884.5", "about 1885"]
    assert slices.values_of(store, "nothing") == {}


def test_documents_that_are_not_yet_counted_are_not_chosen(tmp_path: Path) -> None:
    with create(tmp_path / "a.colloc", {}) as new:
        rows = [DocumentRow(n, f"d{n}", 0, n, 0, 0, 0, 0, {"part": n}) for n in range(3)]
        documents.append_documents(new, rows[:2])
        visibility.show_all(new)
        documents.append_documents(new, rows[2:])
        assert slices.select(new, "").tolist() == [0, 1]
        assert slices.select(new, "part=0..9").tolist() == [0, 1]
        assert slices.select(new, "id=d1,d2").tolist() == [1]
        assert list(slices.values_of(new, "part")) == ["0", "1"]
        visibility.show_all(new)
        assert slices.select(new, "part=0..9").tolist() == [0, 1, 2]


def test_the_complement_of_a_slice() -> None:
    assert slices.complement("b=2 & a=1") == "not (a=1 & b=2)"
    assert slices.complement("a=1", "z=3") == "not (a=1) & z=3"
    with pytest.raises(UsageError, match="all documents have no rest"):
        slices.complement("")


@pytest.mark.parametrize("where", ["not (a=1", "not ()", "not (a=1) b=2", "not (a=1) &", "not (a=1)) & b=2"])
def test_exceptions_that_cannot_be_read(where: str) -> None:
    with pytest.raises(UsageError, match="cannot read the slice"):
        slices.canonical([where])
