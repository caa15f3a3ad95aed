"""Echelle diagrams: frequencies folded with the large separation, periods with their spacing."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.lines import Line2D

from oscsolve.errors import InputError
from oscsolve.plots.style import (
    INK,
    SOFT,
    colour,
    degree_key,
    key_above,
    looking,
    marker,
    marker_size,
)
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.acoustic import ModeColumns, acoustic_modes
from oscsolve.seismology.large_separation import fit_large_separation
from oscsolve.seismology.observed import ObservedModes
from oscsolve.star.integrals import period_spacing

#: Where in the width the ridge of radial modes stands: those of l = 2 at its left, l = 1 far right.
_RADIAL_RIDGE = 0.3
#: Share of the width that neighbours in a ridge differ by at most.
_RIDGE = 0.25
#: Least diameter of a marker, as a share of the full one.
_SMALLEST = 0.35
#: Share of the full diameter below which a key says what small markers mean.
_SMALL = 0.8
#: An asymptotic spacing is used where it is within this factor of the median step in period.
_LIKELY = 2.0


@looking
def frequency_echelle(
    axes: Axes,
    modes: ModeColumns,
    separation: float | None = None,
    observed: ObservedModes | None = None,
) -> Axes:
    """Frequency against frequency modulo the large separation; p and mixed modes, f modes.

    Parameters
    ----------
    axes : to draw on
    modes : mode list; the diameter of a marker goes with the amplitude of the mode at the surface
        for a given energy, relative to radial modes. Thin lines join p modes of one degree.
    separation : uHz; None takes that of `typical_separation`
    observed : drawn as open markers, with bars where they are long enough to show

    Raises
    ------
    InputError
        The list holds no p modes, or no neighbouring ones to take a separation from.

    Examples
    --------
    >>> import oscsolve
    >>> from oscsolve import plots
    >>> modes = oscsolve.solve_modes(oscsolve.polytrope(3), [0, 1], (20, 300), unit="sigma2")
    >>> figure = plots.make_figure(lambda axes: plots.frequency_echelle(axes, modes, 126.0))
    >>> figure.axes[0].get_ylabel()
    'frequency ($\\\\mu$Hz)'
    """
    use = (modes.nu > 0.0) & ((modes.n_g == 0) | (modes.n_p > 0))
    if not np.any(use):
        raise InputError("the list holds no p modes to fold; solve a higher band, or fold periods")
    width = typical_separation(modes) if separation is None else float(separation)
    offset = _fold_from(modes, width)
    _join_ridges(axes, modes, width, offset)
    handles = _draw_folded(axes, modes, np.flatnonzero(use), modes.nu, modes.nu, width, offset)
    if observed is not None:
        draw_observed(axes, observed, width, offset)
        handles.append(observed_key())
    dress_echelle(axes, width, offset)
    key_above(axes, handles)
    return axes


def _draw_folded(
    axes: Axes,
    modes: ModeColumns,
    rows: np.ndarray,
    folded: np.ndarray,
    height: np.ndarray,
    width: float,
    offset: float,
) -> list[Any]:
    """A marker a mode, by degree; what stands for them in a key."""
    share = _diameter(modes)
    handles: list[Any] = []
    for degree in np.unique(modes.degree[rows]):
        own = rows[modes.degree[rows] == degree]
        axes.scatter(
            np.mod(folded[own] - offset, width),
            height[own],
            s=(1.15 * marker_size(degree, rows.size) * share[own]) ** 2,
            color=colour(degree),
            marker=marker(degree),
            lw=0,
            zorder=3,
        )
        handles.append(degree_key(degree))
    if np.any(share[rows] < _SMALL):
        dots: dict[str, Any] = {"marker": "o", "ms": 2.2, "color": SOFT, "mew": 0.0, "ls": "none"}
        handles.append(Line2D([], [], label="smaller: more inertia", **dots))
    return handles


def _join_ridges(axes: Axes, modes: ModeColumns, width: float, offset: float) -> None:
    acoustic = acoustic_modes(modes)
    for degree in np.unique(acoustic.degree):
        use = (acoustic.degree == degree) & ~acoustic.mixed
        nu = modes.nu[acoustic.row[use]]
        _join(
            axes, np.mod(nu - offset, width), nu, np.diff(acoustic.order[use]) == 1, width, degree
        )


def _join(
    axes: Axes, x: np.ndarray, y: np.ndarray, near: np.ndarray, width: float, degree: int
) -> None:
    """A thin line through points, broken where they are no neighbours or form no ridge."""
    cut = np.flatnonzero(~(near & (np.abs(np.diff(x)) < _RIDGE * width))) + 1
    x, y = (np.insert(values, cut, np.nan) for values in (x, y))
    axes.plot(x, y, color=colour(degree), lw=0.6, alpha=0.45, zorder=2)


def draw_observed(axes: Axes, observed: ObservedModes, width: float, offset: float) -> None:
    """Observed modes as open markers, with error bars."""
    for degree in np.unique(observed.degree):
        own = observed.degree == degree
        axes.errorbar(
            np.mod(observed.nu[own] - offset, width),
            observed.nu[own],
            xerr=observed.nu_error[own],
            fmt="none",
            ecolor=INK,
            elinewidth=0.7,
            zorder=4,
        )
        axes.plot(
            np.mod(observed.nu[own] - offset, width),
            observed.nu[own],
            ls="none",
            marker=marker(degree),
            ms=1.75 * marker_size(degree),
            mfc="none",
            mec=INK,
            mew=0.7,
            zorder=5,
        )


def observed_key() -> Line2D:
    """What stands for observed modes in a key."""
    return Line2D(
        [], [], marker="o", ms=7.0, mfc="none", mec=INK, mew=0.7, ls="none", label="observed"
    )


def dress_echelle(axes: Axes, width: float, offset: float) -> None:
    """Labels and limits of a frequency echelle."""
    axes.set_xlim(0.0, width)
    axes.set_xlabel(_folded_label("frequency", offset, width, r"$\mu$Hz"))
    axes.set_ylabel(r"frequency ($\mu$Hz)")


def _folded_label(what: str, offset: float, width: float, unit: str) -> str:
    # A shift below the precision of the label is none.
    shift = f"{offset:.4g}"
    text = what if float(shift) == 0.0 else f"({what} $-$ {shift})"
    return f"{text} mod {width:.5g} ({unit})"


def typical_separation(modes: ModeColumns) -> float:
    """Large separation of a list, uHz: about nu_max where that is known, and of radial modes.

    Where there are no three of these, the median step of the upper half of the p modes of the
    lowest degree that has them.
    """
    if isinstance(modes, ModeSet):
        fit = fit_large_separation(modes)
        if fit is not None:
            return fit.separation
    for degree in np.unique(modes.degree):
        own = (modes.degree == degree) & (modes.order > 0) & (modes.n_g == 0)
        order, nu = modes.order[own], modes.nu[own]
        steps = np.diff(nu)[np.diff(order) == 1]
        if steps.size >= 2:
            return float(np.median(steps[-max(2, steps.size // 2) :]))
    raise InputError(
        "the list holds no three p modes of consecutive order to fold with; give the separation, "
        "or fold periods"
    )


def _fold_from(modes: ModeColumns, width: float) -> float:
    """Where folding begins, so that no ridge is cut: between those of l = 2 and l = 1."""
    radial = modes.nu[(modes.degree == modes.degree.min()) & (modes.order > 0) & (modes.n_g == 0)]
    if radial.size == 0:
        return 0.0
    return ridge_start(radial[radial.size // 2 :], width)


def ridge_start(values: np.ndarray, width: float, share: float = _RADIAL_RIDGE) -> float:
    """Offset that puts the ridge of some values at a share of the width."""
    phase = np.exp(2j * np.pi * values / width)
    ridge = float(np.angle(np.mean(phase)) / (2.0 * np.pi)) * width
    return float(np.mod(ridge - share * width, width))


def _diameter(modes: ModeColumns) -> np.ndarray:
    """(m,) share of the full diameter: sqrt of the inertia of radial modes over that of the mode.

    1 where the list has no radial modes to compare with, and for g modes without p nodes.
    """
    radial = np.flatnonzero((modes.degree == 0) & (modes.sigma2 > 0.0))
    if radial.size < 2:
        return np.ones(modes.nu.size)
    alike = np.exp(np.interp(modes.nu, modes.nu[radial], np.log(modes.inertia[radial])))
    alike = np.where((modes.n_g > 0) & (modes.n_p == 0), modes.inertia, alike)
    return np.clip(np.sqrt(alike / modes.inertia), _SMALLEST, 1.0)


@looking
def period_echelle(
    axes: Axes,
    modes: ModeSet,
    degrees: Sequence[int] | None = None,
    spacing: float | None = None,
) -> Axes:
    """Period against period modulo the period spacing; g and mixed modes.

    Parameters
    ----------
    axes : to draw on
    modes : mode list
    degrees : whose modes are drawn; None takes the lowest that has three g modes. Several degrees
        share a figure by their reduced periods, sqrt(l(l+1)) P, which asymptotically step alike.
    spacing : s, of what is folded; None takes the asymptotic value of the model, or the median
        step where that is far from it

    Raises
    ------
    InputError
        A degree has no three g modes of consecutive order.

    Examples
    --------
    >>> import oscsolve
    >>> from oscsolve import plots
    >>> modes = oscsolve.solve_modes(oscsolve.polytrope(3), [1], (0.02, 0.3), unit="sigma2")
    >>> figure = plots.make_figure(lambda axes: plots.period_echelle(axes, modes))
    >>> figure.axes[0].get_ylabel()
    'period (s)'
    """
    chosen = [int(degree) for degree in degrees or () if degree > 0]
    if not chosen:
        listed = [int(k) for k in np.unique(modes.degree) if k > 0]
        chosen = [k for k in listed if _steps(modes, k).size >= 2][:1] or listed[:1] or [1]
    for degree in chosen:
        if _steps(modes, degree).size < 2:
            raise InputError(
                f"the list holds no three g modes of consecutive order of l = {degree}; solve a "
                "lower band, or fold frequencies"
            )
    several = len(chosen) > 1
    factor = np.sqrt(modes.degree * (modes.degree + 1.0)) if several else np.ones(len(modes))
    width = _fold_width(modes, chosen[0], several) if spacing is None else float(spacing)
    use = np.isin(modes.degree, chosen) & (modes.nu > 0.0) & (modes.n_g > 0)
    rows = np.flatnonzero(use)
    folded = np.where(use, factor * np.where(use, modes.period, 0.0), 0.0)
    offset = ridge_start(folded[rows], width, 0.5)
    for degree in chosen:
        own = rows[modes.degree[rows] == degree]
        x, near = np.mod(folded[own] - offset, width), np.diff(modes.order[own]) == 1
        _join(axes, x, folded[own], near, width, degree)
    handles = _draw_folded(axes, modes, rows, folded, folded, width, offset)
    axes.set_xlim(0.0, width)
    what = r"$\sqrt{\ell(\ell+1)}\,P$" if several else "period"
    axes.set_xlabel(_folded_label(what, offset, width, "s"))
    axes.set_ylabel(f"{what} (s)")
    key_above(axes, handles)
    return axes


def _steps(modes: ModeSet, degree: int) -> np.ndarray:
    """Steps in period between g modes of consecutive order of one degree, s."""
    own = np.flatnonzero((modes.degree == degree) & (modes.nu > 0.0) & (modes.n_g > 0))
    return np.abs(np.diff(modes.period[own]))[np.diff(modes.order[own]) == 1]


def _fold_width(modes: ModeSet, degree: int, reduced: bool) -> float:
    typical = float(np.median(_steps(modes, degree)))
    asymptotic = period_spacing(modes.star, degree)
    likely = typical / _LIKELY < asymptotic < typical * _LIKELY
    return (asymptotic if likely else typical) * (
        float(np.sqrt(degree * (degree + 1.0))) if reduced else 1.0
    )
