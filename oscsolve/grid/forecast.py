"""What a grid would run, and how long that should take, told from a few of its models."""

from __future__ import annotations

import os
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from oscsolve.grid.deal import track_of
from oscsolve.grid.plan import Planned, plan_models
from oscsolve.grid.run import Model, header_of, is_current
from oscsolve.grid.work import Outcome, Settings, introduce, solve_planned
from oscsolve.store.journal import Journal


@dataclass(frozen=True, eq=False)
class Sampled:
    """One model that was solved for the forecast."""

    name: str
    seconds: float
    modes: int
    message: str


@dataclass(frozen=True, eq=False)
class Forecast:
    """What a run would do.

    Attributes
    ----------
    models, folders : models asked for, each once, and how many folders they come from
    kept : models that are in the store already
    to_solve : models that remain
    workers : how many would work
    sample : models solved for this forecast, spread over what remains
    """

    models: int
    folders: int
    kept: int
    to_solve: int
    workers: int
    sample: tuple[Sampled, ...]

    @property
    def seconds(self) -> tuple[float, float, float]:
        """Wall-clock time of the run, s: likely, and if all models were as the fastest and the
        slowest of the sample that have modes."""
        solved = [item.seconds for item in self.sample if item.modes]
        times = np.array(solved or [item.seconds for item in self.sample] or [0.0])
        rounds = self.to_solve / max(1, min(self.workers, self.to_solve))
        likely, least, most = rounds * np.array([times.mean(), times.min(), times.max()])
        return float(likely), float(least), float(most)


def forecast_grid(
    models: Sequence[Model],
    store: Path,
    settings: Settings,
    *,
    workers: int | None = None,
    overwrite: bool = False,
    sample: int = 3,
) -> Forecast:
    """What `solve_grid` would do with the same arguments; nothing is written.

    Raises
    ------
    InputError
        The store was begun with other options, or is no grid store.
    """
    journal = Journal(store, header_of(settings))
    if not overwrite:
        journal.look()
    plan = {planned.key: planned for planned in plan_models(models)}
    remaining = [
        planned
        for key, planned in plan.items()
        if key not in journal.entries or not is_current(planned, journal.entries[key])
    ]
    chosen = _spread(remaining, sample)
    if chosen:
        # The first solve of a process loads compiled code; a worker does so once for all models.
        introduce(settings)
    outcomes = [(planned, solve_planned(planned, settings)) for planned in chosen]
    return Forecast(
        models=len(plan),
        folders=len({track_of(planned) for planned in plan.values()}),
        kept=len(plan) - len(remaining),
        to_solve=len(remaining),
        workers=workers or os.cpu_count() or 1,
        sample=tuple(_sampled(planned, outcome) for planned, outcome in outcomes),
    )


def _spread(planned: list[Planned], count: int) -> list[Planned]:
    places = np.unique(np.linspace(0, len(planned) - 1, count).round().astype(int))
    return [planned[place] for place in places] if planned else []


def _sampled(planned: Planned, outcome: Outcome) -> Sampled:
    return Sampled(planned.name, outcome.seconds, len(outcome.row), outcome.row.message)
