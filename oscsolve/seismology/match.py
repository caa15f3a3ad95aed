"""A mode list against an observed one: pairs, surface correction, chi2, ratios."""

from __future__ import annotations

import os
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from oscsolve.errors import InputError
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.acoustic import ModeColumns, acoustic_modes
from oscsolve.seismology.frozen import freeze_arrays
from oscsolve.seismology.observed import ObservedModes, read_observed
from oscsolve.seismology.pairing import Pairing, pair_modes
from oscsolve.seismology.scaling import nu_max_scaling
from oscsolve.seismology.separations import Separation, combine_frequencies, joint_covariance
from oscsolve.seismology.surface import LAWS, Layer, SurfaceFit, fit_surface

#: Ratios that are compared (Roxburgh & Vorontsov 2003).
RATIOS = ("ratio_01", "ratio_10", "ratio_02")
#: An outlier lies this many times further off than the rest does, and than its own error.
_OUTLIER = 5.0
#: Directions of the covariance of ratios whose variance is below this share of the largest, in
#: units of the single variances, hold no information of their own.
_DEGENERATE = 1e-10


@dataclass(frozen=True, eq=False)
class RatioMatch:
    """Ratios of small to large separations, observed and computed.

    Attributes
    ----------
    name : (k,) str, one of `RATIOS`
    order : (k,) int, n of the definition
    nu : (k,) uHz, where the observed one belongs
    observed, observed_error, computed : (k,) 1
    covariance : (k, k) of the observed ones
    chi2 : d C^-1 d with d = observed - computed
    freedom : rank of the covariance
    """

    name: np.ndarray
    order: np.ndarray
    nu: np.ndarray
    observed: np.ndarray
    observed_error: np.ndarray
    computed: np.ndarray
    covariance: np.ndarray
    chi2: float
    freedom: int

    def __post_init__(self) -> None:
        freeze_arrays(self)

    @property
    def reduced_chi2(self) -> float:
        """chi2 over the number of independent ratios; NaN without any."""
        return self.chi2 / self.freedom if self.freedom else float("nan")


@dataclass(frozen=True, eq=False)
class Match:
    """An observed list paired with a computed one, and what is left between them.

    Attributes
    ----------
    observed : the observed list
    pairing : which mode belongs to which
    pair : (p,) int, rows of the observed list that have a partner
    row : (p,) int, rows of the mode list, their partners
    surface : the fitted law
    computed, corrected, corrected_error : (p,) uHz; the error is that of the correction
    residual : (p,) uHz, observed - corrected
    error : (p,) uHz, of the residual: observed and numerical errors
    chi2 : sum of (residual/error)^2
    freedom : pairs less coefficients
    outlier : (p,) bool, five times further off than most, and than its error
    unmatched_observed : (.,) int, rows of the observed list without a partner
    unmatched_computed : (.,) int, rows of the mode list without one, in the observed range of the
        observed degrees, p modes and modes of not much more inertia only
    ratios : `RatioMatch`
    """

    observed: ObservedModes
    pairing: Pairing
    pair: np.ndarray
    row: np.ndarray
    surface: SurfaceFit
    computed: np.ndarray
    corrected: np.ndarray
    corrected_error: np.ndarray
    residual: np.ndarray
    error: np.ndarray
    chi2: float
    freedom: int
    outlier: np.ndarray
    unmatched_observed: np.ndarray
    unmatched_computed: np.ndarray
    ratios: RatioMatch

    def __post_init__(self) -> None:
        freeze_arrays(self)

    @property
    def reduced_chi2(self) -> float:
        """chi2 over degrees of freedom; NaN without any."""
        return self.chi2 / self.freedom if self.freedom > 0 else float("nan")

    @property
    def rms(self) -> float:
        """Root of the mean squared residual, uHz."""
        return float(np.sqrt(np.mean(self.residual**2)))


