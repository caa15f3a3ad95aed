"""Many models: what a grid costs beside the solving, how it scales and what memory it takes.

``OSCSOLVE_BENCH_MODELS`` says how many small models the large run has; 10,000 by default.
"""

from __future__ import annotations

import os
import resource
import tempfile
import time
from collections.abc import Iterator
from concurrent.futures import Future
from pathlib import Path

import oscsolve
from oscsolve.grid.plan import Planned
from oscsolve.grid.work import Outcome, Settings, solve_planned

_LANTERN = Path(__file__).resolve().parents[1] / "models_demo" / "lantern-1.fgong"
_MANY = int(os.environ.get("OSCSOLVE_BENCH_MODELS", "10000"))
_SMALL = {"degrees": (0, 1, 2), "band": (3.0, 100.0), "unit": "sigma2"}


def _copies(star: oscsolve.StarModel, count: int) -> Iterator[oscsolve.GridModel]:
    """One star under many names."""
    for number in range(count):
        yield oscsolve.GridModel(star, f"lantern-{number}", {"number": number})


def _solve(models: Iterator[oscsolve.GridModel], **options: object) -> oscsolve.GridSummary:
    with tempfile.TemporaryDirectory() as folder:
        return oscsolve.solve_grid(models, Path(folder) / "grid.h5", **options)


class Reading:
    """One FGONG file of 2001 points and 40 variables, hash, checks and findings included."""

    def time_read(self) -> None:
        oscsolve.read_model(_LANTERN)


class Workers:
    """200 stars like the Sun on one and two workers."""

    def setup(self) -> None:
        star = oscsolve.read_model(_LANTERN)
        asked = {"band": (1500, 4000), "surface": "isothermal"}
        self.one, self.two = (
            _solve(_copies(star, 200), workers=workers, **asked) for workers in (1, 2)
        )

    def track_speed_of_two_workers(self) -> float:
        return self.one.seconds / self.two.seconds

    def track_share_of_time_in_the_solver(self) -> float:
        return self.one.solving

    def track_models_a_second_and_worker(self) -> float:
        return 200.0 / self.one.seconds


class _Instant:
    """An executor that answers every model with the same modes: what is left is the grid itself."""

    _max_workers = 1

    def __init__(self, star: oscsolve.StarModel) -> None:
        planned = Planned("", "", "", star, "", {})
        self._outcome = solve_planned(planned, Settings((0, 1, 2), (3.0, 100.0), "sigma2"))

    def submit(self, call: object, *arguments: object) -> Future:
        future: Future = Future()
        if call is not solve_planned:
            future.set_result((oscsolve.__version__, 0))
            return future
        planned, row = arguments[0], self._outcome.row
        values = {name: getattr(row, name) for name in oscsolve.GridRow.__dataclass_fields__}
        values |= {
            "name": planned.name,
            "source_hash": planned.star_hash,
            "parameters": planned.parameters,
        }
        future.set_result(Outcome(oscsolve.GridRow(**values), None, 0.0, 0.0))
        return future


class WithoutSolving:
    """Plan, journal and store of many models that cost nothing to solve."""

    params = (1000, 10_000)
    param_names = ("models",)

    def setup(self, models: int) -> None:
        star = oscsolve.polytrope(3)
        executor = _Instant(star)
        before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
        started = time.perf_counter()
        _solve(_copies(star, models), executor=executor, **_SMALL)
        self.seconds = time.perf_counter() - started
        self.kilobytes = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before

    def track_milliseconds_a_model(self, models: int) -> float:
        return 1e3 * self.seconds / models

    def track_growth_of_memory_in_kb_a_model(self, models: int) -> float:
        return self.kilobytes / models


class ManySmallModels:
    """Polytropes on all cores."""

    def setup(self) -> None:
        self.summary = _solve(_copies(oscsolve.polytrope(3), _MANY), **_SMALL)

    def track_complete(self) -> int:
        return self.summary.complete

    def track_models_a_second(self) -> float:
        return self.summary.solved / self.summary.seconds

    def track_share_of_time_in_the_solver(self) -> float:
        return self.summary.solving
