"""Large separation and epsilon: straight lines through frequencies against order.

Sources: Tassoul (1980, ApJS 43, 469) for the law, White et al. (2011, ApJ 743, 161) for the weights
of the fit; the latter from memory.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import NamedTuple

import numpy as np

from oscsolve.errors import InputError
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.acoustic import acoustic_modes
from oscsolve.seismology.frozen import freeze_arrays
from oscsolve.seismology.scaling import nu_max_scaling

#: Full width at half maximum of the weights, as a share of nu_max (White et al. 2011).
_WIDTH = 0.25
#: Fewest modes that say something of the scatter about a line.
FEWEST = 3


@dataclass(frozen=True, eq=False)
class LargeSeparationFit:
    """nu = separation (n + l/2 + epsilon), fitted to the p modes of one degree.

    Attributes
    ----------
    separation, epsilon : uHz, 1
    separation_error, epsilon_error : from the scatter of the modes about the line: curvature and
        glitches of the star, and what noise there is
    separation_propagated, epsilon_propagated : what the errors of the frequencies alone make of
        them; see the function that made the fit
    degree : degree of the modes
    order : (k,) int, acoustic orders that went in
    weight : (k,) their weights, at most 1
    nu_max : uHz, centre of the weights, or None where all weights are equal
    """

    separation: float
    separation_error: float
    separation_propagated: float
    epsilon: float
    epsilon_error: float
    epsilon_propagated: float
    degree: int
    order: np.ndarray
    weight: np.ndarray
    nu_max: float | None

    def __post_init__(self) -> None:
        freeze_arrays(self)


class Line(NamedTuple):
    """A weighted straight line y = slope n + cut.

    Attributes
    ----------
    slope, ratio : slope, and cut/slope
    slope_error, ratio_error : from the scatter
    slope_by, ratio_by : (k,) their derivatives by each y
    """

    slope: float
    ratio: float
    slope_error: float
    ratio_error: float
    slope_by: np.ndarray
    ratio_by: np.ndarray


def straight_line(n: np.ndarray, y: np.ndarray, weight: np.ndarray) -> Line:
    """The line through three points or more; `n`, `y`, `weight` (k,)."""
    total = weight.sum()
    n0, y0 = weight @ n / total, weight @ y / total
    spread = weight @ (n - n0) ** 2
    slope_by = weight * (n - n0) / spread
    slope = slope_by @ y
    cut = y0 - slope * n0
    # Freedom counts modes by their weight, so that those far from the centre add none.
    effective = total**2 / (weight @ weight)
    residual = y - slope * n - cut
    variance = weight @ residual**2 / total * effective / max(effective - 2.0, 1.0)
    slope_error = math.sqrt(variance / (spread / total * effective))
    # cut/slope = y0/slope - n0, and y0 and slope are independent.
    ratio_error = math.hypot(math.sqrt(variance / effective), y0 / slope * slope_error) / slope
    ratio_by = (weight / total - y0 / slope * slope_by) / slope
    return Line(
        float(slope), float(cut / slope), slope_error, float(ratio_error), slope_by, ratio_by
    )


def fit_large_separation(modes: ModeSet, degree: int = 0) -> LargeSeparationFit | None:
    """Large separation and epsilon of the p modes of one degree of a mode list.

    Parameters
    ----------
    modes : mode list, solved or read back
    degree : whose modes to use

    Returns
    -------
    LargeSeparationFit or None
        None where the degree has fewer than three p modes that are not mixed. Propagated errors
        are the largest that the numerical errors of the frequencies allow.

    Notes
    -----
    Weights are a Gaussian about nu_max of full width 0.25 nu_max (White et al. 2011) where nu_max
    is known and within the modes; otherwise all are equal, and low orders, which do not follow
    the asymptotic law, weigh as much as high ones.

    Examples
    --------
    >>> import oscsolve
    >>> modes = oscsolve.solve_modes(oscsolve.polytrope(3), [0], (20, 300), unit="sigma2")
    >>> fit = oscsolve.fit_large_separation(modes)
    >>> print(f"{fit.separation:.2f} +- {fit.separation_error:.2f} uHz")
    126.03 +- 0.05 uHz
    """
    acoustic = acoustic_modes(modes)
    use = (acoustic.degree == degree) & ~acoustic.mixed
    if np.count_nonzero(use) < FEWEST:
        return None
    row = acoustic.row[use]
    nu_max = nu_max_scaling(modes.star)
    fit, line = _fit(degree, acoustic.order[use], modes.nu[row], nu_max)
    error = modes.nu_error[row]
    return _with_propagated(
        fit, float(np.abs(line.slope_by) @ error), float(np.abs(line.ratio_by) @ error)
    )


def fit_ridge(
    degree: int,
    order: np.ndarray,
    nu: np.ndarray,
    nu_error: np.ndarray,
    *,
    nu_max: float | None = None,
) -> LargeSeparationFit:
    """Large separation and epsilon of a list of p modes of one degree, observed or computed.

    Parameters
    ----------
    degree : of all modes
    order, nu, nu_error : (k,) acoustic order; uHz; uHz, independent standard errors
    nu_max : uHz, centre of the weights; None, or outside the list: all weights are equal

    Returns
    -------
    LargeSeparationFit
        Propagated errors are standard errors. Modes are weighted by their place and not by their
        errors, so that lists of one star measured twice give the same separation.

    Raises
    ------
    InputError
        Fewer than three modes, shapes that differ, or frequencies that do not rise with order.
    """
    order, nu, nu_error = (np.asarray(column, dtype=float) for column in (order, nu, nu_error))
    if order.ndim != 1 or nu.shape != order.shape or nu_error.shape != order.shape:
        raise InputError("order, nu and nu_error must hold one number a mode each")
    if order.size < FEWEST:
        raise InputError(f"a line needs {FEWEST} modes or more; got {order.size}")
    along = np.argsort(order)
    order, nu, nu_error = order[along], nu[along], nu_error[along]
    if np.any(np.diff(order) <= 0.0) or not np.all(np.diff(nu) > 0.0):
        raise InputError("each order comes once, and nu rises with order; the list does otherwise")
    fit, line = _fit(degree, order.astype(np.int64), nu, nu_max)
    return _with_propagated(
        fit,
        float(np.linalg.norm(line.slope_by * nu_error)),
        float(np.linalg.norm(line.ratio_by * nu_error)),
    )


def _fit(
    degree: int, order: np.ndarray, nu: np.ndarray, nu_max: float | None
) -> tuple[LargeSeparationFit, Line]:
    weight = np.ones(nu.size)
    if nu_max is not None and nu[0] <= nu_max <= nu[-1]:
        weight = np.exp(-4.0 * math.log(2.0) * ((nu - nu_max) / (_WIDTH * nu_max)) ** 2)
    else:
        nu_max = None
    line = straight_line(order.astype(float), nu, weight)
    fit = LargeSeparationFit(
        separation=line.slope,
        separation_error=line.slope_error,
        separation_propagated=0.0,
        epsilon=line.ratio - 0.5 * degree,
        epsilon_error=line.ratio_error,
        epsilon_propagated=0.0,
        degree=degree,
        order=order,
        weight=weight,
        nu_max=nu_max,
    )
    return fit, line


def _with_propagated(
    fit: LargeSeparationFit, separation: float, epsilon: float
) -> LargeSeparationFit:
    return replace(fit, separation_propagated=separation, epsilon_propagated=epsilon)
