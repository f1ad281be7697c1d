"""The methods paragraph names everything that decides the numbers; every measure and procedure has its reference."""

from __future__ import annotations

import dataclasses
import json
import re
from pathlib import Path

import pytest

import colloc
from colloc.answers.methods.bibliography import PROCEDURES, entry, references_of
from colloc.answers.methods.paragraph import PROCEDURES_OF
from colloc.errors import UsageError
from colloc.measures.catalogue import MEASURES
from colloc.settings import SegmentSettings, TallySpec
from tests.answers.conftest import Demo


def test_everything_that_decides_the_numbers_is_told(demo: Demo) -> None:
    told = colloc.methods(demo.store, measures=["npmi", "dice"])
    facts = colloc.info(demo.store)
    for source in facts["sources"]:
        assert source["name"] in told.paragraph
        assert source["digest"] in told.paragraph
    for field in dataclasses.fields(SegmentSettings):
        assert f"{field.name.replace('_', ' ')} " in told.paragraph
    assert "within 5 words of each other inside the sentence" in told.paragraph
    assert f"{facts['tokens']:,} words" in told.paragraph
    for name, version in facts["versions"].items():
        assert f"{name} {version}" in told.paragraph
    assert "Normalised pointwise mutual information (Bouma 2009)" in told.paragraph
    assert "Dice coefficient (Dice 1945, Smadja, McKeown & Hatzivassiloglou 1996)" in told.paragraph
    assert "@misc{bouma-2009," in told.bibtex
    assert "doi = {10.2307/1932409}" in told.bibtex
    with pytest.raises(UsageError, match="unknown measure 'nope'"):
        colloc.methods(demo.store, measures=["nope"])


def test_a_result_brings_its_settings_and_procedures(demo: Demo) -> None:
    answer = colloc.contrast(demo.store, this="genre=log", permutations=99, seed=7, limit=2)
    beside = {"colloc": "0.1.0", "command": "contrast", "settings": dict(answer.settings)}
    told = colloc.methods(demo.store, result=json.loads(json.dumps(beside)))
    assert "this genre=log, that not (genre=log)" in told.paragraph
    assert "min count 5" in told.paragraph
    assert "permutations 99, seed 7" in told.paragraph
    assert "rank sum test (Mann & Whitney 1947)" in told.paragraph
    assert "two-cell log-likelihood (Rayson & Garside 2000)" in told.paragraph


def test_units_and_spans_are_told(tmp_path: Path) -> None:
    (tmp_path / "a.txt").write_text("One two three. Two three four.", encoding="utf-8")
    for number, (spec, told) in enumerate(
        [
            (TallySpec(kind="unit", right=0), "in a sentence that holds both"),
            (TallySpec(kind="span", left=1, right=3), "up to 1 words left or 3 right of each other"),
        ]
    ):
        store = tmp_path / f"{number}.colloc"
        colloc.build(store, [str(tmp_path / "a.txt")], tally=spec, jobs=1)
        assert told in colloc.methods(store).paragraph


def test_every_measure_names_its_source() -> None:
    """A source that cites someone gives a reference; only what is common practice or "as ..." gives none."""
    found = references_of(MEASURES, PROCEDURES)
    for name, measure in MEASURES.items():
        if not measure.source.startswith(("as ", "common practice")):
            assert found[measure.title], name
    for name in PROCEDURES:
        (reference,) = found[name]
        assert re.fullmatch(r"\d{4}", reference.year)
    assert {name for names in PROCEDURES_OF.values() for name in names} <= PROCEDURES.keys()


def test_bibtex_is_harmless_to_tex() -> None:
    assert entry("misc", "k", {"note": "a_b & 50 % {x}"}) == "@misc{k,\n  note = {a\\_b \\& 50 \\% \\{x\\}}\n}"