def match_observed(
    modes: ModeSet,
    observed: ObservedModes | str | os.PathLike[str],
    *,
    surface: str = "two-term",
) -> Match:
    """Compare a mode list with observed frequencies.

    Parameters
    ----------
    modes : mode list, solved or read back; its band must hold the observed range
    observed : `ObservedModes`, or a CSV file for `read_observed`
    surface : "none", "power", "cubic", "two-term" or "lorentzian", see
        `oscsolve.seismology.surface`

    Returns
    -------
    Match

    Raises
    ------
    InputError
        The list lacks an observed degree or part of the observed range, or no mode finds a
        partner; the message says what to compute.

    Notes
    -----
    Ratios need no surface correction (Roxburgh & Vorontsov 2003) and are compared as computed.

    Examples
    --------
    >>> import oscsolve
    >>> modes = oscsolve.solve_modes(oscsolve.polytrope(3), [0, 1], (20, 400), unit="sigma2")
    >>> seen = oscsolve.ObservedModes(modes.degree, modes.nu + 0.3, 0.1 + 0.0 * modes.nu)
    >>> found = oscsolve.match_observed(modes, seen, surface="none")
    >>> len(found.pair) == len(modes), round(found.rms, 6)
    (True, 0.3)
    """
    if not isinstance(observed, ObservedModes):
        observed = read_observed(observed)
    return match_columns(modes, observed, surface, nu_max_scaling(modes.star))


def match_columns(
    modes: ModeColumns, observed: ObservedModes, surface: str, nu_max: float | None = None
) -> Match:
    """`match_observed` for anything that has the columns of a mode list."""
    if surface not in LAWS:
        raise InputError(f"surface must be one of {', '.join(LAWS)}; got {surface!r}")
    check_cover(modes, observed)
    pairing = pair_modes(modes, observed)
    pair = np.flatnonzero(pairing.row >= 0)
    row = pairing.row[pair]
    if pair.size == 0:
        raise InputError(
            f"{observed.name}: no observed mode lies within half a large separation "
            f"({0.5 * pairing.large_separation:.4g} uHz) of a computed one; is it this star?"
        )
    layer = _layer(modes, row, observed, nu_max)
    error = np.hypot(observed.nu_error[pair], modes.nu_error[row])
    fit = fit_surface(surface, layer, observed.nu[pair] - modes.nu[row], error)
    corrected = modes.nu[row] + fit.correction(layer)
    residual = observed.nu[pair] - corrected
    return Match(
        observed=observed,
        pairing=pairing,
        pair=pair,
        row=row,
        surface=fit,
        computed=modes.nu[row],
        corrected=corrected,
        corrected_error=fit.correction_error(layer),
        residual=residual,
        error=error,
        chi2=float(np.sum((residual / error) ** 2)),
        freedom=int(pair.size - len(fit.names)),
        outlier=_outliers(residual, error),
        unmatched_observed=np.flatnonzero(pairing.row < 0),
        unmatched_computed=_left_over(modes, observed, pairing),
        ratios=compare_ratios(modes, observed, pairing),
    )


def check_cover(modes: ModeColumns, observed: ObservedModes) -> None:
    """Refuse a mode list that cannot hold the partners of the observed modes."""
    low, high = float(observed.nu.min()), float(observed.nu.max())
    wanted = sorted({int(degree) for degree in observed.degree})
    missing = [degree for degree in wanted if degree not in modes.census.degree]
    if missing:
        raise InputError(
            f"{observed.name}: holds l = {missing[0]}, which the mode list lacks; solve for "
            f"--degrees {','.join(map(str, sorted({0, *wanted})))}"
        )
    for place, degree in enumerate(modes.census.degree):
        if int(degree) not in wanted:
            continue
        first, last = modes.census.low[place], modes.census.high[place]
        if first > low or last < high:
            advice = f"--band {0.93 * min(first, low):.0f}:{1.07 * max(last, high):.0f}"
            raise InputError(
                f"{observed.name}: reaches from {low:.6g} to {high:.6g} uHz, the mode list from "
                f"{first:.6g} to {last:.6g} uHz for l = {degree}; solve with {advice}"
            )


def _layer(
    modes: ModeColumns, row: np.ndarray, observed: ObservedModes, nu_max: float | None
) -> Layer:
    """What a surface law needs, with the inertia of radial modes read between them."""
    reference = float(observed.nu.mean())
    radial = np.flatnonzero((modes.degree == 0) & (modes.sigma2 > 0.0))
    nu = modes.nu[row]
    if radial.size == 0:
        # No radial modes: those listed stand for them, each for itself.
        alike, at_reference = modes.inertia[row], float(np.median(modes.inertia[row]))
    else:
        place = modes.nu[radial], np.log(modes.inertia[radial])
        alike = np.exp(np.interp(nu, *place))
        at_reference = float(np.exp(np.interp(reference, *place)))
    return Layer(
        nu=nu,
        inertia=modes.inertia[row],
        radial_inertia=alike,
        reference=reference,
        reference_inertia=at_reference,
        nu_max=reference if nu_max is None else nu_max,
    )


