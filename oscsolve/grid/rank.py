"""The models of a grid store in the order in which they fit an observed star."""

from __future__ import annotations

import os
from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np

from oscsolve.errors import InputError, OscsolveError
from oscsolve.seismology.match import Match, match_columns
from oscsolve.seismology.observed import ObservedModes, read_observed
from oscsolve.store.grid_read import Grid, load_grid
from oscsolve.store.rows import GridRow
from oscsolve.units import SOLAR_MASS, SOLAR_RADIUS


@dataclass(frozen=True)
class Estimate:
    """A parameter of the star as the grid sees it.

    Attributes
    ----------
    mean, spread : mean over the models weighted by exp(-chi2/2), and root of the weighted variance
    best : value of the model of least chi2
    """

    mean: float
    spread: float
    best: float


@dataclass(frozen=True, eq=False)
class Ranking:
    """How well each model of a grid fits.

    Attributes
    ----------
    grid : the store
    chi2, rms : (n,) of every row of the store; NaN where it could not be compared
    pairs : (n,) int, pairs of modes
    unmatched : (n,) int, observed modes without a partner; such a model is ranked behind all
        that leave fewer
    order : (k,) int, rows that could be compared, best first
    estimates : parameter name to `Estimate`, over the models that leave as few observed modes
        alone as the best; masses and radii in solar units
    effective_models : 1/sum of squared weights: how many models the estimates rest on
    messages : row to the reason why it could not be compared
    """

    grid: Grid
    chi2: np.ndarray
    rms: np.ndarray
    pairs: np.ndarray
    unmatched: np.ndarray
    order: np.ndarray
    estimates: Mapping[str, Estimate]
    effective_models: float
    messages: Mapping[int, str]


def rank_grid(
    grid: Grid | str | os.PathLike[str],
    observed: ObservedModes | str | os.PathLike[str],
    *,
    surface: str = "two-term",
    measure: str = "frequencies",
    progress: Callable[[int, int], None] | None = None,
) -> Ranking:
    """Rank the models of a grid store by chi2 against an observed list.

    Parameters
    ----------
    grid : a store; its models are read one after another
    observed : `ObservedModes`, or a CSV file
    surface : law fitted to each model anew
    measure : "frequencies" or "ratios"
    progress : called as ``progress(done, total)`` now and then

    Raises
    ------
    InputError
        A file cannot be used, or no model of the grid can be compared with the list; the message
        tells why the first could not.
    """
    if not isinstance(grid, Grid):
        grid = load_grid(grid)
    if not isinstance(observed, ObservedModes):
        observed = read_observed(observed)
    size = len(grid)
    chi2, rms = np.full(size, np.nan), np.full(size, np.nan)
    pairs, unmatched = np.zeros(size, np.int64), np.full(size, len(observed))
    messages: dict[int, str] = {}
    for row in grid:
        try:
            found = match_row(row, observed, surface)
        except OscsolveError as error:
            messages[row.row] = str(error)
        else:
            ratios = measure == "ratios"
            usable = not ratios or found.ratios.freedom > 0
            if usable:
                chi2[row.row] = found.ratios.chi2 if ratios else found.chi2
                rms[row.row], pairs[row.row] = found.rms, found.pair.size
                unmatched[row.row] = found.unmatched_observed.size
            else:
                messages[row.row] = "no ratio can be formed from its pairs"
        if progress is not None:
            progress(row.row + 1, size)
    order = np.lexsort((chi2, unmatched))
    order = order[np.isfinite(chi2[order])]
    if order.size == 0:
        reason = f": {next(iter(messages.values()))}" if messages else ""
        raise InputError(f"{grid.path}: no model can be compared with {observed.name}{reason}")
    level = unmatched == unmatched[order[0]]
    estimates, effective = _estimates(grid, np.where(level, chi2, np.nan), int(order[0]))
    return Ranking(grid, chi2, rms, pairs, unmatched, order, estimates, effective, messages)


def match_row(row: GridRow, observed: ObservedModes, surface: str) -> Match:
    """One model of a store against the list."""
    if row.status == "failed":
        raise InputError(f"{row.name}: this model failed and has no modes: {row.message}")
    return match_columns(row, observed, surface)


def _estimates(grid: Grid, chi2: np.ndarray, best: int) -> tuple[dict[str, Estimate], float]:
    weight = np.exp(-0.5 * (chi2 - np.nanmin(chi2)))
    weight = np.nan_to_num(weight)
    weight /= weight.sum()
    columns = {
        "M/Msun": grid.total_mass / SOLAR_MASS,
        "R/Rsun": grid.photospheric_radius / SOLAR_RADIUS,
    }
    for name, values in grid.parameters.items():
        if np.issubdtype(values.dtype, np.number):
            columns[name] = values.astype(float)
    out = {}
    for name, values in columns.items():
        known = np.isfinite(values) & (weight > 0.0)
        if not np.any(known):
            continue
        share = weight[known] / weight[known].sum()
        mean = float(np.sum(share * values[known]))
        spread = float(np.sqrt(np.sum(share * (values[known] - mean) ** 2)))
        out[name] = Estimate(mean, spread, float(values[best]))
    return out, float(1.0 / np.sum(weight**2))
