"""Frequencies between two neighbouring models of a track, mode by mode."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oscsolve.errors import InputError
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.frozen import freeze_arrays

#: Largest change of ln(inertia) of a mode, beyond that of its neighbours, at which it is still the
#: same kind of motion in both models.
_INERTIA_CHANGE = 0.25
#: The error of interpolation is stated as this share of what two ways of doing it differ by.
_CAUTION = 2.0


@dataclass(frozen=True, eq=False)
class InterpolatedModes:
    """Modes of a model between two others.

    Attributes
    ----------
    degree, order : (k,) int, modes that both lists have
    nu, nu_error : (k,) uHz, and what interpolation and numerics may be off by
    nu_dynamical : uHz, sqrt(G M/R^3)/2 pi of the model between
    refused : (r, 2) int, degree and order of modes that could not be interpolated
    reason : (r,) str, why
    """

    degree: np.ndarray
    order: np.ndarray
    nu: np.ndarray
    nu_error: np.ndarray
    nu_dynamical: float
    refused: np.ndarray
    reason: np.ndarray

    def __post_init__(self) -> None:
        freeze_arrays(self)


def interpolate_modes(first: ModeSet, second: ModeSet, share: float) -> InterpolatedModes:
    """The modes of a model a `share` of the way from one model of a track to the next.

    Parameters
    ----------
    first, second : mode lists of neighbouring models, same degrees, boundary and gravity
    share : 0 is the first, 1 the second

    Returns
    -------
    InterpolatedModes
        Modes whose character changes between the two are refused, each with the reason.

    Raises
    ------
    InputError
        The share lies outside 0 to 1, the lists were made under different conditions, or they
        have no mode in common.

    Notes
    -----
    ln sigma2 and ln(M/R^3) are taken as linear in the share. At an avoided crossing a label passes
    from one kind of motion to another and its frequency bends: there no two models tell what is
    between. It is recognised by n_p or n_g differing, and by a change of inertia that the
    neighbouring modes do not share. The stated error is the larger of twice the difference from
    taking sigma2 itself as linear and of what a change of its slope to that of its neighbours
    would make, plus the numerical errors.
    """
    if not 0.0 <= share <= 1.0:
        raise InputError(f"share must be from 0 to 1; got {share:g}")
    for name in ("gravity", "surface"):
        if first.options.get(name) != second.options.get(name):
            raise InputError(
                f"the two lists differ in {name}: {first.options.get(name)} and "
                f"{second.options.get(name)}; solve both alike"
            )
    keys, rows, others = _common(first, second)
    if not keys:
        raise InputError("the two lists have no mode of the same degree and order")
    change = np.log(second.inertia[others] / first.inertia[rows])
    reasons = _reasons(first, second, rows, others, change)
    good = np.array([not reason for reason in reasons])
    degree, order = np.array(keys).T
    nu_dynamical = first.star.nu_dynamical ** (1.0 - share) * second.star.nu_dynamical**share
    a, b = first.sigma2[rows], second.sigma2[others]
    with np.errstate(invalid="ignore", divide="ignore"):
        value = np.exp((1.0 - share) * np.log(a) + share * np.log(b))
    straight = (1.0 - share) * a + share * b
    bend = _CAUTION * np.abs(np.sqrt(np.abs(straight)) - np.sqrt(np.abs(value)))
    bend = np.maximum(bend, _coupling(degree, value, a, b, share))
    numerical = np.maximum(first.nu_error[rows], second.nu_error[others])
    return InterpolatedModes(
        degree=degree[good],
        order=order[good],
        nu=(np.sqrt(value) * nu_dynamical)[good],
        nu_error=(bend * nu_dynamical + numerical)[good],
        nu_dynamical=float(nu_dynamical),
        refused=np.array(keys)[~good],
        reason=np.array([reason for reason in reasons if reason], dtype=str),
    )


def _common(
    first: ModeSet, second: ModeSet
) -> tuple[list[tuple[int, int]], np.ndarray, np.ndarray]:
    places = [
        {key: row for row, key in enumerate(zip(m.degree.tolist(), m.order.tolist(), strict=True))}
        for m in (first, second)
    ]
    keys = sorted(places[0].keys() & places[1].keys())
    rows, others = (np.array([place[key] for key in keys], dtype=int) for place in places)
    return keys, rows, others


def _reasons(
    first: ModeSet, second: ModeSet, rows: np.ndarray, others: np.ndarray, change: np.ndarray
) -> list[str]:
    """Why a mode cannot be interpolated, or nothing."""
    out = []
    for place, (i, j) in enumerate(zip(rows, others, strict=True)):
        alike = first.degree[rows] == first.degree[i]
        usual = float(np.median(change[alike]))
        if not (first.sigma2[i] > 0.0 and second.sigma2[j] > 0.0):
            out.append("the mode grows instead of oscillating")
        elif (first.n_p[i], first.n_g[i]) != (second.n_p[j], second.n_g[j]):
            out.append(
                f"avoided crossing: n_p, n_g go from {first.n_p[i]}, {first.n_g[i]} to "
                f"{second.n_p[j]}, {second.n_g[j]}"
            )
        elif abs(change[place] - usual) > _INERTIA_CHANGE:
            out.append(
                "avoided crossing: the inertia changes by a factor of "
                f"{np.exp(change[place] - usual):.2g} beyond that of its neighbours"
            )
        else:
            out.append("")
    return out


def _coupling(
    degree: np.ndarray, value: np.ndarray, a: np.ndarray, b: np.ndarray, share: float
) -> np.ndarray:
    """(k,) error of the root of sigma2 where the motion of a mode may shift on the way.

    Core and envelope drive ln sigma2 at different rates, and at an avoided crossing a mode
    changes from one rate to the other. Which rates there are shows in its neighbours: the error of
    a parabola whose slope changes by as much as it differs from theirs.
    """
    with np.errstate(invalid="ignore", divide="ignore"):
        slope = np.nan_to_num(np.log(b / a))
    out = np.zeros(value.size)
    for each in np.unique(degree):
        own = np.flatnonzero(degree == each)
        steps = np.abs(np.diff(slope[own]))
        before, after = np.append(0.0, steps), np.append(steps, 0.0)
        # The neighbours but one as well: a pair at its closest shares one rate.
        wide = np.abs(slope[own][2:] - slope[own][:-2])
        far = np.maximum(np.append([0.0, 0.0], wide), np.append(wide, [0.0, 0.0]))
        out[own] = np.maximum(np.maximum(before, after), far)
    return _CAUTION * 0.5 * share * (1.0 - share) * out * np.sqrt(np.abs(value))
