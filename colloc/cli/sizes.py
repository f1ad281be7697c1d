"""Sizes as people write them: ``2GB``, ``64 MB``, ``512k``, ``1048576``."""

from __future__ import annotations

import re

from colloc.errors import UsageError

_POWERS = {"": 0, "K": 1, "M": 2, "G": 3, "T": 4}
_SIZE = re.compile(r"\s*(\d+(?:\.\d+)?)\s*([KMGT]?)(I?B)?\s*", re.IGNORECASE)


def size_in_bytes(text: str) -> int:
    """Bytes of a written size; KB, MB, GB and TB (or K, KiB, ...) are powers of 1024.

    >>> size_in_bytes("2GB"), size_in_bytes("1.5 k"), size_in_bytes("77")
    (2147483648, 1536, 77)

    Raises
    ------
    UsageError
        For anything else, and for nothing at all.
    """
    match = _SIZE.fullmatch(text)
    size = int(float(match[1]) * 1024 ** _POWERS[match[2].upper()]) if match else 0
    if size < 1:
        raise UsageError(f"a size is a number with KB, MB, GB or TB, such as 2GB, not {text!r}")
    return size


def written_size(size: int) -> str:
    """A size as people write it: ``1.5 GB``.

    >>> [written_size(n) for n in (0, 1023, 1536, 2 * 2**30)]
    ['0 B', '1023 B', '1.5 KB', '2 GB']
    """
    power = min((max(size, 1).bit_length() - 1) // 10, 4)
    return f"{size / 1024**power:.1f}".removesuffix(".0") + f" {('B', 'KB', 'MB', 'GB', 'TB')[power]}"
