"""CoNLL-U Plus, tables of words, documents and their names; lines of annotated text; interrupted builds."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

import colloc
from colloc.build import batches, building
from colloc.build.estimating import estimate
from colloc.build.segmenting import SegmentedBatch
from colloc.build.writing import StreamWriter
from colloc.errors import StoreDamagedError, UsageError
from colloc.exports.conllu import conllu_text
from colloc.settings import ReadSettings
from colloc.store import documents, stream, texts
from colloc.store.annotation import read_rests
from colloc.store.database import packing
from colloc.store.opening import open_for_reading, open_for_writing
from colloc.text.sources import open_sources

from .treebanks import read_sentences, relation_counts, treebank

pytestmark = pytest.mark.usefixtures("loops")

PLUS = """# global.columns = ID FORM UPOS HEAD DEPREL MISC PARSEME:MWE
# newdoc id = one
# sent_id = 1
1\tshe\tPRON\t2\tnsubj\t_\t*
2\tgave\tVERB\t0\troot\t_\t1:VID
3\tit\tPRON\t2\tobj\t_\t*
4\tup\tADP\t2\tcompound:prt\tSpaceAfter=No\t1
5\t.\tPUNCT\t2\tpunct\t_\t*

"""
TABLE = "form\tlemma\tupos\nseas\tsea\tNOUN\nring\tring\tVERB\n\n#\t#\tSYM\nbells\tbell\tNOUN\n"


def _text(path: Path, *, number: int = 0) -> str:
    with open_for_reading(path) as store:
        row = documents.document(store, number)
        return texts.read_text(store, row.first_character, row.first_character + row.n_characters)


def _written(path: Path) -> str:
    with open_for_reading(path) as store:
        return "".join(conllu_text(store))


@pytest.mark.parametrize("name", ["a.conllup", "a.cupt", "a.conllu"])
def test_named_columns(tmp_path: Path, name: str) -> None:
    (tmp_path / name).write_text(PLUS, encoding="utf-8")
    colloc.build(tmp_path / "s", [str(tmp_path / name)])
    assert _written(tmp_path / "s") == PLUS
    assert _text(tmp_path / "s") == "she gave it up."
    row = colloc.pairs(tmp_path / "s", relation="compound:prt", min_count=1, any_strength=True).to_dicts()[0]
    assert (row["first"], row["second"], row["joint"]) == ("gave", "up", 1)


def test_table_of_words(tmp_path: Path) -> None:
    (tmp_path / "a.tokens").write_text(TABLE, encoding="utf-8")
    colloc.build(tmp_path / "s", [str(tmp_path / "a.tokens")])
    answer = colloc.words(tmp_path / "s", layer="lemma/upos", sort="word", limit=0)
    assert sorted(answer["word"].tolist()) == ["#/SYM", "bell/NOUN", "ring/VERB", "sea/NOUN"]
    assert _written(tmp_path / "s") == "# global.columns = FORM LEMMA UPOS\n" + TABLE.partition("\n")[2] + "\n"
    with pytest.raises(UsageError, match="annotated text"):
        colloc.pairs(tmp_path / "s", relation="obj")


def test_table_of_words_by_format(tmp_path: Path) -> None:
    """Columns in any order, with heads but no identifiers, under a name that tells another format."""
    (tmp_path / "a.tsv").write_text("deprel\thead\tform\nroot\t0\trings\nobj\t1\tbells\n\n", encoding="utf-8")
    colloc.build(tmp_path / "s", [str(tmp_path / "a.tsv")], read=ReadSettings(format="tokens"))
    answer = colloc.pairs(tmp_path / "s", relation="obj", min_count=1, any_strength=True).to_dicts()
    assert [(row["first"], row["second"]) for row in answer] == [("rings", "bells")]


def test_only_forms(tmp_path: Path) -> None:
    (tmp_path / "a.tokens").write_text("form\nsea\nbells\n\n# a comment\nring\n", encoding="utf-8")
    colloc.build(tmp_path / "s", [str(tmp_path / "a.tokens")])
    with open_for_reading(tmp_path / "s") as store:
        assert stream.read_block(store, 0).sentences.tolist() == [0, 2]
    assert _written(tmp_path / "s") == "# global.columns = FORM\nsea\nbells\n\n# a comment\nring\n\n"


def test_documents_have_names_and_metadata(tmp_path: Path) -> None:
    word = "1\tsea\tsea\tNOUN\t_\t_\t0\troot\t_\t_\n\n"
    text = (
        f"# licence: a comment of its own\n\n# sent_id = 1\n# newdoc id = one\n# meta::year = 1990\n{word}"
        f"# newdoc\n{word}{word}# newdoc id = three\n# meta::title = On the Sea\n{word}"
    )
    (tmp_path / "a.conllu").write_text(text, encoding="utf-8", newline="\r\n")
    source = next(iter(open_sources([str(tmp_path / "a.conllu")], ReadSettings())))
    found = [
        (one.identifier, dict(one.metadata), b"".join(one.sentences).count(b"sea\tsea")) for one in source.documents()
    ]
    assert found == [
        ("one", {"year": 1990}, 1),
        ("a.conllu:2", {}, 2),
        ("three", {"title": "On the Sea"}, 1),
    ]
    colloc.build(tmp_path / "s", [str(tmp_path / "a.conllu")])
    assert _written(tmp_path / "s").replace("\n\n", "\n") == text.replace("\n\n", "\n")


def test_a_file_without_newdoc_is_a_document(tmp_path: Path) -> None:
    (tmp_path / "a.conllu").write_text("1\tsea\tsea\tNOUN\t_\t_\t0\troot\t_\t_", encoding="utf-8")
    colloc.build(tmp_path / "s", [str(tmp_path / "a.conllu")])
    with open_for_reading(tmp_path / "s") as store:
        assert documents.document(store, 0).identifier == "a.conllu"
    assert _text(tmp_path / "s") == "sea"


def test_multiword_tokens_and_spaces(tmp_path: Path) -> None:
    """Offsets of words: those of a multiword token that spells them out, and of one that does not."""
    rows = [
        ("1-2", "du", "_"),
        ("1", "de", "_"),
        ("2", "le", "_"),
        ("3", "pain", "SpaceAfter=No"),
        ("4-5", "don't", "SpaceAfter=No"),
        ("4", "do", "_"),
        ("5", "n't", "_"),
        ("6", "!", "_"),
    ]
    text = "".join(f"{word}\t{form}" + "\t_" * 4 + f"\t_\t_\t_\t{misc}\n" for word, form, misc in rows) + "\n"
    (tmp_path / "a.conllu").write_text(text, encoding="utf-8")
    colloc.build(tmp_path / "s", [str(tmp_path / "a.conllu")])
    assert _text(tmp_path / "s") == "du paindon't!"
    shown = {}
    for word in ("de", "le", "pain", "do", "n't", "!"):
        row = colloc.lines(tmp_path / "s", word).to_dicts()[0]
        shown[word] = row["match"], row["character"]
    assert shown == {
        "de": ("du", 0),
        "le": ("du", 0),
        "pain": ("pain", 3),
        "do": ("do", 7),
        "n't": ("n't", 9),
        "!": ("!", 12),
    }
    assert _written(tmp_path / "s") == text


def test_lines_show_each_word_where_it_is(store_path: Path, text: str) -> None:
    with open_for_reading(store_path) as store:
        for word in ("'s", ",", "sea"):
            answer = colloc.lines(store, word, limit=50, sort="text")
            for row in answer.to_dicts():
                number = documents.find_document(store, row["document"])
                assert number is not None
                document = documents.document(store, number)
                start = document.first_character + row["character"]
                assert texts.read_text(store, start, start + len(row["match"])) == row["match"]
                if "-" not in row["match"] and row["match"] not in ("du", "cannot"):
                    assert row["match"].casefold() == word


def test_interrupted_builds_go_on(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Stopped in the second file, a build goes on behind the last document that was committed."""
    inputs = [str(tmp_path / "1.conllu"), str(tmp_path / "2.conllu")]
    for seed, name in enumerate(inputs, 1):
        Path(name).write_text(treebank(seed), encoding="utf-8")
    monkeypatch.setattr(batches, "BATCH_CHARACTERS", 5000)
    append, written = StreamWriter.append, [0]

    def stop(writer: StreamWriter, batch: SegmentedBatch) -> None:
        written[0] += 1
        if written[0] == 9:
            raise KeyboardInterrupt
        append(writer, batch)

    with monkeypatch.context() as patch:
        patch.setattr(StreamWriter, "append", stop)
        with pytest.raises(KeyboardInterrupt):
            building.build(tmp_path / "s", inputs, jobs=1)
    with open_for_reading(tmp_path / "s") as store:
        assert stream.token_count(store) > 0
        assert documents.find_document(store, "d2-5") is None
    building.build(tmp_path / "s", inputs, jobs=1)
    assert _written(tmp_path / "s") == treebank(1) + treebank(2)
    pairs = colloc.pairs(tmp_path / "s", relation="amod", layer="lemma", min_count=1, any_strength=True, limit=0)
    counts = relation_counts(treebank(1) + treebank(2))
    own = {(head, other): n for (name, head, other), n in counts.items() if name == "amod"}
    assert {(row["first"], row["second"]): row["joint"] for row in pairs.to_dicts()} == own


