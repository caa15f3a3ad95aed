"""What a run has to say beside its list: bands cut, errors not covered, a star that is unstable."""

from __future__ import annotations

import numpy as np

from oscsolve.errors import BandError
from oscsolve.pulsation.boundary import atmosphere_cutoff, surface_structure
from oscsolve.pulsation.degree import DegreeSolution, Problem, solve_degree
from oscsolve.pulsation.mesh import Ground
from oscsolve.pulsation.options import SolveOptions
from oscsolve.pulsation.request import Request
from oscsolve.pulsation.rows import DegreeRows
from oscsolve.pulsation.search import count_at
from oscsolve.star.findings import Finding
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile
from oscsolve.units import frequency_from_sigma2, sigma2_from_frequency

#: A model whose innermost point lies further out than this is told about it.
_FAR_FROM_CENTRE = 0.01
#: Thickest shell under an edge, in R, that may move as one piece unmentioned.
_THICK_SHELL = 1e-6


def usable_band(
    star: StarModel, profile: Profile, request: Request, degree: int, findings: list[Finding]
) -> tuple[float, float, float, float]:
    """The band in sigma2 and its limits, cut where an isothermal atmosphere lets waves escape."""
    low, high = (sigma2_from_frequency(nu, star.nu_dynamical) for nu in request.band)
    cutoff = atmosphere_cutoff(profile, degree)
    top = frequency_from_sigma2(cutoff.high, star.nu_dynamical)
    if request.surface == "free":
        if high > cutoff.high and not profile.has_edge:
            findings.append(_free_cutoff_finding(top))
        return low, high, 0.0 if degree > 0 else -np.inf, np.inf
    if low >= cutoff.high:
        raise BandError(
            f"the band lies above the acoustic cut-off of the atmosphere ({top:.6g} uHz for "
            f"l = {degree}): waves escape there and no modes exist; choose a lower band"
        )
    bottom = frequency_from_sigma2(cutoff.low, star.nu_dynamical)
    if high <= cutoff.low:
        raise BandError(
            f"the band lies below {bottom:.6g} uHz, where gravity waves of l = {degree} escape "
            "through an isothermal atmosphere; use a free surface"
        )
    if high > cutoff.high or (low < cutoff.low and degree > 0):
        findings.append(_cut_finding(degree, bottom, top))
    inside = (1.0 + 1e-9) * cutoff.low, (1.0 - 1e-9) * cutoff.high
    floor = inside[0] if degree > 0 else -np.inf
    return max(low, floor), min(high, inside[1]), floor, inside[1]


def unmeasured_errors(star: StarModel, profile: Profile) -> list[Finding]:
    """What the error bars cannot know: structure that the model leaves out at its two ends."""
    found = []
    first = float(star.fractional_radius[0])
    if first > _FAR_FROM_CENTRE:
        found.append(
            Finding(
                "doubt",
                "centre-extrapolated",
                f"the innermost point lies at x = {first:.3g}; what is inside was extrapolated, "
                "and error bars do not cover that",
                "give the model points down to x = 0.001",
                place=first,
            )
        )
    at = surface_structure(profile)
    shell = float(at.w / (at.g * at.x))
    if profile.has_edge and shell > _THICK_SHELL:
        found.append(
            Finding(
                "doubt",
                "edge-coarse",
                f"the last point inside the edge lies {shell:.1e} R below it; the shell between "
                "moves as one piece, and error bars do not cover that",
                "grade the points towards the edge, to 1e-8 R or closer",
                place=float(at.x),
                size=shell,
            )
        )
    return found


def _free_cutoff_finding(top: float) -> Finding:
    return Finding(
        "doubt",
        "above-cutoff",
        f"the band reaches above the acoustic cut-off of the outermost layer, {top:.6g} uHz; "
        "the modes listed there exist only because a free surface reflects everything",
        "end the band below the cut-off",
    )


def _cut_finding(degree: int, bottom: float, top: float) -> Finding:
    return Finding(
        "doubt",
        f"band-cut-l{degree}",
        f"for l = {degree} the band was cut to {bottom:.6g} - {top:.6g} uHz, where an isothermal "
        "atmosphere holds waves back; outside they escape and no modes exist",
        "end the band at the cut-off",
    )


def report_instability(
    profile: Profile,
    ground: Ground,
    request: Request,
    found: DegreeSolution,
    findings: list[Finding],
) -> None:
    """Say so where radial modes have sigma2 < 0, whatever the band."""
    uniform = found.mesh.size * found.element.gauss.size

    def below(lam: float) -> int:
        return uniform - int(count_at(found.action, np.array([lam]))[0])

    count, bound = below(-1e-9), -10.0
    if count == 0:
        return
    while below(bound) > 0:
        bound *= 4.0
    growing = Problem(0, request.gravity, request.surface, bound, -1e-9, -np.inf, np.inf, 1e-6)
    worst = solve_degree(profile, ground, growing, SolveOptions()).solution.lam.min(initial=0.0)
    findings.append(
        Finding(
            "defect",
            "dynamically-unstable",
            f"the star is dynamically unstable: {count} radial mode(s) with "
            f"sigma2 < 0, the fastest at sigma2 = {worst:.6g} (Gamma1 below 4/3 in the mean)",
            "the star would collapse or explode on its dynamical time; check Gamma1",
            size=float(worst),
        )
    )


def report_unmet_tolerance(request: Request, rows: DegreeRows, findings: list[Finding]) -> None:
    error = 0.5 * rows.error / np.maximum(np.abs(rows.lam), 1e-300)
    late = error > 1.000001 * request.tolerance
    if np.any(late):
        findings.append(
            Finding(
                "doubt",
                f"tolerance-missed-l{rows.degree}",
                f"{np.sum(late)} mode(s) of l = {rows.degree} have error bars above the tolerance "
                f"{request.tolerance:g}, at worst {error.max():.1e} with {rows.cells} cells",
                "round-off or the limit on cells stops refinement; see nu_error",
                size=float(error.max()),
            )
        )
