"""What this processor is slow at, told to numpy before it is loaded."""

from __future__ import annotations

import os
from collections.abc import MutableMapping
from pathlib import Path

_SWITCH = "NPY_DISABLE_CPU_FEATURES"
_WIDE_VECTORS = "X86_V4 AVX512F AVX512CD AVX512_SKX AVX512_CLX AVX512_CNL AVX512_ICL AVX512_SPR"


def prefer_fast_sorting(environment: MutableMapping[str, str] | None = None) -> None:
    """Let numpy sort with the vectors that are fast here; for processes that count, before numpy is loaded.

    A value that the user has set stays. Logarithms are slower without wide vectors, so
    processes that only answer leave them on.

    Parameters
    ----------
    environment : mapping, optional
        Of a process to be started; this process's own when None.
    """
    if _stores_masked_slowly():
        (os.environ if environment is None else environment).setdefault(_SWITCH, _WIDE_VECTORS)


def _stores_masked_slowly() -> bool:
    """Whether this is a processor whose 512-bit compressing store is microcode (AMD family 25, Zen 4).

    numpy's sort is built on that instruction: with 256-bit vectors it sorts five times faster there.
    """
    try:
        text = Path("/proc/cpuinfo").read_text(encoding="ascii", errors="replace").split("\n\n", 1)[0]
    except OSError:
        return False
    facts = {name.strip(): value.strip() for name, _, value in (line.partition(":") for line in text.splitlines())}
    return (
        facts.get("vendor_id") == "AuthenticAMD"
        and facts.get("cpu family") == "25"
        and "avx512f" in facts.get("flags", "").split()
    )