def test_repeats(tmp_path: Path) -> None:
    for name in ("1.conllu", "2.conllu"):
        (tmp_path / name).write_text(PLUS.replace("# newdoc id = one\n", ""), encoding="utf-8")
    inputs = [str(tmp_path / "1.conllu"), str(tmp_path / "2.conllu")]
    report = colloc.build(tmp_path / "s", inputs, read=ReadSettings(skip_duplicates="document"))
    assert report.read.repeated_documents == 1
    with pytest.raises(UsageError, match="plain text"):
        colloc.build(tmp_path / "t", inputs, read=ReadSettings(skip_duplicates="paragraph"))


def test_documents_of_different_columns_are_not_written_together(tmp_path: Path) -> None:
    (tmp_path / "a.conllup").write_text(PLUS, encoding="utf-8")
    (tmp_path / "b.conllu").write_text(treebank(1, 1, 1), encoding="utf-8")
    colloc.build(tmp_path / "s", [str(tmp_path / "a.conllup"), str(tmp_path / "b.conllu")])
    with pytest.raises(UsageError, match="other columns"):
        _written(tmp_path / "s")


def test_the_first_layout_of_rests_is_read(tmp_path: Path) -> None:
    """One JSON object, as docs/file-format.md tells it; and damage to the present one is found."""
    (tmp_path / "a.conllu").write_text(treebank(1, 1, 3), encoding="utf-8")
    colloc.build(tmp_path / "s", [str(tmp_path / "a.conllu")])
    with open_for_writing(tmp_path / "s", "test") as store:
        ((block, rest),) = read_rests(store, 0)
        old = {
            "columns": rest.columns,
            "texts": rest.texts,
            "before": rest.before,
            "after": rest.after,
            "changed": rest.changed,
        }
        for data in (json.dumps(old).encode(), json.dumps({**old, "sizes": [1, 2]}).encode() + b"\nabcd"):
            with store.transaction():
                store.execute("UPDATE annotation_rests SET data = ?", (packing.pack_bytes(data),))
            if data.endswith(b"d"):
                with pytest.raises(StoreDamagedError, match="annotation of document 0 in block 0: cannot be read"):
                    [*read_rests(store, 0)]
            else:
                assert [*read_rests(store, 0)] == [(block, rest)]
                assert "".join(conllu_text(store)) == treebank(1, 1, 3)


def test_plain_text_is_not_written(tmp_path: Path) -> None:
    (tmp_path / "a.txt").write_text("the sea", encoding="utf-8")
    colloc.build(tmp_path / "s", [str(tmp_path / "a.txt")])
    with pytest.raises(colloc.errors.NotSeenError, match="no annotated document"):
        _written(tmp_path / "s")


def test_estimates_know_annotated_text(tmp_path: Path) -> None:
    (tmp_path / "a.conllu").write_text(treebank(1), encoding="utf-8")
    (tmp_path / "b.tokens").write_text(TABLE, encoding="utf-8")
    (tmp_path / "c.txt").write_text("five words of plain text", encoding="utf-8")
    words = sum(map(len, read_sentences(treebank(1))))
    found = estimate(tmp_path / "s", [str(tmp_path / name) for name in ("a.conllu", "b.tokens", "c.txt")])
    assert found.sampled_tokens == words + 4 + 5
