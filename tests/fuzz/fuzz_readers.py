"""Coverage-guided fuzzing of the readers, run by hand: ``python tests/fuzz/fuzz_readers.py [-max_total_time=SECONDS]``.

Needs the library ``atheris`` (extra ``fuzz``). It starts from some hundred of
the hostile inputs of the tests. Only an error of this program that is one line
and names the file may come out of a reader; anything else stops the fuzzer.
"""

from __future__ import annotations

import sys
import tempfile
from pathlib import Path

import atheris

sys.path.insert(0, str(Path(__file__).parents[1]))

with atheris.instrument_imports(include=["colloc.text"]):
    from text.hostile import ENCODINGS, NAMES, hostile_case, read_or_refuse
    from text.samples import PACKERS

    from colloc.settings import ReadSettings

FOLDER = Path(tempfile.mkdtemp(prefix="colloc-fuzz-"))


def read_input(data: bytes) -> None:
    """The first four bytes choose format, packing, encoding and errors; the rest is the file."""
    choice = data[:4].ljust(4, b"\0")
    packed, pack = list(PACKERS.items())[choice[1] % len(PACKERS)]
    path = FOLDER / (NAMES[choice[0] % len(NAMES)] + packed)
    # Half of the packed inputs are packed soundly, so that the formats are reached through them too.
    content = pack(data[4:]) if choice[3] & 2 else data[4:]
    path.write_bytes(content or b"\n")
    settings = ReadSettings(
        max_record=2**16,
        max_unpacked=2**24,
        encoding=ENCODINGS[choice[2] % len(ENCODINGS)],
        errors="replace" if choice[3] & 1 else "strict",
    )
    read_or_refuse(path, settings)


def write_seeds(folder: Path) -> None:
    """Inputs to start from, in the form that `read_input` takes."""
    folder.mkdir()
    extensions = list(PACKERS)
    for seed in range(300):
        name, data, settings = hostile_case(seed)
        stem, _, packing = name.removeprefix("a.").partition(".")
        choice = (
            NAMES.index(f"a.{stem}"),
            extensions.index(f".{packing}" if packing else ""),
            ENCODINGS.index(settings.encoding),
            int(settings.errors == "replace"),
        )
        (folder / str(seed)).write_bytes(bytes(choice) + data)


if __name__ == "__main__":
    write_seeds(FOLDER / "seeds")
    atheris.Setup([*sys.argv, str(FOLDER / "seeds")], read_input)
    atheris.Fuzz()
