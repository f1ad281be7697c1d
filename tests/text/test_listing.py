"""Which files inputs mean: order, globs, links, loops, what is passed over, and what is refused."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from colloc.errors import CollocError, DataError, InputOutputError, NoInputError, UsageError
from colloc.text.listing import list_inputs


def touch(root: Path, *names: str) -> None:
    for name in names:
        path = root / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(name)


def identifiers(*inputs: Path | str, format: str = "auto") -> list[str]:
    return [file.identifier for file in list_inputs([str(given) for given in inputs], format).files]


def test_folders_are_walked_in_sorted_order(tmp_path: Path) -> None:
    touch(tmp_path, "b.txt", "a/z.txt", "a/b/c.txt", "B.txt", "é.txt", "a.txt", "a-b.txt")
    assert identifiers(tmp_path) == ["B.txt", "a/b/c.txt", "a/z.txt", "a-b.txt", "a.txt", "b.txt", "é.txt"]


def test_known_extensions_are_taken_and_the_rest_is_counted(tmp_path: Path) -> None:
    touch(tmp_path, "a.txt", "b.TXT.gz", "c.jsonl", "d.ndjson.zst", "e.csv.bz2", "f.tsv.xz")
    touch(tmp_path, "g.md", "h", "i.gz", ".hidden.txt", ".git/j.txt", "k.txt~")
    listing = list_inputs([str(tmp_path)])
    assert [(file.identifier, file.format.name) for file in listing.files] == [
        ("a.txt", "txt"),
        ("b.TXT.gz", "txt"),
        ("c.jsonl", "jsonl"),
        ("d.ndjson.zst", "jsonl"),
        ("e.csv.bz2", "csv"),
        ("f.tsv.xz", "tsv"),
    ]
    assert listing.ignored == 5


def test_a_named_format_chooses_in_folders_and_decides_for_named_files(tmp_path: Path) -> None:
    touch(tmp_path, "a.txt", "b.csv", "c.dat")
    assert identifiers(tmp_path, format="csv") == ["b.csv"]
    files = list_inputs([str(tmp_path / "c.dat"), str(tmp_path / "a.txt")], "tsv").files
    assert [file.format.name for file in files] == ["tsv", "tsv"]


def test_a_named_file_of_unknown_extension_is_plain_text(tmp_path: Path) -> None:
    touch(tmp_path, "notes.md")
    (file,) = list_inputs([str(tmp_path / "notes.md")]).files
    assert file.format.name == "txt"
    assert file.size == len("notes.md")
    assert file.modified == os.stat(tmp_path / "notes.md").st_mtime


def test_globs(tmp_path: Path) -> None:
    touch(tmp_path, "a/1.txt", "a/2.md", "a/sub/3.txt", "a/[x].txt", "b/4.txt")
    assert identifiers(f"{tmp_path}/a/*.txt") == ["1.txt", "[x].txt"]
    assert identifiers(f"{tmp_path}/a/*") == ["1.txt", "2.md", "[x].txt", "3.txt"]
    assert identifiers(f"{tmp_path}/**/*.txt") == ["1.txt", "[x].txt", "3.txt", "4.txt"]
    assert identifiers(f"{tmp_path}/a/[x].txt") == ["[x].txt"]


def test_a_file_named_twice_is_read_once(tmp_path: Path) -> None:
    touch(tmp_path, "a.txt", "sub/b.txt")
    (tmp_path / "c.txt").symlink_to("a.txt")
    assert identifiers(tmp_path / "sub", tmp_path, tmp_path / "a.txt", tmp_path / "sub" / ".." / "a.txt") == [
        "b.txt",
        "a.txt",
    ]


def test_identifiers_of_named_files(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    touch(tmp_path, "a.txt", "sub/b.txt", "sub/c.txt", "x/d.txt", "y/d.txt", "z/d.txt")
    monkeypatch.chdir(tmp_path / "sub")
    assert identifiers("./b.txt", "../a.txt", tmp_path / "sub" / "c.txt") == ["b.txt", "a.txt", "c.txt"]
    monkeypatch.chdir(tmp_path)
    assert identifiers("sub/b.txt") == ["sub/b.txt"]
    assert identifiers("x", "y", "z/d.txt") == ["x/d.txt", "y/d.txt", "z/d.txt"]


def test_links_are_followed_each_folder_once(tmp_path: Path) -> None:
    touch(tmp_path, "real/a.txt", "corpus/b.txt")
    (tmp_path / "corpus" / "one").symlink_to(tmp_path / "real")
    (tmp_path / "corpus" / "two").symlink_to(tmp_path / "real")
    assert identifiers(tmp_path / "corpus") == ["b.txt", "one/a.txt"]


def test_links_to_links_do_not_multiply(tmp_path: Path) -> None:
    """Forty levels of two links each would be 2^40 visits."""
    for level in range(40):
        folder = tmp_path / f"level{level:02}"
        folder.mkdir()
        for name in ("left", "right"):
            (folder / name).symlink_to(tmp_path / f"level{level + 1:02}")
    touch(tmp_path, "level40/a.txt")
    assert identifiers(tmp_path / "level10") == ["/".join(["left"] * 30 + ["a.txt"])]


def test_a_link_loop_is_refused(tmp_path: Path) -> None:
    touch(tmp_path, "corpus/a/b.txt")
    (tmp_path / "corpus" / "a" / "up").symlink_to(tmp_path / "corpus")
    with pytest.raises(DataError, match=r"corpus/a/up: a link back to a folder above it: remove the link, or name"):
        list_inputs([str(tmp_path / "corpus")])
    (tmp_path / "self").symlink_to(tmp_path / "self")
    with pytest.raises(InputOutputError, match=r"self: cannot be read: Too many levels of symbolic links"):
        list_inputs([str(tmp_path / "self")])


def test_a_broken_link_is_refused(tmp_path: Path) -> None:
    touch(tmp_path, "a.txt")
    (tmp_path / "gone.txt").symlink_to(tmp_path / "nowhere")
    with pytest.raises(NoInputError, match=r"gone\.txt: no such file or folder"):
        list_inputs([str(tmp_path)])


def test_what_is_no_file_is_passed_over_in_folders(tmp_path: Path) -> None:
    touch(tmp_path, "a.txt")
    os.mkfifo(tmp_path / "pipe.txt")
    assert identifiers(tmp_path) == ["a.txt"]
    (file,) = list_inputs([str(tmp_path / "pipe.txt")]).files
    assert file.size == -1


def test_deep_folders(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Deeper than Python recurses."""
    monkeypatch.chdir(tmp_path)
    folders = ["/".join(["d"] * depth) for depth in range(1, 1201)]
    for folder in folders:
        os.mkdir(folder)
    deepest = Path(folders[-1]) / "a.txt"
    deepest.write_text("text")
    assert identifiers("d") == [str(deepest)[2:]]
    # Removed here, since pytest's own cleaning recurses.
    deepest.unlink()
    for folder in reversed(folders):
        os.rmdir(folder)


