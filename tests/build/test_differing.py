"""What is said where a store was built otherwise: each option that differs, with both values."""

from __future__ import annotations

from pathlib import Path

import pytest

from colloc.build.building import build
from colloc.build.differing import differences
from colloc.build.merging import merge
from colloc.errors import CannotCreateError, UsageError
from colloc.settings import ReadSettings, SegmentSettings, TallySpec


def facts(**changed: str) -> dict[str, str]:
    return {
        "inputs": '["a.txt"]',
        "read_settings": ReadSettings().to_json(),
        "segment_settings": SegmentSettings().to_json(),
        "default_tally": TallySpec().to_json(),
        "default_margins": "pairs",
        "keep_text": "1",
    } | changed


@pytest.mark.parametrize(
    ("changed", "said"),
    [
        ({}, []),
        ({"default_margins": "tokens"}, ["--margins was pairs, now tokens"]),
        ({"keep_text": "0"}, ["--text was on, now off"]),
        ({"inputs": '["a.txt", "b", "c", "d"]'}, ["INPUT was a.txt, now a.txt, b, c, ..."]),
        ({"read_settings": ReadSettings(format="csv").to_json()}, ["--input-format was auto, now csv"]),
        (
            {"segment_settings": SegmentSettings(folding=("arabic", "width"), abbreviations=False).to_json()},
            ["--abbreviations was on, now off", "--fold was not given, now arabic, width"],
        ),
        (
            {"default_tally": TallySpec(right=3, layer="form").to_json()},
            ["--layer was fold, now form", "--window was 5, now 3"],
        ),
        (
            {"default_tally": TallySpec(kind="span", left=1, right=2).to_json()},
            ["--window was 5, now not given", "--left was not given, now 1", "--right was not given, now 2"],
        ),
        (
            {"default_tally": TallySpec(kind="unit", right=0, inside="document").to_json()},
            ["--window was 5, now not given", "--inside was sentence, now document", "--unit was not given, now on"],
        ),
    ],
)
def test_each_option_is_named_with_both_values(changed: dict[str, str], said: list[str]) -> None:
    assert sorted(differences(facts(), facts(**changed))) == sorted(said)


def test_a_store_that_does_not_write_a_default_down_agrees_with_one_that_does() -> None:
    written = SegmentSettings().to_json().replace("{", '{"folding": [], ', 1)
    assert differences(facts(), facts(segment_settings=written)) == []


def test_build_and_merge_say_it(tmp_path: Path) -> None:
    for name in ("a", "b"):
        (tmp_path / f"{name}.txt").write_text(f"Thick fog at dawn, {name}.", encoding="utf-8")
    store, other, source = tmp_path / "one", tmp_path / "other", str(tmp_path / "a.txt")
    build(store, [source], jobs=1)
    with pytest.raises(CannotCreateError, match=r"one was built otherwise: --window was 5, now 2\. Use `colloc add`"):
        build(store, [source], tally=TallySpec(right=2), jobs=1)
    build(other, [str(tmp_path / "b.txt")], segment=SegmentSettings(hyphens="split"), keep_text=False, jobs=1)
    with pytest.raises(UsageError, match=r"cannot be merged into .*one: --hyphens is keep there and split here; "):
        merge(store, [other])
