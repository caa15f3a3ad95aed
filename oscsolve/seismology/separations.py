"""Separations of acoustic modes, their ratios and second differences.

Definitions (nu_n,l the frequency of radial order n and degree l):

    large_l         nu_n,l - nu_n-1,l
    small_02        nu_n,0 - nu_n-1,2
    small_13        nu_n,1 - nu_n-1,3
    small_01        nu_n,0 - (nu_n-1,1 + nu_n,1)/2
    small_10        (nu_n,0 + nu_n+1,0)/2 - nu_n,1
    five_01         (nu_n-1,0 - 4 nu_n-1,1 + 6 nu_n,0 - 4 nu_n,1 + nu_n+1,0)/8
    five_10        -(nu_n-1,1 - 4 nu_n,0 + 6 nu_n,1 - 4 nu_n+1,0 + nu_n+1,1)/8
    ratio_01        five_01(n)  / large_1(n)
    ratio_10        five_10(n)  / large_0(n+1)
    ratio_02        small_02(n) / large_1(n)
    ratio_13        small_13(n) / large_0(n+1)
    second_l        nu_n-1,l - 2 nu_n,l + nu_n+1,l

The five-point forms and the ratios are those of Roxburgh & Vorontsov (2003, A&A 411, 215), the
second differences those of Gough (1990, Lecture Notes in Physics 367, 283); both from memory. A
combination appears for every n that has all the modes it needs, and not at all where there is none.

Each value is a sum of frequencies over another, so its derivatives by the frequencies are known
exactly. They are kept with the values (`Separation.row`, `Separation.slope`): whoever has the
errors of a list, or their covariance, gets those of any set of combinations of it from
`joint_covariance`, shared modes and all.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from types import MappingProxyType

import numpy as np

from oscsolve.errors import InputError
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.acoustic import acoustic_modes
from oscsolve.seismology.frozen import freeze_arrays

#: A sum of frequencies: (degree, order relative to n) to weight.
_Sum = dict[tuple[int, int], float]


def _large(degree: int, shift: int = 0) -> _Sum:
    return {(degree, shift): 1.0, (degree, shift - 1): -1.0}


_FIVE_01: _Sum = {(0, -1): 1 / 8, (1, -1): -4 / 8, (0, 0): 6 / 8, (1, 0): -4 / 8, (0, 1): 1 / 8}
_FIVE_10: _Sum = {(1, -1): -1 / 8, (0, 0): 4 / 8, (1, 0): -6 / 8, (0, 1): 4 / 8, (1, 1): -1 / 8}
_SMALL_02: _Sum = {(0, 0): 1.0, (2, -1): -1.0}
_SMALL_13: _Sum = {(1, 0): 1.0, (3, -1): -1.0}

#: Name: sum above, sum below the fraction bar or None, degree whose nu_n,l is the place.
_COMBINATIONS: dict[str, tuple[_Sum, _Sum | None, int]] = {
    **{f"large_{degree}": (_large(degree), None, degree) for degree in range(4)},
    "small_02": (_SMALL_02, None, 0),
    "small_13": (_SMALL_13, None, 1),
    "small_01": ({(0, 0): 1.0, (1, -1): -0.5, (1, 0): -0.5}, None, 0),
    "small_10": ({(0, 0): 0.5, (0, 1): 0.5, (1, 0): -1.0}, None, 1),
    "five_01": (_FIVE_01, None, 0),
    "five_10": (_FIVE_10, None, 1),
    "ratio_01": (_FIVE_01, _large(1), 0),
    "ratio_10": (_FIVE_10, _large(0, 1), 1),
    "ratio_02": (_SMALL_02, _large(1), 0),
    "ratio_13": (_SMALL_13, _large(0, 1), 1),
    **{
        f"second_{degree}": (
            {(degree, -1): 1.0, (degree, 0): -2.0, (degree, 1): 1.0},
            None,
            degree,
        )
        for degree in range(4)
    },
}
#: Names of all combinations, in the order in which they are listed.
SEPARATIONS = tuple(_COMBINATIONS)


@dataclass(frozen=True, eq=False)
class Separation:
    """One combination of frequencies for all orders that have the modes it needs.

    Attributes
    ----------
    name : one of `SEPARATIONS`
    order : (k,) int, the n of its definition
    nu : (k,) uHz, where it belongs: the middle of a large separation, otherwise the mode of order
        n and of the first degree in its name
    value : (k,) uHz, or 1 for ratios
    error : (k,) as `value`; see the function that made it
    row : (k, t) int, rows of the frequency list that go into each value
    slope : (k, t) derivative of each value by the frequency of that row, 1 or 1/uHz
    mixed : (k,) bool, True where a mixed mode stands for a p mode in it; such a value tells of the
        coupling rather than of the layers that sound crosses
    unit : "uHz" or "1"
    """

    name: str
    order: np.ndarray
    nu: np.ndarray
    value: np.ndarray
    error: np.ndarray
    row: np.ndarray
    slope: np.ndarray
    mixed: np.ndarray
    unit: str

    def __post_init__(self) -> None:
        freeze_arrays(self)

    def __len__(self) -> int:
        return int(self.order.size)

    def gradient(self, size: int) -> np.ndarray:
        """(k, size) derivatives of the values by all frequencies of a list of `size` modes."""
        matrix = np.zeros((len(self), size))
        np.add.at(matrix, (np.arange(len(self))[:, None], self.row), self.slope)
        return matrix


def combine_frequencies(
    degree: np.ndarray, order: np.ndarray, nu: np.ndarray, nu_error: np.ndarray
) -> Mapping[str, Separation]:
    """All combinations of a list of p modes, observed or computed, name to `Separation`.

    Parameters
    ----------
    degree, order : (m,) int, acoustic radial order n; each pair once
    nu : (m,) uHz
    nu_error : (m,) uHz, standard errors taken as independent, or (m, m) uHz^2, their covariance

    Returns
    -------
    Mapping
        Errors are standard errors, the roots of the diagonal of `joint_covariance`.

    Raises
    ------
    InputError
        Shapes do not fit, a number is not finite, an error is negative, a mode comes twice, or
        frequencies do not rise with order.

    Examples
    --------
    >>> import numpy as np
    >>> n = np.arange(14, 24)
    >>> degree, order = np.repeat([0, 1], 10), np.tile(n, 2)
    >>> nu = 135.0 * (order + degree / 2 + 1.45) - 2.0 * degree
    >>> found = combine_frequencies(degree, order, nu, np.full(20, 0.1))
    >>> round(float(found["small_01"].value[0]), 6)
    2.0
    >>> round(float(joint_covariance([found["small_01"]], np.full(20, 0.1))[0, 1]), 6)
    0.0025
    """
    degree, order, nu = (np.asarray(column) for column in (degree, order, nu))
    covariance = _covariance_of(nu_error, nu.size)
    _check_list(degree, order, nu)
    found = _combinations(degree, order, nu, np.zeros(nu.size, dtype=bool))
    return MappingProxyType(
        {name: replace(part, error=_standard(part, covariance)) for name, part in found.items()}
    )


def _standard(part: Separation, covariance: np.ndarray) -> np.ndarray:
    """(k,) standard errors, without the covariance between the values."""
    among = covariance[part.row[:, :, None], part.row[:, None, :]]
    return np.sqrt(np.einsum("ki,kij,kj->k", part.slope, among, part.slope))


def joint_covariance(parts: Iterable[Separation], nu_error: np.ndarray) -> np.ndarray:
    """(k, k) covariance of the values of several combinations of one list, one after the other.

    Parameters
    ----------
    parts : combinations of the same list of m modes
    nu_error : (m,) uHz, standard errors taken as independent, or (m, m) uHz^2, their covariance

    Raises
    ------
    InputError
        `nu_error` has neither shape, or a mode of the combinations lies outside it.

    Notes
    -----
    J C J^T with J the derivatives of the values by the frequencies, exact for sums and to first
    order in the errors for ratios.
    """
    parts = list(parts)
    covariance = _covariance_of(nu_error, np.shape(nu_error)[0] if np.ndim(nu_error) else 0)
    size = covariance.shape[0]
    if any(part.row.size and int(part.row.max()) >= size for part in parts):
        raise InputError(
            f"nu_error holds {size} modes; expected those of the list that was combined"
        )
    rows = [part.gradient(size) for part in parts]
    gradient = np.vstack(rows) if rows else np.zeros((0, size))
    return gradient @ covariance @ gradient.T


def separations(modes: ModeSet) -> Mapping[str, Separation]:
    """All combinations that a mode list allows, name to `Separation`.

    Parameters
    ----------
    modes : mode list, solved or read back

    Returns
    -------
    Mapping
        Names and definitions as in the docstring of this module. A combination for which modes
        are missing is absent. Errors are the largest that the numerical errors of the
        frequencies allow (they do not cancel), and `Separation.row` counts rows of the mode list.

    Examples
    --------
    >>> import oscsolve
    >>> modes = oscsolve.solve_modes(oscsolve.polytrope(3), [0, 2], (20, 150), unit="sigma2")
    >>> found = oscsolve.separations(modes)
    >>> sorted(found)
    ['large_0', 'large_2', 'second_0', 'second_2', 'small_02']
    """
    acoustic = acoustic_modes(modes)
    nu = modes.nu[acoustic.row]
    found = {}
    for name, part in _combinations(acoustic.degree, acoustic.order, nu, acoustic.mixed).items():
        row = acoustic.row[part.row]
        bound = np.sum(np.abs(part.slope) * modes.nu_error[row], axis=1)
        found[name] = replace(part, row=row, error=bound)
    return MappingProxyType(found)


def _covariance_of(nu_error: np.ndarray, size: int) -> np.ndarray:
    error = np.asarray(nu_error, dtype=float)
    if error.shape not in ((size,), (size, size)) or size == 0:
        raise InputError(
            f"nu_error has shape {error.shape}; expected one standard error a mode, or a square "
            f"matrix of their covariance"
        )
    variances = error if error.ndim == 1 else np.diag(error)
    if not np.all(np.isfinite(error)) or np.any(variances < 0.0):
        raise InputError("nu_error holds a number that is not finite or is below zero")
    return np.diag(error**2) if error.ndim == 1 else error


def _check_list(degree: np.ndarray, order: np.ndarray, nu: np.ndarray) -> None:
    if nu.ndim != 1 or degree.shape != nu.shape or order.shape != nu.shape:
        raise InputError(
            f"degree, order and nu have shapes {degree.shape}, {order.shape} and {nu.shape}; "
            "expected one number a mode in each"
        )
    if not np.all(np.isfinite(nu)):
        row = int(np.flatnonzero(~np.isfinite(nu))[0])
        raise InputError(f"nu is not a finite number in row {row + 1} of {nu.size}")
    seen: dict[tuple[int, int], int] = {}
    for row, key in enumerate(zip(degree.tolist(), order.tolist(), strict=True)):
        if key in seen:
            raise InputError(
                f"l = {key[0]}, n = {key[1]} is in rows {seen[key] + 1} and {row + 1}; "
                "each mode comes once"
            )
        seen[key] = row
    for each in np.unique(degree):
        rows = np.flatnonzero(degree == each)
        rows = rows[np.argsort(order[rows])]
        low = np.flatnonzero(np.diff(nu[rows]) <= 0.0)
        if low.size:
            first, second = (int(order[rows[low[0] + k]]) for k in (0, 1))
            raise InputError(
                f"l = {int(each)}: nu does not rise from n = {first} to n = {second}; "
                "order is the radial order of a p mode, put it right"
            )


def _combinations(
    degree: np.ndarray, order: np.ndarray, nu: np.ndarray, mixed: np.ndarray
) -> dict[str, Separation]:
    keys = zip(degree.tolist(), order.tolist(), strict=True)
    table = {(int(where), int(n)): row for row, (where, n) in enumerate(keys)}
    found = {name: _combine(table, nu.astype(float), mixed, name) for name in _COMBINATIONS}
    return {name: part for name, part in found.items() if part is not None}


def _combine(
    table: dict[tuple[int, int], int], nu: np.ndarray, mixed: np.ndarray, name: str
) -> Separation | None:
    above, below, degree = _COMBINATIONS[name]
    needed = list(dict.fromkeys([*above, *(below or {})]))
    orders = [
        n
        for n in sorted(n for where, n in table if where == degree)
        if all((where, n + shift) in table for where, shift in needed)
    ]
    if not orders:
        return None
    row = np.array([[table[where, n + shift] for where, shift in needed] for n in orders])
    weights = np.array([above.get(key, 0.0) for key in needed])
    value, slope = nu[row] @ weights, np.tile(weights, (len(orders), 1))
    if below is not None:
        divisor_weights = np.array([below.get(key, 0.0) for key in needed])
        divisor = nu[row] @ divisor_weights
        value = value / divisor
        slope = (weights - value[:, None] * divisor_weights) / divisor[:, None]
    place = nu[[table[degree, n] for n in orders]]
    if name.startswith("large"):
        place = 0.5 * (place + nu[[table[degree, n - 1] for n in orders]])
    return Separation(
        name=name,
        order=np.array(orders),
        nu=place,
        value=value,
        error=np.zeros(len(orders)),
        row=row,
        slope=slope,
        mixed=np.any(mixed[row], axis=1),
        unit="1" if below is not None else "uHz",
    )
