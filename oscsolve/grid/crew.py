"""The workers of a grid: own processes that are replaced when they die, or anybody's executor.

Own workers are executors of one process each. When one of them breaks there is no doubt which model
it was busy with, and nobody else is touched.
"""

from __future__ import annotations

import contextlib
import logging
import math
import multiprocessing
import multiprocessing.connection
import os
import queue
import signal
import threading
import time
from collections import deque
from collections.abc import Callable, Iterator
from concurrent.futures import BrokenExecutor, CancelledError, Future, ProcessPoolExecutor
from dataclasses import dataclass
from typing import Any, Protocol

from oscsolve.errors import IncompleteError, InputError
from oscsolve.grid.plan import Planned
from oscsolve.grid.work import Outcome, Settings, introduce, solve_planned
from oscsolve.pulsation.cache import compile_is_due
from oscsolve.version import __version__

_log = logging.getLogger(__name__)

#: Models that each worker holds: the one it works on and one that waits behind it, so that it never
#: waits for the writer.
_HELD = 2
#: A model that has ended so many workers is not tried again.
_MOST_DEATHS = 2
#: Seconds between two looks at how many workers a cluster has, and between two complaints.
_LOOK_AGAIN, _COMPLAIN = 5.0, 30.0
#: Seconds that a worker has to end.
_FAREWELL = 5.0


@dataclass(frozen=True, eq=False)
class Report:
    """One model that came back: its outcome, or why it has none."""

    planned: Planned
    outcome: Outcome | None
    reason: str = ""


class Crew(Protocol):
    """Takes models and reports them, in any order."""

    @property
    def workers(self) -> int:
        """How many work side by side."""

    def wants(self) -> int | None:
        """A place that could take one more model now, or None."""

    def give(self, place: int, planned: Planned) -> None:
        """Hand a model to a place that wanted one."""

    def take(self, timeout: float) -> Report | None:
        """The next model that came back, or None where nothing did in `timeout` seconds."""

    def stop(self) -> None:
        """End the workers; what they hold is given up."""


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
            self._start(0, settings if compile_is_due() else None)
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
        return held.index(least) if least < _HELD else None

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
            self._reports.append(Report(held.planned, None, _worded(error)))
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
            if place.failed_starts == _MOST_DEATHS:
                raise InputError(
                    "worker processes die as they start. In a script, call solve_grid under "
                    "'if __name__ == \"__main__\":'; otherwise check memory and limits"
                )
        else:
            place.failed_starts = 0
            _log.warning("a worker died with %s", busy.source or busy.name)
            deaths = self._deaths[busy.key] = self._deaths.get(busy.key, 0) + 1
            if deaths == _MOST_DEATHS:
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


class Executor:
    """Workers behind an executor that somebody else made and ends.

    Parameters
    ----------
    executor : anything with the interface of `concurrent.futures`; a Dask client is welcome
    workers : how many it has, where it does not tell
    """

    def __init__(self, executor: Any, settings: Settings, workers: int | None) -> None:
        self._executor = executor.get_executor() if hasattr(executor, "get_executor") else executor
        self._settings = settings
        self._known = workers
        self._done: queue.SimpleQueue[tuple[Planned, Future[Any]]] = queue.SimpleQueue()
        self._held: set[Future[Any]] = set()
        self._count = _Recent(self._count_workers, _LOOK_AGAIN)
        self._check_workers()

    @property
    def workers(self) -> int:
        return self._known or self._count()

    def wants(self) -> int | None:
        return 0 if len(self._held) < _HELD * self.workers else None

    def give(self, place: int, planned: Planned) -> None:
        future = self._submit(solve_planned, planned, self._settings)
        self._held.add(future)
        future.add_done_callback(lambda done: self._done.put((planned, done)))

    def take(self, timeout: float) -> Report | None:
        try:
            planned, future = self._done.get(timeout=timeout)
        except queue.Empty:
            return None
        self._held.discard(future)
        try:
            return Report(planned, future.result())
        except (BrokenExecutor, CancelledError) as error:
            raise _gone(error) from error
        except Exception as error:
            if type(error).__name__ in ("FutureCancelledError", "CommClosedError"):
                raise _gone(error) from error
            return Report(planned, None, _worded(error))

    def stop(self) -> None:
        """Take back what has not begun; the executor itself belongs to the caller."""
        for future in self._held:
            future.cancel()

    def _submit(self, call: Callable[..., Any], *arguments: Any) -> Future[Any]:
        try:
            return self._executor.submit(call, *arguments)
        except RuntimeError as error:  # broken, or shut down
            raise _gone(error) from error

    def _check_workers(self) -> None:
        """One worker tells its version, and compiles what is missing for the others."""
        future = self._submit(introduce, self._settings)
        answered = threading.Event()
        future.add_done_callback(lambda _: answered.set())
        while not answered.wait(_COMPLAIN):
            _log.warning("no worker has answered yet; waiting")
        try:
            version, _ = future.result()
        except (BrokenExecutor, CancelledError) as error:
            raise _gone(error) from error
        except ImportError as error:
            raise InputError(
                f"the workers cannot import oscsolve ({error}); install the same version there"
            ) from error
        if version != __version__:
            raise InputError(
                f"the workers run oscsolve {version}, this is {__version__}; install the same "
                "version everywhere"
            )

    def _count_workers(self) -> int:
        client = getattr(self._executor, "_client", None)
        if client is not None and hasattr(client, "nthreads"):
            return max(1, sum(client.nthreads().values()))
        return int(getattr(self._executor, "_max_workers", 0) or os.cpu_count() or 1)


class _Recent:
    """A number that is asked for anew now and then."""

    def __init__(self, ask: Callable[[], int], seconds: float) -> None:
        self._ask, self._seconds = ask, seconds
        self._value, self._asked = 0, -math.inf

    def __call__(self) -> int:
        if time.monotonic() - self._asked >= self._seconds:
            self._value, self._asked = self._ask(), time.monotonic()
        return self._value


def _gone(error: BaseException) -> IncompleteError:
    return IncompleteError(
        f"the executor gave up ({_worded(error)}); what is finished is in the store. Start its "
        "workers anew, then run the same again to go on"
    )


def _worded(error: BaseException) -> str:
    text = " ".join(str(error).split())
    return f"{type(error).__name__}: {text}" if text else type(error).__name__


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
