"""What one run was asked for: arguments checked, in uHz, as they are recorded."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np

from oscsolve.errors import BandError, InputError
from oscsolve.pulsation.default_band import choose_band
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.pulsation.options import SolveOptions
from oscsolve.star.findings import Finding
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile
from oscsolve.units import band_to_uhz

GRAVITY = ("full", "cowling")
SURFACE = ("free", "isothermal")
#: The highest degree that is accepted; the equations hold beyond, memory and patience may not.
LARGEST_DEGREE = 10_000


@dataclass(frozen=True)
class Request:
    """Checked arguments of one run."""

    degrees: tuple[int, ...]
    band: tuple[float, float]  # uHz
    gravity: str
    surface: str
    tolerance: float
    options: SolveOptions
    verify: bool = False
    guesses: Mapping[int, np.ndarray] = field(default_factory=dict)  # sigma2 by degree


def check_request(
    star: StarModel,
    profile: Profile,
    degrees: Sequence[int],
    band: tuple[float, float] | None,
    unit: str,
    gravity: str,
    surface: str,
    tolerance: float,
    findings: list[Finding],
) -> Request:
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
    return Request(listed, limits, gravity, surface, tolerance, SolveOptions())


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


def guesses_from(similar: ModeSet | None) -> Mapping[int, np.ndarray]:
    """sigma2 of the modes of another star, rising, for each degree."""
    if similar is None:
        return {}
    return {
        int(degree): np.unique(similar.sigma2[similar.degree == degree])
        for degree in similar.census.degree
    }


def recorded_options(request: Request, band_chosen: bool) -> dict[str, object]:
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
