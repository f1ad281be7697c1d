"""``join``: expressions joined in running text."""

from __future__ import annotations

import codecs
import json
from collections.abc import Iterable, Iterator
from contextlib import ExitStack
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any, BinaryIO, Literal

import typer

from colloc.cli import options as opt
from colloc.cli.output import counted, opened, remark
from colloc.cli.tables_in import listed_expressions, opened_input
from colloc.errors import DataError, UsageError

if TYPE_CHECKING:
    from colloc.answers.joining.rewriting import Joined, Joiner

PIECE = 1 << 20
"""Bytes read at a time."""


def join(
    store: opt.StoreArgument,
    text: Annotated[Path, typer.Argument(metavar="INPUT", help="Plain text or JSON Lines; - reads standard input.")],
    expressions: Annotated[
        Path | None,
        typer.Option(
            "--expressions",
            metavar="FILE",
            help="One expression a line: words and spaces, * for any one word; a score may follow after a tab.",
        ),
    ] = None,
    accepted: Annotated[bool, typer.Option("--accepted", help="Those accepted in the store.")] = False,
    joiner: Annotated[str, typer.Option("--joiner", metavar="TEXT", help="Put between the words.")] = "_",
    layer: opt.LayerOption = None,
    across_lines: Annotated[
        bool, typer.Option("--across-lines", help="Also where a line end stands between two words; it is then lost.")
    ] = False,
    input_format: Annotated[
        Literal["auto", "txt", "jsonl"], typer.Option("--input-format", help="auto goes by the file's ending.")
    ] = "auto",
    text_column: Annotated[
        str, typer.Option("--text-column", metavar="KEY", help="What holds the text in JSON Lines.")
    ] = "text",
    offsets: Annotated[
        Path | None,
        typer.Option("--offsets", metavar="FILE", help="Also write where each expression stood and stands now."),
    ] = None,
    output: opt.OutputOption = None,
    quiet: opt.QuietOption = False,
) -> None:
    """Rewrite running text with expressions joined, longest first, overlapping ones by score.

    Nothing but blanks may stand between the words of an expression. The text is read and
    written as it comes; JSON Lines keep their other keys.
    """
    from colloc.verbs import joining

    if (expressions is None) != accepted:
        raise UsageError("say which expressions: --expressions FILE, or --accepted for those accepted in the store")
    listed = None if expressions is None else listed_expressions(expressions)
    ready = joining.make_joiner(store, listed, layer=layer, joiner=joiner, across_lines=across_lines)
    lines = input_format == "jsonl" or (input_format == "auto" and text.suffix.lower() in (".jsonl", ".ndjson"))
    count = 0
    with ExitStack() as stack:
        source = stack.enter_context(opened_input(text))
        target = stack.enter_context(opened(output))
        places = None if offsets is None else stack.enter_context(opened(offsets))
        done = (
            _records(ready, source, target, str(text), text_column)
            if lines
            else _plain(ready, source, target, str(text))
        )
        for record, joined in done:
            count += len(joined.numbers)
            if places is not None:
                _write_offsets(ready, record, joined, places)
    known = counted(len(ready.expressions), "expression", "expressions")
    remark(f"# join: {known}; {count} joined", quiet=quiet)
    pairs = joining.accepted_pairs(store, layer=layer) if accepted else 0
    if pairs:
        were = counted(pairs, "accepted pair was", "accepted pairs were")
        remark(
            f"# {were} left out: only expressions and directed pairs are words in a row (`colloc judge --kind`)",
            quiet=quiet,
        )


def _plain(ready: Joiner, source: BinaryIO, target: BinaryIO, name: str) -> Iterator[tuple[int, Joined]]:
    for joined in ready.join_stream(_decoded(source, name)):
        target.write(joined.text.encode())
        yield 0, joined


def _decoded(source: BinaryIO, name: str) -> Iterator[str]:
    decoder = codecs.getincrementaldecoder("utf-8")()
    read = 0
    while True:
        data = source.read(PIECE)
        waiting = len(decoder.getstate()[0])
        try:
            text = decoder.decode(data, final=not data)
        except UnicodeDecodeError as error:
            place = read - waiting + error.start
            raise DataError(f"{name}: not UTF-8 at byte {place}; convert the file first") from error
        read += len(data)
        if text:
            yield text
        if not data:
            return


def _records(ready: Joiner, source: BinaryIO, target: BinaryIO, name: str, column: str) -> Iterator[tuple[int, Joined]]:
    first = 0
    for records in _batches(source, name, column):
        for place, joined in enumerate(ready.join_many([record[column] for record in records])):
            records[place][column] = joined.text
            yield first + place, joined
        target.write("".join(f"{json.dumps(record, ensure_ascii=False)}\n" for record in records).encode())
        first += len(records)


def _batches(source: Iterable[bytes], name: str, column: str) -> Iterator[list[dict[str, Any]]]:
    """Records whose texts together are about as long as what is worked on at a time."""
    batch: list[dict[str, Any]] = []
    size = 0
    for number, line in enumerate(source, 1):
        if not line.strip():
            continue
        try:
            record = json.loads(line)
        except ValueError as error:
            raise DataError(f"{name}:{number}: not JSON: {error}") from error
        if not isinstance(record, dict) or not isinstance(record.get(column), str):
            raise DataError(f"{name}:{number}: no text under the key {column!r}; name it with --text-column")
        batch.append(record)
        size += len(line)
        if size >= PIECE:
            yield batch
            batch, size = [], 0
    if batch:
        yield batch


def _write_offsets(ready: Joiner, record: int, joined: Joined, places: BinaryIO) -> None:
    rows = zip(joined.spans.tolist(), joined.numbers.tolist(), strict=True)
    lines = [
        json.dumps(
            {
                "record": record,
                "start": start,
                "end": end,
                "joined_start": joined_start,
                "joined_end": joined_end,
                "expression": " ".join(ready.expressions[number].words),
            },
            ensure_ascii=False,
        )
        for (start, end, joined_start, joined_end), number in rows
    ]
    places.write("".join(f"{line}\n" for line in lines).encode())


def register(app: typer.Typer) -> None:
    """Add the command of this module."""
    app.command()(join)
