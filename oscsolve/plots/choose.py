"""Which modes a figure shows where no one said which."""

from __future__ import annotations

import numpy as np

from oscsolve.errors import InputError
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.scaling import nu_max_scaling
from oscsolve.star.likely_band import has_convective_envelope

#: Modes about the middle of a list from which one is taken.
_NEAR = 7


def spread(nu: np.ndarray, rows: np.ndarray, apart: float) -> np.ndarray:
    """Those of the rows, by rising frequency, that differ from the last one taken by a factor."""
    kept: list[int] = []
    for row in rows:
        if not kept or nu[row] > apart * nu[kept[-1]]:
            kept.append(int(row))
    return np.array(kept, dtype=int)


def lightest_row(modes: ModeSet, *, nonradial: bool = False) -> int:
    """Row of the mode of least inertia among some in the middle, see `_middle`.

    Raises
    ------
    InputError
        The list holds no such mode.
    """
    near = _middle(modes, nonradial)
    return int(near[np.argmin(modes.inertia[near])])


def contrasting_rows(modes: ModeSet) -> list[int]:
    """Rows of the lightest and the heaviest nonradial mode among some in the middle."""
    near = _middle(modes, nonradial=True)
    inertia = modes.inertia[near]
    return [int(row) for row in dict.fromkeys((near[inertia.argmin()], near[inertia.argmax()]))]


def _middle(modes: ModeSet, nonradial: bool) -> np.ndarray:
    """Neighbours of one degree, about nu_max where that lies in the list, else about its middle.

    The degree is the lowest nonradial one, or 0 where there is none and it will do.
    """
    use = modes.sigma2 > 0.0
    degrees = np.unique(modes.degree[use & (modes.degree > 0)])
    if degrees.size == 0 and nonradial:
        raise InputError("the list holds no nonradial mode that oscillates; solve for l > 0")
    degree = degrees[0] if degrees.size else 0
    rows = np.flatnonzero(use & (modes.degree == degree))
    if rows.size == 0:
        raise InputError("the list holds no mode that oscillates; solve a wider band")
    nu, centre = modes.nu[rows], nu_max_scaling(modes.star)
    if centre is None or not nu[0] <= centre <= nu[-1]:
        centre = float(nu[nu.size // 2])
    return np.sort(rows[np.argsort(np.abs(nu - centre), kind="stable")[:_NEAR]])


def folds_periods(modes: ModeSet) -> bool:
    """True where an echelle of periods says more of a list than one of frequencies.

    So it does where g modes outnumber p modes, except in stars with a convective envelope, in
    which p and mixed modes are what is seen.
    """
    gravity = int(np.count_nonzero((modes.n_g > 0) & (modes.n_p == 0)))
    sound = int(np.count_nonzero((modes.n_g == 0) & (modes.n_p > 0)))
    if gravity <= sound:
        return False
    return sound == 0 or not has_convective_envelope(modes.star)
