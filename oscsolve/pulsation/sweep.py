"""The action on a mesh: one elimination sweep counts its negative eigenvalues, another inverts it.

In each cell q is a polynomial on s+1 Lobatto nodes and p lives at the s Gauss points. The p are
eliminated point by point; what is left is a quadratic form in the nodal q (Gauss collocation).
With h the cell width, B11 = b0 + b1/lam, and at a Gauss point

    e = q1' - c11 q1,   z = s1 q1 + s2 q2,   beta = b1/lam,
    p1 = (e - beta z)/B11,   p2 = (q2' - c21 q1)/b22,

the action density is

    S = 1/2 [ (e^2 - 2 beta e z - b0 beta z^2)/B11 + (q2' - c21 q1)^2/b22
              - (d0 + d1 lam) q1^2 - d2 q2^2 ]

and its derivative by lam, the kinetic energy density,

    T = 1/2 [ b1/lam^2 ((e + b0 z)/B11)^2 - d1 q1^2 ].

The interior nodes of a cell are eliminated first, then the node blocks from centre to surface.
Within a cell the unknowns are the value at the right node and the differences of the other
nodes from it. Both are needed for accuracy: the stiff part of the form, of size 1/h, then
touches differences only, and eliminating the left node subtracts nothing large. (With nodal
values instead, round-off grows as eps/h and spoils thin cells under a surface.)
By Sylvester's law of inertia the signs of all pivots together, those of the p included (B11 > 0
is a negative one), count the negative eigenvalues of the action: a number that falls by one at
every mode as lam grows.

Every sweep treats several trial values of lam side by side: the last axis of all work arrays.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from oscsolve.pulsation.boundary import Surface, surface_numbers, surface_term
from oscsolve.pulsation.compiled import compiled
from oscsolve.pulsation.equations import coefficients, degrees_of_freedom
from oscsolve.pulsation.mesh import Element, Mesh
from oscsolve.star.profile import Profile


class Action(NamedTuple):
    """The discrete action of one degree on one mesh, packed for compiled code.

    Local unknowns of a cell are ordered interior first, then left, both as differences from the
    right node, then the right node; `value` and `slope` are the functions that go with them.
    """

    dof: int  # canonical pairs per radius
    ll: float  # l(l+1)
    width: np.ndarray  # (n,)
    point: np.ndarray  # (n, s, 10), coefficients at the Gauss points, see equations.FIELDS
    node_term: np.ndarray  # (n,), 2 * the extra action of q1^2 at the left node of each cell
    top: Surface
    weight: np.ndarray  # (s,)
    value: np.ndarray  # (s, s+1)
    slope: np.ndarray  # (s, s+1)


def build_action(
    profile: Profile, mesh: Mesh, elem: Element, degree: int, gravity: str, surface: str
) -> Action:
    """Evaluate the structure at the Gauss points and pack the action of one degree."""
    width = np.diff(mesh.node)
    at = mesh.at(profile, elem.gauss)
    lagrangian = mesh.lagrangian | (degree == 0)
    order = np.append(np.arange(1, elem.gauss.size), (0, elem.gauss.size))
    value, slope = elem.value[:, order], elem.slope[:, order]
    value[:, -1], slope[:, -1] = 1.0, 0.0
    return Action(
        dof=degrees_of_freedom(degree, gravity),
        ll=float(degree * (degree + 1)),
        width=width,
        point=coefficients(at, degree, gravity, lagrangian[:, None]),
        node_term=_node_terms(profile, mesh, lagrangian),
        top=surface_numbers(profile, degree, gravity, surface, bool(lagrangian[-1])),
        weight=elem.weight,
        value=np.ascontiguousarray(value),
        slope=np.ascontiguousarray(slope),
    )


def _node_terms(profile: Profile, mesh: Mesh, lagrangian: np.ndarray) -> np.ndarray:
    """rho g/r^2 on the right minus the left of each node, counted where the form is Eulerian.

    The Lagrangian momentum P1 = p1 - (rho g/r^2) q1 is continuous everywhere, p1 is not where
    density jumps or where the two forms meet.
    """
    jump = mesh.interval[1:] > mesh.last[:-1] + 1
    place = np.flatnonzero(jump | (lagrangian[1:] != lagrangian[:-1]))
    term = np.zeros(mesh.size)
    r = mesh.node[place + 1]
    left, right = profile.at(r, mesh.last[place]), profile.at(r, mesh.interval[place + 1])
    inside = np.where(lagrangian[place], 0.0, left.rho * left.g / r**2)
    outside = np.where(lagrangian[place + 1], 0.0, right.rho * right.g / r**2)
    term[place + 1] = outside - inside
    return term


@compiled
def _assemble(action, cell, lam, mu, scratch, matrix, negative):
    """Upper triangle of the cell's quadratic form 2 S, and one count for each B11 > 0."""
    dof, lanes = action.dof, lam.size
    ee, ez, zz, q1q1 = scratch[0], scratch[1], scratch[2], scratch[3]
    stages, nodes = action.value.shape
    h = action.width[cell]
    matrix[:] = 0.0
    for k in range(stages):
        b0, b1, s1, s2, b22, c11, c21, d0, d1, d2 = action.point[cell, k]
        w = action.weight[k]
        dd, dq, qq = w / (h * b22), -w * c21 / b22, h * w * c21 * c21 / b22
        if dof == 1:
            qq = 0.0
        for j in range(lanes):
            beta = b1 * mu[j]
            b11 = b0 + beta
            if b11 == 0.0:
                b11 = -1e-300
            if b11 > 0.0:
                negative[j] += 1
            factor = w / b11
            ee[j] = factor / h
            ez[j] = -beta * factor
            zz[j] = -h * b0 * beta * factor
            q1q1[j] = zz[j] * s1 * s1 - h * w * (d0 + d1 * lam[j]) + qq
        for i in range(nodes):
            vi, ei = action.value[k, i], action.slope[k, i] - h * c11 * action.value[k, i]
            for m in range(nodes):
                vm, em = action.value[k, m], action.slope[k, m] - h * c11 * action.value[k, m]
                vv = vi * vm
                if m >= i:
                    f, g = ei * em, s1 * (ei * vm + vi * em)
                    a, b = dof * i, dof * m
                    for j in range(lanes):
                        matrix[a, b, j] += ee[j] * f + ez[j] * g + q1q1[j] * vv
                if dof == 2:
                    if m >= i:
                        f = dd * action.slope[k, i] * action.slope[k, m] - h * w * d2 * vv
                        g = s2 * s2 * vv
                        for j in range(lanes):
                            matrix[2 * i + 1, 2 * m + 1, j] += f + zz[j] * g
                    a, b = min(2 * i, 2 * m + 1), max(2 * i, 2 * m + 1)
                    f, g = s2 * ei * vm, dq * vi * action.slope[k, m]
                    both = s1 * s2 * vv
                    for j in range(lanes):
                        matrix[a, b, j] += ez[j] * f + g + zz[j] * both


