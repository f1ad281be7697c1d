"""JSON Lines: one object a line, one document an object.

The text column becomes the text, the others metadata; nested values are kept
as JSON text. Lines end with LF alone (jsonlines.org); empty lines are passed
over. RFC 8259 knows no NaN or Infinity, and neither does this reader.
"""

from __future__ import annotations

import itertools
import json
import math
import re
from collections.abc import Iterator
from typing import Any, NoReturn

from colloc.records import Document, MetaValue
from colloc.text.lines import newline_lines, record_document
from colloc.text.opening import Opened

_BLANK = " \t\r"
_SURROGATE = re.compile(r"\\u[dD][89a-fA-F]")
_LARGEST_INTEGER = 2**63 - 1


class _RepeatedKeyError(Exception):
    pass


def _object(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    found = dict(pairs)
    if len(found) != len(pairs):
        keys = [key for key, _ in pairs]
        raise _RepeatedKeyError(next(key for key in keys if keys.count(key) > 1))
    return found


def _no_constant(name: str) -> NoReturn:
    raise ValueError(f"{name} is not JSON")


_DECODER = json.JSONDecoder(object_pairs_hook=_object, parse_constant=_no_constant)


def read(opened: Opened, skip: int) -> Iterator[Document]:
    """One document for each object from record ``skip`` on; what comes before is not parsed.

    Raises
    ------
    DataError
        ``file:line: ...`` for wrong JSON, a missing or repeated column, text that is not a string.
    """
    for record, (number, value) in enumerate(objects(opened, skip), skip):
        yield _document(opened, record, number, value)


def objects(opened: Opened, skip: int = 0) -> Iterator[tuple[int, dict[str, Any]]]:
    """Line number and object of each record from ``skip`` on.

    Raises
    ------
    DataError
        ``file:line: ...`` for wrong JSON, a repeated column, a value that is no object, a line that is too long.
    """
    lines = ((number, line) for number, line in enumerate(newline_lines(opened), 1) if not _is_blank(line))
    for number, line in itertools.islice(lines, skip, None):
        yield number, _parse(opened, number, line)


def _is_blank(line: str) -> bool:
    return line[:1] in _BLANK and not line.strip(_BLANK)


def _parse(opened: Opened, number: int, line: str) -> dict[str, Any]:
    try:
        value = _DECODER.decode(line)
    except json.JSONDecodeError as error:
        raise opened.error(f"not JSON: {error.msg} (column {error.colno}); correct the line", number) from error
    except _RepeatedKeyError as error:
        raise opened.error(f"column {error.args[0]!r} occurs twice in one record; rename one", number) from error
    except RecursionError as error:
        raise opened.error("JSON nested too deeply; flatten the record", number) from error
    except ValueError as error:
        raise opened.error(f"not JSON: {error}; correct the line", number) from error
    if not isinstance(value, dict):
        raise opened.error('a JSON object was expected, such as {"text": "..."}; correct the line', number)
    if _SURROGATE.search(line):
        _check_surrogates(opened, number, value)
    return value


def _check_surrogates(opened: Opened, number: int, value: dict[str, Any]) -> None:
    try:
        json.dumps(value, ensure_ascii=False).encode()
    except UnicodeEncodeError as error:
        code = ord(error.object[error.start])
        raise opened.error(
            f"half a surrogate pair (\\u{code:04x}) is no character; correct the escape", number
        ) from error


def _document(opened: Opened, record: int, number: int, value: dict[str, Any]) -> Document:
    settings = opened.settings
    text_column, id_column = settings.text_column, settings.id_column or "id"
    if text_column not in value:
        names = ", ".join(map(repr, list(value)[:10])) or "none"
        raise opened.error(f"no column {text_column!r} (columns: {names}); name the text column", number)
    text = value.pop(text_column)
    if not isinstance(text, str):
        raise opened.error(f"column {text_column!r} holds {_kind(text)}, not text; correct it", number)
    identifier = value.pop(id_column, None)
    if isinstance(identifier, (dict, list)) or (settings.id_column and identifier in (None, "")):
        raise opened.error(f"column {id_column!r} holds no identifier; give each record one", number)
    columns = {key: item if type(item) is str else metadata(opened, number, key, item) for key, item in value.items()}
    return record_document(opened, record, text, None if identifier == "" else identifier, columns)


def _kind(value: object) -> str:
    names = {dict: "an object", list: "a list", bool: "true or false", type(None): "null"}
    return names.get(type(value), "a number")


def metadata(opened: Opened, number: int, key: str, value: Any) -> MetaValue:
    """A column's value as metadata: nested values as JSON text, integers beyond 64 bits as digits.

    Raises
    ------
    DataError
        For a number beyond the range of a float.
    """
    if isinstance(value, (dict, list)):
        return json.dumps(value, ensure_ascii=False)
    if isinstance(value, float) and not math.isfinite(value):
        raise opened.error(f"column {key!r} holds a number too large to keep; write it as a string", number)
    if isinstance(value, int) and abs(value) > _LARGEST_INTEGER:
        return str(value)
    return value  # type: ignore[no-any-return]
