"""What ``oscsolve grid`` tells: progress, summary, forecast."""

from __future__ import annotations

import logging
import time
from collections.abc import Iterator
from typing import TYPE_CHECKING

from oscsolve.cli.progress import Progress

if TYPE_CHECKING:
    from oscsolve.grid import GridProgress, GridSummary
    from oscsolve.grid.forecast import Forecast

_MINUTE, _HOUR, _DAY = 60.0, 3600.0, 86400.0
#: Width of the names in front of a summary.
_WIDTH = 11


class GridTold(Progress):
    """Progress of a grid: how many models, how fast, how long still."""

    def __init__(self, **settings: object) -> None:
        super().__init__(announce=lambda: None, **settings)  # type: ignore[arg-type]
        self._seen: GridProgress | None = None
        self._begun = 0.0

    def tell(self, progress: GridProgress) -> None:
        """To be given to `solve_grid` as ``progress``."""
        if self._seen is None:
            self._begun = time.monotonic()
        self._seen = progress
        self(progress.done, progress.total or 0, "models")

    @property
    def seen(self) -> GridProgress | None:
        """The last that was told."""
        return self._seen

    def _told(self, done: int, total: int, what: str, seconds: float) -> str:
        assert self._seen is not None
        return progress_text(self._seen, time.monotonic() - self._begun)


def progress_text(seen: GridProgress, seconds: float) -> str:
    """One line: done, failed, rate, time left."""
    ready = seen.done + seen.kept
    parts = [f"{ready} of {seen.total} models" if seen.total else f"{ready} models"]
    if seen.kept:
        parts.append(f"{seen.kept} of them from before")
    if seen.failed:
        parts.append(f"{seen.failed} failed")
    parts.append(f"{seen.workers} worker{'s' * (seen.workers != 1)}")
    if seen.done and seconds > 0.0:
        rate = seen.done / seconds
        parts.append(rate_text(rate))
        if seen.total:
            parts.append(f"about {duration(max(0, seen.total - ready) / rate)} left")
    return ", ".join(parts)


def rate_text(rate: float) -> str:
    """Models a second, a minute or an hour, whichever is a handy number."""
    for unit, seconds in (("a second", 1.0), ("a minute", _MINUTE)):
        if rate * seconds >= 1.0:
            return f"{rate * seconds:.3g} {unit}"
    return f"{rate * _HOUR:.3g} an hour"


def duration(seconds: float) -> str:
    """A time as people say it: two units at most."""
    if seconds < 10.0:
        return f"{seconds:.1f} s"
    if seconds < 2.0 * _MINUTE:
        return f"{seconds:.0f} s"
    if seconds < 2.0 * _HOUR:
        return f"{seconds / _MINUTE:.0f} min"
    if seconds < 2.0 * _DAY:
        minutes = round(seconds / _MINUTE)
        return f"{minutes // 60} h {minutes % 60:02d} min"
    hours = round(seconds / _HOUR)
    return f"{hours // 24} d {hours % 24} h"


def _entry(name: str, text: str) -> str:
    return f"{name:<{_WIDTH}}{text}"


def summary_lines(summary: GridSummary) -> Iterator[str]:
    """What became of the models."""
    total = summary.complete + summary.incomplete + summary.failed
    yield _entry("store", str(summary.store))
    counts = [("complete", summary.complete), ("incomplete", summary.incomplete)]
    counts.append(("failed", summary.failed))
    shown = ", ".join(f"{count} {name}" for name, count in counts if count or name == "complete")
    yield _entry("models", f"{total}: {shown}")
    if summary.kept:
        yield _entry("kept", f"{summary.kept} that were in the store before")
    if summary.solved:
        rate = rate_text(summary.solved / summary.seconds)
        yield _entry("solved", f"{summary.solved} in {duration(summary.seconds)}, {rate}")
    if summary.solving > 0.0:
        yield _entry("workers", f"{100 * summary.solving:.0f} % of their time in the solver")


def failure_lines(summary: GridSummary) -> Iterator[str]:
    """Failed models by name, and how many are not named."""
    yield from (f"failed: {text}" for text in summary.failures)
    unnamed = summary.failed - len(summary.failures)
    if unnamed > 0:
        yield f"failed: {unnamed} more; /models/message in {summary.store} tells why"
    if summary.incomplete:
        yield (
            f"incomplete: {summary.incomplete} model(s); /models/message in {summary.store} tells "
            "why"
        )


def forecast_lines(forecast: Forecast) -> Iterator[str]:
    """What would run, and how long."""
    folders = f"in {forecast.folders} folder{'s' * (forecast.folders != 1)}"
    yield _entry("models", f"{forecast.models} {folders}")
    if forecast.kept:
        yield _entry("kept", f"{forecast.kept} that are in the store")
    yield _entry("to solve", str(forecast.to_solve))
    for item in forecast.sample:
        result = item.message or f"{item.modes} modes"
        yield _entry("sample", f"{item.name}: {duration(item.seconds)}, {result}")
    if forecast.sample:
        likely, least, most = (duration(value) for value in forecast.seconds)
        workers = f"{forecast.workers} worker{'s' * (forecast.workers != 1)}"
        yield _entry("time", f"about {likely} ({least} to {most}) on {workers} like this one")


class NoteHandler(logging.Handler):
    """Hands what the package logs to a progress line."""

    def __init__(self, progress: Progress) -> None:
        super().__init__(logging.WARNING)
        self._progress = progress

    def emit(self, record: logging.LogRecord) -> None:
        self._progress.note(record.getMessage())