def _outliers(residual: np.ndarray, error: np.ndarray) -> np.ndarray:
    middle = float(np.median(residual))
    spread = 1.4826 * float(np.median(np.abs(residual - middle)))
    return np.abs(residual - middle) > _OUTLIER * np.maximum(spread, error)


def _left_over(modes: ModeColumns, observed: ObservedModes, pairing: Pairing) -> np.ndarray:
    """Computed modes without a partner that could have been seen."""
    acoustic = acoustic_modes(modes)
    ends = np.array([observed.nu.min(), observed.nu.max()])
    low, high = ends + pairing.shift[0] + pairing.shift[1] * (ends - observed.nu.mean())
    rows = acoustic.row[np.isin(acoustic.degree, observed.degree)]
    inside = (modes.nu[rows] >= low) & (modes.nu[rows] <= high)
    return np.setdiff1d(rows[inside], pairing.row)


def compare_ratios(modes: ModeColumns, observed: ObservedModes, pairing: Pairing) -> RatioMatch:
    """Ratios that both lists have, at the orders of the computed partners."""
    acoustic = acoustic_modes(modes)
    order_of = dict(zip(acoustic.row.tolist(), acoustic.order.tolist(), strict=True))
    pair = np.array([k for k, row in enumerate(pairing.row) if int(row) in order_of], dtype=int)
    row = pairing.row[pair]
    order = np.array([order_of[int(k)] for k in row], dtype=int)
    if pair.size == 0 or np.any(_falls(observed.degree[pair], order, observed.nu[pair])):
        return _ratio_match([], [], np.zeros((0, 0)))
    lists: list[dict[str, Separation]] = []
    for nu, error in (
        (observed.nu[pair], observed.nu_error[pair]),
        (modes.nu[row], modes.nu_error[row]),
    ):
        found = combine_frequencies(observed.degree[pair], order, nu, error)
        lists.append({name: found[name] for name in RATIOS if name in found})
    seen, computed = (list(found.values()) for found in lists)
    return _ratio_match(seen, computed, joint_covariance(seen, observed.nu_error[pair]))


def _falls(degree: np.ndarray, order: np.ndarray, nu: np.ndarray) -> np.ndarray:
    """True for every degree whose frequencies do not rise with order."""
    out = []
    for each in np.unique(degree):
        rows = np.flatnonzero(degree == each)
        out.append(bool(np.any(np.diff(nu[rows[np.argsort(order[rows])]]) <= 0.0)))
    return np.array(out)


def _ratio_match(
    seen: Sequence[Separation], computed: Sequence[Separation], covariance: np.ndarray
) -> RatioMatch:
    def joined(parts: Sequence[Separation], name: str) -> np.ndarray:
        return np.concatenate([getattr(part, name) for part in parts] or [np.zeros(0)])

    values = joined(seen, "value")
    difference = values - joined(computed, "value")
    chi2, rank = _chi2(difference, covariance)
    names: list[Any] = [part.name for part in seen for _ in range(len(part))]
    return RatioMatch(
        name=np.array(names, dtype=str),
        order=joined(seen, "order").astype(int),
        nu=joined(seen, "nu"),
        observed=values,
        observed_error=np.sqrt(np.diag(covariance)),
        computed=joined(computed, "value"),
        covariance=covariance,
        chi2=chi2,
        freedom=rank,
    )


def _chi2(difference: np.ndarray, covariance: np.ndarray) -> tuple[float, int]:
    """d C^-1 d, directions without variance left out, and how many there are with."""
    if difference.size == 0:
        return 0.0, 0
    scale = np.sqrt(np.diag(covariance))
    values, vectors = np.linalg.eigh(covariance / np.outer(scale, scale))
    keep = values > _DEGENERATE * values[-1]
    along = vectors[:, keep].T @ (difference / scale)
    return float(np.sum(along**2 / values[keep])), int(np.count_nonzero(keep))
