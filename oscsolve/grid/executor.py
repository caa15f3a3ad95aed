"""Workers behind an executor that somebody else made: a pool, or a cluster."""

from __future__ import annotations

import logging
import math
import os
import queue
import threading
import time
from collections import deque
from collections.abc import Callable
from concurrent.futures import BrokenExecutor, CancelledError, Future
from typing import Any

from oscsolve.errors import IncompleteError, InputError
from oscsolve.grid.crew import HELD, Report, worded
from oscsolve.grid.plan import Planned
from oscsolve.grid.work import Settings, introduce, solve_planned
from oscsolve.version import __version__

_log = logging.getLogger(__name__)

#: Seconds between two looks at how many workers a cluster has, and between two complaints.
_LOOK_AGAIN, _COMPLAIN = 5.0, 30.0
#: Errors of a cluster that is no more, and of a model whose workers died, by name: the package that
#: has them may not be installed.
_CLOSED = ("FutureCancelledError", "CommClosedError")
_DIED = "KilledWorker"


class Executor:
    """Workers behind an executor that somebody else made and ends.

    Parameters
    ----------
    executor : anything with the interface of `concurrent.futures`; a Dask client is welcome
    workers : how many it has, where it does not tell
    """

    def __init__(self, executor: Any, settings: Settings, workers: int | None) -> None:
        self._executor = executor.get_executor() if hasattr(executor, "get_executor") else executor
        # Dask answers a call that it has seen before from memory, errors included.
        self._fresh = {"pure": False} if hasattr(self._executor, "_client") else {}
        self._settings = settings
        self._known = workers
        self._done: queue.SimpleQueue[tuple[Planned, Future[Any]]] = queue.SimpleQueue()
        self._held: set[Future[Any]] = set()
        self._suspects: deque[Planned] = deque()
        self._suspected: set[str] = set()
        self._count = _Recent(self._count_workers, _LOOK_AGAIN)
        self._check_workers()

    @property
    def workers(self) -> int:
        return self._known or self._count()

    def wants(self) -> int | None:
        return 0 if len(self._held) < HELD * self.workers else None

    def give(self, place: int, planned: Planned) -> None:
        future = self._submit(solve_planned, planned, self._settings)
        self._held.add(future)
        future.add_done_callback(lambda done: self._done.put((planned, done)))

    def take(self, timeout: float) -> Report | None:
        if not self._held and self._suspects:
            self.give(0, self._suspects.popleft())
        try:
            planned, future = self._done.get(timeout=timeout)
        except queue.Empty:
            self._check_alive()
            return None
        self._held.discard(future)
        try:
            return Report(planned, future.result())
        except (BrokenExecutor, CancelledError) as error:
            raise _gone(error) from error
        except Exception as error:
            if type(error).__name__ in _CLOSED:
                raise _gone(error) from error
            if type(error).__name__ == _DIED and planned.key not in self._suspected:
                # A cluster blames every model that a dead worker had: see what it does alone.
                self._suspected.add(planned.key)
                self._suspects.append(planned)
                return None
            return Report(planned, None, worded(error))

    def stop(self) -> None:
        """Take back what has not begun; the executor itself belongs to the caller."""
        for future in self._held:
            future.cancel()

    def _submit(self, call: Callable[..., Any], *arguments: Any) -> Future[Any]:
        try:
            return self._executor.submit(call, *arguments, **self._fresh)
        except Exception as error:
            # Broken, shut down, closed: every kind of executor has its own word for it.
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

    def _check_alive(self) -> None:
        """Futures of a cluster that went away may stay silent for ever."""
        client = getattr(self._executor, "_client", None)
        if getattr(client, "status", "running") == "closed":
            raise _gone(IncompleteError("the cluster has closed the connection"))

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
        f"the executor gave up ({worded(error)}); what is finished is in the store. Start its "
        "workers anew, then run the same again to go on"
    )
