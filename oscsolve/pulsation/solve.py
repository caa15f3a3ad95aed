"""`solve_modes`: the one place that turns a star and a band into a complete, labelled mode list."""

from __future__ import annotations

import os
from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, replace

import numpy as np

from oscsolve.errors import BandError, InputError
from oscsolve.pulsation.boundary import atmosphere_cutoff, surface_structure
from oscsolve.pulsation.default_band import choose_band
from oscsolve.pulsation.degree import DegreeSolution, Problem, solve_degree, sub_bands
from oscsolve.pulsation.eigenfunction import ModelPoints, Reconstruction
from oscsolve.pulsation.labels import count_labels, kinds, node_labels
from oscsolve.pulsation.mesh import Ground
from oscsolve.pulsation.modeset import Census, Eigenfunctions, ModeSet
from oscsolve.pulsation.options import SolveOptions
from oscsolve.pulsation.search import count_at
from oscsolve.pulsation.shooting import with_second_opinion
from oscsolve.star.findings import Finding
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile
from oscsolve.units import band_to_uhz, frequency_from_sigma2, sigma2_from_frequency
from oscsolve.version import __version__

GRAVITY = ("full", "cowling")
SURFACE = ("free", "isothermal")
#: The highest degree that is accepted; the equations hold beyond, memory and patience may not.
LARGEST_DEGREE = 10_000

#: A model whose innermost point lies further out than this is told about it.
_FAR_FROM_CENTRE = 0.01
#: Thickest shell under an edge, in R, that may move as one piece unmentioned.
_THICK_SHELL = 1e-6

Progress = Callable[[int, int, str], None]


@dataclass(frozen=True)
class _Request:
    """Checked arguments of one run."""

    degrees: tuple[int, ...]
    band: tuple[float, float]  # uHz
    gravity: str
    surface: str
    tolerance: float
    options: SolveOptions
    verify: bool = False


def solve_modes(
    star: StarModel,
    degrees: Sequence[int] = (0, 1, 2, 3),
    band: tuple[float, float] | None = None,
    *,
    unit: str = "uHz",
    gravity: str = "full",
    surface: str = "free",
    tolerance: float = 1e-8,
    verify: bool = False,
    options: SolveOptions | None = None,
    progress: Progress | None = None,
) -> ModeSet:
    """The complete list of modes of a star in a band of frequency.

    Parameters
    ----------
    star : the structure model
    degrees : spherical degrees, any order, each once
    band : two limits in `unit`, or None to let the program choose; what it chose is a finding
    unit : "uHz", "mHz", "c/d", "s", "min", "h", "d" (periods, either order) or "sigma2"
    gravity : "full", or "cowling" to neglect the perturbation of the potential
    surface : "free" (no pressure perturbation at the outermost point) or "isothermal" (an
        isothermal atmosphere above it)
    tolerance : largest relative error of a frequency that is accepted; the mesh follows from it
    verify : recompute every mode by shooting, an independent method, see
        `oscsolve.pulsation.shooting`. Modes that differ by more than both error estimates allow
        are named in a finding of severity "defect", code "second-opinion-differs".
    options : rarely needed knobs
    progress : called as ``progress(done, total, what)`` between degrees

    Returns
    -------
    ModeSet
        Its census says for each degree how many modes were counted, by Sylvester's law of
        inertia at both ends of the band, and how many are listed.

    Raises
    ------
    InputError
        An argument is out of range.
    BandError
        The band is empty, reaches zero or below for l > 0, or lies above the cut-off.
    IncompleteError
        Two modes agree to round-off, or one did not settle.

    Examples
    --------
    >>> import oscsolve
    >>> star = oscsolve.polytrope(3)
    >>> modes = oscsolve.solve_modes(star, degrees=[0], band=(9, 17), unit="sigma2")
    >>> modes.order.tolist(), modes.complete
    ([1, 2], True)
    """
    profile = Profile(star)
    findings: list[Finding] = []
    request = _check(star, profile, degrees, band, unit, gravity, surface, tolerance, findings)
    request = replace(request, options=options or SolveOptions(), verify=verify)
    findings += _unmeasured_errors(star, profile)
    parts = _all_degrees(star, profile, request, findings, progress)
    modes = _assemble_set(star, request, parts, findings, band is None)
    return with_second_opinion(modes, progress) if verify else modes


