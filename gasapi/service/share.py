"""Shares of a series with very many compositions, each answered by a process of its own; ``python -m`` runs this module there.

Tracing the phase boundary of one composition takes a tenth of a second, in Python code that threads cannot share. A process
starts in a second or two, so that it pays from about a hundred compositions on. What goes over and comes back are files of
this process's own; a process that fails costs time only, since its share is then answered here.
"""

from __future__ import annotations

import os
import pickle
import subprocess
import sys
import tempfile
from pathlib import Path
from typing import Any, Final, NamedTuple, Self

__all__ = ["Share", "cores"]

_MOST_CORES: Final = 4
_QUESTION: Final = "question"
_ANSWER: Final = "answer"


def cores() -> int:
    """Return how many processes a series may use."""
    count = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1
    return min(count, _MOST_CORES)


class _Task(NamedTuple):
    """What a process is asked: the site of the context, the question and the columns of its share."""

    site: Any
    question: Any
    columns: Any


class Share:
    """A process that answers a share of the rows; to be used in a ``with`` statement.

    :param site: the site of the service, None where there is none
    :param question: the question, its equation named
    :param columns: the rows of the share
    """

    def __init__(self, site: Any, question: Any, columns: Any) -> None:
        self._task = _Task(site, question, columns)

    def __enter__(self) -> Self:
        self._folder: tempfile.TemporaryDirectory[str] | None = None
        self._process: subprocess.Popen[bytes] | None = None
        try:
            self._folder = tempfile.TemporaryDirectory(prefix="gasapi-share-")
            self._process = self._started(Path(self._folder.name))
        except OSError:
            # no room, or no more processes: the share is answered here
            self._process = None
        return self

    def _started(self, folder: Path) -> subprocess.Popen[bytes]:
        (folder / _QUESTION).write_bytes(pickle.dumps(self._task))
        return subprocess.Popen(
            [sys.executable, "-m", "gasapi.service.share", str(folder)],
            env={**os.environ, "PYTHONPATH": os.pathsep.join(path for path in sys.path if path)},
            stdin=subprocess.DEVNULL,
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
        )

    def __exit__(self, *exception: object) -> None:
        if self._process is not None and self._process.poll() is None:
            self._process.kill()
            self._process.wait()
        if self._folder is not None:
            self._folder.cleanup()

    def result(self) -> Any:
        """Return the rows and the tally of the share once they are there, None where the process failed."""
        if self._process is None or self._folder is None or self._process.wait() != 0:
            return None
        return pickle.loads((Path(self._folder.name) / _ANSWER).read_bytes())


def _main(folder: Path) -> None:
    from gasapi.gases.catalogue import Catalogue
    from gasapi.service.context import Context
    from gasapi.service.series import answer_share

    task: _Task = pickle.loads((folder / _QUESTION).read_bytes())
    catalogue = Catalogue.load()
    context = Context(catalogue) if task.site is None else Context(catalogue.with_site(task.site), task.site)
    (folder / _ANSWER).write_bytes(pickle.dumps(answer_share(context, task.question, task.columns)))


if __name__ == "__main__":
    # under its own name, so that what is unpickled is of the classes that were pickled
    from gasapi.service import share

    share._main(Path(sys.argv[1]))
