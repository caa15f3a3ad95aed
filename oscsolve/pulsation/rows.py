"""Columns of the list: labels, inertias and eigenfunctions degree by degree, then all as one."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oscsolve.pulsation.degree import DegreeSolution, Problem
from oscsolve.pulsation.eigenfunction import ModelPoints, Reconstruction
from oscsolve.pulsation.labels import count_labels, kinds, node_labels
from oscsolve.pulsation.modeset import Census, Eigenfunctions, ModeSet
from oscsolve.pulsation.request import Request, recorded_options
from oscsolve.star.findings import Finding
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile
from oscsolve.units import frequency_from_sigma2
from oscsolve.version import __version__


@dataclass(frozen=True, eq=False)
class DegreeRows:
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


def degree_rows(
    star: StarModel, profile: Profile, request: Request, problem: Problem, found: DegreeSolution
) -> DegreeRows:
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
    return DegreeRows(
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


def join_rows(
    star: StarModel, problem: Problem, pieces: list[DegreeRows], counted: int
) -> DegreeRows:
    """One degree from its sub-bands."""
    columns = [piece.columns for piece in pieces if piece.columns is not None]
    names = ("order", "n_p", "n_g", "kind", "lam", "error", "inertia")
    joined = {name: np.concatenate([getattr(piece, name) for piece in pieces]) for name in names}
    # A mode exactly where two sub-bands meet may be found from both sides: its number tells.
    _, once = np.unique(joined["order"], return_index=True)
    joined = {name: column[once] for name, column in joined.items()}
    return DegreeRows(
        degree=problem.degree,
        low=frequency_from_sigma2(problem.low, star.nu_dynamical),
        high=frequency_from_sigma2(problem.high, star.nu_dynamical),
        counted=counted,
        cells=max(piece.cells for piece in pieces),
        columns=np.concatenate(columns, axis=1)[:, once] if columns else None,
        **joined,
    )


def assemble_set(
    star: StarModel,
    request: Request,
    parts: list[DegreeRows],
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
        options=recorded_options(request, band_chosen),
        findings=tuple(findings),
        program_version=__version__,
    )


def _eigenfunctions(
    star: StarModel, request: Request, parts: list[DegreeRows]
) -> Eigenfunctions | None:
    if not request.options.eigenfunctions:
        return None
    columns = np.concatenate([part.columns for part in parts if part.columns is not None], axis=1)
    return Eigenfunctions(star.fractional_radius, *columns)
