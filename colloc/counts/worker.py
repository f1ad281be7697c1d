"""A process that counts: reads tasks as lines of JSON, answers each with a line of JSON.

``python -m colloc.counts.worker STORE`` is started by `colloc.counts.processes` and ends when its input does.
"""

from __future__ import annotations

import json
import signal
import sys
from typing import TextIO

from colloc.counts.tasks import Facts, perform
from colloc.errors import CollocError
from colloc.store.opening import open_for_reading


def serve(path: str, tasks: TextIO, answers: TextIO) -> None:
    """Answer tasks until there are no more.

    An error that a user can cause is answered with its class and message; any other ends the process.
    """
    with open_for_reading(path) as store:
        for line in tasks:
            request = json.loads(line)
            try:
                answer: Facts = {"result": perform(store, request["task"], request["arguments"])}
            except CollocError as error:
                answer = {"error": type(error).__name__, "message": str(error)}
            answers.write(json.dumps(answer) + "\n")
            answers.flush()


if __name__ == "__main__":
    # an interrupt from the keyboard reaches every process of the terminal; the one that started this one ends it
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    serve(sys.argv[1], sys.stdin, sys.stdout)
