"""What a reader holds before it makes a star, and the repairs that all formats share.

Every repair leaves a `Finding`: nothing is reordered, dropped or merged in silence.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np

from oscsolve.errors import InputError
from oscsolve.star.derive import derive_a_star, estimate_gravity
from oscsolve.star.findings import Finding
from oscsolve.star.model import StarModel
from oscsolve.units import NEWTON_G

#: A first point below this fraction of R is a stand-in for the centre, not a point of the model.
PLACEHOLDER_FRACTION = 1e-12
#: How far the pressure and density of a placeholder may lie from those of the next point.
PLACEHOLDER_AGREEMENT = 0.01
#: G outside this range (cm^3 g^-1 s^-2) is not Newton's constant in cgs units.
GRAVITY_RANGE = (6.6e-8, 6.75e-8)
#: Relative distance between the G of a file and the one its structure implies worth a doubt.
GRAVITY_AGREEMENT = 1e-4


@dataclass
class Draft:
    """Columns and scalars of a model while it is being read; the names are those of StarModel.

    Attributes
    ----------
    where : file name for error messages
    columns : name to (n,) array in cgs units
    scalars : name to number in cgs units
    findings : what was decided so far
    """

    where: str
    columns: dict[str, np.ndarray]
    scalars: dict[str, float]
    findings: list[Finding] = field(default_factory=list)

    @property
    def size(self) -> int:
        """Number of points."""
        return int(self.columns["radius"].size)

    def note(
        self,
        severity: str,
        code: str,
        message: str,
        advice: str = "",
        place: float | None = None,
        size: float | None = None,
    ) -> None:
        """Add a finding."""
        self.findings.append(Finding(severity, code, message, advice, place, size))

    def take(self, index: np.ndarray | slice) -> None:
        """Keep the points of `index`, in that order."""
        self.columns = {name: column[index] for name, column in self.columns.items()}


def order_outward(draft: Draft) -> None:
    """Put the centre first; refuse a radius that neither rises nor falls throughout."""
    radius = draft.columns["radius"]
    if radius.size < 5:
        raise InputError(
            f"{draft.where}: a model needs at least 5 points; got {radius.size}. "
            "Export the whole model"
        )
    if radius[0] > radius[-1]:
        draft.take(slice(None, None, -1))
        draft.note("note", "order-reversed", "the file runs from the surface to the centre")
    step = np.diff(draft.columns["radius"])
    wrong = np.flatnonzero(~(step >= 0.0))
    if wrong.size:
        at = int(wrong[0]) + 1
        x = draft.columns["radius"][at] / draft.scalars["photospheric_radius"]
        raise InputError(
            f"{draft.where}: radius must increase outward; it falls at point {at + 1} "
            f"from the centre (x = {x:.6g}). Drop that point or repair the file"
        )


def settle_centre(draft: Draft) -> None:
    """Turn a placeholder centre (r far below any mesh spacing) into r = 0, or drop it.

    Left as it is, a cell of length 1e-60 R would shift every mode label by one.
    """
    radius = draft.columns["radius"]
    x = float(radius[0]) / draft.scalars["photospheric_radius"]
    if x >= PLACEHOLDER_FRACTION:
        return
    if _centre_is_physical(draft):
        if x > 0.0 or _mass_at_centre(draft):
            draft.note(
                "note",
                "centre-placeholder",
                f"the innermost point (r/R = {x:.3g}) stands for the centre; "
                "it was set to r = 0, m = 0, A* = 0",
                place=0.0,
            )
        for name in ("radius", "mass", "a_star", "brunt_n2"):
            if name in draft.columns:
                column = draft.columns[name].copy()
                column[0] = 0.0
                draft.columns[name] = column
        return
    draft.note(
        "note",
        "centre-dropped",
        f"the innermost point (r/R = {x:.3g}) is a placeholder whose pressure and density do "
        "not continue those of its neighbour; it was dropped",
        place=0.0,
    )
    draft.take(slice(1, None))


def _mass_at_centre(draft: Draft) -> bool:
    return bool(draft.columns["mass"][0] > 1e-30 * draft.scalars["total_mass"])


def _centre_is_physical(draft: Draft) -> bool:
    """True if P and rho of the first point continue those of the second to the centre."""
    c = draft.columns
    pressure, density = c["pressure"], c["density"]
    if not (pressure[0] > 0.0 and density[0] > 0.0):
        return False
    # P rises by G m rho / 2r from r to the centre; a coarse but true model may go beyond 1 %.
    rise = NEWTON_G * c["mass"][1] * density[1] / (2.0 * c["radius"][1] * pressure[1])
    allowed = max(PLACEHOLDER_AGREEMENT, 2.0 * float(rise))
    for column in (pressure, density):
        if not abs(column[0] / column[1] - 1.0) <= allowed:
            return False
    return "gamma1" not in c or bool(c["gamma1"][0] > 0.0)


def merge_repeated_radii(draft: Draft, digits: float) -> None:
    """Keep two points of a group at one radius if density jumps there, else only the first.

    Parameters
    ----------
    digits : relative rounding of the numbers in the file, e.g. 1e-9 for ten digits.

    Notes
    -----
    Within one rounding unit of r the pressure may change by V times that unit (V = dlnP/dlnr)
    and the density by about as much, so "agree to rounding" and "more than rounding explains"
    are measured against the gradients beside the group.
    """
    radius = draft.columns["radius"]
    same = np.diff(radius) <= 0.0
    if not same.any():
        return
    start = np.flatnonzero(np.diff(np.concatenate(([0], same.view(np.int8)))) == 1)
    stop = np.flatnonzero(np.diff(np.concatenate((same.view(np.int8), [0]))) == -1) + 1
    keep = np.ones(radius.size, dtype=bool)
    jumps, dropped = [], []
    for first, last in zip(start.tolist(), stop.tolist(), strict=True):
        if _is_density_jump(draft, first, last, digits):
            keep[first + 1 : last] = False
            jumps.append(first)
            if last > first + 1:
                dropped.append(first)
        else:
            keep[first + 1 : last + 1] = False
            dropped.append(first)
    _note_repeated(draft, keep, jumps, dropped)
    draft.take(keep)


def _is_density_jump(draft: Draft, first: int, last: int, digits: float) -> bool:
    density, pressure = draft.columns["density"], draft.columns["pressure"]
    mass = draft.columns["mass"]
    if min(density[first], density[last], pressure[first], pressure[last]) <= 0.0:
        return False
    jump = abs(np.log(density[last] / density[first]))
    slack = _rounding_change(draft, first, last, digits)
    steady = abs(np.log(pressure[last] / pressure[first])) <= slack
    steady &= abs(mass[last] - mass[first]) <= slack * mass[last]
    return bool(steady and jump > 10.0 * slack)


def _rounding_change(draft: Draft, first: int, last: int, digits: float) -> float:
    """Largest relative change of P or rho that a radius rounded to `digits` can hide."""
    slope = 1.0
    lnr, size = draft.columns["radius"], draft.size
    for name in ("pressure", "density"):
        column = draft.columns[name]
        for low, high in ((first - 1, first), (last, last + 1)):
            if low < 0 or high >= size or lnr[low] <= 0.0 or column[low] * column[high] <= 0.0:
                continue
            rise = abs(np.log(column[high] / column[low]))
            slope = max(slope, rise / np.log(lnr[high] / lnr[low]))
    return float((2.0 * slope + 4.0) * digits)


def _note_repeated(draft: Draft, keep: np.ndarray, jumps: list[int], dropped: list[int]) -> None:
    x = draft.columns["radius"] / draft.scalars["photospheric_radius"]
    if dropped:
        count = int(np.count_nonzero(~keep))
        places = _listed(x[dropped])
        draft.note(
            "note",
            "repeated-radii",
            f"{count} points repeat the radius of the one before (x = {places}); the "
            "difference is rounding, and they were dropped",
            "export the model with more digits",
            place=float(x[dropped[0]]),
            size=float(count),
        )
    if jumps:
        draft.note(
            "note",
            "density-jumps",
            f"{len(jumps)} density jumps, two points at one radius (x = {_listed(x[jumps])})",
            place=float(x[jumps[0]]),
            size=float(len(jumps)),
        )


def _listed(values: np.ndarray) -> str:
    shown = ", ".join(f"{value:.7g}" for value in values[:5])
    return shown if values.size <= 5 else f"{shown}, and {values.size - 5} more"


def settle_gravity(
    draft: Draft,
    given: float | None,
    stated: float | None,
    estimate: tuple[float, float] | None = None,
) -> None:
    """Choose G: the caller's, else the file's, else the one hydrostatic balance implies.

    Parameters
    ----------
    given, stated : cm^3 g^-1 s^-2; from the caller and from the file
    estimate : G and its uncertainty (relative) if the reader knows a better estimate than
        `estimate_gravity` makes from the points.
    """
    if estimate is None:
        names = ("radius", "mass", "pressure", "density")
        estimate = estimate_gravity(*(draft.columns[name] for name in names))
    implied, scatter = estimate
    if given is not None:
        draft.scalars["gravitational_constant"] = float(given)
        said = "no G" if stated is None else f"G = {stated:.8g}"
        draft.note(
            "note",
            "gravity-given",
            f"G = {given:.8g} was given by the caller; the file says {said}, "
            f"hydrostatic balance implies {implied:.7g}",
        )
    elif stated is not None:
        draft.scalars["gravitational_constant"] = float(stated)
        draft.note("note", "gravity-read", f"G = {stated:.8g} was read from the file")
    else:
        _settle_estimate(draft, implied, scatter)
        return
    chosen = draft.scalars["gravitational_constant"]
    off = implied / chosen - 1.0
    if not abs(off) <= GRAVITY_AGREEMENT + 3.0 * scatter:
        draft.note(
            "doubt",
            "gravity-mismatch",
            f"hydrostatic balance implies G = {implied:.7g}, {off:+.2g} from the "
            f"{chosen:.7g} in use",
            "check the G, the units and the digits of the file",
            size=abs(off),
        )


def _settle_estimate(draft: Draft, implied: float, scatter: float) -> None:
    low, high = GRAVITY_RANGE
    if not low < implied < high:
        raise InputError(
            f"{draft.where}: hydrostatic balance implies G = {implied:.4g} instead of about "
            "6.67e-08, so a unit or a column is not what it seems; repair the file or give "
            "gravitational_constant"
        )
    draft.scalars["gravitational_constant"] = implied
    draft.note(
        "note",
        "gravity-estimated",
        f"the file holds no G; hydrostatic balance implies G = {implied:.7g} "
        f"(to about {scatter:.1g} relative), which is used",
        "give gravitational_constant if you know the value of the evolution code",
        size=scatter,
    )


def make_star(draft: Draft, **labels: str) -> StarModel:
    """The StarModel of a finished draft; the file name goes in front of any complaint."""
    fields: dict[str, Any] = {**draft.columns, **draft.scalars, **labels}
    try:
        return StarModel(**fields, findings=tuple(draft.findings))
    except InputError as error:
        raise type(error)(f"{draft.where}: {error}") from error


def settle_a_star(draft: Draft, rounding: float, missing: str) -> None:
    """Derive A* and say so; `missing` completes "the file has ..." in the finding."""
    c = draft.columns
    c["a_star"], widened = derive_a_star(
        c["radius"],
        c["mass"],
        c["pressure"],
        c["density"],
        c["gamma1"],
        draft.scalars["gravitational_constant"],
        rounding,
    )
    wide = f"; {widened} points lie too close for the digits of the file and were fitted together"
    draft.note(
        "doubt" if widened else "note",
        "a-star-derived",
        f"the file has {missing}; A* was derived from P, rho and Gamma1 by second-order "
        f"differences of ln rho over ln P{wide if widened else ''}",
        "export A* or N^2 if the code knows it better (composition gradients)",
        size=float(widened),
    )
