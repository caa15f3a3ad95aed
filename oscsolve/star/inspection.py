"""Inspecting a model: the figures of the star, and what is wrong or doubtful about it."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from oscsolve.errors import InputError
from oscsolve.star.checks import structure_findings
from oscsolve.star.derive import estimate_gravity
from oscsolve.star.findings import SEVERITIES, Finding
from oscsolve.star.fitness import band_findings, points_per_wavelength
from oscsolve.star.integrals import acoustic_cutoff, large_separation, period_spacing
from oscsolve.star.likely_band import likely_band
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile
from oscsolve.units import band_to_uhz

#: dln rho/dlnP - 1/Gamma1 that counts as unstable where A* is the file's, and where it was
#: derived by differences, which scatter about zero in convective zones.
_UNSTABLE, _UNSTABLE_DERIVED = -1e-12, 1e-3
#: Runs of fewer points than this do not make a zone, nor part one.
_SHORT = 3

_BROKEN = Finding(
    "defect",
    "structure-broken",
    "the columns contradict each other so much that between points the sound speed is not real",
    "repair the columns named in the other findings",
)


@dataclass(frozen=True)
class Figures:
    """The figures of a star as a whole.

    Attributes
    ----------
    total_mass, photospheric_radius : M, R in g, cm
    gravitational_constant, gravity_implied : cm^3 g^-1 s^-2, in use, and what hydrostatic
        balance implies (NaN if it cannot be told)
    points, innermost, outermost : number of points, and the fractional radii of the first and
        the last
    central_density_ratio : density of the centre over the mean density 3 M/(4 pi R^3)
    nu_dynamical : sqrt(G M/R^3)/2 pi, uHz
    large_separation : [2 int dr/c]^-1, uHz; NaN in a broken model
    period_spacing : (degree, 2 pi^2/(sqrt(l(l+1)) int N dr/r) in s) for l = 1, 2, 3; infinite
        without stable layers
    acoustic_cutoff : c/(4 pi H) of the outermost layer, uHz; infinite at a true edge
    buoyancy_range : smallest and largest N where N^2 > 0, below the photosphere, uHz; NaN if
        nowhere
    lamb_range : (degree, S_l at the outermost point, S_l at the innermost point above the
        centre) in uHz, for l = 1, 2, 3
    convective_zones : (inner, outer) fractional radius of each zone where N^2 < 0
    """

    total_mass: float
    photospheric_radius: float
    gravitational_constant: float
    gravity_implied: float
    points: int
    innermost: float
    outermost: float
    central_density_ratio: float
    nu_dynamical: float
    large_separation: float
    period_spacing: tuple[tuple[int, float], ...]
    acoustic_cutoff: float
    buoyancy_range: tuple[float, float]
    lamb_range: tuple[tuple[int, float, float], ...]
    convective_zones: tuple[tuple[float, float], ...]


@dataclass(frozen=True)
class Inspection:
    """What an inspection found; iterating it gives the findings, worst first.

    Attributes
    ----------
    findings : of the reader and of the inspection, defects before doubts before notes
    figures : the figures of the star
    band : low and high, uHz, that the mesh and the atmosphere were judged for
    band_reason : why this band, or "" if the caller gave it
    points_per_wavelength : the fewest points that a wave of the band meets per wavelength;
        infinite if none travels
    """

    findings: tuple[Finding, ...]
    figures: Figures
    band: tuple[float, float]
    band_reason: str
    points_per_wavelength: float

    def __iter__(self) -> Iterator[Finding]:
        return iter(self.findings)

    def __len__(self) -> int:
        return len(self.findings)

    @property
    def usable(self) -> bool:
        """True if no finding is a defect."""
        return all(finding.severity != "defect" for finding in self.findings)


def inspect_model(
    star: StarModel,
    *,
    degrees: Sequence[int] = (0, 1, 2, 3),
    band: tuple[float, float] | None = None,
    unit: str = "uHz",
) -> Inspection:
    """Findings about a model (what is wrong or doubtful, where, what to do) and its figures.

    Parameters
    ----------
    star : the model.
    degrees : spherical degrees that the mesh is judged for.
    band : two limits in `unit` that mesh and atmosphere are judged for; None takes what the
        solver would choose for this star.
    unit : one of `oscsolve.units.UNITS`.

    Raises
    ------
    BandError
        The band is empty or not finite.
    InputError
        The unit is unknown, or a degree is no whole number from 0.

    Examples
    --------
    >>> import oscsolve
    >>> found = inspect_model(oscsolve.polytrope(3))
    >>> found.usable
    True
    >>> round(found.figures.central_density_ratio, 4)
    54.1825
    """
    for degree in degrees:
        if int(degree) != degree or degree < 0:
            raise InputError(f"degrees are whole numbers from 0; got {degree!r}")
    asked = None if band is None else band_to_uhz(band, unit, star.nu_dynamical)
    # A broken model must end in findings, not in warnings of the arithmetic.
    with np.errstate(over="ignore", invalid="ignore", divide="ignore"):
        return _inspect(star, degrees, asked)


def _inspect(
    star: StarModel, degrees: Sequence[int], asked: tuple[float, float] | None
) -> Inspection:
    profile = Profile(star)
    limits, why = likely_band(star, profile) if asked is None else (asked, "")
    figures = model_figures(star, profile)
    findings = [*star.findings, *structure_findings(star)]
    if np.isfinite(figures.large_separation) and np.all(np.isfinite(limits)):
        findings += band_findings(star, profile, degrees, limits)
    else:
        findings.append(_BROKEN)
    findings.sort(key=lambda found: -SEVERITIES.index(found.severity))
    fewest = points_per_wavelength(star, profile, degrees, limits)[0]
    return Inspection(tuple(findings), figures, limits, why, fewest)


def model_figures(star: StarModel, profile: Profile | None = None) -> Figures:
    """The figures of a star as a whole."""
    profile = profile or Profile(star)
    columns = (star.radius, star.mass, star.pressure, star.density)
    mean = 3.0 * star.total_mass / (4.0 * np.pi * star.photospheric_radius**3)
    x0 = profile.at(np.zeros(1), profile.interval[:1])
    dimensionless = float(x0.rho[0]) * star.total_mass / star.photospheric_radius**3
    cutoff = np.inf if profile.has_edge else acoustic_cutoff(profile) * star.nu_dynamical
    return Figures(
        total_mass=star.total_mass,
        photospheric_radius=star.photospheric_radius,
        gravitational_constant=star.gravitational_constant,
        gravity_implied=estimate_gravity(*columns)[0],
        points=star.radius.size,
        innermost=float(star.fractional_radius[0]),
        outermost=float(star.fractional_radius[-1]),
        central_density_ratio=dimensionless / mean,
        nu_dynamical=star.nu_dynamical,
        large_separation=large_separation(star, profile),
        period_spacing=tuple((k, period_spacing(star, k, profile)) for k in (1, 2, 3)),
        acoustic_cutoff=float(cutoff),
        buoyancy_range=_buoyancy_range(star),
        lamb_range=_lamb_range(star),
        convective_zones=convective_zones(star),
    )


def _buoyancy_range(star: StarModel) -> tuple[float, float]:
    assert star.brunt_n2 is not None
    n2 = star.brunt_n2[(star.brunt_n2 > 0.0) & (star.fractional_radius <= 1.0)]
    if n2.size == 0:
        return float("nan"), float("nan")
    low, high = (float(np.sqrt(v)) * 1e6 / (2.0 * np.pi) for v in (n2.min(), n2.max()))
    return low, high


def _lamb_range(star: StarModel) -> tuple[tuple[int, float, float], ...]:
    inside = (star.radius > 0.0) & (star.pressure > 0.0)
    r = star.radius[inside]
    speed = np.sqrt(star.gamma1[inside] * star.pressure[inside] / star.density[inside])
    unit = speed / r * 1e6 / (2.0 * np.pi)
    return tuple(
        (k, float(np.sqrt(k * (k + 1)) * unit[-1]), float(np.sqrt(k * (k + 1)) * unit[0]))
        for k in (1, 2, 3)
    )


def convective_zones(star: StarModel) -> tuple[tuple[float, float], ...]:
    """Inner and outer fractional radius of each zone where N^2 < 0, centre outward.

    Borders lie half-way between two points. Runs of fewer than three points are ignored, and
    where A* was derived from rounded columns values within 1e-3 of neutral count as convective.
    """
    assert star.a_star is not None
    inside = (star.radius > 0.0) & (star.pressure > 0.0)
    r, x = star.radius[inside], star.fractional_radius[inside]
    v = star.gravitational_constant * star.mass[inside] * star.density[inside]
    excess = star.a_star[inside] * r * star.pressure[inside] / v
    places = {finding.code: finding.place for finding in star.findings}
    limit = np.full(x.size, _UNSTABLE_DERIVED if "a-star-derived" in places else _UNSTABLE)
    # In degenerate matter A* is small and, taken from the temperature, does not scatter.
    limit[x <= (places.get("a-star-thermal") or 0.0)] = _UNSTABLE
    unstable = _without_short_runs(excess < limit)
    start = np.flatnonzero(np.diff(unstable.astype(np.int8), prepend=0) == 1)
    stop = np.flatnonzero(np.diff(unstable.astype(np.int8), append=0) == -1)
    border = np.concatenate(([0.0], 0.5 * (x[1:] + x[:-1]), x[-1:]))
    return tuple((float(border[a]), float(border[b + 1])) for a, b in zip(start, stop, strict=True))


def _without_short_runs(flags: np.ndarray) -> np.ndarray:
    """Flags in which runs shorter than `_SHORT` took the value of their surroundings."""
    out = flags.copy()
    for value in (False, True):
        edges = np.flatnonzero(np.diff(out.astype(np.int8))) + 1
        for run in np.split(np.arange(out.size), edges):
            bounded = run[0] > 0 and run[-1] < out.size - 1
            if bounded and run.size < _SHORT and out[run[0]] == value:
                out[run] = not value
    return out
