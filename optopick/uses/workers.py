"""Work done side by side: one interface, whoever does the work. Results come back in the order of the items."""

from __future__ import annotations

import os
import signal
import threading
import time
from collections import deque
from collections.abc import Callable, Iterable, Iterator
from concurrent.futures import FIRST_COMPLETED, Future, ProcessPoolExecutor, wait
from concurrent.futures.process import BrokenProcessPool
from itertools import chain, islice
from multiprocessing import get_context
from typing import Generic, Protocol, TypeVar

from optopick.errors import WorkLostError

Item = TypeVar("Item")
Answer = TypeVar("Answer")

AHEAD = 32
"""Items handed out for each worker: enough that none waits for the slow one before it, few enough to hold."""

PARENT_LOOK = 1.0
"""Seconds between two looks at whether the process that asked for the work is still there."""

TOGETHER, TRIES = 2, 4
"""How often an item that was lost is done beside others, and how often it is tried at all."""


class Workers(Protocol):
    """Calls a function of a module on every item; both must pickle.

    The answers do not depend on who does the work. An item's `str` names it in messages. Raises WorkLostError where an
    item is lost again and again.
    """

    def map(self, function: Callable[[Item], Answer], items: Iterable[Item]) -> Iterator[Answer]:
        """The answers, in the order of the items, as they come; items are taken as workers get free."""

    def as_done(self, function: Callable[[Item], Answer], items: Iterable[Item]) -> Iterator[tuple[Item, Answer]]:
        """Each item with its answer as soon as it is there, in whatever order."""


class Here:
    """One item after the other, in this process."""

    def map(self, function: Callable[[Item], Answer], items: Iterable[Item]) -> Iterator[Answer]:
        """The answers, one by one."""
        return (function(item) for item in items)

    def as_done(self, function: Callable[[Item], Answer], items: Iterable[Item]) -> Iterator[tuple[Item, Answer]]:
        """The items and their answers, one by one."""
        return ((item, function(item)) for item in items)


class Processes:
    """Processes of this machine, as many as it has cores or as told; the work of one that dies is done again."""

    def __init__(self, count: int | None = None) -> None:
        self.count = count or len(os.sched_getaffinity(0))

    def map(self, function: Callable[[Item], Answer], items: Iterable[Item]) -> Iterator[Answer]:
        """The answers in order; on an interrupt or when the caller stops early, waiting work is called off."""
        return (answer for _, answer in self._done(function, items, in_order=True))

    def as_done(self, function: Callable[[Item], Answer], items: Iterable[Item]) -> Iterator[tuple[Item, Answer]]:
        """The answers as they come, else the same."""
        return self._done(function, items, in_order=False)

    def _done(
        self, function: Callable[[Item], Answer], items: Iterable[Item], *, in_order: bool
    ) -> Iterator[tuple[Item, Answer]]:
        source = iter(items)
        some = list(islice(source, 2))
        source = chain(some, source)
        if self.count == 1 or len(some) < 2:
            yield from Here().as_done(function, source)
            return
        queue = _Queue(self.count, function)
        try:
            for item in islice(source, AHEAD * self.count):
                queue.add(item)
            while queue.waiting:
                if not in_order:
                    queue.done_first()
                yield queue.next()
                for item in islice(source, 1):
                    queue.add(item)
        finally:
            queue.close()


class _Queue(Generic[Item, Answer]):
    """Items handed to a pool of processes, in order. A pool that lost a process is replaced."""

    def __init__(self, count: int, function: Callable[[Item], Answer]) -> None:
        self.count, self.function = count, function
        self.waiting: deque[tuple[Item, Future[Answer]]] = deque()
        self.pool = _pool(count)

    def add(self, item: Item) -> None:
        """Hand out one more."""
        self.waiting.append((item, self._submit(item)))

    def done_first(self) -> None:
        """Move one that is done to the front; waits until there is one."""
        done = wait([task for _, task in self.waiting], return_when=FIRST_COMPLETED).done
        at = next(k for k, (_, task) in enumerate(self.waiting) if task in done)
        first = self.waiting[at]
        del self.waiting[at]
        self.waiting.appendleft(first)

    def next(self) -> tuple[Item, Answer]:
        """The item in front, which leaves the queue, and its answer.

        Which process died of which item nobody tells: an item that is lost is done again beside the others, and from
        then on alone.
        """
        item, task = self.waiting[0]
        for lost in range(TRIES):
            if lost:
                task = self._again(alone=lost >= TOGETHER)
            try:
                answer = task.result()
            except BrokenProcessPool:
                continue
            self.waiting.popleft()
            if lost >= TOGETHER:
                self._resubmit()
            return item, answer
        raise WorkLostError(f"{item}: given up, the process that did it died {TRIES} times")

    def close(self) -> None:
        """Call off what waits."""
        self.pool.shutdown(wait=False, cancel_futures=True)

    def _submit(self, item: Item) -> Future[Answer]:
        try:
            return self.pool.submit(self.function, item)
        except BrokenProcessPool as error:
            # told when its turn comes
            lost: Future[Answer] = Future()
            lost.set_exception(error)
            return lost

    def _again(self, *, alone: bool) -> Future[Answer]:
        """The task of the item in front, in a new pool."""
        # until the end of the old one, so that no thread runs while the new one forks
        self.pool.shutdown(wait=True, cancel_futures=True)
        self.pool = _pool(self.count)
        if not alone:
            self._resubmit()
            return self.waiting[0][1]
        return self._submit(self.waiting[0][0])

    def _resubmit(self) -> None:
        """Hand out again what has no answer."""
        self.waiting = deque((item, self._submit(item) if _is_lost(task) else task) for item, task in self.waiting)


def _is_lost(task: Future[Answer]) -> bool:
    return task.cancelled() or (task.done() and isinstance(task.exception(), BrokenProcessPool))


def _pool(count: int) -> ProcessPoolExecutor:
    return ProcessPoolExecutor(count, mp_context=get_context("fork"), initializer=_begin, initargs=(os.getpid(),))


def _begin(parent: int) -> None:
    """Ctrl-C is for the parent: it decides what to show of what is finished. Where it is killed, this one ends too."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    threading.Thread(target=_end_with, args=(parent,), daemon=True).start()


def _end_with(parent: int) -> None:
    while os.getppid() == parent:
        time.sleep(PARENT_LOOK)
    os._exit(1)
