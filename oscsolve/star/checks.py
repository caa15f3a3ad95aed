"""What is wrong or doubtful in the numbers of a model, whatever band it is used in.

Each check yields findings. Limits stand well above what good public files show: two solar models,
a subgiant and staggered files moved to cell centres hold hydrostatic balance to 7e-3 inside
0.95 R and to 2e-2 at the surface, A* to 4e-3 inside and to 0.1 in an atmosphere, mass to 3e-3.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from oscsolve.star.balance import Balance, mass_of_density, measure_balance, shell_masses
from oscsolve.star.derive import estimate_gravity
from oscsolve.star.findings import Finding
from oscsolve.star.model import StarModel
from oscsolve.units import SOLAR_MASS

#: Codes evolve turbulent pressure and simplified atmospheres outside this fractional radius.
_INTERIOR = 0.95
#: Residuals from which a law is doubtful and from which it is broken: hydrostatic balance,
#: A* against the density, mass against the density.
_HYDROSTATIC, _DENSITY, _MASS = (0.03, 0.3), (0.02, 0.2), (4e-3, 0.05)
#: Outside `_INTERIOR` residuals up to this are the habit of codes.
_SURFACE = 0.5
#: Gamma1 of every gas without phase changes lies within, with a margin for tables.
_GAMMA1 = (1.0, 5.0 / 3.0 + 0.02)
#: Relative distance of G from the implied one: doubtful (beyond the uncertainty), wrong.
_GRAVITY = (1e-4, 0.02)
#: Fit of another meaning of the mass column that is accepted as its explanation.
_FITS = 0.02


def structure_findings(star: StarModel) -> Iterator[Finding]:
    """All findings about the numbers of a model, that its reader has not told already."""
    told = {finding.code for finding in star.findings}
    balance = measure_balance(star)
    yield from _monotonic(star)
    yield from _repeated_radii(star, told)
    mass = list(_mass(star, balance))
    yield from mass
    yield from _saturated_mass(star)
    yield from _hydrostatic(balance, wrong_mass=any(f.severity == "defect" for f in mass))
    yield from _gravity(star, told)
    yield from _buoyancy(star, balance, told)
    yield from _gamma1(star)
    yield from _centre(star)


def _monotonic(star: StarModel) -> Iterator[Finding]:
    """Pressure must fall outward; density may rise only where convection is vigorous."""
    x = star.fractional_radius
    real = np.diff(star.radius) > 0.0
    rising = np.flatnonzero(real & (np.diff(star.pressure) > 0.0))
    if rising.size:
        rise = np.log(star.pressure[rising + 1] / star.pressure[rising])
        # Ten digits and a thin shell: what rounding can do is no defect.
        severe = float(rise.max()) > 1e-6
        yield Finding(
            "defect" if severe else "note",
            "pressure-rises",
            f"pressure rises outward in {_cells(rising.size)}, first at x = {x[rising[0]]:.6g}, "
            f"by up to {float(rise.max()):.2g}",
            "no star in balance does that; repair the column" if severe else "",
            float(x[rising[0]]),
            float(rise.max()),
        )
    assert star.a_star is not None
    rise = np.where(real, np.log(_ratio(star.density)), 0.0)
    inverted = np.flatnonzero(rise > 1e-9)
    if inverted.size:
        stable = np.minimum(star.a_star[inverted], star.a_star[inverted + 1]) > 0.0
        at = float(x[inverted[0]])
        yield Finding(
            "doubt" if stable.any() else "note",
            "density-inversion",
            f"density rises outward in {_cells(inverted.size)} from x = {at:.8g} to "
            f"{float(x[inverted[-1] + 1]):.8g}, by {float(rise[inverted].sum()):.2g} in all, "
            + (
                f"at {int(stable.sum())} of them although A* says that the layer is stable"
                if stable.any()
                else "where A* < 0, as strong convection can bring about"
            ),
            "check the density and A* there" if stable.any() else "",
            at,
            float(rise[inverted].sum()),
        )


def _cells(number: int) -> str:
    return f"{number} cell{'s' * (number != 1)}"


def _ratio(values: np.ndarray) -> np.ndarray:
    """values[i+1]/values[i], 1 where either is zero."""
    low, high = values[:-1], values[1:]
    return np.divide(high, low, out=np.ones_like(low), where=(low > 0.0) & (high > 0.0))


def _repeated_radii(star: StarModel, told: set[str]) -> Iterator[Finding]:
    """Two points at one radius: a density jump, rounding, or a break of the pressure."""
    pairs = np.flatnonzero(np.diff(star.radius) == 0.0)
    if pairs.size == 0:
        return
    x = star.fractional_radius
    pressure, density = (np.abs(np.log(_ratio(c)))[pairs] for c in (star.pressure, star.density))
    broken = pressure > 1e-3
    jumps = ~broken & (density > 10.0 * pressure + 1e-9)
    rounding = ~broken & ~jumps
    if broken.any():
        at, size = float(x[pairs[broken][0]]), float(pressure[broken].max())
        yield Finding(
            "defect",
            "pressure-jump",
            f"pressure differs by {size:.2g} between two points at one radius (x = {at:.6g})",
            "pressure is continuous in a star; repair these points",
            at,
            size,
        )
    if jumps.any() and "density-jumps" not in told:
        at, size = float(x[pairs[jumps][0]]), float(density[jumps].max())
        yield Finding(
            "note",
            "density-jumps",
            f"{int(jumps.sum())} density jumps, two points at one radius, the first at "
            f"x = {at:.6g}, the largest a factor of {np.exp(size):.4g}",
            place=at,
            size=size,
        )
    if rounding.any():
        at = float(x[pairs[rounding][0]])
        yield Finding(
            "doubt",
            "repeated-radii",
            f"{int(rounding.sum())} points repeat the radius of the one before without a density "
            f"jump (first at x = {at:.7g}); the difference is rounding",
            "drop one point of each pair, or export the model with more digits",
            at,
            float(rounding.sum()),
        )


def _mass(star: StarModel, balance: Balance) -> Iterator[Finding]:
    """The mass column against the integral of the density."""
    ratio = balance.mass[np.isfinite(balance.mass)]
    factor = float(np.median(ratio))
    off = np.abs(ratio / factor - 1.0) if factor != 0.0 else np.abs(ratio)
    spread = float(np.median(off))
    size = max(abs(factor - 1.0), spread)
    if size <= _MASS[0] + _coarseness(star):
        return
    severity = "defect" if size > _MASS[1] else "doubt"
    meaning = _meaning_of_mass(star)
    if spread <= _MASS[1]:
        what = f"the mass column is {factor:.6g} times the mass that the density makes"
        place = None
    else:
        worst = int(np.argmax(off))
        place = float(balance.mass_x[worst])
        what = (
            f"the mass column does not follow from the density: shells differ by {spread:.2g} "
            f"(median), most at x = {place:.4g}"
        )
    yield Finding(
        severity,
        "mass-mismatch",
        f"{what}{'; ' if meaning else ''}{meaning}{_who_is_wrong(star)}",
        "give the mass inside each point in g, and check the unit of the density",
        place,
        size,
    )


def _coarseness(star: StarModel) -> float:
    """Relative error that the integral of the density may have: twice that of second order."""
    fine, coarse = (
        float(np.sum(shell_masses(star.radius[::k], star.density[::k]))) for k in (1, 2)
    )
    return 2.0 / 3.0 * abs(coarse / fine - 1.0)


def _meaning_of_mass(star: StarModel) -> str:
    """What a wrong mass column holds instead, if one of the usual mistakes explains it."""
    right = mass_of_density(star)
    shells = np.append(right[0], shell_masses(star.radius, star.density))
    meanings = {
        "it looks like fractions of the total mass": right / star.total_mass,
        "it looks like solar masses": right / SOLAR_MASS,
        "it looks like kg": right / 1e3,
        "it looks like the mass above each point": right[-1] - right,
        "it looks like the mass of each shell, not added up": shells,
        "it looks like the decimal logarithm of the mass in g": np.log10(np.maximum(right, 1.0)),
    }
    heavy = (right > 1e-3 * right[-1]) & (right < 0.999 * right[-1])
    if np.count_nonzero(heavy) < 5:
        return ""
    for meaning, expected in meanings.items():
        good = heavy & (expected > 0.0)
        if np.median(np.abs(star.mass[good] / expected[good] - 1.0)) < _FITS:
            return meaning
    return ""


def _who_is_wrong(star: StarModel) -> str:
    """Hydrostatic balance with the mass that the density makes tells which column to blame."""
    balance = measure_balance(star, mass_of_density(star))
    if balance.x.size == 0:
        return ""
    if abs(float(np.median(balance.hydrostatic))) < _FITS:
        return "; with the mass that the density makes, pressure balances: the mass is wrong"
    own = measure_balance(star)
    if abs(float(np.median(own.hydrostatic))) < _FITS:
        return "; pressure balances with the mass column: the density or the radius is in doubt"
    return ""


def _saturated_mass(star: StarModel) -> Iterator[Finding]:
    """Mass column that no longer grows although there is matter: too few digits, harmless."""
    flat = star.mass >= star.mass[-1]
    first = int(np.argmax(flat))
    missing = mass_of_density(star)
    rest = float((missing[-1] - missing[first]) / star.total_mass)
    x = star.fractional_radius
    # A few points at a true edge, or a rest below round-off, are nothing to report.
    if star.radius.size - first > 10 and rest > 1e-14:
        yield Finding(
            "note",
            "mass-saturated",
            f"the mass column is constant from x = {x[first]:.6g} outward, where the density "
            f"still holds {rest:.1g} of the star",
            place=float(x[first]),
            size=rest,
        )


def _hydrostatic(balance: Balance, wrong_mass: bool) -> Iterator[Finding]:
    """Where dP/dr departs from -G m rho/r^2, a uniform factor (which is G) apart."""
    if balance.x.size == 0:
        yield Finding(
            "doubt",
            "balance-unknown",
            "pressure falls by more than a factor e between all points: hydrostatic balance "
            "cannot be checked, and no interpolation between such points means much",
            "give the model more points",
        )
        return
    middle = 1.0 + float(np.median(balance.hydrostatic))
    residual = np.abs((1.0 + balance.hydrostatic) / middle - 1.0)
    if wrong_mass or not np.all(np.isfinite(residual)):
        return
    inside = balance.x < _INTERIOR
    worst, inner = int(np.argmax(residual)), float(np.max(residual[inside], initial=0.0))
    outer = float(np.max(residual[~inside], initial=0.0))
    severity = "note"
    if inner > _HYDROSTATIC[0] or outer > _SURFACE:
        severity = "defect" if inner > _HYDROSTATIC[1] else "doubt"
        worst = int(np.argmax(np.where(inside, residual, residual * _HYDROSTATIC[0] / _SURFACE)))
    at, size = float(balance.x[worst]), float(residual[worst])
    yield Finding(
        severity,
        "hydrostatic-balance",
        f"hydrostatic balance holds to {float(np.median(residual)):.1g} (median); the largest "
        f"residual is {size:.2g} at x = {at:.6g}",
        "" if severity == "note" else "check P, rho, m and r there; a jump needs two points",
        at,
        size,
    )


def _gravity(star: StarModel, told: set[str]) -> Iterator[Finding]:
    """The G that hydrostatic balance implies against the one in use."""
    columns = (star.radius, star.mass, star.pressure, star.density)
    implied, uncertainty = estimate_gravity(*columns)
    used = star.gravitational_constant
    off = abs(implied / used - 1.0)
    if "gravity-mismatch" in told or not off > _GRAVITY[0] + 3.0 * uncertainty:
        return
    yield Finding(
        "defect" if off > _GRAVITY[1] else "doubt",
        "gravity-mismatch",
        f"hydrostatic balance implies G = {implied:.7g} (to about {uncertainty:.1g} relative), "
        f"{implied / used - 1.0:+.2g} from the {used:.7g} in use",
        "use the G of the evolution code; frequencies scale with its square root"
        if off <= _GRAVITY[1]
        else "check the units of mass, radius, pressure and density",
        size=off,
    )


def _buoyancy(star: StarModel, balance: Balance, told: set[str]) -> Iterator[Finding]:
    """A* against P, rho and Gamma1, and stars without stable layers."""
    assert star.a_star is not None
    residual = np.abs(balance.density)
    inside = balance.x < _INTERIOR
    if "a-star-derived" not in told and inside.any() and np.all(np.isfinite(residual)):
        middle = float(np.median(residual[inside]))
        masked = np.where(inside, residual, 0.0)
        worst = int(np.argmax(masked))
        size = float(masked[worst])
        if middle > _DENSITY[0] or size > 3.0 * _DENSITY[0]:
            yield Finding(
                "defect" if middle > _DENSITY[1] else "doubt",
                "buoyancy-mismatch",
                f"A* or N^2 contradicts P, rho and Gamma1: the fall of ln rho differs from what "
                f"it says by {middle:.2g} of the fall of ln P (median), and by {size:.2g} at "
                f"x = {balance.x[worst]:.4g}",
                "check the unit and the sign of A* or N^2, or leave it out to have it derived",
                float(balance.x[worst]),
                size,
            )
    body = (star.fractional_radius < _INTERIOR) & (star.radius > 0.0)
    excess = _density_excess(star)[body]
    if excess.size and not np.any(excess > 1e-9):
        neutral = bool(np.median(excess) > -1e-3)
        yield Finding(
            "note" if neutral else "doubt",
            "no-stable-layer",
            "N^2 is nowhere above zero inside x = 0.95"
            + (": the star is convective throughout" if neutral else ", and far below it"),
            "there are no g modes"
            if neutral
            else "convection would remove such a gradient; check A* and Gamma1. There are no g "
            "modes, and modes that grow for every l above zero",
            size=float(-np.median(excess)),
        )


def _density_excess(star: StarModel) -> np.ndarray:
    """(n,) A*/V = dln rho/dlnP - 1/Gamma1; 0 at the centre and the edge."""
    assert star.a_star is not None
    weight = star.gravitational_constant * star.mass * star.density
    scale = star.radius * star.pressure
    return np.divide(
        star.a_star * scale, weight, out=np.zeros_like(scale), where=(weight > 0.0) & (scale > 0.0)
    )


def _gamma1(star: StarModel) -> Iterator[Finding]:
    """Gamma1 outside what a gas can have, or too small for a stable star."""
    x = star.fractional_radius
    low, high = _GAMMA1
    odd = np.flatnonzero((star.gamma1 < low) | (star.gamma1 > high))
    if odd.size:
        worst = odd[int(np.argmax(np.abs(np.log(star.gamma1[odd] / 1.4))))]
        yield Finding(
            "doubt",
            "gamma1-range",
            f"Gamma1 lies outside 1 to 5/3 at {odd.size} of {star.radius.size} points; it is "
            f"{star.gamma1[worst]:.6g} at x = {x[worst]:.6g}",
            "no gas has that; check the column, unless the star is a mathematical one",
            float(x[worst]),
            float(star.gamma1[worst]),
        )
    volume = np.diff(star.radius**3)
    weight = 0.5 * (star.pressure[1:] + star.pressure[:-1]) * volume
    mean = float(np.sum(weight * 0.5 * (star.gamma1[1:] + star.gamma1[:-1])) / np.sum(weight))
    if mean < 4.0 / 3.0:
        yield Finding(
            "doubt",
            "gamma1-low",
            f"the mean of Gamma1, weighted with pressure, is {mean:.6g}, below 4/3: the star is "
            "close to dynamical instability, or beyond",
            "look at the radial fundamental mode; check Gamma1 if none is expected to grow",
            size=mean,
        )


def _centre(star: StarModel) -> Iterator[Finding]:
    """A first point above the centre, and what has to be extrapolated below it."""
    x0 = float(star.fractional_radius[0])
    if x0 == 0.0:
        return
    assert star.a_star is not None
    r, m, rho = star.radius[0], star.mass[0], star.density[0]
    v = star.gravitational_constant * m * rho / (r * star.pressure[0])
    # ln P and ln rho rise by half their logarithmic slope to the centre of an even function.
    size = 0.5 * float(max(v, abs(star.a_star[0] + v / star.gamma1[0])))
    ball = float(m / (4.0 / 3.0 * np.pi * r**3 * rho))
    point_mass = not 1.0 / (1.5 + 2.0 * size) < ball < 1.5 + 2.0 * size
    severity = "note" if size < 0.02 and not point_mass else "doubt"
    if size > 0.5 or ball > 3.0:
        severity = "defect"
    lump = (
        f", where the mass is {ball:.3g} times that of a ball of the density there"
        if point_mass
        else ""
    )
    yield Finding(
        severity,
        "centre-missing",
        f"the innermost point is at x = {x0:.4g} (m/M = {m / star.total_mass:.2g}){lump}; the "
        f"centre was extrapolated from it, a change of ln P or ln rho by {size:.2g}",
        "" if severity == "note" else "export the model down to the centre",
        x0,
        size,
    )
