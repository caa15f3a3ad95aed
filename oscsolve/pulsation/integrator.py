"""Explicit integration of linear equations through the layers of a star, with error control.

An embedded Runge-Kutta pair of order 8(5,3) by Dormand and Prince (Hairer, Norsett & Wanner 1993,
sect. II.5), its coefficients from scipy. Steps end at the points of the model, where the
interpolated structure is only once or twice differentiable.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from scipy.integrate import DOP853

from oscsolve.pulsation.compiled import compiled
from oscsolve.pulsation.dziembowski import COWLING, RADIAL, fill_matrix

_A, _B, _C = (np.ascontiguousarray(table) for table in (DOP853.A, DOP853.B, DOP853.C))
_E3, _E5 = np.ascontiguousarray(DOP853.E3), np.ascontiguousarray(DOP853.E5)
_STAGES = int(DOP853.n_stages)
#: A row of a plane smaller than this share of the largest is not asked to be relatively exact.
_SMALLEST_ROW = 1e-3
_MOST_STEPS = 200_000


class Accuracy(NamedTuple):
    """How finely to integrate: relative error of a step, and least steps an interval."""

    tolerance: float
    pieces: int


class Work(NamedTuple):
    """Room for one step: the new value, the stages, the matrix of the equations."""

    new: np.ndarray
    stage: np.ndarray
    m: np.ndarray


@compiled
def _derivative(p, k, t, trial, u, m, out):
    """Put du/dt at the share t of interval k into `out`."""
    x = fill_matrix(p, k, t, trial, m)
    per_t = p.width[k] / x
    size, columns = u.shape
    for i in range(size):
        for c in range(columns):
            total = 0.0
            for j in range(size):
                total += m[i, j] * u[j, c]
            out[i, c] = total * per_t


@compiled
def _relative_error(h, u, new, stage):
    """Error of a step, each row relative to its larger entry."""
    size, columns = u.shape
    largest = 0.0
    for i in range(size):
        for c in range(columns):
            largest = max(largest, abs(u[i, c]), abs(new[i, c]))
    fifth, third = 0.0, 0.0
    for i in range(size):
        scale = _SMALLEST_ROW * largest
        for c in range(columns):
            scale = max(scale, abs(u[i, c]), abs(new[i, c]))
        for c in range(columns):
            e5, e3 = 0.0, 0.0
            for j in range(_STAGES + 1):
                e5 += _E5[j] * stage[j, i, c]
                e3 += _E3[j] * stage[j, i, c]
            fifth += (e5 / scale) ** 2
            third += (e3 / scale) ** 2
    if fifth == 0.0:
        return 0.0
    return h * fifth / math.sqrt((fifth + 0.01 * third) * size * columns)


@compiled
def _try_step(p, k, t, h, trial, u, work):
    """One step of size h in t from u to `work.new`; returns an estimate of its relative error."""
    new, stage, m = work.new, work.stage, work.m
    size, columns = u.shape
    for s in range(_STAGES):
        for i in range(size):
            for c in range(columns):
                total = 0.0
                for j in range(s):
                    total += _A[s, j] * stage[j, i, c]
                new[i, c] = u[i, c] + h * total
        _derivative(p, k, t + _C[s] * h, trial, new, m, stage[s])
    for i in range(size):
        for c in range(columns):
            total = 0.0
            for j in range(_STAGES):
                total += _B[j] * stage[j, i, c]
            new[i, c] = u[i, c] + h * total
    _derivative(p, k, t + h, trial, new, m, stage[_STAGES])
    return _relative_error(abs(h), u, new, stage)


@compiled
def _normalise(u):
    """Gram-Schmidt where columns have become parallel, long or short; keeps the orientation."""
    size, columns = u.shape
    a, b, dot = 0.0, 0.0, 0.0
    for i in range(size):
        a += u[i, 0] ** 2
        b += u[i, columns - 1] ** 2
        dot += u[i, 0] * u[i, columns - 1]
    tame = 1e-6 < a < 1e6 and 1e-6 < b < 1e6
    if tame and (columns == 1 or dot * dot < 0.8 * a * b):
        return
    for i in range(size):
        if columns == 2:
            u[i, 1] -= dot / a * u[i, 0]
        u[i, 0] /= math.sqrt(a)
    if columns == 2:
        b = 0.0
        for i in range(size):
            b += u[i, 1] ** 2
        for i in range(size):
            u[i, 1] /= math.sqrt(b)


@compiled
def _cross(u, form, gravity, weight):
    """Carry solutions over a jump: xi_r, Phi', delta p and g z4 are continuous."""
    if gravity == 1.0 and weight == 1.0:
        return
    for c in range(u.shape[1]):
        if form == RADIAL:
            u[1, c] *= weight
        elif form == COWLING:
            u[1, c] = u[0, c] + weight * (u[1, c] - u[0, c])
        else:
            lifted = u[1, c] - u[2, c] - u[0, c]
            u[2, c] *= gravity
            u[3, c] *= gravity
            u[1, c] = u[0, c] + u[2, c] + weight * lifted


@compiled
def _pass(p, k, t, direction, length, trial, accuracy, u, work):
    """Carry u from the share t of interval k to its end; returns the next step length in x.

    Negative where steps fail.
    """
    end = 1.0 if direction > 0 else 0.0
    step = min(length / p.width[k], abs(end - t) / accuracy.pieces)
    for _ in range(_MOST_STEPS):
        rest = abs(end - t)
        h = rest if rest <= 1.0000001 * step else min(step, 0.5 * rest)
        error = _try_step(p, k, t, direction * h, trial, u, work) / accuracy.tolerance
        if not error < 1e300 or t + h == t:
            return -1.0
        step = h * (6.0 if error < 1e-6 else min(6.0, max(0.2, 0.9 * error**-0.125)))
        if error <= 1.0:
            u[:] = work.new
            _normalise(u)
            if h == rest:
                return step * p.width[k]
            t += direction * h
    return -1.0


@compiled
def integrate(layers, trial, first, last, direction, t, accuracy, u, planes):
    """Carry solutions u from the share t of interval `first` through interval `last`.

    Outward where `direction` is 1, inward where it is -1. `planes[k]` receives the solutions at the
    right end of interval k, inner side, for each interval passed; inward, those given and those at
    the left end of interval `last` too. u is overwritten. False where steps fail.
    """
    size, columns = u.shape
    work = Work(
        np.empty((size, columns)),
        np.empty((_STAGES + 1, size, columns)),
        np.empty((size, size)),
    )
    length = 1e300
    if direction < 0:
        planes[first] = u
    for k in range(first, last + direction, direction):
        length = _pass(layers.polynomials, k, t, direction, length, trial, accuracy, u, work)
        if length < 0.0:
            return False
        t = 0.0 if direction > 0 else 1.0
        if direction > 0:
            planes[k] = u
            if k < last:
                _cross(u, trial.form, layers.gravity[k + 1], layers.weight[k + 1])
        else:
            _cross(u, trial.form, 1.0 / layers.gravity[k], 1.0 / layers.weight[k])
        if direction < 0:
            planes[k - 1] = u
    return True