def _all_degrees(
    star: StarModel,
    profile: Profile,
    request: _Request,
    findings: list[Finding],
    progress: Progress | None,
) -> list[_DegreeRows]:
    """Degrees side by side in threads (compiled code runs without the interpreter's lock)."""
    degrees, total = request.degrees, len(request.degrees)
    ground = Ground(profile)
    if progress is not None:
        progress(0, total, f"degree {degrees[0]}")
    rows, noticed = [], []
    with ThreadPoolExecutor(max_workers=min(total, os.cpu_count() or 1)) as pool:
        jobs = [
            pool.submit(_one_degree, star, profile, ground, request, degree) for degree in degrees
        ]
        try:
            for done, job in enumerate(jobs, start=1):
                row, found = job.result()
                rows.append(row)
                noticed += found
                if progress is not None:
                    progress(done, total, f"degree {degrees[done - 1]}")
        except BaseException:
            for job in jobs:
                job.cancel()
            raise
    for finding in noticed:
        if all(known.code != finding.code for known in findings):
            findings.append(finding)
    return rows


@dataclass(frozen=True, eq=False)
class _DegreeRows:
    """Columns of one degree, ready for the list."""

    degree: int
    low: float  # uHz
    high: float
    counted: int
    cells: int
    order: np.ndarray
    n_p: np.ndarray
    n_g: np.ndarray
    kind: np.ndarray
    lam: np.ndarray
    error: np.ndarray
    inertia: np.ndarray
    columns: np.ndarray | None  # (5, m, points)


def _check(
    star: StarModel,
    profile: Profile,
    degrees: Sequence[int],
    band: tuple[float, float] | None,
    unit: str,
    gravity: str,
    surface: str,
    tolerance: float,
    findings: list[Finding],
) -> _Request:
    if gravity not in GRAVITY:
        raise InputError(f"gravity must be one of {', '.join(GRAVITY)}; got {gravity!r}")
    if surface not in SURFACE:
        raise InputError(f"surface must be one of {', '.join(SURFACE)}; got {surface!r}")
    if surface == "isothermal" and profile.has_edge:
        raise InputError("this star has an edge where pressure vanishes: use surface='free'")
    if not 1e-13 <= tolerance <= 1e-2:
        raise InputError(f"tolerance must be from 1e-13 to 1e-2; got {tolerance:g}")
    listed = _check_degrees(degrees)
    if band is None:
        limits, finding = choose_band(star, profile)
        findings.append(finding)
    else:
        limits = band_to_uhz(band, unit, star.nu_dynamical)
    if limits[0] <= 0.0 and any(degree > 0 for degree in listed):
        raise BandError(
            f"the band begins at {limits[0]:g} uHz; for l > 0 it must begin above zero, "
            "where g modes pile up without end"
        )
    return _Request(listed, limits, gravity, surface, tolerance, SolveOptions())


def _check_degrees(degrees: Sequence[int]) -> tuple[int, ...]:
    try:
        listed = sorted(int(degree) for degree in degrees)
        whole = all(float(degree) == int(degree) for degree in degrees)
    except (TypeError, ValueError) as error:
        raise InputError(f"degrees must be whole numbers; got {degrees!r}") from error
    if not listed or not whole:
        raise InputError(f"degrees must be whole numbers, at least one; got {degrees!r}")
    if listed[0] < 0 or listed[-1] > LARGEST_DEGREE:
        raise InputError(f"degrees must be from 0 to {LARGEST_DEGREE}; got {degrees!r}")
    if len(set(listed)) < len(listed):
        raise InputError(f"each degree is given once; got {degrees!r}")
    return tuple(listed)


def _one_degree(
    star: StarModel, profile: Profile, ground: Ground, request: _Request, degree: int
) -> tuple[_DegreeRows, list[Finding]]:
    findings: list[Finding] = []
    low, high, floor, limit = _usable_band(star, profile, request, degree, findings)
    problem = Problem(
        degree, request.gravity, request.surface, low, high, floor, limit, request.tolerance
    )
    pieces, ends = [], []
    for piece in sub_bands(profile, ground, problem):
        found = solve_degree(profile, ground, piece, request.options)
        ends += [found.first, found.beyond]
        pieces.append(_rows(star, profile, request, piece, found))
    if degree == 0:
        _report_instability(profile, ground, request, found, findings)
    rows = _join_rows(star, problem, pieces, ends[-1] - ends[0])
    _report_unmet_tolerance(request, rows, findings)
    return rows, findings


