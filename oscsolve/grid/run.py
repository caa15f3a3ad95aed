"""`solve_grid`: many models on many workers, into one store, in a way that can be broken off."""

from __future__ import annotations

import logging
import os
import time
from collections.abc import Callable, Iterable, Iterator, Sequence, Sized
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

from oscsolve.errors import InputError
from oscsolve.grid.crew import Crew, Report
from oscsolve.grid.deal import Dealer
from oscsolve.grid.executor import Executor
from oscsolve.grid.plan import GridModel, Planned, plan_models
from oscsolve.grid.processes import OwnWorkers, refuse_recursion
from oscsolve.grid.work import Settings, failed_row, file_stamp
from oscsolve.pulsation.options import SolveOptions
from oscsolve.pulsation.request import SURFACE, check_request
from oscsolve.star.build import uniform_sphere
from oscsolve.star.formats.files import file_hash
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile
from oscsolve.store.grid_write import GridHeader
from oscsolve.store.journal import Entry, Journal, label_mark, open_journal
from oscsolve.store.lock import only_writer
from oscsolve.version import __version__

_log = logging.getLogger(__name__)

#: The store is made anew after the first seconds, then when so many have passed, and never for
#: more than a twentieth of the time.
_FIRST_STORE, _NEXT_STORE, _STORE_SHARE = 10.0, 60.0, 20.0
#: Seconds between two waits for the disk itself; a power cut loses no more.
_SYNC = 5.0
#: Seconds to wait for a model before looking at the clock.
_WAIT = 0.5
#: Failed models that a summary names.
_MOST_NAMED = 10

Model = str | os.PathLike[str] | StarModel | GridModel


@dataclass(frozen=True)
class GridProgress:
    """How far a run is.

    Attributes
    ----------
    done : models solved by this run, failed ones included; `kept` were in the store before
    failed : models of this run that failed
    total : models asked for, or None while that is not known
    workers : how many work side by side
    """

    done: int
    kept: int
    failed: int
    total: int | None
    workers: int


@dataclass(frozen=True)
class GridSummary:
    """How a run ended.

    Attributes
    ----------
    store : the HDF5 file
    complete, incomplete, failed : models asked for by status
    solved, kept : models that this run solved, and that were in the store before
    seconds : wall-clock time of this run
    working, solving : shares of that time, per worker, spent on models, and in the solver alone
    failures : messages of the first failed models, name first
    notes : what else should be known
    """

    store: Path
    complete: int
    incomplete: int
    failed: int
    solved: int
    kept: int
    seconds: float
    working: float
    solving: float
    failures: tuple[str, ...] = ()
    notes: tuple[str, ...] = ()

    @property
    def all_complete(self) -> bool:
        """True where every model has a complete list of modes."""
        return self.incomplete == 0 and self.failed == 0


def solve_grid(
    models: Iterable[Model],
    store: str | os.PathLike[str],
    *,
    degrees: Sequence[int] = (0, 1, 2, 3),
    band: tuple[float, float] | None = None,
    unit: str = "uHz",
    gravity: str = "full",
    surface: str = "free",
    tolerance: float = 1e-8,
    verify: bool = False,
    gravitational_constant: float | None = None,
    eigenfunctions: bool = False,
    warm_start: bool = False,
    options: SolveOptions | None = None,
    executor: Any = None,
    workers: int | None = None,
    overwrite: bool = False,
    progress: Callable[[GridProgress], None] | None = None,
) -> GridSummary:
    """Mode lists of many models in one store; the same call goes on where it was broken off.

    Parameters
    ----------
    models : files, stars, or `GridModel` objects that add a name and parameters; any iterable, read
        as workers become free, in the order that the store will have. A model that comes twice is
        solved once.
    store : HDF5 file; read it with `oscsolve.load_grid`. While the run lasts it says that it is
        unfinished, and a journal lies beside it.
    degrees, band, unit, gravity, surface, tolerance, verify, options : as for `solve_modes`, the
        same for every model
    gravitational_constant : cm^3 g^-1 s^-2, in place of the G of each model
    eigenfunctions : keep them; a model of 2,000 points and 100 modes then needs 8 MB, not 10 kB
    warm_start : search each model from the modes of the one before it in its folder, where one
        worker has both. The census proves completeness as ever; frequencies agree with those of
        a cold start within their error bars, not to the last bit.
    executor : where to work: anything with the interface of `concurrent.futures`, or a Dask client;
        None starts processes on this machine
    workers : how many; None: one for each core, or what the executor has
    overwrite : begin anew where there is a store
    progress : called with a `GridProgress` at the start and after each model

    Returns
    -------
    GridSummary
        What became of the models. A model that cannot be solved is a row of status "failed" with
        the message, no error.

    Raises
    ------
    InputError
        An argument is out of range; the store belongs to another run, was begun with other options
        or cannot be written. Rows that were finished are kept.
    IncompleteError
        The executor gave up. Rows that were finished are kept.

    Notes
    -----
    A script that calls this with ``executor=None`` does so under ``if __name__ == "__main__":``,
    because worker processes import the script.

    Failed models are tried again when a run goes on, and so are files that have changed since.

    Examples
    --------
    >>> import os, tempfile
    >>> from concurrent.futures import ThreadPoolExecutor
    >>> import oscsolve
    >>> stars = [oscsolve.polytrope(n) for n in (1, 3)]
    >>> with tempfile.TemporaryDirectory() as folder, ThreadPoolExecutor(1) as pool:
    ...     path = os.path.join(folder, "grid.h5")
    ...     summary = oscsolve.solve_grid(
    ...         stars, path, degrees=[0], band=(2, 20), unit="sigma2", executor=pool
    ...     )
    ...     orders = [row.order.tolist() for row in oscsolve.load_grid(path)]
    >>> summary.complete, orders
    (2, [[2], [1, 2]])
    """
    knobs = replace(options or SolveOptions(), eigenfunctions=eigenfunctions)
    settings = checked_settings(
        degrees, band, unit, gravity, surface, tolerance, verify, gravitational_constant, knobs,
        warm_start,
    )  # fmt: skip
    if executor is None:
        refuse_recursion()
    if workers is not None and workers < 1:
        raise InputError(f"workers must be at least 1; got {workers}")
    path = Path(store)
    if path.is_dir():
        raise InputError(f"{path}: this is a folder; give the name of a file to write")
    total = len(models) if isinstance(models, Sized) else None
    with (
        only_writer(path),
        open_journal(path, header_of(settings), overwrite=overwrite) as journal,
    ):
        run = _Run(journal, lambda: _crew(executor, workers, total, settings), total, progress)
        return run.work(models)


