"""Eigenfunctions: from the nodal q of a solution to displacements on the points of the model."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from oscsolve.pulsation.compiled import compiled
from oscsolve.pulsation.inverse import _point_values
from oscsolve.pulsation.mesh import Element, Mesh
from oscsolve.pulsation.search import Solution, batches
from oscsolve.pulsation.sweep import Action
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile

#: Modes whose momenta are taken side by side.
_SIDE_BY_SIDE = 32


@dataclass(frozen=True, eq=False)
class NodalMode:
    """One mode at the nodes of the mesh, Eulerian form, inner side of each node.

    Attributes
    ----------
    q1, q2, p1, p2 : (nodes,) canonical variables, see `equations`; q2 and p2 are zero in the
        Cowling approximation
    xi_h : (nodes,) horizontal displacement, 0 at the centre
    lam : sigma2
    energy : integral of rho (xi_r^2 + l(l+1) xi_h^2) r^2 over the star
    """

    q1: np.ndarray
    q2: np.ndarray
    p1: np.ndarray
    p2: np.ndarray
    xi_h: np.ndarray
    lam: float
    energy: float


class Reconstruction:
    """What turns vectors of one action into eigenfunctions; shared by all modes of a degree."""

    def __init__(self, profile: Profile, mesh: Mesh, elem: Element, action: Action) -> None:
        self.mesh, self.elem, self.action = mesh, elem, action
        self.width = np.diff(mesh.node)
        inner = profile.at(mesh.node[1:], mesh.last)
        self.rho = np.concatenate(([np.nan], inner.rho))
        self.g = np.concatenate(([0.0], inner.g))
        self.c2 = np.concatenate(([np.nan], inner.c2))
        self.n2 = np.concatenate(([0.0], inner.n2))
        lagrangian = mesh.lagrangian | (action.ll == 0.0)
        self.shift = np.where(lagrangian, inner.rho * inner.g / mesh.node[1:] ** 2, 0.0)
        at = mesh.at(profile, elem.gauss)
        shells = 4.0 * np.pi * (at.rho * at.x**2) @ elem.weight
        #: (cells,) mass inside the outer end of each cell, as the density makes it
        self.mass = np.cumsum(shells * self.width)

    def at_nodes(self, solution: Solution) -> Iterator[NodalMode]:
        """The modes of a solution at the nodes of the mesh, one after the other."""
        action, stages = self.action, self.elem.gauss.size
        if solution.lam.size == 0:
            return
        for batch in batches(solution.lam.size, _SIDE_BY_SIDE):
            lam = solution.lam[batch]
            p1, p2 = np.zeros((2, self.mesh.size + 1, lam.size))
            energy = np.zeros(lam.size)
            vector = np.ascontiguousarray(solution.vector[:, batch])
            swing = np.ascontiguousarray(solution.swing[:, :, batch])
            ends = np.ascontiguousarray(self.elem.slope), np.ascontiguousarray(self.elem.value)
            momenta(action, lam, vector, swing, *ends, p1, p2, energy)
            nodal = vector.reshape(-1, action.dof, lam.size)[::stages]
            for j in range(lam.size):
                q2 = nodal[:, 1, j] if action.dof == 2 else p2[:, j]
                yield self._mode(lam[j], nodal[:, 0, j], q2, p1[:, j], p2[:, j], energy[j])

    def _mode(
        self,
        lam: float,
        q1: np.ndarray,
        q2: np.ndarray,
        p1: np.ndarray,
        p2: np.ndarray,
        energy: float,
    ) -> NodalMode:
        p1 = p1.copy()
        p1[1:] += self.shift * q1[1:]
        if self.action.dof == 1:
            # Radial motion: Phi' is the sum of its steps, zero outside; its p2 is zero.
            q2 = np.concatenate((np.cumsum(p2[:0:-1])[::-1], [0.0]))
            p2 = np.zeros_like(q2)
        xi_h = np.zeros_like(q1)
        if self.action.ll > 0.0:
            xi_h[1:] = (p1[1:] / self.rho[1:] + q2[1:]) / (lam * self.mesh.node[1:])
        return NodalMode(q1, q2, p1, p2, xi_h, float(lam), float(energy))


@compiled
def momenta(action, lam, vector, swing, slope, value, p1, p2, energy):
    """Momenta at the nodes of the mesh: derivatives of the action of a cell by q at its ends.

    They are as accurate as the eigenvalue, which interpolated values are not.

    Parameters
    ----------
    action : `Action`
    lam : (lanes,) sigma2
    vector, swing : (nodes * dof, lanes), (cells, s, lanes), a mode in every lane
    slope, value : (s, s+1) of the `Element`
    p1, p2 : (cells + 1, lanes), receive the momenta of the form used inside each node. With one
        degree of freedom p2 receives -h dPhi'/dr, the step of Phi' over the cell, instead.
    energy : (lanes,), receives twice the kinetic energy
    """
    dof, lanes = action.dof, lam.size
    stages = action.value.shape[0]
    q1, e, q2, f = np.empty(lanes), np.empty(lanes), np.empty(lanes), np.empty(lanes)
    for cell in range(action.width.size):
        h = action.width[cell]
        for k in range(stages):
            b0, b1, s1, s2, b22, c11, c21, d0, d1, d2 = action.point[cell, k]
            w = action.weight[k]
            up, here = slope[k, stages], h * value[k, stages]
            _point_values(action, cell, k, vector, q1, e, q2, f)
            for j in range(lanes):
                y = swing[cell, k, j]
                if action.ll > 0.0:
                    first = lam[j] * y - s1 * q1[j] - s2 * q2[j] * (dof - 1)
                else:
                    first = e[j] / (h * b0)
                second = f[j] / (h * b22) if dof == 2 else 0.0
                gradient = b1 * y * s1 + c11 * first + c21 * second + (d0 + d1 * lam[j]) * q1[j]
                p1[cell + 1, j] += w * (first * up - here * gradient)
                if cell == 0:
                    p1[0, j] -= w * (first * slope[k, 0] - h * value[k, 0] * gradient)
                if dof == 2:
                    p2[cell + 1, j] += w * (second * up - here * (b1 * y * s2 + d2 * q2[j]))
                else:
                    p2[cell + 1, j] -= w * h * c21 * q1[j]
                energy[j] += w * h * (b1 * y * y - d1 * q1[j] * q1[j])


class ModelPoints:
    """Carries nodal modes to the points of a model and scales them at the photosphere."""

    def __init__(self, star: StarModel, rebuilt: Reconstruction, full_gravity: bool) -> None:
        x = star.fractional_radius
        node = rebuilt.mesh.node
        self.index = np.minimum(np.searchsorted(node, x * (1.0 - 1e-15)), node.size - 1)
        self.x, self.rebuilt, self.full_gravity = x, rebuilt, full_gravity
        self.r = np.maximum(node[self.index], node[1])
        scale = star.photospheric_radius**3 / star.total_mass
        self.rho = star.density * scale
        self.inside = node[self.index] > 0.0
        outer_side = np.zeros(x.size, bool)
        outer_side[1:] = np.diff(x) == 0.0
        inner_rho = np.nan_to_num(rebuilt.rho[self.index])
        self.jump = np.where(outer_side, self.rho - inner_rho, 0.0)
        # The cell that holds the photosphere, and where in it.
        place = min(1.0, node[-1])
        first = int(np.clip(np.searchsorted(node, place, side="right") - 1, 1, node.size - 2))
        self.outer = first, float((place - node[first]) / (node[first + 1] - node[first]))

    def photosphere(self, mode: NodalMode, degree: int) -> tuple[float, float]:
        """Squared total displacement, and the sign of the radial one, at r = R."""
        a, share = self.outer
        b, node = a + 1, self.rebuilt.mesh.node
        xi_r = (1.0 - share) * mode.q1[a] / node[a] ** 2 + share * mode.q1[b] / node[b] ** 2
        xi_h = (1.0 - share) * mode.xi_h[a] + share * mode.xi_h[b]
        return float(xi_r**2 + degree * (degree + 1) * xi_h**2), 1.0 if xi_r >= 0.0 else -1.0

    def columns(self, mode: NodalMode, scale: float) -> tuple[np.ndarray, ...]:
        """xi_r, xi_h, p', Phi', dPhi'/dr on the points of the model, times `scale`."""
        i, r = self.index, self.r
        q1, q2, p1, p2 = mode.q1[i], mode.q2[i], mode.p1[i], mode.p2[i]
        xi_r = np.where(self.inside, q1 / r**2, self._central(mode.q1))
        p_prime = p1 + self.jump * self.rebuilt.g[i] * xi_r
        dphi = np.zeros_like(xi_r)
        if self.full_gravity:
            dphi = -4.0 * np.pi * (p2 / r**2 + self.rho * xi_r)
            dphi[~self.inside] = 0.0
            if self.rebuilt.action.ll == 2.0:
                dphi[~self.inside] = (mode.q2[1] - mode.q2[0]) / self.rebuilt.mesh.node[1]
        xi_h = np.where(self.inside, mode.xi_h[i], xi_r if self._is_dipole else 0.0)
        outer = (self.jump != 0.0) & (self.rho > 0.0)
        if self.rebuilt.action.ll > 0.0:
            xi_h[outer] = (p_prime[outer] / self.rho[outer] + q2[outer]) / (mode.lam * r[outer])
        return tuple(scale * column for column in (xi_r, xi_h, p_prime, q2, dphi))

    @property
    def _is_dipole(self) -> bool:
        return self.rebuilt.action.ll == 2.0

    def _central(self, q1: np.ndarray) -> float:
        """xi_r at r = 0: that of the first node for l = 1, where xi_r tends to a constant."""
        return float(q1[1] / self.rebuilt.mesh.node[1] ** 2) if self._is_dipole else 0.0
