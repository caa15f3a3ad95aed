"""What measured splittings say about rotation: the mean rates of core and envelope.

With K_c the part of a mode's rotation kernel inside a radius and K_e = 1 - K_c that outside, a star
that rotates at two rates splits by beta (K_c Omega_c + K_e Omega_e)/(2 pi). Two or more measured
splittings give the two rates by weighted least squares; where the star does not rotate at two
rates, these are the averages that the modes sense on either side.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oscsolve.errors import InputError
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.integrals import point_structure
from oscsolve.seismology.rotation import split_rows, step_rotation
from oscsolve.star.model import StarModel

#: Two kernels whose shares of the core differ by less than this say nothing about two rates.
_LEAST_CONTRAST = 1e-6


@dataclass(frozen=True, eq=False)
class MeasuredSplittings:
    """Splittings of some modes, nu(m + 1) - nu(m).

    Attributes
    ----------
    degree, order : (k,) int
    splitting, splitting_error : (k,) nHz; errors above zero

    Raises
    ------
    InputError
        Shapes differ, a value is not finite, an error is not above zero, or a mode is there twice.
    """

    degree: np.ndarray
    order: np.ndarray
    splitting: np.ndarray
    splitting_error: np.ndarray

    def __post_init__(self) -> None:
        for name in ("degree", "order", "splitting", "splitting_error"):
            dtype = np.int64 if name in ("degree", "order") else np.float64
            array = np.array(getattr(self, name), dtype=dtype, ndmin=1)
            array.setflags(write=False)
            object.__setattr__(self, name, array)
            if array.shape != np.shape(self.degree):
                raise InputError(f"measured splittings: {name} differs in length from degree")
        for k, (value, error) in enumerate(zip(self.splitting, self.splitting_error, strict=True)):
            if not (np.isfinite(value) and np.isfinite(error) and error > 0.0):
                raise InputError(
                    f"measured splittings: row {k + 1} is {value:g} +- {error:g} nHz; both must be "
                    "finite and the error above zero"
                )
        seen: set[tuple[int, int]] = set()
        for pair in zip(self.degree.tolist(), self.order.tolist(), strict=True):
            if pair in seen:
                raise InputError(
                    f"measured splittings: l = {pair[0]}, n = {pair[1]} is there twice"
                )
            seen.add(pair)


@dataclass(frozen=True, eq=False)
class MeanRotation:
    """Mean rotation of core and envelope.

    Attributes
    ----------
    core, envelope : nHz, Omega/(2 pi)
    core_error, envelope_error : nHz, one standard deviation from the errors of the splittings
    correlation : of the two rates, -1 to 1
    radius : fractional radius that parts them
    chi2 : sum of squared residuals over errors
    freedom : number of splittings less two
    row : (k,) rows of the modes in the list
    core_share : (k,) part of each kernel inside `radius`
    fitted : (k,) nHz, splittings that the two rates give
    """

    core: float
    envelope: float
    core_error: float
    envelope_error: float
    correlation: float
    radius: float
    chi2: float
    freedom: int
    row: np.ndarray
    core_share: np.ndarray
    fitted: np.ndarray


def mean_rotation(
    modes: ModeSet, measured: MeasuredSplittings, radius: float | None = None
) -> MeanRotation:
    """Mean rotation of core and envelope as sensed by some modes.

    Parameters
    ----------
    modes : mode list with eigenfunctions that holds the measured modes
    measured : their splittings
    radius : fractional radius that parts core and envelope; None: the top of the g-mode cavity
        at the mean frequency of the measured modes

    Raises
    ------
    InputError
        Fewer than two splittings, a mode that the list does not hold or that is radial, no g-mode
        cavity where `radius` is None, or modes whose kernels all see the same mixture.

    Notes
    -----
    Weighted least squares for two unknowns; the covariance is that of the given errors and is not
    scaled by chi2.
    """
    rows = _find(modes, measured)
    if rows.size < 2:
        raise InputError(f"two rates need at least two measured splittings; got {rows.size}")
    if radius is None:
        radius = cavity_top(
            modes.star, int(modes.degree[rows].min()), float(np.mean(modes.nu[rows]))
        )
    # The part of a splitting from the core is that of a core at 1 nHz in an envelope at rest.
    found = split_rows(modes, step_rotation(1.0, 0.0, radius), rows)
    beta, core = found.beta, found.splitting
    design = np.column_stack((core, beta - core)) / measured.splitting_error[:, None]
    share = core / beta
    if np.ptp(share) < _LEAST_CONTRAST:
        raise InputError(
            f"the measured modes all sense the same mixture of core and envelope ({share[0]:.3g} "
            f"inside x = {radius:g}); add a mode of another character or move the radius"
        )
    _, triangle = np.linalg.qr(design)
    inverse = np.linalg.inv(triangle)
    covariance = inverse @ inverse.T
    rates = np.linalg.lstsq(design, measured.splitting / measured.splitting_error, rcond=None)[0]
    errors = np.sqrt(np.diag(covariance))
    fitted = core * rates[0] + (beta - core) * rates[1]
    residual = (measured.splitting - fitted) / measured.splitting_error
    return MeanRotation(
        core=float(rates[0]),
        envelope=float(rates[1]),
        core_error=float(errors[0]),
        envelope_error=float(errors[1]),
        correlation=float(covariance[0, 1] / (errors[0] * errors[1])),
        radius=float(radius),
        chi2=float(residual @ residual),
        freedom=rows.size - 2,
        row=rows,
        core_share=share,
        fitted=fitted,
    )


def cavity_top(star: StarModel, degree: int, nu: float) -> float:
    """Fractional radius where the g-mode cavity of the interior ends, at a frequency in uHz.

    The cavity is a run of layers where sigma2 is below N^2 and S_l^2. Of several, the one through
    which waves turn most phase is taken (largest int sqrt((N^2/sigma2 - 1) l(l+1)) dr/r).

    Raises
    ------
    InputError
        No layer is such a cavity.
    """
    at = point_structure(star)
    lam = (nu / star.nu_dynamical) ** 2
    above = np.minimum(at.n2, at.lamb2(degree)) - lam
    # An atmosphere is a cavity to slow waves, but nobody's core.
    inside = (above > 0.0) & (at.x <= 1.0) & (at.x > 0.0)
    if not np.any(inside):
        raise InputError(
            f"no layer is a g-mode cavity for l = {degree} at {nu:.6g} uHz, so core and envelope "
            "do not part by themselves; give the radius that parts them"
        )
    number = np.where(inside, np.maximum(at.n2 / lam - 1.0, 0.0), 0.0)
    wave = np.divide(np.sqrt(number), at.x, out=np.zeros_like(at.x), where=at.x > 0.0)
    phase = 0.5 * (wave[1:] + wave[:-1]) * np.diff(at.x)
    starts = np.flatnonzero(inside & ~np.concatenate(([False], inside[:-1])))
    stops = np.flatnonzero(inside & ~np.concatenate((inside[1:], [False])))
    turned = [np.sum(phase[a:b]) for a, b in zip(starts, stops, strict=True)]
    last = int(stops[int(np.argmax(turned))])
    if last + 1 == at.x.size or above[last + 1] == above[last]:
        return float(at.x[last])
    t = above[last] / (above[last] - above[last + 1])
    return float(at.x[last] + t * (at.x[last + 1] - at.x[last]))


def _find(modes: ModeSet, measured: MeasuredSplittings) -> np.ndarray:
    """Rows of the measured modes."""
    place = {
        (int(degree), int(order)): row
        for row, (degree, order) in enumerate(zip(modes.degree, modes.order, strict=True))
    }
    rows: list[int] = []
    for degree, order in zip(measured.degree.tolist(), measured.order.tolist(), strict=True):
        if degree == 0:
            raise InputError("a radial mode does not split; measured splittings have l > 0")
        if (degree, order) not in place:
            raise InputError(
                f"the mode list does not hold l = {degree}, n = {order}; solve in a band that "
                "reaches it, or take it out of the measured splittings"
            )
        rows.append(place[degree, order])
    return np.array(rows, dtype=np.int64)
