"""Echelle diagrams: frequencies folded with the large separation, periods with their spacing."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes

from oscsolve.errors import InputError
from oscsolve.plots.style import OBSERVED, colour, marker
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.acoustic import ModeColumns
from oscsolve.seismology.observed import ObservedModes

#: Inertia over that of radial modes at which the area of a marker has fallen to 1/e.
_FAINT_FROM = 3.0


def frequency_echelle(
    axes: Axes,
    modes: ModeColumns,
    separation: float | None = None,
    observed: ObservedModes | None = None,
) -> Axes:
    """Frequency against frequency modulo the large separation, a marker a mode.

    Parameters
    ----------
    axes : to draw on
    modes : mode list; markers shrink as inertia grows above that of radial modes
    separation : uHz; None takes the median step between radial modes, or modes of one degree
    observed : drawn as open markers with bars where they show

    Raises
    ------
    InputError
        The list holds no two neighbouring p modes to take a separation from.
    """
    width = typical_separation(modes) if separation is None else separation
    offset = _fold_from(modes, width)
    use = modes.nu > 0.0
    for degree in np.unique(modes.degree[use]):
        own = np.flatnonzero(use & (modes.degree == degree))
        axes.scatter(
            np.mod(modes.nu[own] - offset, width),
            modes.nu[own],
            s=26.0 * _weight(modes)[own],
            color=colour(int(degree)),
            marker=marker(int(degree)),
            lw=0,
            label=f"l = {degree}",
        )
    if observed is not None:
        draw_observed(axes, observed, width, offset)
    dress_echelle(axes, width, offset)
    return axes


def draw_observed(axes: Axes, observed: ObservedModes, width: float, offset: float) -> None:
    """Observed modes as open markers, with error bars."""
    for degree in np.unique(observed.degree):
        own = observed.degree == degree
        axes.errorbar(
            np.mod(observed.nu[own] - offset, width),
            observed.nu[own],
            xerr=observed.nu_error[own],
            fmt=marker(int(degree)),
            mfc="none",
            mec=OBSERVED,
            ecolor=OBSERVED,
            elinewidth=0.7,
            mew=0.8,
            ms=7.0,
            label="observed" if degree == observed.degree.min() else None,
        )


def dress_echelle(axes: Axes, width: float, offset: float) -> None:
    """Labels, limits and legend of a frequency echelle."""
    axes.set_xlim(0.0, width)
    start = np.mod(offset, width)
    shift = f" - {start:.4g}" if start > 0.005 * width else ""
    axes.set_xlabel(f"(frequency{shift}) mod {width:.5g} uHz")
    axes.set_ylabel("frequency / uHz")
    axes.legend(loc="upper left", bbox_to_anchor=(1.0, 1.0), handletextpad=0.4)


def typical_separation(modes: ModeColumns) -> float:
    """Median step in frequency between p modes of consecutive order, uHz."""
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
    phase = np.exp(2j * np.pi * radial[radial.size // 2 :] / width)
    ridge = float(np.angle(np.mean(phase)) / (2.0 * np.pi)) * width
    return float(np.mod(ridge - 0.3 * width, width))


def _weight(modes: ModeColumns) -> np.ndarray:
    """(m,) share of the full area of a marker."""
    radial = np.flatnonzero((modes.degree == 0) & (modes.sigma2 > 0.0))
    if radial.size < 2:
        return np.ones(modes.nu.size)
    alike = np.exp(np.interp(modes.nu, modes.nu[radial], np.log(modes.inertia[radial])))
    excess = np.maximum(modes.inertia / alike - 1.0, 0.0)
    return np.maximum(np.exp(-excess / _FAINT_FROM), 0.12 if modes.nu.size < 200 else 0.03)


def period_echelle(
    axes: Axes, modes: ModeSet, degree: int = 1, spacing: float | None = None
) -> Axes:
    """Period against period modulo the mean period spacing of one degree.

    Parameters
    ----------
    axes : to draw on
    modes : mode list
    degree : whose modes are drawn
    spacing : s; None takes the median step between consecutive orders

    Raises
    ------
    InputError
        The list holds fewer than three g modes of consecutive order of that degree.
    """
    own = np.flatnonzero((modes.degree == degree) & (modes.nu > 0.0) & (modes.n_g > 0))
    period, order = modes.period[own], modes.order[own]
    steps = np.abs(np.diff(period))[np.abs(np.diff(order)) == 1]
    if steps.size < 2:
        raise InputError(
            f"the list holds no three g modes of consecutive order of l = {degree}; solve a lower "
            "band, or fold frequencies"
        )
    width = float(np.median(steps)) if spacing is None else spacing
    shade = np.clip(_weight(modes)[own], 0.12, 1.0)
    points = axes.scatter(
        np.mod(period, width),
        period,
        s=10.0 + 22.0 * shade,
        color=colour(degree),
        marker=marker(degree),
        lw=0,
    )
    points.set_label(f"l = {degree}")
    axes.set_xlim(0.0, width)
    axes.set_xlabel(f"period mod {width:.5g} s")
    axes.set_ylabel("period / s")
    axes.legend(loc="upper left", bbox_to_anchor=(1.0, 1.0), handletextpad=0.4)
    return axes
