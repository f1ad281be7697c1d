"""Whether this process uses compiled loops.

Loading the compiler's library takes most of a second, so that nothing but large
work is worth it: whoever begins such work calls `prefer_compiled`. Whatever has
a compiled form asks `compiled`, and does the same with numpy where the answer is
no. Both give the same numbers.
"""

from __future__ import annotations

import importlib.util
import os

SWITCH = "COLLOC_COMPILED"
"""Environment variable: ``0`` never, ``1`` whatever the size (an error where numba is missing), else by size."""

WORTH_BYTES = 2**24
"""Bytes of text from which on loading the compiled loops pays."""
WORTH_PAIRS = 2**24
"""Pairs of tokens to be counted, likewise."""

_state = {"on": False}


def compiled() -> bool:
    """Whether the compiled loops are to be used in this process."""
    return _state["on"]


def prefer_compiled(large: bool) -> bool:
    """Use compiled loops from now on where they can be had and the work is large.

    Returns
    -------
    bool
        What `compiled` says from now on.

    Raises
    ------
    MissingExtraError
        They are demanded by the environment, and numba is not installed.
    """
    asked = os.environ.get(SWITCH, "")
    if not _state["on"] and asked != "0" and (large or asked == "1"):
        _state["on"] = _load(demanded=asked == "1")
    return _state["on"]


def use_numpy() -> None:
    """Use numpy from now on."""
    _state["on"] = False


def _load(demanded: bool) -> bool:
    if importlib.util.find_spec("numba") is None:
        if demanded:
            from colloc.errors import MissingExtraError

            raise MissingExtraError(
                f"{SWITCH}=1 asks for compiled loops, which need numba: pip install 'colloc[fast]', or unset it"
            )
        return False
    from colloc.kernels import loading

    return loading.load()
