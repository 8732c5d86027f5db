"""Work done by the machines of a Dask cluster, with the interface of `workers`. Dask is an extra of the package."""

from __future__ import annotations

import logging
import socket
import sys
import threading
import time
from collections import deque
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from functools import cache
from importlib.metadata import version
from itertools import islice
from types import TracebackType
from typing import Any, Generic, Self
from urllib.parse import urlsplit

from optopick.errors import InputError, Mistake, WorkLostError
from optopick.uses.workers import AHEAD, Answer, Item

ANSWERS_WITHIN = 10.0
"""Seconds in which the scheduler must answer, and then have a worker."""

LOOK, DESERTED = 2.0, 60.0
"""Seconds between two looks at whether there is a worker, and after how many without one the work is given up."""

GLANCE = 0.01
"""Seconds between two glances at which task is done."""

TRIES = 2
"""How often an item is handed to the cluster. Each time Dask itself tries it on several workers."""

SAME = ("optopick", "numpy", "scipy", "highspy", "pyomo")
"""Packages of which every worker must have this process's version: else it might answer otherwise."""

_TURN = threading.Lock()


class Cluster:
    """The workers of the cluster whose scheduler listens at an address; to be closed, or used in a `with`.

    Raises InputError where Dask is not installed, the scheduler does not answer, or it has no worker.
    """

    def __init__(self, address: str, answers_within: float = ANSWERS_WITHIN) -> None:
        self.address = address
        self.deserted_at: float | None = None
        self.client = _connected(address, answers_within)
        try:
            self.client.wait_for_workers(1, timeout=answers_within)
        except TimeoutError:
            self.close()
            raise _refused(address, "a scheduler without a worker", "a cluster with workers (dask worker)") from None

    def __enter__(self) -> Self:
        """Itself."""
        return self

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, at: TracebackType | None) -> None:
        """Close the connection."""
        self.close()

    def close(self) -> None:
        """Leave the cluster, which goes on."""
        self.client.close()

    def map(self, function: Callable[[Item], Answer], items: Iterable[Item]) -> Iterator[Answer]:
        """The answers in order; work that a lost worker had is done again, waiting work is called off at the end."""
        return (answer for _, answer in self._done(function, items, in_order=True))

    def as_done(self, function: Callable[[Item], Answer], items: Iterable[Item]) -> Iterator[tuple[Item, Answer]]:
        """The answers as they come, else the same."""
        return self._done(function, items, in_order=False)

    def _done(
        self, function: Callable[[Item], Answer], items: Iterable[Item], *, in_order: bool
    ) -> Iterator[tuple[Item, Answer]]:
        call = _Call(function, versions())
        source = iter(items)
        waiting: deque[tuple[Item, Any]] = deque()
        try:
            for item in islice(source, AHEAD * max(1, len(self._workers()))):
                waiting.append((item, self._submit(call, item)))
            while waiting:
                if not in_order:
                    self._done_first(waiting)
                yield waiting[0][0], self._answer(call, *waiting[0])
                waiting.popleft()
                for item in islice(source, 1):
                    waiting.append((item, self._submit(call, item)))
        finally:
            self._call_off([task for _, task in waiting])

    def _done_first(self, waiting: deque[tuple[Item, Any]]) -> None:
        """Move one that is done to the front; waits until there is one."""
        looked = time.monotonic()
        while (at := next((k for k, (_, task) in enumerate(waiting) if task.done()), None)) is None:
            time.sleep(GLANCE)
            if time.monotonic() - looked > LOOK:
                self._look()
                looked = time.monotonic()
        first = waiting[at]
        del waiting[at]
        waiting.appendleft(first)

    def _submit(self, call: _Call[Item, Answer], item: Item) -> Any:  # noqa: ANN401 - a library loaded on demand
        return self.client.submit(call, item, pure=False)

    def _answer(self, call: _Call[Item, Answer], item: Item, task: Any) -> Answer:  # noqa: ANN401 - as above
        from distributed import CancelledError, KilledWorker  # noqa: PLC0415
        from distributed.comm.core import CommClosedError  # noqa: PLC0415

        tries = 1
        while True:
            try:
                answer: Answer = self._result(task)
            except KilledWorker:
                if tries == TRIES:
                    raise WorkLostError(f"{item}: given up, every worker of {self.address} that did it died") from None
                task, tries = self._submit(call, item), tries + 1
            except (CancelledError, CommClosedError):
                raise self._gone() from None
            except ImportError as error:
                expected = "the same optopick on every worker"
                raise _refused(self.address, f"a worker that cannot do the work ({error})", expected) from None
            else:
                return answer

    def _result(self, task: Any) -> Any:  # noqa: ANN401 - as above
        """A task's answer, unless the cluster is left without workers for long."""
        while True:
            try:
                return task.result(timeout=LOOK)
            except TimeoutError:
                self._look()

    def _look(self) -> None:
        """Raise WorkLostError where there has been no worker for long."""
        now = time.monotonic()
        self.deserted_at = None if self._workers() else self.deserted_at or now
        if self.deserted_at is not None and now - self.deserted_at > DESERTED:
            raise WorkLostError(f"the cluster at {self.address} has no worker left")

    def _workers(self) -> dict[str, int]:
        """Threads of each worker that is there."""
        if self.client.status != "running":
            raise self._gone()
        try:
            found: dict[str, int] = self.client.nthreads()
        except OSError:
            raise self._gone() from None
        return found

    def _gone(self) -> WorkLostError:
        return WorkLostError(f"the cluster at {self.address} is gone: its scheduler no longer answers")

    def _call_off(self, tasks: list[Any]) -> None:
        if tasks and self.client.status == "running":
            self.client.cancel(tasks)


