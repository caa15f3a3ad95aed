"""The mesh: cells between the points of the model, fine enough for the modes of a band."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.polynomial import legendre

from oscsolve.errors import BandError
from oscsolve.star.profile import Profile, Structure

#: Largest change of ln rho within a cell.
_E_FOLDS = 1.5
_MOST_HALVINGS = 50
#: Cells narrower than this, relative to their radius, are not split.
_NARROWEST = 1e-12
#: Phase that a cell of a rough mesh may hold, radian, and how many cells it may stand for.
_ROUGH_PHASE = 1.0
_MOST_MERGED = 8
#: In a star with an edge the Lagrangian form is used outside this fractional radius.
LAGRANGIAN_FROM = 0.99


@dataclass(frozen=True, eq=False)
class Mesh:
    """Cells from the centre to the outermost point that carries matter.

    Attributes
    ----------
    node : (n+1,) fractional radii; node 0 is the centre
    interval : (n,) interval of the profile that holds each cell, or its inner end
    lagrangian : (n,) bool, form of the equations in each cell
    last : (n,) interval that holds the outer end of each cell
    """

    node: np.ndarray
    interval: np.ndarray
    lagrangian: np.ndarray
    last: np.ndarray

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
            last=self.last[cell],
        )

    def merged(self, first: np.ndarray) -> Mesh:
        """A mesh of fewer cells; `first` (k,) are the cells that begin one."""
        return Mesh(
            node=self.node[np.append(first, self.size)],
            interval=self.interval[first],
            lagrangian=self.lagrangian[first],
            last=self.last[np.append(first[1:], self.size) - 1],
        )

    def at(self, profile: Profile, position: np.ndarray) -> Structure:
        """Structure at `position` (s,), from 0 to 1, of every cell; arrays (n, s)."""
        x = self.node[:-1, None] + np.diff(self.node)[:, None] * position
        interval = np.broadcast_to(self.interval[:, None], x.shape)
        if np.any(self.last != self.interval):
            found = profile.interval[np.searchsorted(profile.x[profile.interval], x) - 1]
            interval = np.clip(found, interval, self.last[:, None])
        return profile.at(x, interval)


def model_mesh(profile: Profile) -> Mesh:
    """The mesh whose nodes are the points of the model."""
    interval = profile.interval
    node = np.append(profile.x[interval], profile.x[interval[-1] + 1])
    outer = profile.has_edge & (node[:-1] >= LAGRANGIAN_FROM * node[-1])
    return Mesh(node=node, interval=interval, lagrangian=outer, last=interval)


class Ground:
    """The points of a model as a mesh that any band can start from.

    Cells are halved until density changes by few e-folds in each: weights that span many are
    integrated wrongly and bring modes of the mesh.

    Parameters
    ----------
    profile : the star

    Attributes
    ----------
    mesh : the cells
    fall : (cells,) change of ln rho across each
    middle : structure in their middles, (cells,)
    """

    def __init__(self, profile: Profile) -> None:
        self.mesh = model_mesh(profile)
        for _ in range(_MOST_HALVINGS):
            inner = profile.at(self.mesh.node[:-1], self.mesh.interval)
            outer = profile.at(self.mesh.node[1:], self.mesh.interval)
            self.fall = np.abs(np.log(outer.rho / inner.rho))
            finer = self.mesh.split(np.where(self.fall > _E_FOLDS, 2, 1))
            if finer.size == self.mesh.size:
                break
            self.mesh = finer
        middle = 0.5 * (self.mesh.node[:-1] + self.mesh.node[1:])
        self.middle = profile.at(middle, self.mesh.interval)

    def phase(self, degree: int, band: tuple[float, float]) -> np.ndarray:
        """(cells,) phase, or logarithm of an evanescent amplitude, that a mode of a band gains."""
        at = self.middle
        ll = degree * (degree + 1)
        lamb = ll * at.c2 / at.x**2
        wave = np.zeros(self.mesh.size)
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
        return np.sqrt(wave) * np.diff(self.mesh.node)


def band_mesh(
    ground: Ground,
    degree: int,
    band: tuple[float, float],
    phase_per_cell: float,
    most_cells: int,
) -> Mesh:
    """The model's own points, split where a mode of the band turns by more than asked.

    Parameters
    ----------
    ground : the points of the model
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
    parts = np.maximum(1.0, np.ceil(ground.phase(degree, band) / phase_per_cell))
    if not np.sum(parts) <= most_cells:
        raise BandError(
            f"modes of l = {degree} in this band have waves so short that the mesh needs "
            f"{np.sum(parts):.3g} cells, more than {most_cells}; choose a higher or narrower "
            "band, or raise most_cells"
        )
    return ground.mesh.split(parts.astype(np.int64))


def rough_mesh(ground: Ground, degree: int, band: tuple[float, float]) -> Mesh:
    """A mesh for first guesses, of few cells.

    Cells are split up to a phase, and neighbours merged up to a phase, a fall of density and a
    number of cells; never across a density jump or from one form of the equations to the other.
    """
    phase = ground.phase(degree, band) / _ROUGH_PHASE
    parts = np.maximum(1, np.ceil(phase)).astype(np.int64)
    mesh = ground.mesh.split(parts)
    cost = np.repeat((phase + ground.fall / _E_FOLDS) / parts + 1.0 / _MOST_MERGED, parts)
    group = np.floor(np.cumsum(cost))
    jump = mesh.interval[1:] > mesh.last[:-1] + 1
    starts = (np.diff(group) > 0.0) | jump | np.diff(mesh.lagrangian)
    return mesh.merged(np.flatnonzero(np.append(True, starts)))


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
