"""Build, add, remove and merge: whatever the way, the store holds what one undisturbed build holds."""

from __future__ import annotations

import json
import random
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

from colloc.build import batches
from colloc.build.building import build
from colloc.build.changing import add, remove
from colloc.build.merging import merge
from colloc.errors import CannotCreateError, CollocError, DataError, NoInputError, NotSeenError, UsageError
from colloc.kernels import switch
from colloc.settings import ReadSettings, SegmentSettings, TallySpec
from colloc.store.documents import iterate_documents
from colloc.store.opening import open_for_reading
from colloc.store.texts import read_text
from tests.build.texts import content, make_text, write_corpus


@pytest.fixture
def small_batches(monkeypatch: pytest.MonkeyPatch) -> None:
    """Batches of a few documents, and documents longer than a batch."""
    monkeypatch.setattr(batches, "BATCH_CHARACTERS", 700)


def test_jobs_do_not_change_the_content(tmp_path: Path, small_batches: None) -> None:
    write_corpus(tmp_path / "c.jsonl", 1, 40)
    stores = []
    for jobs in (1, 2, 3):
        build(tmp_path / f"s{jobs}", [str(tmp_path / "c.jsonl")], jobs=jobs)
        stores.append(content(tmp_path / f"s{jobs}"))
    assert stores[0] == stores[1] == stores[2]
    assert len(stores[0]["documents"]) == 40


def test_compiled_loops_do_not_change_the_content(
    tmp_path: Path, small_batches: None, monkeypatch: pytest.MonkeyPatch
) -> None:
    """All tables of the store, by arrays and by compiled loops, in this process and in two that it forks."""
    write_corpus(tmp_path / "c.jsonl", 8, 40)
    stores = []
    for on in ("0", "1"):
        monkeypatch.setenv(switch.SWITCH, on)
        switch.use_numpy()
        for jobs in (1, 2):
            build(tmp_path / f"{on}{jobs}", [str(tmp_path / "c.jsonl")], jobs=jobs)
            assert switch.compiled() is (on == "1")
            stores.append(content(tmp_path / f"{on}{jobs}"))
    switch.use_numpy()
    assert stores[0] == stores[1] == stores[2] == stores[3]


