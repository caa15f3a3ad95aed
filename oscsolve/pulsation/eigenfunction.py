"""Eigenfunctions: from the nodal q of a solution to displacements on the points of the model."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oscsolve.pulsation.mesh import Element, Mesh
from oscsolve.pulsation.search import Solution
from oscsolve.pulsation.sweep import Action
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile


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


@dataclass(frozen=True, eq=False)
class GaussMode:
    """One mode at the Gauss points, (cells, s); gradients are -dp/dr without the jump terms."""

    q1: np.ndarray
    q2: np.ndarray
    p1: np.ndarray
    p2: np.ndarray
    energy_density: np.ndarray
    gradient1: np.ndarray
    gradient2: np.ndarray


class Reconstruction:
    """What turns vectors of one action into eigenfunctions; shared by all modes of a degree."""

    def __init__(self, profile: Profile, mesh: Mesh, elem: Element, action: Action) -> None:
        self.mesh, self.elem, self.action = mesh, elem, action
        self.width = np.diff(mesh.node)
        inner = profile.at(mesh.node[1:], mesh.interval)
        self.rho = np.concatenate(([np.nan], inner.rho))
        self.g = np.concatenate(([0.0], inner.g))
        self.c2 = np.concatenate(([np.nan], inner.c2))
        lagrangian = mesh.lagrangian | (action.ll == 0.0)
        self.shift = np.where(lagrangian, inner.rho * inner.g / mesh.node[1:] ** 2, 0.0)
        at_gauss = mesh.node[:-1, None] + self.width[:, None] * elem.gauss
        self.rho_gauss = profile.at(
            at_gauss, np.broadcast_to(mesh.interval[:, None], at_gauss.shape)
        ).rho
        self.r_gauss = at_gauss

    def at_gauss(self, solution: Solution, index: int) -> GaussMode:
        """Mode `index` of a solution at the Gauss points."""
        lam = solution.lam[index]
        b0, b1, s1, s2, b22, c11, c21, d0, d1, d2 = np.moveaxis(self.action.point, -1, 0)
        q1, slope1 = self._interpolate(solution, index, 0)
        q2, slope2 = np.zeros_like(q1), np.zeros_like(q1)
        p2 = np.zeros_like(q1)
        if self.action.dof == 2:
            q2, slope2 = self._interpolate(solution, index, 1)
            p2 = (slope2 - c21 * q1) / b22
        y = solution.swing[index]
        if self.action.ll > 0.0:
            p1 = lam * y - s1 * q1 - s2 * q2
        else:
            p1 = (slope1 - c11 * q1) / b0
        return GaussMode(
            q1=q1,
            q2=q2,
            p1=p1,
            p2=p2,
            energy_density=b1 * y * y - d1 * q1 * q1,
            gradient1=b1 * y * s1 + c11 * p1 + c21 * p2 + (d0 + d1 * lam) * q1,
            gradient2=b1 * y * s2 + d2 * q2,
        )

    def _interpolate(
        self, solution: Solution, index: int, component: int
    ) -> tuple[np.ndarray, np.ndarray]:
        nodal = solution.vector[index].reshape(-1, self.action.dof)[:, component]
        stages = self.elem.gauss.size
        cell = np.arange(self.mesh.size)[:, None] * stages + np.arange(stages + 1)
        right = nodal[cell[:, -1:]]
        difference = nodal[cell] - right
        value = right + difference @ self.elem.value.T
        return value, (difference @ self.elem.slope.T) / self.width[:, None]

    def at_nodes(self, solution: Solution, index: int) -> NodalMode:
        """Mode `index` of a solution at the nodes of the mesh.

        The momentum at the right end of a cell is the derivative of the cell's action by the
        value of q there, which is as accurate as the eigenvalue.
        """
        at = self.at_gauss(solution, index)
        stages, weight, h = self.elem.gauss.size, self.elem.weight, self.width[:, None]
        nodal = solution.vector[index].reshape(-1, self.action.dof)[::stages]
        q1 = nodal[:, 0]
        p1, p2 = np.zeros_like(q1), np.zeros_like(q1)
        value, slope = self.elem.value, self.elem.slope
        p1[1:] = (at.p1 * slope[:, -1] - h * at.gradient1 * value[:, -1]) @ weight
        p1[0] = -((at.p1 * slope[:, 0] - h * at.gradient1 * value[:, 0]) @ weight)[0]
        p1[1:] += self.shift * q1[1:]
        if self.action.dof == 2:
            q2 = nodal[:, 1]
            p2[1:] = (at.p2 * slope[:, -1] - h * at.gradient2 * value[:, -1]) @ weight
        elif self.action.ll == 0.0 and self.action.point[0, 0, 6] != 0.0:
            q2 = self._radial_potential(at.q1)
        else:
            q2 = np.zeros_like(q1)
        xi_h = np.zeros_like(q1)
        if self.action.ll > 0.0:
            r, lam = self.mesh.node[1:], solution.lam[index]
            xi_h[1:] = (p1[1:] / self.rho[1:] + q2[1:]) / (lam * r)
        energy = float(np.sum(at.energy_density * weight * h))
        return NodalMode(
            q1=q1, q2=q2, p1=p1, p2=p2, xi_h=xi_h, lam=float(solution.lam[index]), energy=energy
        )

    def _radial_potential(self, q1_gauss: np.ndarray) -> np.ndarray:
        """Phi' of radial motion at the nodes: dPhi'/dr = -4 pi rho xi_r, zero outside."""
        density = 4.0 * np.pi * self.rho_gauss * q1_gauss / self.r_gauss**2
        steps = (density @ self.elem.weight) * self.width
        return np.concatenate((np.cumsum(steps[::-1])[::-1], [0.0]))


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

    def photosphere(self, mode: NodalMode, degree: int) -> tuple[float, float]:
        """Squared total displacement, and the sign of the radial one, at r = R."""
        node = self.rebuilt.mesh.node
        place = min(1.0, node[-1])
        xi_r = np.interp(place, node[1:], mode.q1[1:] / node[1:] ** 2)
        xi_h = np.interp(place, node[1:], mode.xi_h[1:])
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