def _usable_band(
    star: StarModel, profile: Profile, request: _Request, degree: int, findings: list[Finding]
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


def _unmeasured_errors(star: StarModel, profile: Profile) -> list[Finding]:
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


def _report_instability(
    profile: Profile,
    ground: Ground,
    request: _Request,
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


def _report_unmet_tolerance(request: _Request, rows: _DegreeRows, findings: list[Finding]) -> None:
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


def _rows(
    star: StarModel, profile: Profile, request: _Request, problem: Problem, found: DegreeSolution
) -> _DegreeRows:
    """Labels, inertias and eigenfunctions of one degree."""
    degree, full = problem.degree, request.gravity == "full"
    rebuilt = Reconstruction(profile, found.mesh, found.element, found.action)
    points = ModelPoints(star, rebuilt, full)
    lam = found.solution.lam
    n_p, n_g = np.zeros(lam.size, np.int64), np.zeros(lam.size, np.int64)
    inertia = np.empty(lam.size)
    keep = request.options.eigenfunctions
    columns = np.empty((5, lam.size, star.radius.size)) if keep else None
    for i, mode in enumerate(rebuilt.at_nodes(found.solution)):
        n_p[i], n_g[i] = node_labels(mode, rebuilt, float(lam[i]), degree, full)
        square, sign = points.photosphere(mode, degree)
        inertia[i] = 4.0 * np.pi * mode.energy / square
        if columns is not None:
            columns[:, i] = points.columns(mode, sign / np.sqrt(square))
    order = count_labels(
        found.solution.negative,
        found.mesh.size,
        found.element.gauss.size,
        found.action.dof,
        degree == 1 and full,
    )
    return _DegreeRows(
        degree=degree,
        low=frequency_from_sigma2(problem.low, star.nu_dynamical),
        high=frequency_from_sigma2(problem.high, star.nu_dynamical),
        counted=found.beyond - found.first,
        cells=found.mesh.size,
        order=order,
        n_p=n_p,
        n_g=n_g,
        kind=kinds(degree, n_p, n_g, order),
        lam=lam,
        error=found.error,
        inertia=inertia,
        columns=columns,
    )


def _join_rows(
    star: StarModel, problem: Problem, pieces: list[_DegreeRows], counted: int
) -> _DegreeRows:
    """One degree from its sub-bands."""
    columns = [piece.columns for piece in pieces if piece.columns is not None]
    names = ("order", "n_p", "n_g", "kind", "lam", "error", "inertia")
    joined = {name: np.concatenate([getattr(piece, name) for piece in pieces]) for name in names}
    # A mode exactly where two sub-bands meet may be found from both sides: its number tells.
    _, once = np.unique(joined["order"], return_index=True)
    joined = {name: column[once] for name, column in joined.items()}
    return _DegreeRows(
        degree=problem.degree,
        low=frequency_from_sigma2(problem.low, star.nu_dynamical),
        high=frequency_from_sigma2(problem.high, star.nu_dynamical),
        counted=counted,
        cells=max(piece.cells for piece in pieces),
        columns=np.concatenate(columns, axis=1)[:, once] if columns else None,
        **joined,
    )


def _assemble_set(
    star: StarModel,
    request: _Request,
    parts: list[_DegreeRows],
    findings: list[Finding],
    band_chosen: bool,
) -> ModeSet:
    def joined(name: str) -> np.ndarray:
        return np.concatenate([getattr(part, name) for part in parts])

    lam, error = joined("lam"), joined("error")
    nu = np.copysign(np.sqrt(np.abs(lam)), lam) * star.nu_dynamical
    tiny = np.maximum(np.sqrt(np.abs(lam)), np.sqrt(error))
    census = Census(
        degree=np.array([part.degree for part in parts]),
        low=np.array([part.low for part in parts]),
        high=np.array([part.high for part in parts]),
        counted=np.array([part.counted for part in parts]),
        listed=np.array([part.lam.size for part in parts]),
        relabelled=np.array([np.sum(part.n_p - part.n_g != part.order) for part in parts]),
    )
    return ModeSet(
        degree=np.concatenate([np.full(part.lam.size, part.degree) for part in parts]),
        order=joined("order"),
        n_p=joined("n_p"),
        n_g=joined("n_g"),
        kind=joined("kind"),
        nu=nu,
        nu_error=0.5 * error / tiny * star.nu_dynamical,
        sigma2=lam,
        inertia=joined("inertia"),
        census=census,
        star=star,
        eigenfunctions=_eigenfunctions(star, request, parts),
        options=_options(request, band_chosen),
        findings=tuple(findings),
        program_version=__version__,
    )


def _eigenfunctions(
    star: StarModel, request: _Request, parts: list[_DegreeRows]
) -> Eigenfunctions | None:
    if not request.options.eigenfunctions:
        return None
    columns = np.concatenate([part.columns for part in parts if part.columns is not None], axis=1)
    return Eigenfunctions(star.fractional_radius, *columns)


def _options(request: _Request, band_chosen: bool) -> dict[str, object]:
    return {
        "degrees": ",".join(str(degree) for degree in request.degrees),
        "band_low_uHz": request.band[0],
        "band_high_uHz": request.band[1],
        "band_chosen_by_program": band_chosen,
        "gravity": request.gravity,
        "surface": request.surface,
        "tolerance": request.tolerance,
        "verify": request.verify,
        "stages": request.options.stages or "chosen",
        "phase_per_cell": request.options.phase_per_cell or "chosen",
        "cells_factor": request.options.cells_factor,
        "most_cells": request.options.most_cells,
    }
