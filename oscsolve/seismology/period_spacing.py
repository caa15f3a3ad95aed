"""Period spacings of g and mixed modes, their dips, and straight lines through periods.

Source of the law: Tassoul (1980, ApJS 43, 469); of what dips mean: Brassard et al. (1992, ApJS 80,
369) and Miglio et al. (2008, MNRAS 386, 1487), both from memory.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.frozen import freeze_arrays
from oscsolve.seismology.large_separation import FEWEST, straight_line

#: A spacing below this share of the median of its degree, and lower than both its neighbours, is
#: a dip.
_DIP = 0.9


@dataclass(frozen=True, eq=False)
class PeriodSpacings:
    """Steps in period between modes of one degree and consecutive orders.

    Attributes
    ----------
    degree : int
    order : (k,) int, order n of the mode of the shorter period
    period : (k,) s, middle of the two periods
    spacing : (k,) s
    error : (k,) s, the largest that the numerical errors of the frequencies allow
    dip : (k,) bool, True where the spacing is lower than both neighbours and than 0.9 of the
        median: a mode caught by a sharp layer, or a mixed mode near a p mode
    """

    degree: int
    order: np.ndarray
    period: np.ndarray
    spacing: np.ndarray
    error: np.ndarray
    dip: np.ndarray

    def __post_init__(self) -> None:
        freeze_arrays(self)

    def __len__(self) -> int:
        return int(self.order.size)


@dataclass(frozen=True, eq=False)
class PeriodSpacingFit:
    """period = spacing (|n| + epsilon), fitted to the g modes of one degree.

    Attributes
    ----------
    spacing, epsilon : s, 1
    spacing_error, epsilon_error : from the scatter of the modes about the line
    spacing_propagated, epsilon_propagated : the largest that the numerical errors of the
        frequencies allow
    degree : int
    order : (k,) int, orders n that went in
    """

    spacing: float
    spacing_error: float
    spacing_propagated: float
    epsilon: float
    epsilon_error: float
    epsilon_propagated: float
    degree: int
    order: np.ndarray

    def __post_init__(self) -> None:
        freeze_arrays(self)


def period_spacings(modes: ModeSet) -> tuple[PeriodSpacings, ...]:
    """Period spacings of g and mixed modes, one entry for each degree that has any.

    Modes with g nodes are taken, with both of a pair of consecutive order; they come by rising
    period.

    Examples
    --------
    >>> import oscsolve
    >>> modes = oscsolve.solve_modes(oscsolve.polytrope(3), [1], (0.1, 3), unit="sigma2")
    >>> (dipole,) = oscsolve.period_spacings(modes)
    >>> print(*(f"{value:.0f}" for value in dipole.spacing), "s")
    2517 2537 2545 2546 2544 2539 2534 2529 2525 2520 s
    """
    found = []
    error = _period_error(modes)
    for degree in np.unique(modes.degree[modes.degree > 0]):
        rows = np.flatnonzero((modes.degree == degree) & (modes.n_g > 0) & (modes.sigma2 > 0.0))
        rows = rows[::-1]
        first, second = rows[:-1], rows[1:]
        pairs = modes.order[first] - modes.order[second] == 1
        first, second = first[pairs], second[pairs]
        if first.size == 0:
            continue
        period = modes.period
        spacing = period[second] - period[first]
        found.append(
            PeriodSpacings(
                degree=int(degree),
                order=modes.order[first],
                period=0.5 * (period[first] + period[second]),
                spacing=spacing,
                error=error[first] + error[second],
                dip=_dips(spacing, modes.order[first]),
            )
        )
    return tuple(found)


def _period_error(modes: ModeSet) -> np.ndarray:
    """(m,) s; 0 for growing modes, which have no period."""
    error = np.zeros(len(modes))
    np.divide(1e6 * modes.nu_error, modes.nu**2, out=error, where=modes.nu > 0.0)
    return error


def _dips(spacing: np.ndarray, order: np.ndarray) -> np.ndarray:
    """Local minima among consecutive orders; the first and last of a run cannot be told."""
    low = np.zeros(spacing.size, dtype=bool)
    if spacing.size > 2:
        inner = spacing[1:-1]
        joined = order[:-2] - order[2:] == 2
        low[1:-1] = joined & (inner < spacing[:-2]) & (inner <= spacing[2:])
    return low & (spacing < _DIP * np.median(spacing))


def fit_period_spacing(modes: ModeSet, degree: int = 1) -> PeriodSpacingFit | None:
    """Period spacing from a straight line through the periods of g modes against |n|.

    None where there are fewer than three g modes without p nodes; for mixed modes use
    `fit_mixed_modes`.
    """
    rows = np.flatnonzero((modes.degree == degree) & (modes.kind == "g") & (modes.sigma2 > 0.0))
    if rows.size < FEWEST:
        return None
    order = modes.order[rows]
    line = straight_line(np.abs(order).astype(float), modes.period[rows], np.ones(rows.size))
    error = _period_error(modes)[rows]
    return PeriodSpacingFit(
        spacing=line.slope,
        spacing_error=line.slope_error,
        spacing_propagated=float(np.abs(line.slope_by) @ error),
        epsilon=line.ratio,
        epsilon_error=line.ratio_error,
        epsilon_propagated=float(np.abs(line.ratio_by) @ error),
        degree=degree,
        order=order,
    )
