"""Inverse iteration with the action: one sweep down and up, and the quotient that polishes lam.

Written with y = (p1 + z)/lam = rho r xi_h at the Gauss points as a further unknown, the action
is linear in lam (method of the linear pencil):

    S = 1/2 b0 p1^2 - b1 y z + 1/2 (q2' - c21 q1)^2/b22 - 1/2 d0 q1^2 - 1/2 d2 q2^2 + lam T,
    T = 1/2 b1 y^2 - 1/2 d1 q1^2,        p1 = (e - b1 y)/b0.

One step solves A(lam) (q, y) = dT/d(q, y) at the previous vector and sets lam <- lam - S/T, the
Rayleigh quotient: it converges from anywhere and cubically near a mode. What lies on top of the
star is not linear in lam; the zero of S of the new vector is found there by Newton's rule. The
step also tells how far it may still be from the mode: with theta the angle between the old and
the new vector in the metric of T, the residual of the new one is sin(theta) times the old norm
over the new one, an eigenvalue lies within it (Weinstein 1934), and the distance to that is at
most the square of the residual over the gap to all others (Temple 1928, Kato 1949). Eliminating
y gives the matrix of `sweep`, and with y0 the previous y

    y = (e + b0 z + b0 y0)/(lam B11),     p1 = lam y - z - y0,

the second free of the cancellation in e - b1 y. S and T are summed cell by cell from differences
of nodal values, which keeps round-off near that of the numbers themselves instead of eps/h^2.
(Iterating with y taken from q alone, without y0, does not converge: T is then singular wherever
B11 is nearly zero.)
"""

from __future__ import annotations

import numpy as np

from oscsolve.pulsation.boundary import surface_term
from oscsolve.pulsation.compiled import compiled, padded
from oscsolve.pulsation.sweep import Action, _assemble, _join

#: Spacing of double precision numbers around 1.
EPSILON = float(np.finfo(np.float64).eps)
#: Rounds of Newton's rule for what lies on top of the star.
_NEWTON_STEPS = 3


class Workspace:
    """Arrays of one inverse iteration, reused between steps.

    Attributes
    ----------
    vector : (nodes * dof, lanes) nodal values of q, centre first
    swing : (cells, s, lanes) y at the Gauss points
    rows : (cells, pivots, size, lanes) the factors of the elimination
    negative : (lanes,) int64, eigenvalues of the action below zero at lam
    step : (lanes,) what to add to lam
    residual : (lanes,) norm of the residual of the new vector, an amount of lam
    noise : (lanes,) round-off of lam to expect from the size of the terms of S
    """

    def __init__(self, action: Action, lanes: int) -> None:
        stages, nodes = action.value.shape
        cells, dof = action.width.size, action.dof
        self._shapes = (
            ((cells * stages + 1) * dof,),
            (cells, stages),
            (cells, dof * (nodes - 1), dof * nodes),
        )
        most = padded(lanes)
        self._memory = tuple(np.empty(int(np.prod(shape)) * most) for shape in self._shapes)
        self._use(lanes)
        self.swing[:] = 0.0

    def _use(self, lanes: int) -> None:
        """Lay arrays of this many lanes over the memory."""
        width = padded(lanes)
        self._wide = tuple(
            memory[: int(np.prod(shape)) * width].reshape(*shape, width)
            for memory, shape in zip(self._memory, self._shapes, strict=True)
        )
        self.vector, self.swing, self.rows = (array[..., :lanes] for array in self._wide)
        self.negative = np.zeros(lanes, np.int64)
        self.step, self.residual, self.noise = np.empty(lanes), np.empty(lanes), np.empty(lanes)

    def keep(self, lanes: np.ndarray) -> None:
        """Go on with some of the lanes only: those where the mask is True."""
        vector, swing = self.vector[:, lanes], self.swing[:, :, lanes]
        self._use(int(np.count_nonzero(lanes)))
        self.vector[:], self.swing[:] = vector, swing

    def iterate(self, action: Action, lam: np.ndarray) -> None:
        """Replace `vector` by the next iterate at `lam` and fill the other arrays."""
        used, width = lam.size, padded(lam.size)
        for array in self._wide[:2]:  # what pads the lanes must be harmless
            array[..., used:] = array[..., used - 1 : used]
        step, residual, noise = np.empty((3, width))
        negative = np.zeros(width, np.int64)
        trial = np.pad(lam, (0, width - used), "edge")
        vector, swing, rows = self._wide
        inverse_step(action, trial, vector, swing, rows, negative, step, residual, noise)
        for own, wide in (
            (self.negative, negative),
            (self.step, step),
            (self.residual, residual),
            (self.noise, noise),
        ):
            own[:] = wide[:used]


