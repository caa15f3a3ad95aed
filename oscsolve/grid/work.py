"""What a worker does with one model. Everything here can be sent to another process."""

from __future__ import annotations

import os
import threading
import time
from dataclasses import dataclass, replace
from typing import Any

from oscsolve.errors import OscsolveError
from oscsolve.grid.deal import track_of
from oscsolve.grid.plan import Planned
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.pulsation.options import SolveOptions
from oscsolve.pulsation.solve import solve_modes
from oscsolve.star.build import polytrope
from oscsolve.star.formats import read_model
from oscsolve.star.model import StarModel
from oscsolve.store.rows import GridRow, row_of_modes, scales_of
from oscsolve.version import __version__


@dataclass(frozen=True)
class Settings:
    """The same for every model of a grid; see `oscsolve.solve_modes`."""

    degrees: tuple[int, ...] = (0, 1, 2, 3)
    band: tuple[float, float] | None = None
    unit: str = "uHz"
    gravity: str = "full"
    surface: str = "free"
    tolerance: float = 1e-8
    verify: bool = False
    gravitational_constant: float | None = None
    options: SolveOptions = SolveOptions(eigenfunctions=False)
    warm_start: bool = False

    def recorded(self) -> dict[str, object]:
        """As plain values, for the store."""
        band = (None, None) if self.band is None else tuple(float(limit) for limit in self.band)
        return {
            "degrees": ",".join(str(degree) for degree in self.degrees),
            "band_first": band[0],
            "band_second": band[1],
            "band_unit": "chosen" if self.band is None else self.unit,
            "gravity": self.gravity,
            "surface": self.surface,
            "tolerance": float(self.tolerance),
            "verify": self.verify,
            "gravitational_constant": self.gravitational_constant,
            "stages": self.options.stages or "chosen",
            "phase_per_cell": self.options.phase_per_cell or "chosen",
            "cells_factor": self.options.cells_factor,
            "most_cells": self.options.most_cells,
            "eigenfunctions": self.options.eigenfunctions,
            "warm_start": self.warm_start,
        }


@dataclass(frozen=True, eq=False)
class Outcome:
    """What a worker sends back.

    Attributes
    ----------
    row : the row of the store
    stamp : size and time of change (ns) of the file before it was read, or None
    seconds, solving : wall-clock time of the whole, and of the solver in it
    program_version : version of oscsolve that the worker runs
    """

    row: GridRow
    stamp: tuple[int, int] | None
    seconds: float
    solving: float
    program_version: str = __version__


def solve_planned(planned: Planned, settings: Settings) -> Outcome:
    """Read and solve one model; whatever goes wrong with it is a failed row, not an error."""
    started = time.perf_counter()
    stamp = file_stamp(planned.source) if planned.source else None
    star: StarModel | None = planned.star
    solving = 0.0
    try:
        if star is None:
            star = read_model(
                planned.source, gravitational_constant=settings.gravitational_constant
            )
        elif settings.gravitational_constant is not None:
            star = star.with_changes(gravitational_constant=settings.gravitational_constant)
        begun = time.perf_counter()
        modes = solve_star(star, settings, _memory.recall(planned, settings))
        _memory.keep(planned, modes)
        solving = time.perf_counter() - begun
        row = row_of_modes(modes, **_labels(planned, star))
    except OscsolveError as error:
        row = failed_row(planned, str(error), star)
    except Exception as error:
        # One bad model must not end a run of a hundred thousand; the row says what happened.
        row = failed_row(planned, f"unexpected {type(error).__name__}: {error}", star)
    return Outcome(row, stamp, time.perf_counter() - started, solving)


class _Memory(threading.local):
    """The modes of the last star that a worker has solved, for the next one of its track."""

    def __init__(self) -> None:
        self._track = ""
        self._modes: ModeSet | None = None

    def keep(self, planned: Planned, modes: ModeSet) -> None:
        """Remember the modes, not the star or the eigenfunctions."""
        self._track, self._modes = track_of(planned), replace(modes, eigenfunctions=None)

    def recall(self, planned: Planned, settings: Settings) -> ModeSet | None:
        """What is remembered of the same track, if the run wants that."""
        known = settings.warm_start and self._track == track_of(planned)
        return self._modes if known else None


_memory = _Memory()


def solve_star(star: StarModel, settings: Settings, similar: ModeSet | None = None) -> ModeSet:
    """The mode list of one star, in one thread: a grid has one worker for each core."""
    return solve_modes(
        star,
        settings.degrees,
        settings.band,
        unit=settings.unit,
        gravity=settings.gravity,
        surface=settings.surface,
        tolerance=settings.tolerance,
        verify=settings.verify,
        similar=similar,
        options=replace(settings.options, threads=1),
    )


def failed_row(planned: Planned, message: str, star: StarModel | None = None) -> GridRow:
    """The row of a model that has no modes."""
    scales = {} if star is None else scales_of(star)
    text = " ".join(message.split())
    return GridRow(status="failed", message=text, **_labels(planned, star), **scales)


def _labels(planned: Planned, star: StarModel | None) -> dict[str, Any]:
    digest = planned.star_hash or ("" if star is None else star.source_hash)
    return {
        "name": planned.name,
        "source": planned.source,
        "source_hash": digest,
        "parameters": planned.parameters,
    }


def file_stamp(path: str) -> tuple[int, int] | None:
    """Size and time of change (ns) of a file, or None where there is none."""
    try:
        found = os.stat(path)
    except OSError:
        return None
    return found.st_size, found.st_mtime_ns


def introduce(settings: Settings | None) -> tuple[str, int]:
    """Version of oscsolve and process id of a worker.

    Parameters
    ----------
    settings : solve a small star with these first, so that the compiled code that a run needs is
        on disk before many workers want it at once; None: do not
    """
    if settings is not None:
        solve_modes(
            polytrope(1.5),
            sorted({0, 1, 2}),
            (5.0, 20.0),
            unit="sigma2",
            gravity=settings.gravity,
            tolerance=1e-6,
            verify=settings.verify,
            options=SolveOptions(eigenfunctions=False, threads=1),
        )
    return __version__, os.getpid()
