"""Worker processes of this machine, replaced when they die.

Each worker is an executor of one process. When one breaks there is no doubt which model it was busy
with, and nobody else is touched.
"""

from __future__ import annotations

import contextlib
import logging
import multiprocessing
import multiprocessing.connection
import os
import queue
import signal
import threading
from collections import deque
from collections.abc import Iterator
from concurrent.futures import BrokenExecutor, Future, ProcessPoolExecutor
from dataclasses import dataclass
from typing import Any

from oscsolve.errors import InputError
from oscsolve.grid.crew import HELD, MOST_DEATHS, Report, worded
from oscsolve.grid.plan import Planned
from oscsolve.grid.work import Settings, introduce, solve_planned
from oscsolve.pulsation.cache import compile_may_be_due

_log = logging.getLogger(__name__)

#: Seconds that a worker has to end.
_FAREWELL = 5.0


@dataclass(eq=False)
class _Held:
    """A model that a worker has; `planned` is None for its introduction."""

    place: int
    planned: Planned | None
    future: Future[Any]
    generation: int


class OwnWorkers:
    """Worker processes of this machine.

    Raises
    ------
    InputError
        Worker processes cannot be started.
    """

    def __init__(self, workers: int, settings: Settings) -> None:
        self._settings = settings
        self._done: queue.SimpleQueue[_Held] = queue.SimpleQueue()
        self._reports: deque[Report] = deque()
        self._deaths: dict[str, int] = {}
        self._places = [_Place() for _ in range(workers)]
        try:
            # Compiled code that is missing is made by the first worker and found by the others.
            due = compile_may_be_due()
            self._start(0, settings if due else None)
            if due:
                self._meet(self._done_within(None))
            for place in range(1, workers):
                self._start(place, None)
        except BaseException:
            self.stop()
            raise

    @property
    def workers(self) -> int:
        return len(self._places)

    def wants(self) -> int | None:
        held = [len(place.held) for place in self._places]
        least = min(held)
        return held.index(least) if least < HELD else None

    def give(self, place: int, planned: Planned) -> None:
        self._submit(place, planned, solve_planned, planned, self._settings)

    def take(self, timeout: float) -> Report | None:
        while not self._reports:
            try:
                held = self._done_within(timeout)
            except queue.Empty:
                return None
            self._meet(held)
        return self._reports.popleft()

    def stop(self) -> None:
        for place in self._places:
            place.stop(at_once=bool(place.held))
        for place in self._places:
            place.wait()

    def _done_within(self, timeout: float | None) -> _Held:
        return self._done.get(timeout=timeout)

    def _start(self, number: int, warm_up: Settings | None) -> None:
        self._places[number].start()
        self._submit(number, None, introduce, warm_up)

    def _submit(self, number: int, planned: Planned | None, call: Any, *arguments: Any) -> None:
        place = self._places[number]
        assert place.executor is not None
        try:
            with _deaf():
                future = place.executor.submit(call, *arguments)
        except BrokenExecutor as error:
            # The worker died while it was idle, and nobody has noticed yet.
            future = Future()
            future.set_exception(error)
        held = _Held(number, planned, future, place.generation)
        place.held.append(held)
        future.add_done_callback(lambda _: self._done.put(held))

    def _meet(self, held: _Held) -> None:
        """Turn one future that is done into a report, or start a worker anew."""
        place = self._places[held.place]
        if held.generation != place.generation:
            return  # of a worker that is gone: dealt with when that was noticed
        error = held.future.exception()
        if isinstance(error, BrokenExecutor):
            self._replace(held.place)
            return
        place.held.remove(held)
        if held.planned is None:
            if error is not None:
                raise error
        elif error is not None:
            self._reports.append(Report(held.planned, None, worded(error)))
        else:
            self._reports.append(Report(held.planned, held.future.result()))

    def _replace(self, number: int) -> None:
        """A worker died: the model it was busy with is tried once more, the others again."""
        place = self._places[number]
        lost, place.held = place.held, deque()
        place.stop(at_once=True)
        busy = lost[0].planned
        if busy is None:
            place.failed_starts += 1
            if place.failed_starts == MOST_DEATHS:
                raise InputError(
                    "worker processes die as they start. In a script, call solve_grid under "
                    "'if __name__ == \"__main__\":'; otherwise check memory and limits"
                )
        else:
            place.failed_starts = 0
            _log.warning("a worker died with %s", busy.source or busy.name)
            deaths = self._deaths[busy.key] = self._deaths.get(busy.key, 0) + 1
            if deaths == MOST_DEATHS:
                lost.popleft()
                self._reports.append(
                    Report(busy, None, f"its worker process died {deaths} times: out of memory?")
                )
        self._start(number, None)
        for held in lost:
            if held.planned is not None:
                self.give(number, held.planned)


class _Context(multiprocessing.context.SpawnContext):
    """Starts processes and remembers them: an executor does not say which are its own."""

    def __init__(self) -> None:
        super().__init__()
        self.processes: list[Any] = []

    def Process(self, *arguments: Any, **keywords: Any) -> Any:  # type: ignore[override]
        process = multiprocessing.context.SpawnProcess(*arguments, **keywords)
        self.processes.append(process)
        return process


class _Place:
    """One worker process and the models it holds, oldest first."""

    def __init__(self) -> None:
        self.executor: ProcessPoolExecutor | None = None
        self.held: deque[_Held] = deque()
        self.generation = 0
        self.failed_starts = 0
        self._context = _Context()

    def start(self) -> None:
        """A process that is new."""
        self.generation += 1
        self._context = _Context()
        self.executor = ProcessPoolExecutor(1, mp_context=self._context, initializer=_settle_in)

    def stop(self, *, at_once: bool) -> None:
        """End the process, at once or when it is idle."""
        if self.executor is not None:
            self.executor.shutdown(wait=False, cancel_futures=True)
        self.executor = None
        if at_once:
            for process in self._context.processes:
                with contextlib.suppress(OSError, ValueError):
                    process.terminate()

    def wait(self) -> None:
        """Wait until the process is gone."""
        sentinels = [process.sentinel for process in self._context.processes if process.pid]
        multiprocessing.connection.wait(sentinels, _FAREWELL)
        for process in self._context.processes:
            with contextlib.suppress(OSError, ValueError):
                process.kill()


def refuse_recursion() -> None:
    """A script without a guard runs again in each worker that it starts; end that at once."""
    if getattr(multiprocessing.current_process(), "_inheriting", False):
        raise InputError(
            "solve_grid starts processes, which import this script again: call it under "
            "'if __name__ == \"__main__\":'"
        )


@contextlib.contextmanager
def _deaf() -> Iterator[None]:
    """Hold interrupts back for a moment: processes started in it never hear them.

    A handler set by the new process itself would come too late for one that is just importing.
    """
    if not hasattr(signal, "pthread_sigmask"):
        yield
        return
    before = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT})
    try:
        yield
    finally:
        signal.pthread_sigmask(signal.SIG_SETMASK, before)


def _settle_in() -> None:
    """First thing in a worker process: leave interrupts to the parent, and leave with it."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    parent = multiprocessing.parent_process()
    if parent is not None:
        threading.Thread(target=_leave_with, args=(parent,), daemon=True).start()


def _leave_with(parent: Any) -> None:
    parent.join()
    os._exit(1)