@compiled
def inverse_step(action, lam, vector, swing, rows, negative, step, residual, noise):
    """One step of inverse iteration in every lane; arguments as in `Workspace`."""
    lanes = lam.size
    mu, before = np.empty(lanes), np.zeros(lanes)
    for j in range(lanes):
        negative[j] = 0
        mu[j] = 1.0 / lam[j] if action.ll > 0.0 else 0.0
    _eliminate(action, lam, mu, vector, swing, rows, negative, before)
    _substitute(action, vector, rows)
    _quotient(action, lam, mu, vector, swing, before, step, residual, noise)


@compiled
def _point_values(action, cell, k, vector, q1, e, q2, f):
    """q1, h (q1' - c11 q1), q2 and h (q2' - c21 q1) at Gauss point k of a cell, all lanes."""
    dof, stages = action.dof, action.value.shape[0]
    lanes = q1.size
    base = cell * stages * dof
    end = base + stages * dof
    for j in range(lanes):
        q1[j], e[j] = vector[end, j], 0.0
        q2[j], f[j] = vector[end + dof - 1, j], 0.0
    for i in range(stages):
        node = base + dof * (i + 1) if i < stages - 1 else base
        v, s = action.value[k, i], action.slope[k, i]
        for j in range(lanes):
            difference = vector[node, j] - vector[end, j]
            q1[j] += v * difference
            e[j] += s * difference
        if dof == 2:
            for j in range(lanes):
                difference = vector[node + 1, j] - vector[end + 1, j]
                q2[j] += v * difference
                f[j] += s * difference
    h = action.width[cell]
    c11, c21 = h * action.point[cell, k, 5], h * action.point[cell, k, 6]
    for j in range(lanes):
        e[j] -= c11 * q1[j]
        f[j] -= c21 * q1[j]


@compiled
def _energy_gradient(action, cell, mu, vector, swing, scratch, right_side, energy):
    """Derivative of T by the nodal q of one cell, that by y eliminated; adds up 2 T."""
    dof, stages = action.dof, action.value.shape[0]
    lanes = mu.size
    h = action.width[cell]
    q1, e, q2, f = scratch[0], scratch[1], scratch[2], scratch[3]
    inertia, push = scratch[4], scratch[5]
    right_side[:] = 0.0
    for k in range(stages):
        b0, b1, s1, s2, b22, c11, c21, d0, d1, d2 = action.point[cell, k]
        w = action.weight[k]
        _point_values(action, cell, k, vector, q1, e, q2, f)
        for j in range(lanes):
            b11 = b0 + b1 * mu[j]
            if b11 == 0.0:
                b11 = -1e-300
            y0 = swing[cell, k, j]
            inertia[j] = -w * h * d1 * q1[j]
            push[j] = w * b1 * mu[j] * y0 / b11
            energy[j] += inertia[j] * q1[j] + w * h * b1 * y0 * y0
        for i in range(stages + 1):
            v = action.value[k, i]
            along = action.slope[k, i] + h * (b0 * s1 - c11) * v
            for j in range(lanes):
                right_side[dof * i, j] += inertia[j] * v + push[j] * along
            if dof == 2:
                for j in range(lanes):
                    right_side[2 * i + 1, j] += push[j] * h * b0 * s2 * v


