"""The asymptotic relation of mixed modes, fitted to computed ones.

    tan theta_p = q tan theta_g

(Shibahashi 1979, PASJ 31, 87) with theta_p = pi (x(nu) - p) and theta_g = pi (1/(nu DPi) - e_g)
(Mosser et al. 2012, A&A 540, A143; 2015, A&A 584, A50; all three from memory). Here x(nu) is the
radial order read off the radial modes, x(nu_n,0) = n, linear between them, so that the curvature
of the p modes and their glitches need no parameters of their own, and

    p = 1/2 l + offset + slope (x - x_middle)

is where between two radial modes the p modes of degree l would lie.

The relation is fitted in a form without branches. With phi(t) the continuous arc tangent,
phi = arctan(q tan t) + pi round(t/pi), modes are where F(nu) = theta_p - phi(theta_g) is a whole
multiple of pi; F rises with nu (theta_g falls), so its multiples of pi are the consecutive radial
orders n = n_p - n_g, and every mode is tied to its own root without guessing.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy.optimize import least_squares

from oscsolve.errors import InputError
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.frozen import freeze_arrays
from oscsolve.seismology.two_zones import cavity_top
from oscsolve.star.integrals import buoyancy_integral
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile

#: Couplings from which the fit is started, weak to strong.
_STARTS = (0.02, 0.1, 0.2, 0.4, 0.8)
#: Starting period spacings, in units of the integral.
_SPACINGS = (0.97, 1.0, 1.03)
#: Fewest modes for five parameters.
_FEWEST = 7
#: Fewest g modes that the range must span for their spacing and the coupling to part.
_FEWEST_TURNS = 3.0
#: Distance to the relation, in distances between modes, beyond which a mode counts less at first.
_USUAL_MISFIT = 0.05
#: Halvings that bring an interval down to round-off.
_HALVINGS = 50
#: Beyond half of what phases at random give (0.29) the modes are not tied to the relation.
_LARGEST_MISFIT = 0.15


@dataclass(frozen=True, eq=False)
class MixedModeFit:
    """The asymptotic relation that fits the mixed modes of one degree best.

    Attributes
    ----------
    degree : int
    spacing : period spacing DPi of pure g modes, s
    coupling : q, from 0 (no coupling) to 1 (no evanescent zone)
    epsilon_g : phase of the g modes, 0 to 1: without coupling their periods would be
        spacing (k + 1/2 + epsilon_g), k whole
    offset : where p modes lie between radial modes, in large separations beyond l/2; the small
        separation over the large one with the opposite sign, d01 for l = 1 and d02 for l = 2
    spacing_error, coupling_error, epsilon_g_error, offset_error : from the scatter of the modes
        about the relation
    spacing_propagated, coupling_propagated, epsilon_g_propagated, offset_propagated : the largest
        that the numerical errors of the frequencies allow
    row : (k,) int, rows of the modes that were fitted
    predicted : (k,) uHz, frequencies by the relation
    rms : uHz, root mean square of computed less predicted
    misfit : the same in units of the distance between neighbouring modes; 0.3 would be chance

    Notes
    -----
    The relation has no room for glitches of the buoyancy, nor for a coupling that changes with
    frequency; both show in `rms` and in the errors.
    """

    degree: int
    spacing: float
    spacing_error: float
    spacing_propagated: float
    coupling: float
    coupling_error: float
    coupling_propagated: float
    epsilon_g: float
    epsilon_g_error: float
    epsilon_g_propagated: float
    offset: float
    offset_error: float
    offset_propagated: float
    row: np.ndarray
    predicted: np.ndarray
    rms: float
    misfit: float

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True)
class _Relation:
    """F(nu) for given parameters; see the docstring of the module."""

    nu_radial: np.ndarray
    order_radial: np.ndarray
    degree: int

    def at(self, nu: np.ndarray, parameters: np.ndarray) -> np.ndarray:
        """F/pi at frequencies in uHz; parameters: DPi, e_g, ln q, offset, slope."""
        spacing, phase, log_q, offset, slope = parameters
        x = np.interp(nu, self.nu_radial, self.order_radial)
        middle = 0.5 * (self.order_radial[0] + self.order_radial[-1])
        theta_p = math.pi * (x - 0.5 * self.degree - offset - slope * (x - middle))
        theta_g = math.pi * (1e6 / (nu * spacing) - phase)
        turns = np.round(theta_g / math.pi)
        wound = np.arctan(math.exp(log_q) * np.tan(theta_g)) + math.pi * turns
        return (theta_p - wound) / math.pi

    def roots(self, order: np.ndarray, parameters: np.ndarray) -> np.ndarray:
        """Frequencies where F/pi is `order`, by bisection; the nearest end where there is none."""
        first, last = self.nu_radial[0], self.nu_radial[-1]
        below, above = np.full(order.size, 0.5 * first), np.full(order.size, last + 0.5 * first)
        for _ in range(_HALVINGS):
            middle = 0.5 * (below + above)
            short = self.at(middle, parameters) < order
            below, above = np.where(short, middle, below), np.where(short, above, middle)
        return 0.5 * (below + above)


def core_period_spacing(star: StarModel, degree: int, nu: float) -> float | None:
    """Asymptotic period spacing of the g-mode cavity in which modes of one frequency move, in s.

    2 pi^2/(sqrt(l(l+1)) int N dr/r) (Tassoul 1980) with the integral over the layers inside the
    top of the cavity at `nu` uHz; None where there is no such cavity. Other than the integral
    over the whole star it is not spoiled by what N^2 does in the envelope.
    """
    try:
        outer = cavity_top(star, degree, nu)
    except InputError:
        return None
    integral = buoyancy_integral(Profile(star), outer=outer)
    dynamical = 2.0 * math.pi * star.nu_dynamical * 1e-6
    return 2.0 * math.pi**2 / (math.sqrt(degree * (degree + 1)) * integral * dynamical)


def fit_mixed_modes(
    modes: ModeSet, degree: int = 1, *, band: tuple[float, float] | None = None
) -> MixedModeFit | None:
    """Coupling, period spacing and phase that reproduce the mixed modes of one degree best.

    Parameters
    ----------
    modes : mode list with radial modes and mixed ones
    degree : of the mixed modes
    band : uHz, range of the modes to fit; None takes all between the first and the last radial
        mode. The coupling falls with frequency: a few radial orders tell most.

    Returns
    -------
    MixedModeFit or None
        None where fewer than seven modes of consecutive orders lie in the range, where none of
        them is mixed, where there is no g-mode cavity or it holds fewer than three g modes, or
        where no parameters tie the modes to the relation (a misfit above 0.15).
    """
    radial = np.flatnonzero((modes.degree == 0) & (modes.sigma2 > 0.0))
    if radial.size < 2 or degree < 1:
        return None
    nu0 = modes.nu[radial]
    low, high = (nu0[0], nu0[-1]) if band is None else (max(band[0], nu0[0]), min(band[1], nu0[-1]))
    rows = np.flatnonzero((modes.degree == degree) & (modes.nu >= low) & (modes.nu <= high))
    if rows.size < _FEWEST or not np.any(modes.kind[rows] == "mixed"):
        return None
    if np.any(np.diff(modes.order[rows]) != 1):
        return None
    integral = core_period_spacing(modes.star, degree, float(np.median(modes.nu[rows])))
    if integral is None:
        return None
    turns = 1e6 / integral * (1.0 / modes.nu[rows[0]] - 1.0 / modes.nu[rows[-1]])
    if turns < _FEWEST_TURNS:
        return None
    relation = _Relation(nu0, modes.order[radial].astype(float), degree)
    found = _best_fit(modes, rows, relation, integral)
    return found if found.misfit <= _LARGEST_MISFIT else None


def _best_fit(
    modes: ModeSet, rows: np.ndarray, relation: _Relation, spacing: float
) -> MixedModeFit:
    nu, order = modes.nu[rows], modes.order[rows]

    def phases(parameters: np.ndarray) -> np.ndarray:
        return relation.at(nu, parameters) - order

    best = None
    for q in _STARTS:
        for factor in _SPACINGS:
            start = np.array([factor * spacing, 0.0, math.log(q), 0.0, 0.0])
            # The phase, with its whole number of turns, follows from the mean of F.
            start[1] = np.mean(order - relation.at(nu, start))
            tried = least_squares(
                phases, start, x_scale=_scales(spacing), loss="soft_l1", f_scale=_USUAL_MISFIT
            )
            if best is None or tried.cost < best.cost:
                best = tried
    assert best is not None

    def differences(parameters: np.ndarray) -> np.ndarray:
        return nu - relation.roots(order, parameters)

    final = least_squares(differences, best.x, x_scale=_scales(spacing), diff_step=1e-6)
    return _as_fit(modes, rows, relation, _normal(final.x), final.jac)


def _scales(spacing: float) -> np.ndarray:
    """Steps of the parameters that matter alike."""
    return np.array([0.01 * spacing, 0.1, 0.3, 0.05, 0.01])


def _normal(parameters: np.ndarray) -> np.ndarray:
    """The same relation with q <= 1 and the offset between -1/2 and 1/2.

    tan a = q tan b is cot a = q cot b with both angles a quarter turn on, so (q, phases) and (1/q,
    phases + 1/2) are one relation; and both angles may be turned by pi together.
    """
    spacing, phase, log_q, offset, slope = parameters
    if log_q > 0.0:
        log_q, phase, offset = -log_q, phase + 0.5, offset + 0.5
    turns = round(offset)
    return np.array([spacing, phase - turns, log_q, offset - turns, slope])


def _as_fit(
    modes: ModeSet,
    rows: np.ndarray,
    relation: _Relation,
    parameters: np.ndarray,
    jacobian: np.ndarray,
) -> MixedModeFit:
    nu, order = modes.nu[rows], modes.order[rows]
    predicted = relation.roots(order, parameters)
    residual = nu - predicted
    variance = residual @ residual / (rows.size - parameters.size)
    inverse = np.linalg.pinv(jacobian)
    error = np.sqrt(np.sum(inverse**2, axis=1) * variance)
    bound = np.abs(inverse) @ modes.nu_error[rows]
    coupling = math.exp(parameters[2])
    return MixedModeFit(
        degree=relation.degree,
        spacing=float(parameters[0]),
        spacing_error=float(error[0]),
        spacing_propagated=float(bound[0]),
        coupling=coupling,
        coupling_error=float(coupling * error[2]),
        coupling_propagated=float(coupling * bound[2]),
        epsilon_g=float(parameters[1] % 1.0),
        epsilon_g_error=float(error[1]),
        epsilon_g_propagated=float(bound[1]),
        offset=float(parameters[3]),
        offset_error=float(error[3]),
        offset_propagated=float(bound[3]),
        row=rows,
        predicted=predicted,
        rms=float(np.sqrt(np.mean(residual**2))),
        misfit=float(np.sqrt(np.mean((residual / np.gradient(nu)) ** 2))),
    )