def test_missing_and_empty_inputs(tmp_path: Path) -> None:
    (tmp_path / "empty").mkdir()
    (tmp_path / "empty.txt").write_text("")
    touch(tmp_path, "other/a.md", "full.txt")
    cases = {
        "gone.txt": r"gone\.txt: no such file or folder",
        "gone*.txt": r"gone\*\.txt: nothing matches",
        "empty": r"empty: no file to read in it: from folders those of known formats are taken \(such as \.txt\)",
        "other": r"other: no file to read in it",
        "empty.txt": r"empty\.txt: empty; name a file with text in it",
        "full.txt/x": r"full\.txt/x: cannot be read: Not a directory",
        "a\0b": r"a\\x00b: no file can have this name",
        "\ud800": r"\\ud800: no file can have this name",
    }
    for name, message in cases.items():
        with pytest.raises(CollocError, match=message) as raised:
            list_inputs([f"{tmp_path}/{name}"])
        assert raised.value.exit_code in (66, 74)
    with pytest.raises(NoInputError, match=r"'': no such file or folder"):
        list_inputs([""])
    with pytest.raises(NoInputError, match=r"no input: name files, folders, globs, or - for standard input"):
        list_inputs([])


def test_an_empty_file_among_others_is_an_empty_document(tmp_path: Path) -> None:
    (tmp_path / "a.txt").write_text("")
    touch(tmp_path, "b.txt")
    assert identifiers(tmp_path) == ["a.txt", "b.txt"]
    (tmp_path / "b.txt").write_text("")
    with pytest.raises(NoInputError, match=r"a\.txt: empty like all other inputs; name a file with text in it"):
        list_inputs([str(tmp_path)])


def test_an_unknown_format(tmp_path: Path) -> None:
    touch(tmp_path, "a.txt")
    with pytest.raises(UsageError, match=r"unknown format 'doc': choose auto, txt, jsonl, csv, tsv"):
        list_inputs([str(tmp_path)], "doc")


def test_names_that_are_not_utf8(tmp_path: Path) -> None:
    path = os.fsencode(tmp_path) + b"/caf\xe9.txt"
    with open(path, "w") as file:
        file.write("text")
    (found,) = list_inputs([str(tmp_path)]).files
    assert found.identifier == "caf\\udce9.txt"
    found.name.encode()
    assert os.fsencode(found.path) == path