@compiled
def _join(action, cell, carry, matrix):
    """Add what lies inside the left node to a cell; returns how many unknowns to eliminate.

    The left node is (right + difference), so its form goes to three blocks. At the centre q
    vanishes: there the difference of the left node is minus the right node, not an unknown.
    """
    dof, lanes = action.dof, matrix.shape[2]
    inner = dof * (action.value.shape[1] - 2)
    right = inner + dof
    if cell == 0:
        for j in range(lanes):
            for a in range(dof):
                for b in range(dof):
                    low, high = min(a, b), max(a, b)
                    if b >= a:
                        matrix[right + a, right + b, j] += (
                            matrix[inner + low, inner + high, j]
                            - matrix[inner + a, right + b, j]
                            - matrix[inner + b, right + a, j]
                        )
            for p in range(inner):
                for a in range(dof):
                    matrix[p, right + a, j] -= matrix[p, inner + a, j]
                    matrix[p, inner + a, j] = 0.0
        return inner
    for j in range(lanes):
        for a in range(dof):
            for b in range(dof):
                low, high = min(a, b), max(a, b)
                form = carry[low, high, j]
                if a == 0 and b == 0:
                    form += action.node_term[cell]
                matrix[inner + a, right + b, j] += form
                if b >= a:
                    matrix[inner + a, inner + b, j] += form
                    matrix[right + a, right + b, j] += form
    return right


@compiled
def count_negative(action, lam, negative):
    """Number of negative eigenvalues of the action at each of several values of lam.

    Parameters
    ----------
    action : `Action`
    lam : (lanes,) trial values of sigma2, not zero unless the motion is radial
    negative : (lanes,) int64, receives the counts
    """
    dof, lanes = action.dof, lam.size
    stages, nodes = action.value.shape
    size = dof * nodes
    inner = dof * (nodes - 2)
    right = inner + dof
    matrix = np.empty((size, size, lanes))
    carry = np.zeros((dof, dof, lanes))
    scratch = np.empty((4, lanes))
    mu, inverse, factor = np.empty(lanes), np.empty(lanes), np.empty(lanes)
    for j in range(lanes):
        negative[j] = 0
        mu[j] = 1.0 / lam[j] if action.ll > 0.0 else 0.0
    for cell in range(action.width.size):
        _assemble(action, cell, lam, mu, scratch, matrix, negative)
        last = _join(action, cell, carry, matrix)
        for p in range(last):
            for j in range(lanes):
                inverse[j] = 1.0 / matrix[p, p, j]
                if inverse[j] < 0.0:
                    negative[j] += 1
            for a in range(p + 1, size):
                for j in range(lanes):
                    factor[j] = matrix[p, a, j] * inverse[j]
                for b in range(a, size):
                    for j in range(lanes):
                        matrix[a, b, j] -= factor[j] * matrix[p, b, j]
        for a in range(dof):
            for b in range(a, dof):
                for j in range(lanes):
                    carry[a, b, j] = matrix[right + a, right + b, j]
    for j in range(lanes):
        k11, k12, k22, _, _, _, hidden = surface_term(action.top, lam[j], mu[j])
        negative[j] += hidden
        first = carry[0, 0, j] + k11
        if first < 0.0:
            negative[j] += 1
        if dof == 2:
            coupling = carry[0, 1, j] + k12
            if carry[1, 1, j] + k22 - coupling * coupling / first < 0.0:
                negative[j] += 1