@dataclass(frozen=True)
class _Call(Generic[Item, Answer]):
    """A function as a worker calls it: with the same packages, and one at a time however many threads it has.

    The solver's front end keeps state of the whole process.
    """

    function: Callable[[Item], Answer]
    versions: tuple[str, ...]

    def __call__(self, item: Item) -> Answer:
        if versions() != self.versions:
            pairs = zip(versions(), self.versions, strict=True)
            found = "; ".join(f"{there} on a worker, {ours} here" for there, ours in pairs if there != ours)
            raise InputError([Mistake("--cluster", found, "the same versions on every machine")])
        with _TURN:
            return self.function(item)


@cache
def versions() -> tuple[str, ...]:
    """Python and packages of this process, with their versions."""
    return (f"Python {sys.version_info.major}.{sys.version_info.minor}", *(f"{name} {version(name)}" for name in SAME))


def _connected(address: str, answers_within: float) -> Any:  # noqa: ANN401 - a library loaded on demand
    try:
        import distributed  # noqa: PLC0415
    except ImportError:
        expected = "pip install 'optopick[cluster]'"
        raise _refused(address, "an installation without the extra for clusters", expected) from None
    # what becomes of the connection is told by this module's errors
    for name in list(logging.root.manager.loggerDict):
        if name.partition(".")[0] in ("distributed", "asyncio"):
            logging.getLogger(name).setLevel(logging.CRITICAL)
    try:
        _knock(address, answers_within)
        connect: Callable[..., Any] = distributed.Client
        return connect(address, timeout=answers_within, set_as_default=False)
    except (OSError, ValueError):
        expected = "the address of a scheduler that answers, such as tcp://192.0.2.7:8786"
        raise _refused(address, "no answer", expected) from None


def _knock(address: str, answers_within: float) -> None:
    """Raise OSError or ValueError where nobody listens at an address, at which Dask would wait for long."""
    place = urlsplit(address if "://" in address else f"tcp://{address}")
    with socket.create_connection((place.hostname or "", place.port or 0), answers_within):
        pass


def _refused(address: str, found: str, expected: str) -> InputError:
    return InputError([Mistake(f"--cluster {address}", found, expected)])
