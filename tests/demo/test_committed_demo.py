"""The committed files are what the generator makes, and have the shape that their README promises."""

from __future__ import annotations

import shutil
from collections import Counter
from itertools import pairwise
from pathlib import Path
from time import process_time
from typing import Any

import pytest

from corpora_demo import generate
from corpora_demo.vocabulary import AUTHORS


def test_committed_files_are_what_the_generator_makes(capsys: pytest.CaptureFixture[str]) -> None:
    assert generate.main(["--check"]) == 0
    assert capsys.readouterr().out == "all files are what generate.py makes\n"


def test_a_changed_or_missing_file_is_named(tmp_path: Path) -> None:
    for name in (*generate.FILES.values(), "truths.json", "README.md"):
        shutil.copy(generate.HERE / name, tmp_path)
    assert generate.different_files(tmp_path) == []
    with (tmp_path / "logbooks.jsonl").open("a", encoding="utf-8") as file:
        file.write("\n")
    (tmp_path / "truths.json").unlink()
    assert generate.different_files(tmp_path) == ["logbooks.jsonl", "truths.json"]


def test_documents_have_the_promised_shape(committed: list[dict[str, Any]]) -> None:
    assert len(committed) == generate.N_DOCUMENTS
    assert len({document["id"] for document in committed}) == len(committed)
    assert Counter(d["genre"] for d in committed) == {"log": 300, "notice": 300}
    assert set(Counter(d["year"] for d in committed).values()) == {30}
    periods = {a.name: (a.genre, a.station, range(a.first_year, a.last_year + 1)) for a in AUTHORS}
    for document in committed:
        assert list(document) == ["id", "genre", "year", "author", "station", "text"]
        genre, station, years = periods[document["author"]]
        assert (document["genre"], document["station"]) == (genre, station)
        assert document["year"] in years
    lengths = sorted(len(document["text"].split()) for document in committed)
    assert lengths[0] >= 190
    assert lengths[-2] <= 500
    assert 900_000 < sum(len(document["text"]) for document in committed) < 1_100_000


def test_text_is_clean(committed: list[dict[str, Any]]) -> None:
    for document in committed:
        text = document["text"]
        assert not {"@", "(", "_", "|"} & set(text), document["id"]
        assert "  " not in text
        assert " ." not in text
        assert " ," not in text
        for paragraph in text.split("\n"):
            assert paragraph[0].isupper()
            assert paragraph.endswith(".")
        words = text.replace("\n", " ").lower().split(" ")
        for article, word in pairwise(words):
            vowel = word[0] in "aeiou" and word.strip(".,;") not in {"useful", "usual"}
            assert article not in {"a", "an"} or (article == "an") == vowel, f"{article} {word}"


def test_seeds_decide_everything() -> None:
    first = list(generate.documents(5, 40))
    assert first == list(generate.documents(5, 40))
    assert first != list(generate.documents(6, 40))
    assert [d["id"] for d in first] == [d["id"] for d in generate.documents(6, 40)]


def test_without_the_burst_no_document_is_talkative() -> None:
    assert sum("strange" in str(d["text"]) for d in generate.documents(5, 40)) == 1
    assert sum("strange" in str(d["text"]) for d in generate.documents(5, 40, bursty=False)) == 0


def test_batches_do_not_show(monkeypatch: pytest.MonkeyPatch) -> None:
    """Years, genres and identifiers run through batches; only the draws depend on the batch size."""
    whole = [(d["id"], d["year"]) for d in generate.documents(5, 50)]
    monkeypatch.setattr(generate, "BATCH", 7)
    assert [(d["id"], d["year"]) for d in generate.documents(5, 50)] == whole


def test_generating_is_fast() -> None:
    """200,000 words a second is what simulations of hundreds of corpora need; it is about ten times faster."""
    next(generate.documents(1, 2))
    best = 0.0
    for seed in range(3):
        start = process_time()
        words = sum(str(d["text"]).count(" ") for d in generate.documents(seed, 300))
        best = max(best, words / (process_time() - start))
    assert best > 200_000
