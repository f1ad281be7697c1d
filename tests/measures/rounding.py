"""Compare with a printed number to exactly the digits it was printed with."""

from __future__ import annotations

import math


def rounds_to(value: float, printed: str) -> bool:
    """Whether the value, rounded to the decimals of the printed number, is that number."""
    decimals = len(printed.partition(".")[2])
    return abs(float(value) - float(printed)) <= 0.5 * 10.0**-decimals * (1 + 1e-9)


def cuts_to(value: float, printed: str) -> bool:
    """Whether the value, cut off after the decimals of the printed number, is that number."""
    scale = 10 ** len(printed.partition(".")[2])
    return math.floor(float(value) * scale) == round(float(printed) * scale)