def test_batches_do_not_change_the_counts(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Where a long text is cut leaves no trace: neither in sentences nor in pairs."""
    rng = random.Random(5)
    # One paragraph of 40,000 characters and one without any end: soft cuts only.
    long = (
        make_text(rng, 900).replace("\n", " ")
        + "\n"
        + " ".join(rng.choice(["sea", "Fog", "e.g.", "1.5"]) for _ in range(4000))
    )
    (tmp_path / "long.txt").write_text(long, encoding="utf-8")
    build(tmp_path / "whole", [str(tmp_path / "long.txt")], jobs=1)
    monkeypatch.setattr(batches, "BATCH_CHARACTERS", 512)
    build(tmp_path / "cut", [str(tmp_path / "long.txt")], jobs=1)
    assert content(tmp_path / "whole", by_text=True) == content(tmp_path / "cut", by_text=True)
    with open_for_reading(tmp_path / "cut") as store:
        row = next(iterate_documents(store))
        assert read_text(store, row.first_character, row.first_character + row.n_characters) == long


def test_vocabularies_that_spill_change_nothing(
    tmp_path: Path, small_batches: None, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Workers that must forget what they numbered, and a registry that must look types up in the store."""
    from colloc.build import reading, segmenting

    write_corpus(tmp_path / "c.jsonl", 12, 40)
    build(tmp_path / "roomy", [str(tmp_path / "c.jsonl")], jobs=1)
    forgotten = []
    reset, real = segmenting.TypeNumberer.reset, reading.segment_batches

    def forgetful(batches_: Any, settings: SegmentSettings, **options: Any) -> Any:
        return real(batches_, settings, **{**options, "memory": 0})

    monkeypatch.setattr(reading, "segment_batches", forgetful)
    monkeypatch.setattr(segmenting.TypeNumberer, "reset", lambda self: (forgotten.append(1), reset(self)))
    monkeypatch.setattr(reading, "registry_limit", lambda memory: 3)
    build(tmp_path / "tight", [str(tmp_path / "c.jsonl")], jobs=1)
    assert len(forgotten) > 5
    assert content(tmp_path / "tight") == content(tmp_path / "roomy")


@pytest.mark.parametrize("setting", ["0", "1"])
def test_one_huge_line_in_bounded_memory(tmp_path: Path, setting: str, monkeypatch: pytest.MonkeyPatch) -> None:
    """A line of 24 MB: what it takes beyond a line of 1 MB is no more than a few batches."""
    # The library of compiled loops takes its 100 MB however long the line is.
    monkeypatch.setenv(switch.SWITCH, setting)
    peaks = []
    for megabytes in (1, 24):
        (tmp_path / f"{megabytes}.txt").write_text("the sea and the fog " * (megabytes * 50_000), encoding="ascii")
        script = (
            "import resource, sys; from colloc.build.building import build; "
            "build(sys.argv[1], [sys.argv[2]], jobs=1); "
            "print(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss)"
        )
        arguments = [str(tmp_path / f"s{megabytes}"), str(tmp_path / f"{megabytes}.txt")]
        done = subprocess.run([sys.executable, "-c", script, *arguments], capture_output=True, text=True, check=True)
        peaks.append(int(done.stdout) / 1024)
    assert peaks[1] < peaks[0] + 160


def test_add_equals_one_build(tmp_path: Path, small_batches: None) -> None:
    first = write_corpus(tmp_path / "a.jsonl", 1, 9)
    write_corpus(tmp_path / "b.jsonl", 2, 7, prefix="e")
    write_corpus(tmp_path / "c.jsonl", 3, 5, prefix="f")
    build(tmp_path / "all", [str(tmp_path / name) for name in ("a.jsonl", "b.jsonl", "c.jsonl")], jobs=1)
    build(tmp_path / "grown", [str(tmp_path / "a.jsonl")], jobs=1)
    add(tmp_path / "grown", [str(tmp_path / "b.jsonl")], jobs=1)
    report = add(tmp_path / "grown", [str(tmp_path / "c.jsonl")], jobs=2)
    assert content(tmp_path / "grown", by_text=True) == content(tmp_path / "all", by_text=True)
    assert report.total_documents == len(first) + 12


def test_remove_equals_a_build_without(tmp_path: Path, small_batches: None) -> None:
    rows = write_corpus(tmp_path / "a.jsonl", 4, 20)
    kept = [row for row in rows if row["year"] != 1903 and row["id"] != "d1"]
    (tmp_path / "kept.jsonl").write_text("".join(json.dumps(row) + "\n" for row in kept), encoding="utf-8")
    build(tmp_path / "fresh", [str(tmp_path / "kept.jsonl")], jobs=1)
    build(tmp_path / "store", [str(tmp_path / "a.jsonl")], jobs=1)
    remove(tmp_path / "store", where=["year=1903"])
    remove(tmp_path / "store", identifiers=["d1"])
    assert content(tmp_path / "store", by_text=True) == content(tmp_path / "fresh", by_text=True)
    # What was removed can come back.
    (tmp_path / "again.jsonl").write_text(json.dumps(rows[1]) + "\n", encoding="utf-8")
    add(tmp_path / "store", [str(tmp_path / "again.jsonl")])
    assert "d1" in {document[0] for document in content(tmp_path / "store")["documents"]}


def test_removed_text_is_gone_from_the_file(tmp_path: Path) -> None:
    (tmp_path / "a.jsonl").write_text(
        json.dumps({"id": "secret", "text": "Quixotically unmistakable confession. " * 9})
        + "\n"
        + json.dumps({"id": "plain", "text": "The sea and the fog."})
        + "\n",
        encoding="utf-8",
    )
    build(tmp_path / "store", [str(tmp_path / "a.jsonl")])
    remove(tmp_path / "store", identifiers=["secret"])
    with open_for_reading(tmp_path / "store") as store:
        whole = read_text(store, 0, 300)
    assert "Quixotically" not in whole


def test_merge_equals_one_build(tmp_path: Path, small_batches: None) -> None:
    write_corpus(tmp_path / "a.jsonl", 1, 9)
    write_corpus(tmp_path / "b.jsonl", 2, 7, prefix="e")
    build(tmp_path / "all", [str(tmp_path / "a.jsonl"), str(tmp_path / "b.jsonl")], jobs=1)
    build(tmp_path / "a", [str(tmp_path / "a.jsonl")], jobs=1)
    build(tmp_path / "b", [str(tmp_path / "b.jsonl")], jobs=1)
    merge(tmp_path / "a", [tmp_path / "b"])
    assert content(tmp_path / "a", by_text=True) == content(tmp_path / "all", by_text=True)


def test_merge_refuses_what_does_not_fit(tmp_path: Path) -> None:
    write_corpus(tmp_path / "a.jsonl", 1, 3)
    build(tmp_path / "a", [str(tmp_path / "a.jsonl")])
    build(tmp_path / "same", [str(tmp_path / "a.jsonl")])
    build(tmp_path / "other", [str(tmp_path / "a.jsonl")], segment=SegmentSettings(hyphens="split"))
    before = content(tmp_path / "a")
    with pytest.raises(UsageError, match="cannot be merged into"):
        merge(tmp_path / "a", [tmp_path / "other"])
    with pytest.raises(UsageError, match="itself"):
        merge(tmp_path / "a", [tmp_path / "a"])
    with pytest.raises(DataError, match="'d0' is in the store already"):
        merge(tmp_path / "a", [tmp_path / "same"])
    assert content(tmp_path / "a") == before


def test_same_build_again_does_nothing(tmp_path: Path) -> None:
    write_corpus(tmp_path / "a.jsonl", 1, 3)
    build(tmp_path / "s", [str(tmp_path / "a.jsonl")])
    before = (tmp_path / "s").read_bytes()
    assert build(tmp_path / "s", [str(tmp_path / "a.jsonl")]).already_complete
    assert content(tmp_path / "s")
    with pytest.raises(CannotCreateError, match="INPUT was"):
        build(tmp_path / "s", [str(tmp_path)])
    with pytest.raises(CannotCreateError, match="--window was"):
        build(tmp_path / "s", [str(tmp_path / "a.jsonl")], tally=TallySpec(right=2))
    assert len(before) == (tmp_path / "s").stat().st_size


@pytest.mark.parametrize(
    ("bad", "message"),
    [
        ('{"id": "x", "text": "fine"}\n{"id": "y", "text": }\n', r"bad\.jsonl:2"),
        ('{"id": "x", "text": "fine"}\n{"id": "x", "text": "twice"}\n', "'x' is in the store already"),
        ('{"id": "x", "body": "no text"}\n', "text"),
    ],
)
def test_bad_input_leaves_the_store_as_it_was(tmp_path: Path, bad: str, message: str) -> None:
    write_corpus(tmp_path / "a.jsonl", 1, 5)
    build(tmp_path / "s", [str(tmp_path / "a.jsonl")])
    before = content(tmp_path / "s")
    (tmp_path / "bad.jsonl").write_text(bad, encoding="utf-8")
    with pytest.raises(CollocError, match=message):
        add(tmp_path / "s", [str(tmp_path / "bad.jsonl")])
    after = content(tmp_path / "s")
    assert after == before
    with pytest.raises(CollocError, match=message):
        build(tmp_path / "new", [str(tmp_path / "bad.jsonl")])
    assert not (tmp_path / "new").exists()


def test_a_build_goes_on_where_it_was_stopped(
    tmp_path: Path, small_batches: None, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Stopped after some batches; the rest is read, the finished documents are not segmented again."""
    from colloc.build import reading

    rows = write_corpus(tmp_path / "a.jsonl", 8, 30)
    build(tmp_path / "whole", [str(tmp_path / "a.jsonl")], jobs=1)
    real = reading.segment_batches
    seen: list[str] = []

    def stopping(batches_: Any, *args: Any, **kwargs: Any) -> Any:
        for number, segmented in enumerate(real(batches_, *args, **kwargs)):
            if number == 4:
                raise KeyboardInterrupt
            yield segmented

    def watching(batches_: Any, *args: Any, **kwargs: Any) -> Any:
        for segmented in real(batches_, *args, **kwargs):
            seen.extend(entry.identifier for entry in segmented.batch.entries)
            yield segmented

    monkeypatch.setattr(reading, "segment_batches", stopping)
    with pytest.raises(KeyboardInterrupt):
        build(tmp_path / "s", [str(tmp_path / "a.jsonl")], jobs=1)
    monkeypatch.setattr(reading, "segment_batches", watching)
    build(tmp_path / "s", [str(tmp_path / "a.jsonl")], jobs=1)
    assert 0 < len(set(seen)) < len(rows)
    assert content(tmp_path / "s", by_text=True) == content(tmp_path / "whole", by_text=True)


def test_repeats_are_dropped_and_counted(tmp_path: Path, small_batches: None) -> None:
    paragraph = "The keeper trimmed the wick and wrote the hour of it into the book before the relief came over."
    rows = [
        {"id": "a", "text": f"{paragraph}\nOnly here."},
        {"id": "b", "text": f"{paragraph}\nOnly here."},
        {"id": "c", "text": f"{paragraph}\nSomething else."},
        {"id": "long", "text": paragraph * 20},
        {"id": "longer", "text": paragraph * 20},
    ]
    (tmp_path / "a.jsonl").write_text("".join(json.dumps(row) + "\n" for row in rows), encoding="utf-8")
    source = [str(tmp_path / "a.jsonl")]
    report = build(tmp_path / "d", source, read=ReadSettings(skip_duplicates="document"))
    assert [name for name, *_ in content(tmp_path / "d")["documents"]] == ["a", "c", "long"]
    assert report.read.repeated_documents == 2
    report = build(tmp_path / "p", source, read=ReadSettings(skip_duplicates="paragraph"))
    assert report.read.repeated_paragraphs == 3
    sizes = {name: tokens for name, tokens, *_ in content(tmp_path / "p")["documents"]}
    assert sizes["b"] == 2
    assert sizes["longer"] == 0


def test_removed_files_can_be_read_again(tmp_path: Path) -> None:
    write_corpus(tmp_path / "a.jsonl", 1, 4)
    write_corpus(tmp_path / "b.jsonl", 2, 4, prefix="e")
    build(tmp_path / "s", [str(tmp_path / "a.jsonl"), str(tmp_path / "b.jsonl")])
    before = content(tmp_path / "s", by_text=True)
    remove(tmp_path / "s", identifiers=["e0", "e1", "e2", "e3"])
    add(tmp_path / "s", [str(tmp_path / "b.jsonl")])
    assert content(tmp_path / "s", by_text=True) == before


def test_nothing_but_blanks_is_no_text(tmp_path: Path) -> None:
    write_corpus(tmp_path / "a.jsonl", 1, 4)
    build(tmp_path / "s", [str(tmp_path / "a.jsonl")])
    before = content(tmp_path / "s")
    (tmp_path / "blank.txt").write_text(" \n . \n", encoding="utf-8")
    with pytest.raises(NoInputError, match="no words were found"):
        build(tmp_path / "new", [str(tmp_path / "blank.txt")])
    assert not (tmp_path / "new").exists()
    with pytest.raises(NoInputError, match="no words were found"):
        add(tmp_path / "s", [str(tmp_path / "blank.txt")])
    assert content(tmp_path / "s") == before


def test_identifiers_and_metadata_from_paths(tmp_path: Path) -> None:
    for name in ("log/1871-a.txt", "log/1872-b.txt", "notice/1871-c.txt"):
        (tmp_path / "in" / name).parent.mkdir(parents=True, exist_ok=True)
        (tmp_path / "in" / name).write_text("The sea and the fog.", encoding="utf-8")
    build(tmp_path / "s", [str(tmp_path / "in")], read=ReadSettings(meta_from_path="{genre}/{year}-{id}.txt"))
    found = {name: metadata for name, _, _, metadata in content(tmp_path / "s")["documents"]}
    assert found == {
        "a": {"genre": "log", "year": 1871},
        "b": {"genre": "log", "year": 1872},
        "c": {"genre": "notice", "year": 1871},
    }


def test_without_text(tmp_path: Path) -> None:
    write_corpus(tmp_path / "a.jsonl", 1, 4)
    build(tmp_path / "s", [str(tmp_path / "a.jsonl")], keep_text=False)
    with open_for_reading(tmp_path / "s") as store, pytest.raises(UsageError, match="without its text"):
        read_text(store, 0, 5)


def test_what_is_refused(tmp_path: Path) -> None:
    write_corpus(tmp_path / "a.jsonl", 1, 4)
    with pytest.raises(NoInputError, match="missing"):
        build(tmp_path / "s", [str(tmp_path / "missing.txt")])
    with pytest.raises(CannotCreateError, match="does not exist"):
        build(tmp_path / "no" / "s", [str(tmp_path / "a.jsonl")])
    build(tmp_path / "s", [str(tmp_path / "a.jsonl")])
    with pytest.raises(NotSeenError, match="no document 'z'"):
        remove(tmp_path / "s", identifiers=["z"])
    with pytest.raises(UsageError, match="which documents"):
        remove(tmp_path / "s")


@pytest.mark.parametrize("layer", ["lemma", "upos", "lemma/upos"])
def test_plain_text_is_not_built_for_a_layer_of_annotation(tmp_path: Path, layer: str) -> None:
    write_corpus(tmp_path / "a.jsonl", 1, 4)
    with pytest.raises(UsageError, match=f"carry nothing for the layer '{layer}'"):
        build(tmp_path / "new", [str(tmp_path / "a.jsonl")], tally=TallySpec(layer=layer))
    assert not (tmp_path / "new").exists()
    build(tmp_path / "new", [str(tmp_path / "a.jsonl")])
    assert len(content(tmp_path / "new")["documents"]) == 4
