"""Which modes of a list count as p modes, and of which acoustic order.

In a star without mixed modes that is plain: the order n. In an evolved star the order n = n_p - n_g
runs through p and g modes alike, and n_p alone does not tell which of several neighbours carries
the pulsation of the envelope; inertia does.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np

from oscsolve.pulsation.modeset import Census
from oscsolve.seismology.frozen import freeze_arrays

#: Excess of ln(inertia) over that of radial modes from which a mode counts as mixed.
_MIXED = 0.05
#: The same, from which a mode without g nodes is no p mode: a twin nearby moves the envelope more.
_FOREIGN = 0.5
#: Small separation over the large one and l(l+1), where p modes of degree l are looked for (common
#: practice: 0.01 to 0.03 in main-sequence stars and giants).
_SMALL_SHARE = 0.02
#: Highest degree for which a mixed mode stands for a p mode.
_HIGHEST = 3


class ModeColumns(Protocol):
    """Columns of a mode list; a `ModeSet`, or one model of a grid store, has them."""

    @property
    def degree(self) -> np.ndarray: ...
    @property
    def order(self) -> np.ndarray: ...
    @property
    def n_p(self) -> np.ndarray: ...
    @property
    def n_g(self) -> np.ndarray: ...
    @property
    def nu(self) -> np.ndarray: ...
    @property
    def nu_error(self) -> np.ndarray: ...
    @property
    def sigma2(self) -> np.ndarray: ...
    @property
    def inertia(self) -> np.ndarray: ...
    @property
    def census(self) -> Census: ...


@dataclass(frozen=True, eq=False)
class AcousticModes:
    """The modes of a list that count as p modes, one for each degree and acoustic order.

    Attributes
    ----------
    row : (k,) int, row in the mode list
    degree : (k,) int
    order : (k,) int, the acoustic order: n of a p mode; of a mode that is mixed, that of the
        p mode which it stands for
    mixed : (k,) bool, True where g modes reach up to the frequency of the mode and its inertia is
        more than a twentieth above that of radial modes
    """

    row: np.ndarray
    degree: np.ndarray
    order: np.ndarray
    mixed: np.ndarray

    def __post_init__(self) -> None:
        freeze_arrays(self)


def acoustic_modes(modes: ModeColumns) -> AcousticModes:
    """The modes that count as p modes.

    Notes
    -----
    A mode without g nodes is a p mode and its order is n, unless its inertia is far above that of
    radial modes. Elsewhere, as in evolved stars, the radial modes lay out the acoustic orders: the
    p mode of degree l and order n is expected at

        nu_n+k,0 + (1/2 if l is odd) Delta nu - 0.02 l(l+1) Delta nu,   k = l // 2

    (Tassoul 1980, with a small separation that suits most stars), and the mode of least inertia
    within half a large separation of it stands for it. No mode is taken where the band does not
    hold the whole stretch, nor for l > 3.
    """
    excess = inertia_excess(modes)
    row, order, mixed = [], [], []
    for degree in np.unique(modes.degree):
        rows = np.flatnonzero((modes.degree == degree) & (modes.sigma2 > 0.0))
        pure = rows[(modes.n_g[rows] == 0) & (modes.order[rows] > 0) & (excess[rows] < _FOREIGN)]
        found = {int(modes.order[k]): int(k) for k in pure}
        reach = _gravity_reach(modes, rows, excess)
        if 0 < degree <= _HIGHEST and reach > 0.0:
            free = np.setdiff1d(rows, pure)
            for n, k in _stand_ins(modes, int(degree), free):
                found.setdefault(n, k)
        for n in sorted(found):
            row.append(found[n])
            order.append(n)
            mixed.append(modes.nu[found[n]] <= reach and excess[found[n]] > _MIXED)
    rows = np.array(row, dtype=np.int64)
    return AcousticModes(
        row=rows,
        degree=modes.degree[rows],
        order=np.array(order, dtype=np.int64),
        mixed=np.array(mixed, dtype=bool),
    )


def inertia_excess(modes: ModeColumns) -> np.ndarray:
    """(m,) ln of inertia over that of radial modes of the same frequency.

    Without radial modes: infinite for modes with g nodes, 0 for the rest.
    """
    radial = np.flatnonzero((modes.degree == 0) & (modes.sigma2 > 0.0))
    if radial.size == 0:
        return np.where(modes.n_g > 0, np.inf, 0.0)
    alike = np.interp(modes.nu, modes.nu[radial], np.log(modes.inertia[radial]))
    return np.log(modes.inertia) - alike


def _gravity_reach(modes: ModeColumns, rows: np.ndarray, excess: np.ndarray) -> float:
    """Highest frequency at which one degree has a mode with g nodes, or one next to it that
    shares its energy; 0 where there is none."""
    bearing = np.flatnonzero(modes.n_g[rows] > 0)
    if bearing.size == 0:
        return 0.0
    last = int(bearing[-1])
    # The partner above an avoided crossing has lost its g node, not its core.
    if last + 1 < rows.size and excess[rows[last + 1]] > _MIXED:
        last += 1
    return float(modes.nu[rows[last]])


def _stand_ins(modes: ModeColumns, degree: int, free: np.ndarray) -> list[tuple[int, int]]:
    """(acoustic order, row) of those among the rows `free` that stand for p modes."""
    radial = np.flatnonzero((modes.degree == 0) & (modes.sigma2 > 0.0))
    if radial.size < 2 or free.size == 0:
        return []
    place = int(np.flatnonzero(modes.census.degree == degree)[0])
    low, high = modes.census.low[place], modes.census.high[place]
    nu = modes.nu[radial]
    spacing = np.gradient(nu)
    shift = 0.5 * (degree % 2) - _SMALL_SHARE * degree * (degree + 1)
    found = []
    for n, centre, width in zip(modes.order[radial], nu + shift * spacing, spacing, strict=True):
        start, stop = centre - 0.5 * width, centre + 0.5 * width
        inside = free[(modes.nu[free] >= start) & (modes.nu[free] < stop)]
        if start >= low and stop <= high and inside.size:
            best = inside[np.argmin(modes.inertia[inside])]
            acoustic = int(n) - degree // 2
            if acoustic > 0:
                found.append((acoustic, int(best)))
    return found
