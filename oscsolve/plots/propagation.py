"""Propagation diagram: where sound and gravity waves of a frequency travel, and the modes there."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from oscsolve.plots.choose import spread
from oscsolve.plots.coordinate import Coordinate, coordinate_of, dress_coordinate
from oscsolve.plots.interior import cavities, counted_nodes
from oscsolve.plots.style import (
    CONVECTIVE,
    FILLS,
    INK,
    SOFT,
    colour,
    key_above,
    line,
    looking,
    plain_ticks,
)
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.integrals import PointStructure, Quadrature, point_structure
from oscsolve.star.inspection import convective_zones
from oscsolve.star.likely_band import likely_band
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile

#: S_l is drawn for the nonradial degrees up to this one.
_HIGHEST = 3
#: Share of the height of the frame that lines of modes keep apart.
_APART = 0.024
#: Share of int N dr/r within the frequencies shown, and room above and below them.
_SHOWN, _ROOM = 0.998, 1.6


@looking
def propagation_diagram(
    axes: Axes,
    star: StarModel,
    modes: ModeSet | None = None,
    *,
    degrees: Sequence[int] | None = None,
    rows: Iterable[int] | None = None,
    band: tuple[float, float] | None = None,
    coordinate: str = "auto",
) -> Axes:
    """N and S_l through a star; the band beside them; modes as lines that bear their nodes.

    Parameters
    ----------
    axes : to draw on
    star : the model
    modes : mode list of it, with eigenfunctions if nodes are wanted
    degrees : whose S_l is drawn; None takes the nonradial ones of the list up to 3, or 1 to 3.
        The cavities of the lowest are filled.
    rows : of the modes to draw; None takes modes of the degree whose cavities are filled, evenly
        taken where there are many
    band : uHz; None takes that of the list, or what suits the star
    coordinate : one of `oscsolve.plots.COORDINATES`

    Returns
    -------
    Axes
        Where a mode travels its line is strong, where it fades thin. Full dots are the nodes that
        n_p counts, open ones those of n_g, see `oscsolve.ModeSet`.

    Examples
    --------
    >>> import oscsolve
    >>> from oscsolve import plots
    >>> star = oscsolve.polytrope(3)
    >>> figure = plots.make_figure(lambda axes: plots.propagation_diagram(axes, star))
    >>> figure.axes[0].get_xlabel()
    '$r/R$'
    """
    shown = _degrees(modes) if degrees is None else sorted({int(k) for k in degrees if k > 0})
    band = _band(star, modes) if band is None else band
    along, at = coordinate_of(star, coordinate), point_structure(star)
    low, high = _limits(star, at, band)
    drawn = np.zeros(0, dtype=int)
    if modes is not None and rows is None:
        drawn = _rows(modes, shown, float((high / low) ** _APART))
    elif modes is not None and rows is not None:
        drawn = np.array(list(rows), dtype=int)
        low = min([low, *modes.nu[drawn] / _ROOM])
        high = max([high, *modes.nu[drawn] * _ROOM])
    dress_coordinate(axes, star, along)
    axes.set_yscale("log")
    axes.set_ylim(low, high)
    axes.set_ylabel(r"frequency ($\mu$Hz)")
    plain_ticks(axes.yaxis)
    handles = _draw_structure(axes, star, at, along, shown)
    _mark_band(axes, band)
    if modes is not None and drawn.size:
        handles += _draw_modes(axes, modes, drawn, at, along)
    key_above(axes, handles)
    return axes


def _degrees(modes: ModeSet | None) -> list[int]:
    if modes is None:
        return list(range(1, _HIGHEST + 1))
    listed = [int(k) for k in np.unique(modes.degree) if k > 0]
    return [k for k in listed if k <= _HIGHEST] or listed[:1] or [1]


def _rows(modes: ModeSet, degrees: Sequence[int], apart: float) -> np.ndarray:
    degree = next((k for k in degrees if np.any(modes.degree == k)), 0)
    rows = np.flatnonzero((modes.degree == degree) & (modes.sigma2 > 0.0))
    return spread(modes.nu, rows, apart)


def _band(star: StarModel, modes: ModeSet | None) -> tuple[float, float]:
    if modes is None or modes.census.low.size == 0:
        return likely_band(star, Profile(star))[0]
    # A band may begin below zero for the sake of growing modes.
    positive = modes.nu[modes.nu > 0.0]
    low, high = float(modes.census.low.min()), float(modes.census.high.max())
    return (low if low > 0.0 else float(positive.min()) if positive.size else 0.1 * high), high


def _limits(star: StarModel, at: PointStructure, band: tuple[float, float]) -> tuple[float, float]:
    """Frequencies that hold the band and most of N."""
    inside = (at.n2 > 0.0) & (at.x > 0.0) & (at.x < 1.0)
    buoyancy = np.sqrt(at.n2[inside]) * star.nu_dynamical
    low, high = band
    if buoyancy.size > 1:
        # Noise at single points of a model reaches far above N; it holds no share of the integral.
        phase = buoyancy * np.abs(np.gradient(np.log(at.x[inside])))
        order = np.argsort(buoyancy)
        share = np.cumsum(phase[order]) / phase.sum()
        high = max(high, float(np.interp(_SHOWN, share, buoyancy[order])))
        low = min(low, float(np.quantile(buoyancy, 0.2)))
    return low / _ROOM, high * _ROOM


def _draw_structure(
    axes: Axes, star: StarModel, at: PointStructure, along: Coordinate, degrees: Sequence[int]
) -> list[Any]:
    """Curves of N and S_l over the filled cavities of the lowest degree."""
    place, unit = along.place(at), star.nu_dynamical
    bottom, top = axes.get_ylim()
    # Below the frame where there is none, so that borders of convective layers are seen.
    buoyancy = np.maximum(np.sqrt(np.maximum(at.n2, 0.0)) * unit, 0.1 * bottom)
    handles: list[Any] = axes.plot(place, buoyancy, color=INK, lw=1.5, label="$N$", zorder=3)
    for degree in degrees:
        # S_l is infinite at the centre.
        lamb = np.minimum(np.sqrt(at.lamb2(degree)) * unit, 1e3 * top)
        look: dict[str, Any] = {"color": colour(degree), "ls": line(degree), "lw": 1.3}
        handles += axes.plot(place, lamb, label=rf"$S_{{{degree}}}$", zorder=3, **look)
        if degree == degrees[0]:
            floor = np.maximum(buoyancy, bottom)
            least, most = np.minimum(floor, lamb), np.minimum(np.maximum(floor, lamb), top)
            axes.fill_between(place, bottom, least, color=FILLS["g"], lw=0.0, zorder=0)
            axes.fill_between(place, most, top, color=FILLS["p"], lw=0.0, zorder=0)
    lowest = degrees[0] if degrees else 1
    stable = bool(np.any(buoyancy > bottom))
    handles = handles if stable else handles[1:]
    handles += [
        Patch(color=fill, label=rf"{kind} cavity ($\ell={lowest}$)")
        for kind, fill in FILLS.items()
        if kind == "p" or stable
    ]
    zones = convective_zones(star)
    for zone in zones:
        first, last = np.interp(zone, at.x, place)
        axes.axvspan(first, last, ymax=0.022, color=CONVECTIVE, lw=0.0, zorder=2)
    if zones:
        handles.append(Patch(color=CONVECTIVE, label="convective"))
    return handles


def _mark_band(axes: Axes, band: tuple[float, float]) -> None:
    """A bar beside the frame."""
    beside = axes.get_yaxis_transform()
    look: dict[str, Any] = {"color": SOFT, "transform": beside}
    butt = "butt"
    axes.plot(
        [1.015, 1.015], band, lw=3.0, solid_capstyle=butt, clip_on=False, label="_band", **look
    )
    middle = float(np.sqrt(band[0] * band[1]))
    axes.text(1.03, middle, "band", rotation=90.0, va="center", fontsize=9.0, **look)


def _draw_modes(
    axes: Axes, modes: ModeSet, rows: np.ndarray, at: PointStructure, along: Coordinate
) -> list[Any]:
    place = along.place(at)
    quadrature = None if modes.eigenfunctions is None else Quadrature(modes)
    marked: set[bool] = set()
    for row in (int(row) for row in rows):
        degree, nu = int(modes.degree[row]), float(modes.nu[row])
        own = colour(degree)
        axes.axhline(nu, color=own, lw=0.3, alpha=0.5, zorder=1)
        for _, *ends in cavities(at, place, degree, float(modes.sigma2[row])):
            axes.plot(ends, [nu, nu], color=own, lw=1.0, zorder=4, solid_capstyle="butt")
        if quadrature is None:
            continue
        nodes = counted_nodes(quadrature, row, along)
        for acoustic in (True, False):
            x = nodes.place[nodes.acoustic == acoustic]
            dots: dict[str, Any] = {"mfc": own if acoustic else "white", "mec": own, "mew": 0.6}
            axes.plot(x, np.full(x.size, nu), "o", ms=2.6, ls="none", zorder=5, **dots)
            if x.size:
                marked.add(acoustic)
    return _mode_handles(modes, rows, marked)


def _mode_handles(modes: ModeSet, rows: np.ndarray, marked: set[bool]) -> list[Any]:
    handles: list[Any] = []
    for degree in np.unique(modes.degree[rows]):
        shown = int(np.count_nonzero(modes.degree[rows] == degree))
        listed = int(np.count_nonzero(modes.degree == degree))
        text = rf"$\ell={degree}$ modes" + ("" if shown == listed else f" ({shown} of {listed})")
        handles.append(Line2D([], [], color=colour(degree), lw=1.0, label=text))
    return handles + [node_key(acoustic) for acoustic in (True, False) if acoustic in marked]


def node_key(acoustic: bool) -> Line2D:
    """What stands for nodes at which modes turn p-wise, or g-wise, in a key."""
    face, text = (SOFT, "p node") if acoustic else ("white", "g node")
    return Line2D([], [], marker="o", ms=3.4, mfc=face, mec=SOFT, mew=0.7, ls="none", label=text)
