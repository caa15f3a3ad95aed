"""`solve_modes`: the one place that turns a star and a band into a complete, labelled mode list."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import replace

from oscsolve.pulsation.degree import NO_GUESSES, Problem, solve_degree, sub_bands
from oscsolve.pulsation.mesh import Ground
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.pulsation.options import SolveOptions
from oscsolve.pulsation.remarks import (
    report_instability,
    report_unmet_tolerance,
    unmeasured_errors,
    usable_band,
)
from oscsolve.pulsation.request import Request, check_request, guesses_from
from oscsolve.pulsation.rows import DegreeRows, assemble_set, degree_rows, join_rows
from oscsolve.star.findings import Finding
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile

Progress = Callable[[int, int, str], None]


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
    similar: ModeSet | None = None,
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
    similar : modes of a star much like this one. Their sigma2, free of the scale of the star, are
        first guesses; the census proves the list as ever.
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
    request = check_request(
        star, profile, degrees, band, unit, gravity, surface, tolerance, findings
    )
    request = replace(
        request, options=options or SolveOptions(), verify=verify, guesses=guesses_from(similar)
    )
    findings += unmeasured_errors(star, profile)
    parts = _all_degrees(star, profile, request, findings, progress)
    modes = assemble_set(star, request, parts, findings, band is None)
    if not verify:
        return modes
    # Imported here: it needs libraries whose import takes longer than solving a star.
    from oscsolve.pulsation.shooting import with_second_opinion

    return with_second_opinion(modes, progress, request.options.threads)


def _all_degrees(
    star: StarModel,
    profile: Profile,
    request: Request,
    findings: list[Finding],
    progress: Progress | None,
) -> list[DegreeRows]:
    """Degrees side by side in threads (compiled code runs without the interpreter's lock)."""
    degrees, total = request.degrees, len(request.degrees)
    ground = Ground(profile)
    if progress is not None:
        progress(0, total, f"degree {degrees[0]}")
    rows, noticed = [], []
    with ThreadPoolExecutor(max_workers=min(total, request.options.most_threads)) as pool:
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


def _one_degree(
    star: StarModel, profile: Profile, ground: Ground, request: Request, degree: int
) -> tuple[DegreeRows, list[Finding]]:
    findings: list[Finding] = []
    low, high, floor, limit = usable_band(star, profile, request, degree, findings)
    problem = Problem(
        degree, request.gravity, request.surface, low, high, floor, limit, request.tolerance
    )
    guesses = request.guesses.get(degree, NO_GUESSES)
    pieces, ends = [], []
    for piece in sub_bands(profile, ground, problem):
        found = solve_degree(profile, ground, piece, request.options, guesses)
        ends += [found.first, found.beyond]
        pieces.append(degree_rows(star, profile, request, piece, found))
    if degree == 0:
        report_instability(profile, ground, request, found, findings)
    rows = join_rows(star, problem, pieces, ends[-1] - ends[0])
    report_unmet_tolerance(request, rows, findings)
    return rows, findings
