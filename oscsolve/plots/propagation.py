"""Propagation diagram: where waves of a frequency can run, and the modes there."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes

from oscsolve.plots.coordinate import Coordinate
from oscsolve.plots.style import BUOYANCY, FAINT, SOUND, colour, line
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.integrals import point_structure
from oscsolve.star.model import StarModel

#: Most modes of which lines are drawn, and most nodes; of longer lists every second, third, ...
_MOST_MODES, _MOST_NODES = 40, 500


def propagation_diagram(
    axes: Axes,
    star: StarModel,
    modes: ModeSet | None = None,
    *,
    degrees: tuple[int, ...] = (1, 2),
    coordinate: str = "auto",
) -> Axes:
    """N and S_l through a star; modes as lines with their nodes, the band as two thin lines.

    Parameters
    ----------
    axes : to draw on
    star : the model
    modes : mode list of it, with eigenfunctions if nodes are wanted
    degrees : of which S_l is drawn, and modes
    coordinate : one of `oscsolve.plots.coordinate.COORDINATES`

    Examples
    --------
    >>> import oscsolve
    >>> from oscsolve.plots import figure, propagation
    >>> star = oscsolve.polytrope(3)
    >>> made = figure.make_figure(lambda axes: propagation.propagation_diagram(axes, star))
    >>> made.axes[0].get_ylabel()
    'frequency / uHz'
    """
    at, scale = point_structure(star), star.nu_dynamical
    across = Coordinate(star, coordinate)
    buoyancy = np.sqrt(np.where(at.n2 > 0.0, at.n2, np.nan)) * scale
    axes.plot(across.values, buoyancy, color=BUOYANCY, lw=1.6, label="N")
    axes.fill_between(across.values, buoyancy, 1e-30, color=BUOYANCY, alpha=0.10, lw=0)
    for degree in degrees:
        lamb = np.sqrt(at.lamb2(degree)) * scale
        axes.plot(
            across.values, lamb, color=SOUND, ls=line(degree), lw=1.3, label=f"$S_{{{degree}}}$"
        )
    axes.set_yscale("log")
    axes.set_ylim(*_limits(buoyancy, at.lamb2(max(degrees)) ** 0.5 * scale, modes, star))
    if modes is not None and len(modes):
        _draw_modes(axes, star, modes, degrees, across)
    across.dress(axes)
    axes.set_ylabel("frequency / uHz")
    axes.legend(loc="upper left", bbox_to_anchor=(1.0, 1.0), handletextpad=0.4)
    return axes


def _limits(
    buoyancy: np.ndarray, lamb: np.ndarray, modes: ModeSet | None, star: StarModel
) -> tuple[float, float]:
    """From below the lowest mode, or the dynamical frequency, to above the highest and N."""
    low, high = 0.3 * star.nu_dynamical, 10.0 * star.nu_dynamical
    finite = buoyancy[np.isfinite(buoyancy)]
    if finite.size:
        high = max(high, 1.5 * float(np.percentile(finite, 98)))
    if modes is not None and np.any(modes.nu > 0.0):
        nu = modes.nu[modes.nu > 0.0]
        low, high = min(low, 0.6 * float(nu.min())), max(high, 1.8 * float(nu.max()))
    return low, high


def _draw_modes(
    axes: Axes, star: StarModel, modes: ModeSet, degrees: tuple[int, ...], across: Coordinate
) -> None:
    rows = np.flatnonzero(np.isin(modes.degree, degrees) & (modes.nu > 0.0))
    if rows.size == 0:
        rows = np.flatnonzero(modes.nu > 0.0)
    marks = int(np.sum(modes.n_p[rows] + modes.n_g[rows]))
    step = max(-(-rows.size // _MOST_MODES), -(-marks // _MOST_NODES), 1)
    rows = rows[:: min(step, max(rows.size // 3, 1))]
    for row in rows:
        degree, nu = int(modes.degree[row]), float(modes.nu[row])
        axes.axhline(nu, color=colour(degree), lw=0.5, alpha=0.6)
        if modes.eigenfunctions is not None:
            nodes = mode_nodes(modes, int(row))
            axes.plot(
                across.at(nodes, star), np.full(nodes.size, nu), ".", color=colour(degree), ms=2.6
            )
    for edge in {float(modes.census.low.min()), float(modes.census.high.max())}:
        axes.axhline(edge, color=FAINT, lw=0.8, ls=(0, (4, 3)))
    for degree in np.unique(modes.degree[rows]):
        axes.plot([], [], ".-", color=colour(int(degree)), lw=0.5, ms=4, label=f"l = {degree}")


def mode_nodes(modes: ModeSet, row: int) -> np.ndarray:
    """Fractional radii at which the radial displacement of a mode vanishes."""
    eigen = modes.eigenfunction(row)
    x, xi = eigen.radius, eigen.xi_r
    keep = (xi != 0.0) & (x > 0.0)
    x, xi = x[keep], xi[keep]
    at = np.flatnonzero(np.signbit(xi[1:]) != np.signbit(xi[:-1]))
    share = xi[at] / (xi[at] - xi[at + 1])
    return x[at] + share * (x[at + 1] - x[at])