@compiled
def _eliminate(action, lam, mu, vector, swing, rows, negative, energy):
    """Factor the action and carry the right side along; leaves it in `vector`."""
    dof, lanes = action.dof, lam.size
    stages, nodes = action.value.shape
    cells = action.width.size
    size, inner = dof * nodes, dof * (nodes - 2)
    right = inner + dof
    matrix = np.empty((size, size, lanes))
    carry = np.zeros((dof, dof, lanes))
    side = np.empty((size, lanes))
    side_carry = np.zeros((dof, lanes))
    inverse, factor = np.empty(lanes), np.empty(lanes)
    scratch = np.empty((6, lanes))
    for cell in range(cells):
        _assemble(action, cell, lam, mu, scratch, matrix, negative)
        _energy_gradient(action, cell, mu, vector, swing, scratch, side, energy)
        last = _join(action, cell, carry, matrix)
        for j in range(lanes):
            for a in range(dof):
                if cell == 0:
                    side[right + a, j] -= side[inner + a, j]
                else:
                    side[inner + a, j] += side_carry[a, j]
                    side[right + a, j] += side_carry[a, j]
        for p in range(last):
            for j in range(lanes):
                inverse[j] = 1.0 / matrix[p, p, j]
                if inverse[j] < 0.0:
                    negative[j] += 1
                rows[cell, p, p, j] = inverse[j]
            for a in range(p + 1, size):
                for j in range(lanes):
                    factor[j] = matrix[p, a, j] * inverse[j]
                    rows[cell, p, a, j] = factor[j]
                    side[a, j] -= factor[j] * side[p, j]
                for b in range(a, size):
                    for j in range(lanes):
                        matrix[a, b, j] -= factor[j] * matrix[p, b, j]
        base = cell * stages * dof
        for p in range(right):
            node = base + dof + p if p < inner else base + p - inner
            for j in range(lanes):
                # q vanishes at the centre, which is not among the unknowns.
                vector[node, j] = side[p, j] if p < last else 0.0
        for j in range(lanes):
            for a in range(dof):
                side_carry[a, j] = side[right + a, j]
                for b in range(a, dof):
                    carry[a, b, j] = matrix[right + a, right + b, j]
    base = cells * stages * dof
    for j in range(lanes):
        k11, k12, k22, t11, t12, t22, hidden = surface_term(action.top, lam[j], mu[j])
        negative[j] += hidden
        first = carry[0, 0, j] + k11
        y1 = side_carry[0, j] + t11 * vector[base, j]
        energy[j] += t11 * vector[base, j] ** 2
        # At a mode found to the last digit a pivot can be zero: any tiny one serves as well.
        if first == 0.0:
            first = EPSILON * abs(carry[0, 0, j])
        if first < 0.0:
            negative[j] += 1
        if dof == 2:
            y1 += t12 * vector[base + 1, j]
            energy[j] += 2.0 * t12 * vector[base, j] * vector[base + 1, j]
            energy[j] += t22 * vector[base + 1, j] ** 2
            y2 = side_carry[1, j] + t12 * vector[base, j] + t22 * vector[base + 1, j]
            coupling = carry[0, 1, j] + k12
            second = carry[1, 1, j] + k22 - coupling * coupling / first
            if second == 0.0:
                second = EPSILON * abs(k22)
            if second < 0.0:
                negative[j] += 1
            vector[base + 1, j] = (y2 - coupling * y1 / first) / second
            y1 -= coupling * vector[base + 1, j]
        vector[base, j] = y1 / first


@compiled
def _substitute(action, vector, rows):
    """Back substitution, surface to centre: differences from the right node, then nodal values."""
    dof, lanes = action.dof, vector.shape[1]
    stages, nodes = action.value.shape
    size, inner = dof * nodes, dof * (nodes - 2)
    right = inner + dof
    for cell in range(action.width.size - 1, -1, -1):
        base = cell * stages * dof
        end = base + stages * dof
        last = inner if cell == 0 else right
        for p in range(last - 1, -1, -1):
            node = base + dof + p if p < inner else base + p - inner
            for j in range(lanes):
                vector[node, j] *= rows[cell, p, p, j]
            for a in range(p + 1, size):
                if a < inner:
                    other = base + dof + a
                elif a < right:
                    other = base + a - inner
                else:
                    other = end + a - right
                for j in range(lanes):
                    vector[node, j] -= rows[cell, p, a, j] * vector[other, j]
        for p in range(last):
            node = base + dof + p if p < inner else base + p - inner
            for j in range(lanes):
                vector[node, j] += vector[end + p % dof, j]


