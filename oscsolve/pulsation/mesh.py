"""The mesh: cells between the points of the model, fine enough for the modes of a band."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.polynomial import legendre

from oscsolve.errors import BandError
from oscsolve.star.profile import Profile

#: Largest change of ln rho within a cell.
_E_FOLDS = 1.5
_MOST_HALVINGS = 50
#: Cells narrower than this, relative to their radius, are not split.
_NARROWEST = 1e-12
#: In a star with an edge the Lagrangian form is used outside this fractional radius.
LAGRANGIAN_FROM = 0.99


@dataclass(frozen=True, eq=False)
class Mesh:
    """Cells from the centre to the outermost point that carries matter.

    Attributes
    ----------
    node : (n+1,) fractional radii; node 0 is the centre
    interval : (n,) interval of the profile that holds each cell
    lagrangian : (n,) bool, form of the equations in each cell
    """

    node: np.ndarray
    interval: np.ndarray
    lagrangian: np.ndarray

    @property
    def size(self) -> int:
        """Number of cells."""
        return self.interval.size

    def split(self, parts: np.ndarray) -> Mesh:
        """A mesh in which cell i is cut into ``parts[i]`` equal cells."""
        wide = np.diff(self.node) > _NARROWEST * self.node[1:]
        parts = np.where(wide, parts, 1)
        cell = np.repeat(np.arange(self.size), parts)
        first = np.cumsum(parts) - parts
        share = (np.arange(cell.size) - first[cell]) / parts[cell]
        left = self.node[:-1][cell] + share * np.diff(self.node)[cell]
        return Mesh(
            node=np.append(left, self.node[-1]),
            interval=self.interval[cell],
            lagrangian=self.lagrangian[cell],
        )


def model_mesh(profile: Profile) -> Mesh:
    """The mesh whose nodes are the points of the model."""
    interval = profile.interval
    node = np.append(profile.x[interval], profile.x[interval[-1] + 1])
    outer = profile.has_edge & (node[:-1] >= LAGRANGIAN_FROM * node[-1])
    return Mesh(node=node, interval=interval, lagrangian=outer)


def _gentle_mesh(profile: Profile) -> Mesh:
    """The model's own points, halved until density changes by few e-folds in each cell.

    Weights that span many e-folds in one cell are integrated wrongly and bring modes of the mesh.
    """
    mesh = model_mesh(profile)
    for _ in range(_MOST_HALVINGS):
        inner = profile.at(mesh.node[:-1], mesh.interval)
        outer = profile.at(mesh.node[1:], mesh.interval)
        steep = np.abs(np.log(outer.rho / inner.rho)) > _E_FOLDS
        finer = mesh.split(np.where(steep, 2, 1))
        if finer.size == mesh.size:
            break
        mesh = finer
    return mesh


def band_mesh(
    profile: Profile,
    degree: int,
    band: tuple[float, float],
    phase_per_cell: float,
    most_cells: int,
) -> Mesh:
    """The model's own points, split where a mode of the band turns by more than asked.

    Parameters
    ----------
    degree : spherical degree
    band : lowest and highest sigma2
    phase_per_cell : largest change of phase, or of the logarithm of an evanescent amplitude,
        that one cell may hold, radian
    most_cells : refuse to build a larger mesh

    Raises
    ------
    BandError
        The band needs more cells than that.
    """
    mesh = _gentle_mesh(profile)
    at = profile.at(0.5 * (mesh.node[:-1] + mesh.node[1:]), mesh.interval)
    ll = degree * (degree + 1)
    lamb = ll * at.c2 / at.x**2
    wave = np.zeros(mesh.size)
    for lam in band:
        if lam == 0.0:
            continue
        sound = np.abs(lam) / at.c2
        if degree == 0:
            k2 = sound
        else:
            k2 = np.abs((lam - at.n2) * (lam - lamb) / (lam * at.c2))
            # The first cell reaches the centre, where amplitudes are powers of r and the
            # evanescent part of k2 has no meaning: only the two oscillating parts count there.
            k2[0] = sound[0] + ll * np.abs(at.n2[0] / lam) / at.x[0] ** 2
        wave = np.maximum(wave, k2)
    phase = np.sqrt(wave) * np.diff(mesh.node)
    parts = np.maximum(1.0, np.ceil(phase / phase_per_cell))
    if not np.sum(parts) <= most_cells:
        raise BandError(
            f"modes of l = {degree} in this band have waves so short that the mesh needs "
            f"{np.sum(parts):.3g} cells, more than {most_cells}; choose a higher or narrower "
            "band, or raise most_cells"
        )
    return mesh.split(parts.astype(np.int64))


@dataclass(frozen=True, eq=False)
class Element:
    """Reference cell of Gauss collocation with s stages on [0, 1].

    Attributes
    ----------
    gauss, weight : (s,) Gauss-Legendre points and weights
    lobatto : (s+1,) nodes of the polynomial q, from 0 to 1
    value, slope : (s, s+1) Lagrange polynomials of the nodes, and their derivatives, at the
        Gauss points
    """

    gauss: np.ndarray
    weight: np.ndarray
    lobatto: np.ndarray
    value: np.ndarray
    slope: np.ndarray


def element(stages: int) -> Element:
    """The reference cell with `stages` Gauss points (order 2 * stages)."""
    points, weights = legendre.leggauss(stages)
    inner = legendre.Legendre.basis(stages).deriv().roots().real
    lobatto = 0.5 * (1.0 + np.concatenate(([-1.0], np.sort(inner), [1.0])))
    gauss = 0.5 * (1.0 + points)
    value = lagrange_basis(lobatto, gauss)
    slope = np.empty_like(value)
    for j in range(stages + 1):
        others = np.delete(lobatto, j)
        scale = np.prod(lobatto[j] - others)
        for k, t in enumerate(gauss):
            factors = t - others
            slope[k, j] = sum(np.prod(np.delete(factors, i)) for i in range(stages)) / scale
    return Element(gauss=gauss, weight=0.5 * weights, lobatto=lobatto, value=value, slope=slope)


def lagrange_basis(nodes: np.ndarray, at: np.ndarray) -> np.ndarray:
    """(k, n) values at `at` of the n Lagrange polynomials of `nodes`."""
    out = np.empty((at.size, nodes.size))
    for j in range(nodes.size):
        others = np.delete(nodes, j)
        out[:, j] = np.prod((at[:, None] - others) / (nodes[j] - others), axis=1)
    return out