def checked_settings(
    degrees: Sequence[int],
    band: tuple[float, float] | None,
    unit: str,
    gravity: str,
    surface: str,
    tolerance: float,
    verify: bool,
    gravitational_constant: float | None,
    options: SolveOptions,
    warm_start: bool = False,
) -> Settings:
    """Settings that suit some star, so that not every model fails for the same wrong argument.

    Raises
    ------
    InputError
        An argument is out of range.
    """
    sphere = uniform_sphere()
    if surface not in SURFACE:
        raise InputError(f"surface must be one of {', '.join(SURFACE)}; got {surface!r}")
    request = check_request(
        sphere, Profile(sphere), degrees, band, unit, gravity, "free", tolerance, []
    )
    if gravitational_constant is not None and not gravitational_constant > 0.0:
        raise InputError(
            f"gravitational_constant must be above zero; got {gravitational_constant:g}"
        )
    return Settings(
        request.degrees, band, unit, gravity, surface, tolerance, verify, gravitational_constant,
        options, warm_start,
    )  # fmt: skip


def header_of(settings: Settings) -> GridHeader:
    """What the store says of a run."""
    return GridHeader(settings.recorded(), settings.degrees, __version__, settings.verify)


def is_current(planned: Planned, entry: Entry) -> bool:
    """True where the row that is there is that of the model as it is now."""
    if entry.status == "failed":
        return False
    if planned.star is not None:
        return True
    stamp = file_stamp(planned.source)
    if stamp is None:
        # The file is gone, its modes are not.
        return True
    return stamp == entry.stamp or file_hash(Path(planned.source)) == entry.source_hash


def _crew(executor: Any, workers: int | None, total: int | None, settings: Settings) -> Crew:
    if executor is not None:
        return Executor(executor, settings, workers)
    wanted = workers or os.cpu_count() or 1
    return OwnWorkers(wanted if total is None else max(1, min(wanted, total)), settings)


