"""Which observed mode is which computed one."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from scipy.optimize import linear_sum_assignment

from oscsolve.seismology.acoustic import ModeColumns, acoustic_modes, inertia_excess
from oscsolve.seismology.frozen import freeze_arrays
from oscsolve.seismology.observed import ObservedModes

#: Costs are in units of the large separation. A pair further apart than this is none, ...
_FURTHEST = 0.5
#: ... each e-fold of inertia above that of radial modes makes a mode as unlikely as this, ...
_HEAVY = 0.02
#: ... a published order that a p mode has settles the pair, one of a mixed mode favours it, ...
_SAME_LABEL = 10.0
_SAME_ACOUSTIC = 0.05
#: ... and a pair is in doubt where another one would have cost no more than this in addition.
_DOUBT = 0.05
_FORBIDDEN = 1e3
#: Trial shifts over one large separation where no orders are known.
_SHIFTS = 200


@dataclass(frozen=True, eq=False)
class Pairing:
    """Pairs of observed and computed modes.

    Attributes
    ----------
    row : (k,) int, row of the mode list for each observed mode, -1 where it has none
    doubtful : observed row to the rows of the mode list that would do nearly as well
    shift : (2,) uHz and 1: computed - observed is about shift[0] + shift[1] (nu - mean nu)
    large_separation : uHz, of the computed modes
    """

    row: np.ndarray
    doubtful: Mapping[int, tuple[int, ...]]
    shift: np.ndarray
    large_separation: float

    def __post_init__(self) -> None:
        freeze_arrays(self)


def pair_modes(modes: ModeColumns, observed: ObservedModes) -> Pairing:
    """Pair observed with computed modes of the same degree, each at most once.

    Notes
    -----
    A published order that a pure p mode of the list has settles a pair. The rest are paired so
    that the sum of distances is least (Kuhn 1955), after a smooth shift between the two lists is
    taken off: from the pairs already settled, or, without orders, the one that brings the lists
    closest, never more than half a large separation. Modes of large inertia are less likely to
    be seen. Of mixed modes a published order is taken as the acoustic one, and only favours.
    """
    spacing = _large_separation(modes, observed)
    labels, settled = _labelled(modes, observed)
    shift = _shift(modes, observed, labels, spacing)
    row = np.full(len(observed), -1)
    doubtful: dict[int, tuple[int, ...]] = {}
    expected = observed.nu + shift[0] + shift[1] * (observed.nu - observed.nu.mean())
    heavy = _HEAVY * np.clip(np.nan_to_num(inertia_excess(modes), posinf=0.0), 0.0, None)
    for degree in np.unique(observed.degree):
        seen = np.flatnonzero(observed.degree == degree)
        own = np.flatnonzero((modes.degree == degree) & (modes.sigma2 > 0.0))
        if own.size == 0:
            continue
        distance = np.abs(modes.nu[own] - expected[seen, None]) / spacing
        cost = np.where(distance > _FURTHEST, _FORBIDDEN, distance + heavy[own])
        same = own == labels[seen, None]
        cost -= np.where(same, np.where(settled[seen, None], _SAME_LABEL, _SAME_ACOUSTIC), 0.0)
        cost = np.where(same & settled[seen, None], distance - _SAME_LABEL, cost)
        for i, j in zip(*linear_sum_assignment(cost), strict=True):
            if cost[i, j] >= 0.5 * _FORBIDDEN:
                continue
            row[seen[i]] = own[j]
            near = np.flatnonzero(cost[i] <= cost[i, j] + _DOUBT)
            others = tuple(int(own[k]) for k in near if k != j)
            if others:
                doubtful[int(seen[i])] = others
    taken = set(row.tolist())
    doubtful = {
        place: free
        for place, rows in doubtful.items()
        if (free := tuple(k for k in rows if k not in taken))
    }
    return Pairing(row, doubtful, shift, spacing)


def _large_separation(modes: ModeColumns, observed: ObservedModes) -> float:
    """Median distance of neighbouring p modes of one degree about the observed range, uHz."""
    low, high = observed.nu.min(), observed.nu.max()
    for degree in np.unique(modes.degree):
        own = (modes.degree == degree) & (modes.order > 0) & (modes.n_g == 0)
        nu = np.sort(modes.nu[own])
        near = nu[(nu > 0.7 * low) & (nu < 1.3 * high)]
        if near.size > 1:
            return float(np.median(np.diff(near)))
    # No two p modes of one degree: whatever is nearest by up to a tenth may be a pair.
    return 0.2 * float(observed.nu.mean())


def _labelled(modes: ModeColumns, observed: ObservedModes) -> tuple[np.ndarray, np.ndarray]:
    """(k,) row of the mode that carries the published order or -1, and whether that settles it."""
    row, settled = np.full(len(observed), -1), np.zeros(len(observed), bool)
    if observed.order is None:
        return row, settled
    keys = zip(modes.degree.tolist(), modes.order.tolist(), strict=True)
    plain = {
        key: place
        for place, key in enumerate(keys)
        if modes.n_g[place] == 0 and modes.sigma2[place] > 0.0
    }
    acoustic = acoustic_modes(modes)
    keys = zip(acoustic.degree.tolist(), acoustic.order.tolist(), strict=True)
    standing = dict(zip(keys, acoustic.row.tolist(), strict=True))
    mixed = {
        int(place) for place, is_mixed in zip(acoustic.row, acoustic.mixed, strict=True) if is_mixed
    }
    for place, key in enumerate(
        zip(observed.degree.tolist(), observed.order.tolist(), strict=True)
    ):
        # Where a twin shares the character of a p mode, its label is a matter of taste.
        row[place] = standing.get(key, plain.get(key, -1))
        settled[place] = plain.get(key) == row[place] and row[place] not in mixed
    return row, settled


def _shift(
    modes: ModeColumns, observed: ObservedModes, labels: np.ndarray, spacing: float
) -> np.ndarray:
    """Line through computed - observed over observed frequency, about the mean of that."""
    use = labels >= 0
    if not np.any(use):
        return _line(*_alignment(modes, observed, spacing), observed)
    return _line(observed.nu[use], modes.nu[labels[use]] - observed.nu[use], observed)


def _line(nu: np.ndarray, difference: np.ndarray, observed: ObservedModes) -> np.ndarray:
    middle = float(observed.nu.mean())
    if nu.size < 4 or np.ptp(nu) == 0.0:
        return np.array([np.median(difference), 0.0]) if nu.size else np.zeros(2)
    keep = np.ones(nu.size, bool)
    for _ in range(3):
        slope, height = np.polyfit(nu[keep] - middle, difference[keep], 1)
        rest = np.abs(difference - height - slope * (nu - middle))
        keep = rest <= 4.0 * max(float(np.median(rest)), 1e-9)
    return np.array([height, slope])


def _alignment(
    modes: ModeColumns, observed: ObservedModes, spacing: float
) -> tuple[np.ndarray, np.ndarray]:
    """Observed frequencies and their distance from the mode nearest after the best shift."""
    excess = np.nan_to_num(inertia_excess(modes), posinf=0.0)
    light = (modes.sigma2 > 0.0) & (excess < 1.0)
    best: tuple[float, np.ndarray] = (np.inf, np.zeros(0))
    for shift in spacing * np.linspace(-0.5, 0.5, _SHIFTS + 1):
        difference = np.full(len(observed), np.nan)
        for degree in np.unique(observed.degree):
            nu = modes.nu[light & (modes.degree == degree)]
            seen = np.flatnonzero(observed.degree == degree)
            if nu.size:
                nearest = nu[np.argmin(np.abs(nu - observed.nu[seen, None] - shift), axis=1)]
                difference[seen] = nearest - observed.nu[seen]
        rest = np.abs(difference - shift)
        # Of shifts that fit alike the smaller one is the more likely.
        size = float(np.nanmean(np.minimum(rest, 0.25 * spacing))) + 0.01 * abs(shift)
        if size < best[0]:
            best = size, np.where(rest < 0.25 * spacing, difference, np.nan)
    use = np.isfinite(best[1])
    return observed.nu[use], best[1][use]
