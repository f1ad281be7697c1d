"""One key at a time from a terminal, without waiting for Enter."""

from __future__ import annotations

import contextlib
import os
import sys
from collections.abc import Iterator

from colloc.errors import UsageError

END = ""
"""What is read where there are no more keys."""
_ESCAPE = "\x1b"


def check_terminal(instead: str) -> None:
    """Raise UsageError where nobody can press keys and see what they do.

    Parameters
    ----------
    instead : str
        What can be done without a terminal.
    """
    if not (sys.stdin.isatty() and sys.stdout.isatty()):
        raise UsageError(f"deciding by keys needs a terminal for input and output; without one {instead}")


class Keys:
    """Keys as they are pressed; control-C interrupts as everywhere."""

    def __init__(self) -> None:
        self._ahead = ""

    def read(self) -> str:
        """The next key: a character, or ``END``. Arrows and other keys that send an escape sequence are passed over."""
        while True:
            if not self._ahead:
                self._ahead = _pressed()
            if not self._ahead:
                return END
            key, self._ahead = self._ahead[0], self._ahead[1:]
            if key == "\x04":
                return END
            if key != _ESCAPE:
                return key
            if self._ahead[:1] in ("[", "O"):
                self._ahead = self._after_sequence(self._ahead[1:])

    @staticmethod
    def _after_sequence(rest: str) -> str:
        """What follows a control sequence: its parameters end at a character from ``@`` to ``~`` (ECMA-48, 5.4)."""
        for place, character in enumerate(rest):
            if "@" <= character <= "~":
                return rest[place + 1 :]
        return ""


if sys.platform == "win32":

    def _pressed() -> str:
        import msvcrt

        key = msvcrt.getwch()
        if key in ("\x00", "\xe0"):  # the first half of a function key
            msvcrt.getwch()
            return _ESCAPE
        if key == "\x03":
            raise KeyboardInterrupt
        return key

else:

    def _pressed() -> str:
        with _unbuffered(sys.stdin.fileno()) as descriptor:
            data = os.read(descriptor, 1024)
            # A character of several bytes can be cut at the end of what was read.
            while data and _incomplete(data):
                data += os.read(descriptor, 1)
        return data.decode("utf-8", "replace")

    @contextlib.contextmanager
    def _unbuffered(descriptor: int) -> Iterator[int]:
        import termios
        import tty

        before = termios.tcgetattr(descriptor)
        try:
            tty.setcbreak(descriptor)
            yield descriptor
        finally:
            termios.tcsetattr(descriptor, termios.TCSADRAIN, before)


def _incomplete(data: bytes) -> bool:
    try:
        data.decode()
    except UnicodeDecodeError as error:
        return error.reason == "unexpected end of data"
    return False