@dataclass(eq=False)
class _Run:
    """One run: from models to rows in the journal, and from there to the store."""

    journal: Journal
    open_crew: Callable[[], Crew]
    total: int | None
    progress: Callable[[GridProgress], None] | None
    order: dict[str, None] = field(default_factory=dict)
    solved: int = 0
    kept: int = 0
    failed_now: int = 0
    repeated: int = 0
    working: float = 0.0
    solving: float = 0.0
    notes: list[str] = field(default_factory=list)
    failures: list[str] = field(default_factory=list)

    def work(self, models: Iterable[Model]) -> GridSummary:
        started = time.monotonic()
        self.notes += self.journal.notes
        dealer = Dealer(self._to_do(plan_models(models)))
        first = dealer.deal(0)
        workers = 1
        if first is not None:
            self.publish(None)
            workers = self._solve_all(first, dealer)
        return self._finish(started, workers)

    def _to_do(self, plan: Iterator[Planned]) -> Iterator[Planned]:
        """Models that have no row yet; remembers the order of all."""
        changed = 0
        for planned in plan:
            if planned.key in self.order:
                self.repeated += 1
                continue
            self.order[planned.key] = None
            entry = self.journal.entries.get(planned.key)
            if entry is None:
                yield planned
            elif is_current(planned, entry):
                self.kept += 1
                self._relabel(planned, entry)
            else:
                changed += entry.status != "failed"
                yield planned
        self.total = len(self.order)
        if self.repeated:
            self.notes.append(f"{self.repeated} model(s) came twice and were solved once")
        if changed:
            self.notes.append(f"{changed} model file(s) had changed and were solved again")
        strangers = sum(key not in self.order for key in self.journal.entries)
        if strangers:
            self.notes.append(
                f"{strangers} row(s) of models that were not asked for this time stand at the end"
            )

    def _relabel(self, planned: Planned, entry: Entry) -> None:
        """Give a row that is there the name and parameters that came this time."""
        if label_mark(planned.name, planned.parameters) == entry.label_mark:
            return
        row = replace(
            self.journal.row(planned.key), name=planned.name, parameters=planned.parameters
        )
        self.journal.add(planned.key, row, stamp=entry.stamp, seconds=entry.seconds)

    def _solve_all(self, first: Planned, dealer: Dealer) -> int:
        """Keep every worker busy until no model is left; how many workers there were."""
        crew, clock = self.open_crew(), _Clock()
        try:
            most = crew.workers
            self._tell(most)
            held = 0
            waiting: Planned | None = first
            while True:
                while (place := crew.wants()) is not None:
                    planned = waiting or dealer.deal(place)
                    waiting = None
                    if planned is None:
                        break
                    crew.give(place, planned)
                    held += 1
                if held == 0:
                    return most
                report = crew.take(_WAIT)
                if report is not None:
                    held -= 1
                    self._keep(report)
                    most = max(most, crew.workers)
                    self._tell(most)
                self._look_at(clock)
        except KeyboardInterrupt:
            # The rows that are finished are worth seeing; the journal has them in any case.
            crew.stop()
            self.publish(None)
            raise
        finally:
            crew.stop()

    def _keep(self, report: Report) -> None:
        planned, outcome = report.planned, report.outcome
        if outcome is None:
            row, stamp, seconds = failed_row(planned, report.reason), None, 0.0
        else:
            row, stamp, seconds = outcome.row, outcome.stamp, outcome.seconds
            self.working += seconds
            self.solving += outcome.solving
        self.journal.add(planned.key, row, stamp=stamp, seconds=seconds)
        self.solved += 1
        if row.status == "failed":
            self.failed_now += 1
            if len(self.failures) < _MOST_NAMED:
                self.failures.append(f"{row.name}: {row.message}")

    def _look_at(self, clock: _Clock) -> None:
        if clock.sync_is_due():
            self.journal.sync()
        if clock.store_is_due():
            try:
                self.publish(None)
            except InputError as error:
                # The journal has everything; a later store may succeed, or say why it cannot.
                _log.warning("%s", error)
            clock.store_made()

    def publish(self, planned: int | None) -> None:
        """Make the store from the rows that are there; finished if `planned` is all of them."""
        total = self.total if planned is None else planned
        if planned is None and total is not None and total <= self._rows_planned():
            total = None  # one that is complete by number, but not yet by eigenfunctions
        self.journal.publish(self.order, total, eigenfunctions=planned is not None)

    def _rows_planned(self) -> int:
        return sum(key in self.journal.entries for key in self.order)

    def _finish(self, started: float, workers: int) -> GridSummary:
        self.publish(len(self.order))
        self.journal.remove()
        seconds = time.monotonic() - started
        entries = [self.journal.entries[key] for key in self.order]
        counts = {
            status: sum(entry.status == status for entry in entries)
            for status in ("complete", "incomplete", "failed")
        }
        return GridSummary(
            store=self.journal.store,
            solved=self.solved,
            kept=self.kept,
            seconds=seconds,
            working=self.working / (seconds * workers),
            solving=self.solving / (seconds * workers),
            failures=tuple(self.failures),
            notes=tuple(self.notes),
            **counts,
        )

    def _tell(self, workers: int) -> None:
        if self.progress is not None:
            self.progress(
                GridProgress(self.solved, self.kept, self.failed_now, self.total, workers)
            )


class _Clock:
    """When to wait for the disk and when to make the store anew."""

    def __init__(self) -> None:
        self._synced = self._began = time.monotonic()
        self._next_store = self._began + _FIRST_STORE

    def sync_is_due(self) -> bool:
        now = time.monotonic()
        if now - self._synced < _SYNC:
            return False
        self._synced = now
        return True

    def store_is_due(self) -> bool:
        self._began = time.monotonic()
        return self._began >= self._next_store

    def store_made(self) -> None:
        now = time.monotonic()
        self._next_store = now + max(_NEXT_STORE, _STORE_SHARE * (now - self._began))
