"""What a waiting user sees on standard error."""

from __future__ import annotations

import sys
import threading
import time
from collections.abc import Callable, Iterable
from typing import TYPE_CHECKING, Self, TextIO

import click

from oscsolve.pulsation.cache import compile_is_due

if TYPE_CHECKING:
    from oscsolve.star.findings import Finding

#: Seconds a run may take in silence; seconds between two lines, off and on a terminal.
_SILENCE, _INTERVAL, _TICK = 2.0, 15.0, 0.5


class Progress:
    """``progress(done, total, what)`` for the solver: silent at first, then told now and then.

    On a terminal one line is rewritten in place and cleared at the end; elsewhere plain lines
    follow at long intervals. A thread of its own keeps time, for the solver may be busy for long
    between two calls. Use as a context manager.

    The first call comes when the solver has found its arguments good: only then `announce` is
    called, so that a refused run leaves one line and no more.
    """

    def __init__(
        self,
        announce: Callable[[], None],
        stream: TextIO | None = None,
        *,
        silence: float = _SILENCE,
        interval: float = _INTERVAL,
    ) -> None:
        self._announce = announce
        self._stream = sys.stderr if stream is None else stream
        self._terminal = self._stream.isatty()
        self._silence = silence
        self._interval = min(_TICK, interval) if self._terminal else interval
        self._started = time.monotonic()
        self._state: tuple[int, int, str] | None = None
        self._width = 0
        self._lock = threading.Lock()
        self._end = threading.Event()
        self._clock = threading.Thread(target=self._keep_time, daemon=True)

    def __enter__(self) -> Self:
        self._clock.start()
        return self

    def __exit__(self, *_: object) -> None:
        self._end.set()
        self._clock.join()
        if self._width:
            self._stream.write("\r" + " " * self._width + "\r")
            self._stream.flush()

    def __call__(self, done: int, total: int, what: str) -> None:
        if self._state is None:
            self._announce()
            if compile_is_due():
                self._say("compiling the solver for the first run; later runs start at once")
        self._state = (done, total, what)

    def _keep_time(self) -> None:
        wait = self._silence
        while not self._end.wait(wait):
            wait = self._interval
            if self._state is not None:
                self._say(self._told(*self._state, time.monotonic() - self._started))

    def note(self, text: str) -> None:
        """A line that stays, whatever stands in the line that is rewritten."""
        with self._lock:
            if self._width:
                self._stream.write("\r" + " " * self._width + "\r")
                self._width = 0
            self._stream.write(f"oscsolve: {' '.join(text.split())}\n")
            self._stream.flush()

    def _told(self, done: int, total: int, what: str, seconds: float) -> str:
        return f"{what} ({done} of {total} done, {seconds:.0f} s)"

    def _say(self, text: str) -> None:
        line = f"oscsolve: {text}"
        with self._lock:
            if self._terminal:
                self._stream.write("\r" + line.ljust(self._width))
                self._width = max(self._width, len(line))
            else:
                self._stream.write(line + "\n")
            self._stream.flush()


def show_findings(findings: Iterable[Finding]) -> None:
    """Findings of a model or a run on standard error, one line each, worst first."""
    rank = {"defect": 0, "doubt": 1, "note": 2}
    for finding in sorted(findings, key=lambda found: rank[found.severity]):
        parts = [part.rstrip(".") for part in (finding.message, finding.advice) if part]
        text = " ".join("; ".join(parts).split())
        click.echo(f"oscsolve: {finding.severity}: {text}", err=True)
