"""Progress on a terminal: share done, rate, time remaining."""

from __future__ import annotations

import sys
import time
from types import TracebackType
from typing import Protocol, Self, TextIO

INTERVAL = 0.2
"""Seconds between two drawings."""


class Progress(Protocol):
    """What long work calls: share done (0..1), tokens so far, and what is being done."""

    def __call__(self, done: float, tokens: int, phase: str) -> None: ...


class ProgressLine:
    """One line on standard error, redrawn in place; nothing at all where that is not a terminal.

    Use as a context manager: leaving it wipes the line.
    """

    def __init__(self, *, quiet: bool = False, stream: TextIO | None = None) -> None:
        self._stream = stream if stream is not None else sys.stderr
        self._shown = not quiet and self._stream.isatty()
        self._started = self._drawn = time.monotonic()
        self._phase = ""
        self._length = 0

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self._length:
            self._draw("")

    def __call__(self, done: float, tokens: int, phase: str) -> None:
        now = time.monotonic()
        if phase != self._phase:
            self._phase, self._started = phase, now
        elif now - self._drawn < INTERVAL:
            return
        if self._shown:
            self._drawn = now
            self._draw(progress_text(done, tokens, phase, now - self._started))

    def _draw(self, text: str) -> None:
        self._stream.write("\r" + text.ljust(self._length) + ("" if text else "\r"))
        self._stream.flush()
        self._length = len(text)


def progress_text(done: float, tokens: int, phase: str, seconds: float) -> str:
    """``counting  42 %  1.21 M tokens/s  0:35 left``; rate and time only once they can be told."""
    parts = [phase, f"{100 * min(max(done, 0.0), 1.0):3.0f} %"]
    if seconds >= 1 and tokens:
        parts.append(f"{tokens / seconds / 1e6:.2f} M tokens/s")
    if seconds >= 1 and done > 0.01:
        parts.append(f"{clock(seconds * (1 - done) / done)} left")
    return "  ".join(parts)


def clock(seconds: float) -> str:
    """Hours, minutes and seconds.

    >>> [clock(s) for s in (4.4, 75, 3601)]
    ['0:04', '1:15', '1:00:01']
    """
    whole = max(round(seconds), 0)
    hours, minutes, rest = whole // 3600, whole // 60 % 60, whole % 60
    return f"{hours}:{minutes:02}:{rest:02}" if hours else f"{minutes}:{rest:02}"
