"""Results made once and remembered: a question asks, long work goes to one thread, the page stays alive.

One thread does all the computing. Loops over several cores are therefore never started from two
threads at once, and a frame that somebody waits for goes before work done ahead.
"""

from __future__ import annotations

import heapq
import itertools
import threading
import time
from collections import OrderedDict
from collections.abc import Callable, Hashable
from dataclasses import dataclass, field
from typing import Any

NOW, SOON, AHEAD = 0, 1, 2  # ranks: waited for on screen; needed next; done ahead


class Working(Exception):
    """Raised by a question while a result is being made; ``label`` says what is being done."""

    def __init__(self, key: Hashable, label: str) -> None:
        super().__init__(label)
        self.key, self.label = key, label


@dataclass(order=True)
class _Job:
    rank: int
    number: int
    key: Hashable = field(compare=False)
    make: Callable[[], Any] = field(compare=False)
    label: str = field(compare=False)
    group: str = field(compare=False)
    heavy: bool = field(compare=False)


class Results:
    """The memory and its worker; shared by all viewers of one review.

    Parameters
    ----------
    heavy : int
        How many large results (fields on the mesh) are kept; the least recently used goes first.
        Small results are kept for good.
    """

    def __init__(self, *, heavy: int = 120) -> None:
        self.heavy = heavy
        self._made: OrderedDict[Hashable, tuple[Any, Exception | None, bool]] = OrderedDict()
        self._waiting: dict[Hashable, _Job] = {}
        self._queue: list[_Job] = []
        self._numbers = itertools.count()
        self._changed = threading.Condition()
        self._listeners: set[Callable[[Hashable], None]] = set()
        self._stopped: set[str] = set()
        self._current: _Job | None = None
        self._thread: threading.Thread | None = None

    def get(
        self, key: Hashable, make: Callable[[], Any], *, label: str, rank: int = NOW, group: str = "", heavy: bool = False,
    ) -> Any:
        """The result under ``key``.

        Raises ``Working`` while it is being made, and whatever ``make`` raised once it has failed.
        """
        with self._changed:
            if key in self._made:
                value, error, _ = self._made[key]
                self._made.move_to_end(key)
                if error is not None:
                    raise error
                return value
            job = self._job(key, make, label, rank, group, heavy)
            if threading.current_thread() is not self._thread:
                self._ask(job)
                raise Working(key, label)
        return self._do(job)  # the worker itself needs it: made on the spot

    def put(self, key: Hashable, value: Any) -> None:
        """Take a result that was made elsewhere in place of the one there is."""
        with self._changed:
            self._made[key] = (value, None, False)

    def have(self, key: Hashable) -> bool:
        """Whether the result is ready (or has failed)."""
        with self._changed:
            return key in self._made

    def peek(self, key: Hashable) -> Any:
        """The result if it is ready and sound, else None; starts nothing."""
        with self._changed:
            value, error, _ = self._made.get(key, (None, None, False))
            return None if error else value

    def ahead(self, key: Hashable, make: Callable[[], Any], *, label: str, group: str, heavy: bool = False) -> None:
        """Have a result made when nothing else is waited for, unless its group was stopped."""
        with self._changed:
            if group not in self._stopped and key not in self._made and key not in self._waiting:
                self._ask(self._job(key, make, label, AHEAD, group, heavy))

    def stop(self, group: str) -> None:
        """Drop a group's work that has not begun; what is made stays."""
        with self._changed:
            self._stopped.add(group)
            for key in [k for k, job in self._waiting.items() if job.group == group and job is not self._current]:
                del self._waiting[key]
            self._queue = [j for j in self._queue if self._waiting.get(j.key) is j]
            heapq.heapify(self._queue)

    def resume(self, group: str) -> None:
        """Let a stopped group's work be asked for again."""
        with self._changed:
            self._stopped.discard(group)

    def stopped(self, group: str) -> bool:
        """Whether the group's work was stopped."""
        return group in self._stopped

    def forget(self, key: Hashable) -> None:
        """Drop one result, so that it is made anew when next asked for."""
        with self._changed:
            self._made.pop(key, None)

    def listen(self, told: Callable[[Hashable], None]) -> Callable[[], None]:
        """Call ``told(key)`` from the worker after each result; returns how to end it."""
        self._listeners.add(told)
        return lambda: self._listeners.discard(told)

    def tell(self, key: Hashable) -> None:
        """Tell all who listen that something they show has changed elsewhere."""
        for told in list(self._listeners):
            told(key)

    def wait(self, seconds: float) -> bool:
        """Wait until nothing is left to do; False when time ran out. For scripts and tests."""
        end = time.monotonic() + seconds
        with self._changed:
            while self._waiting:
                left = end - time.monotonic()
                if left <= 0:
                    return False
                self._changed.wait(left)
        return True

    def _job(self, key, make, label, rank, group, heavy) -> _Job:
        return _Job(rank, next(self._numbers), key, make, label, group, heavy)

    def _ask(self, job: _Job) -> None:
        before = self._waiting.get(job.key)
        if before is not None and (before.rank <= job.rank or before is self._current):
            return
        self._waiting[job.key] = job
        heapq.heappush(self._queue, job)
        if self._thread is None:
            self._thread = threading.Thread(target=self._work, name="results", daemon=True)
            self._thread.start()
        self._changed.notify_all()

    def _work(self) -> None:
        while True:
            with self._changed:
                while not self._queue:
                    self._changed.wait()
                job = heapq.heappop(self._queue)
                if self._waiting.get(job.key) is not job:
                    continue  # stopped, or asked again with a better rank
                self._current = job
            try:
                self._do(job)
            except Exception:  # kept with the result, and raised where it is asked for
                pass

    def _do(self, job: _Job) -> Any:
        """Make a result on the worker, keep it or its error, and tell those who listen."""
        value, error = None, None
        try:
            value = job.make()
        except Exception as failure:
            error = failure
        with self._changed:
            if self._current is job:
                self._current = None
            self._waiting.pop(job.key, None)
            self._made[job.key] = (value, error, job.heavy)
            self._let_go()
            self._changed.notify_all()
        self.tell(job.key)
        if error is not None:
            raise error
        return value

    def _let_go(self) -> None:
        heavy = [k for k, (_, _, h) in self._made.items() if h]
        for key in heavy[: max(0, len(heavy) - self.heavy)]:
            del self._made[key]
