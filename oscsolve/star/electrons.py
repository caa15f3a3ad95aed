"""The electron gas at any degeneracy and at relativistic speeds, without pairs or interaction.

With y = p/mc, eps = sqrt(1 + y^2) - 1 the kinetic energy in mc^2, t = kT/mc^2, x = eps/t, f the
Fermi function of x - eta and w = f (1 - f), integration by parts turns the Fermi-Dirac integrals
(Cox & Giuli 1968, ch. 24) into averages of zero-temperature functions (Chandrasekhar 1939, ch. X)
over w, which is a narrow bell about x = eta:

    n = N int (y^3/3) w dx,    P = N mc^2 int p0(y) w dx,    N = 8 pi (mc/h)^3,
    p0 = int (y^3/3) d eps = [y (2 y^2 - 3) sqrt(1 + y^2) + 3 asinh y]/24.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oscsolve.units import BOLTZMANN, COMPTON_DENSITY, ELECTRON_REST_ENERGY

#: Half the range of x about eta that is integrated: w falls to e^-38 at its ends.
_REACH = 38.0
#: Nodes of the trapezoidal rule. It converges exponentially here: the integrands are analytic
#: and vanish at the ends, or, in s = sqrt(x), are even functions.
_NODES = 160
#: Below this y, p0 is summed as a series, since its closed form cancels.
_SMALL = 0.06
#: Steps of the Newton method for eta, and relative error of n at which it stops.
_STEPS, _EXACT = 30, 1e-13
#: Points treated at a time, so that the work arrays stay in the cache of the processor.
_CHUNK = 256


@dataclass(frozen=True, eq=False)
class ElectronGas:
    """State of an electron gas; arrays of one shape, cgs units.

    Attributes
    ----------
    eta : chemical potential without rest energy over kT; far above zero where degenerate
    pressure : dyn cm^-2
    by_density : dP/dln n at constant T, dyn cm^-2
    by_temperature : dP/dln T at constant n, dyn cm^-2
    heat : dU/dln T at constant n, U the kinetic energy per volume, erg cm^-3
    """

    eta: np.ndarray
    pressure: np.ndarray
    by_density: np.ndarray
    by_temperature: np.ndarray
    heat: np.ndarray


def electron_gas(number_density: np.ndarray, temperature: np.ndarray) -> ElectronGas:
    """State of free electrons.

    Parameters
    ----------
    number_density, temperature : (n,) cm^-3, K; above zero. Pairs are left out, which is right
        below some 1e9 K.
    """
    n, t = (np.atleast_1d(np.asarray(v, dtype=float)) for v in (number_density, temperature))
    scaled = n / COMPTON_DENSITY
    relative = BOLTZMANN * t / ELECTRON_REST_ENERGY
    parts = [
        _state(scaled[k : k + _CHUNK], relative[k : k + _CHUNK]) for k in range(0, n.size, _CHUNK)
    ]
    eta, *rest = (np.concatenate(columns) for columns in zip(*parts, strict=True))
    return ElectronGas(eta, *(COMPTON_DENSITY * ELECTRON_REST_ENERGY * column for column in rest))


@dataclass(frozen=True, eq=False)
class Electrons:
    """Electrons of a given eta; arrays of one shape, cgs units.

    Attributes
    ----------
    number, pressure : n in cm^-3, P in dyn cm^-2
    by_eta, by_t : dln n/d eta at constant T, dln n/dlnT at constant eta
    pressure_by_t : dP/dlnT at constant eta; dP/d eta is n kT
    energy_by_eta, energy_by_t : dU/d eta and dU/dlnT likewise, U the kinetic energy per volume
    """

    number: np.ndarray
    pressure: np.ndarray
    by_eta: np.ndarray
    by_t: np.ndarray
    pressure_by_t: np.ndarray
    energy_by_eta: np.ndarray
    energy_by_t: np.ndarray


def electrons_of_eta(eta: np.ndarray, temperature: np.ndarray) -> Electrons:
    """The electron gas as a function of its chemical potential over kT and of T in K.

    Notes
    -----
    From `electron_gas`, whose derivatives are at constant n: with <x> = -(d eta/dlnT) at
    constant n, the identities dln n/dlnT = <x> dln n/d eta and dU/dln n = n kT <x> hold.
    """
    t = BOLTZMANN * temperature / ELECTRON_REST_ENERGY
    parts = [_of_eta(eta[k : k + _CHUNK], t[k : k + _CHUNK]) for k in range(0, eta.size, _CHUNK)]
    number, slope, mean, *rest = (np.concatenate(column) for column in zip(*parts, strict=True))
    pressure, by_density, by_temperature, heat = rest
    unit = COMPTON_DENSITY * ELECTRON_REST_ENERGY
    by_t = slope * mean
    per_ln_n = number * t * mean
    return Electrons(
        number=COMPTON_DENSITY * number,
        pressure=unit * pressure,
        by_eta=slope,
        by_t=by_t,
        pressure_by_t=unit * (by_temperature + by_density * by_t),
        energy_by_eta=unit * per_ln_n * slope,
        energy_by_t=unit * (heat + per_ln_n * by_t),
    )


def cold_pressure(y: np.ndarray) -> np.ndarray:
    """p0(y), the pressure of cold electrons of Fermi momentum y mc over 8 pi (mc/h)^3 mc^2.

    Their density is y^3/3 in the same unit.
    """
    root = np.sqrt(1.0 + y * y)
    y2 = y * y
    series = y2 * y2 * y / 15.0 * (1.0 - y2 * (5 / 14 - y2 * (5 / 24 - y2 * (25 / 176))))
    # The next term of the series is 2e-9 of the sum at the border, where the closed form has
    # lost five digits of sixteen.
    series += y2**4 * y2 * y2 * y * (35 / 128 / 13 / 3)
    closed = (y * (2.0 * y2 - 3.0) * root + 3.0 * np.arcsinh(y)) / 24.0
    return np.where(y < _SMALL, series, closed)


def _state(n: np.ndarray, t: np.ndarray) -> tuple[np.ndarray, ...]:
    """eta, P, dP/dln n, dP/dln T, dU/dln T of n in N and t = kT/mc^2, in units of N mc^2."""
    eta = _degeneracy(n, t)
    return eta, *_of_eta(eta, t)[3:]


def _of_eta(eta: np.ndarray, t: np.ndarray) -> tuple[np.ndarray, ...]:
    """n in N, dln n/d eta, <x>, and P, dP/dln n, dP/dln T, dU/dln T in units of N mc^2."""
    x, w = _nodes(eta)
    y, eps = _momentum(x, t)
    cube = y**3 / 3.0 * w
    n = np.sum(cube, axis=1)
    states = y * (1.0 + eps) * t[:, None] * w
    number = np.sum(states, axis=1)
    mean = np.sum(states * x, axis=1) / number
    off = x - mean[:, None]
    return (
        n,
        number / n,
        mean,
        np.sum(cold_pressure(y) * w, axis=1),
        n * n * t / number,
        # Differences from the mean: what is left of a cold gas is small, and would cancel.
        t * np.sum(cube * off, axis=1),
        t * np.sum(states * off * off, axis=1),
    )


def _degeneracy(n: np.ndarray, t: np.ndarray) -> np.ndarray:
    """eta of a density, by the Newton method on ln n, which is concave in eta."""
    y = np.cbrt(3.0 * n)
    fermi = y * y / (1.0 + np.sqrt(1.0 + y * y)) / t
    dilute = 4.0 / (3.0 * np.sqrt(np.pi)) * fermi**1.5
    with np.errstate(divide="ignore"):
        eta = np.where(fermi > 3.0, fermi - np.pi**2 / (12.0 * fermi), np.log(dilute) + dilute / 3)
    for _ in range(_STEPS):
        x, w = _nodes(eta)
        y, eps = _momentum(x, t)
        found = np.sum(y**3 * w, axis=1) / 3.0
        slope = np.sum(y * (1.0 + eps) * w, axis=1) * t
        step = np.log(n / found) * found / slope
        eta = eta + step
        if np.all(np.abs(step) <= _EXACT * np.maximum(np.abs(eta), 1.0)):
            break
    return eta


def _momentum(x: np.ndarray, t: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    eps = x * t[:, None]
    return np.sqrt(eps * (eps + 2.0)), eps


def _nodes(eta: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """(n, k) x and quadrature weight times w = f (1 - f)."""
    grid = np.arange(_NODES) + 0.5
    cold = eta > _REACH
    # Cold: evenly in x about eta. Else: evenly in s = sqrt(x) from 0, dx = 2 s ds.
    top = np.sqrt(np.maximum(eta, 0.0) + _REACH)
    s = grid * (top / _NODES)[:, None]
    x = np.where(cold[:, None], eta[:, None] + _REACH * (2.0 * grid / _NODES - 1.0), s * s)
    step = np.where(cold[:, None], 2.0 * _REACH / _NODES, 2.0 * s * (top / _NODES)[:, None])
    tail = np.exp(-np.abs(x - eta[:, None]))
    return x, step * tail / (1.0 + tail) ** 2
