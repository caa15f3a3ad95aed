"""Whether a model is fit for the modes of a band: mesh and atmosphere."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np

from oscsolve.star.findings import Finding
from oscsolve.star.integrals import acoustic_cutoff
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile, Structure

#: Points per wavelength of the model below which its own mesh is doubtful. The solver splits
#: cells as far as it needs, but between the points it only has the interpolated structure.
_FEW = 4.0
#: Radius in units of R below which a model without an edge ends under its photosphere.
_PHOTOSPHERE = 1.0 - 1e-4


def band_findings(
    star: StarModel,
    profile: Profile,
    degrees: Sequence[int],
    band: tuple[float, float],
) -> Iterator[Finding]:
    """Findings about the modes of `degrees` in `band` (uHz)."""
    yield from _mesh(star, profile, degrees, band)
    yield from _atmosphere(star, profile, band)


def wavenumber2(at: Structure, degree: int, sigma2: float) -> np.ndarray:
    """Squared local radial wavenumber, 1/R^2; negative where waves are evanescent.

    Notes
    -----
    k^2 = (sigma2 - N^2)(sigma2 - S^2)/(sigma2 c^2), S^2 = l(l+1) c^2/r^2 (Unno et al. 1989,
    ch. III), for short waves; sigma2/c^2 for l = 0.
    """
    if degree == 0:
        return sigma2 / at.c2
    lamb = degree * (degree + 1) * at.c2 / at.x**2
    return (sigma2 - at.n2) * (sigma2 - lamb) / (sigma2 * at.c2)


def points_per_wavelength(
    star: StarModel, profile: Profile, degrees: Sequence[int], band: tuple[float, float]
) -> tuple[float, float, int, float]:
    """The fewest points that a wavelength of the band gets anywhere.

    Returns
    -------
    points, x, degree, nu : number of points, and where: fractional radius, degree, uHz;
        infinite points where no wave of the band travels.
    """
    i = profile.interval
    left, h = profile.x[i], np.diff(profile.x)[i]
    at = profile.at(left + 0.5 * h, i)
    fewest = (np.inf, 0.0, 0, 0.0)
    for degree in degrees:
        for nu in band:
            sigma2 = (nu / star.nu_dynamical) ** 2
            if sigma2 == 0.0 or nu < 0.0:
                continue
            phase = np.sqrt(np.maximum(wavenumber2(at, degree, sigma2), 0.0)) * h
            # Near the centre amplitudes are powers of r, and N^2/r^2 at its first cell is none
            # of a travelling wave.
            phase[0] = 0.0
            worst = int(np.argmax(phase))
            if phase[worst] > 0.0 and 2.0 * np.pi / phase[worst] < fewest[0]:
                fewest = (float(2.0 * np.pi / phase[worst]), float(at.x[worst]), degree, nu)
    return fewest


def _mesh(
    star: StarModel, profile: Profile, degrees: Sequence[int], band: tuple[float, float]
) -> Iterator[Finding]:
    points, x, degree, nu = points_per_wavelength(star, profile, degrees, band)
    if points >= _FEW:
        return
    yield Finding(
        "doubt",
        "mesh-coarse",
        f"the model has {points:.2g} points per wavelength of l = {degree} waves at {nu:.5g} uHz, "
        f"at x = {x:.5g}; the structure between them is interpolated",
        "export the model on a finer mesh there, or choose a narrower band",
        x,
        points,
    )


def _atmosphere(star: StarModel, profile: Profile, band: tuple[float, float]) -> Iterator[Finding]:
    """Waves must be turned back below the outermost point."""
    if profile.has_edge:
        return
    x, interval = profile.outermost()
    cutoff = acoustic_cutoff(profile) * star.nu_dynamical
    at = profile.at(np.array(x), np.array(interval))
    height = float(at.w / at.g)
    if x < _PHOTOSPHERE and x + height < 1.0:
        yield Finding(
            "doubt",
            "atmosphere-missing",
            f"the points end at x = {x:.6g}, {(1.0 - x) / height:.3g} pressure scale heights "
            "below the photospheric radius",
            "export the model up to the photosphere and beyond",
            x,
            1.0 - x,
        )
    if band[1] > cutoff:
        yield Finding(
            "doubt",
            "atmosphere-short",
            f"the acoustic cut-off at the outermost point (x = {x:.6g}) is {cutoff:.5g} uHz, below "
            f"the upper limit of the band, {band[1]:.5g} uHz: waves above it are not held back",
            "choose a lower band, or export the atmosphere further up",
            x,
            band[1] / cutoff,
        )