@compiled
def _quotient(action, lam, mu, vector, swing, before, step, residual, noise):
    """S and T of the vector, term by term; scales it to T = 1/2 and estimates round-off."""
    dof, lanes = action.dof, lam.size
    stages = action.value.shape[0]
    cells = action.width.size
    base = cells * stages * dof
    total, size, energy = np.zeros(lanes), np.zeros(lanes), np.zeros(lanes)
    q1, e, q2, f = np.empty(lanes), np.empty(lanes), np.empty(lanes), np.empty(lanes)
    for cell in range(cells):
        h = action.width[cell]
        node = cell * stages * dof
        for j in range(lanes):
            total[j] += action.node_term[cell] * vector[node, j] ** 2
        for k in range(stages):
            b0, b1, s1, s2, b22, c11, c21, d0, d1, d2 = action.point[cell, k]
            w = action.weight[k] * h
            _point_values(action, cell, k, vector, q1, e, q2, f)
            for j in range(lanes):
                z = s1 * q1[j] + (s2 * q2[j] if dof == 2 else 0.0)
                b11 = b0 + b1 * mu[j]
                if b11 == 0.0:
                    b11 = -1e-300
                y0 = swing[cell, k, j]
                y = mu[j] * (e[j] / h + b0 * (z + y0)) / b11
                p1 = lam[j] * y - z - y0 if action.ll > 0.0 else e[j] / (h * b0)
                squeeze, shear = b0 * p1 * p1, 2.0 * b1 * y * z
                lift, field = d0 * q1[j] * q1[j], 0.0
                if dof == 2:
                    field = f[j] * f[j] / (h * h * b22) - d2 * q2[j] * q2[j]
                kinetic = b1 * y * y - d1 * q1[j] * q1[j]
                total[j] += w * (squeeze - shear - lift + field + lam[j] * kinetic)
                size[j] += w * (abs(squeeze) + abs(shear) + abs(lift) + abs(field))
                energy[j] += w * kinetic
                swing[cell, k, j] = y
    for j in range(lanes):
        a, b = vector[base, j], vector[base + dof - 1, j] if dof == 2 else 0.0
        form, kinetic = _top_values(action, lam[j], a, b)
        cosine2 = (total[j] + form) ** 2 / (before[j] * (energy[j] + kinetic))
        step[j] = _zero_of_action(action, lam[j], a, b, total[j], energy[j])
        energy[j] += kinetic
        residual[j] = np.sqrt(max(1.0 - cosine2, 0.0) * before[j] / abs(energy[j]))
        noise[j] = EPSILON * (abs(lam[j]) + size[j] / abs(energy[j]))
        energy[j] = 1.0 / np.sqrt(abs(energy[j]))
    for i in range(base + dof):
        for j in range(lanes):
            vector[i, j] *= energy[j]
    for cell in range(cells):
        for k in range(stages):
            for j in range(lanes):
                swing[cell, k, j] *= energy[j]


@compiled
def _top_values(action, lam, a, b):
    """2 S and 2 T of what lies on top, for q1 = a and q2 = b at the outermost node."""
    mu = 1.0 / lam if action.ll > 0.0 else 0.0
    k11, k12, k22, t11, t12, t22, _ = surface_term(action.top, lam, mu)
    form = k11 * a * a + 2.0 * k12 * a * b + k22 * b * b
    return form, t11 * a * a + 2.0 * t12 * a * b + t22 * b * b


@compiled
def _zero_of_action(action, lam, a, b, total, energy):
    """The step from lam to the zero of S of a vector; inside the star S is linear in lam."""
    form, kinetic = _top_values(action, lam, a, b)
    step = -(total + form) / (energy + kinetic)
    for _ in range(_NEWTON_STEPS):
        form, kinetic = _top_values(action, lam + step, a, b)
        change = -(total + energy * step + form) / (energy + kinetic)
        if not abs(change) < abs(step):
            break
        step += change
    return step
