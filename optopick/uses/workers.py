"""Work done side by side: one interface, whoever does the work. Results come back in the order of the items."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from multiprocessing import get_context
from typing import Protocol, TypeVar

Item = TypeVar("Item")
Answer = TypeVar("Answer")


class Workers(Protocol):
    """Calls a function of a module on every item; both must pickle."""

    def map(self, function: Callable[[Item], Answer], items: Sequence[Item]) -> Iterator[Answer]:
        """The answers, in the order of the items, as they come."""


class Here:
    """One item after the other, in this process."""

    def map(self, function: Callable[[Item], Answer], items: Sequence[Item]) -> Iterator[Answer]:
        """The answers, one by one."""
        return (function(item) for item in items)


class Processes:
    """Processes of this machine, as many as it has cores or as told."""

    def __init__(self, count: int | None = None) -> None:
        self.count = count or len(os.sched_getaffinity(0))

    def map(self, function: Callable[[Item], Answer], items: Sequence[Item]) -> Iterator[Answer]:
        """The answers in order; on an interrupt or when the caller stops early, waiting work is called off."""
        if self.count == 1 or len(items) < 2:
            yield from Here().map(function, items)
            return
        pool = ProcessPoolExecutor(self.count, mp_context=get_context("fork"), initializer=_leave_interrupts_alone)
        try:
            waiting = [pool.submit(function, item) for item in items]
            for task in waiting:
                yield task.result()
        finally:
            pool.shutdown(wait=False, cancel_futures=True)


def _leave_interrupts_alone() -> None:
    """Ctrl-C is for the parent: it decides what to show of what is finished."""
    import signal  # noqa: PLC0415

    signal.signal(signal.SIGINT, signal.SIG_IGN)
