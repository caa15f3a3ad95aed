"""Boundary value problems of stars by Gauss collocation and a damped Newton method.

Unknown are three functions of s = ln(P_c/P), a = ln(r^2/s), b = ln(m/r^3), c = ln T, all analytic
at the centre s = 0, and two numbers: S, the s of the photosphere, and the level of the gradient.
Each cell is a step of the implicit Runge-Kutta method of Gauss; its stages are eliminated, and
what is left joins the values at neighbouring nodes (Ascher, Mattheij & Russell 1995, ch. 5).
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Protocol

import numpy as np
from numpy.polynomial import legendre
from numpy.typing import ArrayLike
from scipy.sparse import csc_matrix
from scipy.sparse.linalg import splu

from oscsolve.errors import ModelError

#: Gauss points in a cell; values at the nodes are good to order 2 _STAGES.
_STAGES = 3
#: Steps of the Newton method, and the change of any unknown at which it stops; round-off of
#: ln r and of the density is some 1e-14.
_STEPS, _EXACT = 40, 1e-12
#: Longest change of an unknown in one step: a factor 1.6.
_LONGEST = 0.5
#: A step that does not shrink the residual is halved at most so often.
_HALVINGS = 6


class NotSolvedError(ModelError):
    """The Newton method did not reach a solution from where it started."""


@dataclass(frozen=True, eq=False)
class Trial:
    """A star on the way to a solution.

    Attributes
    ----------
    z : (j+1,) nodes inside the photosphere: s = S z, from 0 to 1
    above : (k,) nodes above it: s = S + above
    y : (j+k+1, 3) a, b, c
    stages : (j+k, `_STAGES`, 3) the same at the Gauss points
    depth, level : S and the level of the gradient
    """

    z: np.ndarray
    above: np.ndarray
    y: np.ndarray
    stages: np.ndarray
    depth: float
    level: float

    @property
    def s(self) -> np.ndarray:
        """(j+k+1,) s of the nodes."""
        return np.append(self.depth * self.z, self.depth + self.above)


class Equations(Protocol):
    """What a problem must offer; (n,) arrays."""

    def slopes(
        self, ln_p: np.ndarray, s: np.ndarray, y: np.ndarray, level: float
    ) -> tuple[np.ndarray, np.ndarray]:
        """(n, 3) slopes of a, b, c by s, and (n, 3, 6) their derivatives by a, b, c, ln P, s and
        the level."""

    def centre(self, ln_p: float, c: float) -> tuple[np.ndarray, np.ndarray]:
        """(2,) a and b of a regular centre and (2, 2) their derivatives by ln P and c."""

    surface: np.ndarray
    ln_photosphere: float


def gauss(stages: int = _STAGES) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """(k,) nodes on [0, 1], (k, k) integrals of their Lagrange polynomials up to each, weights."""
    x, w = legendre.leggauss(stages)
    nodes, weights = 0.5 * (1.0 + x), 0.5 * w
    powers = np.arange(stages)
    vandermonde = nodes[:, None] ** powers
    integrals = nodes[:, None] ** (powers + 1) / (powers + 1)
    return nodes, integrals @ np.linalg.inv(vandermonde), weights


def relax(problem: Equations, trial: Trial, exact: float = _EXACT) -> Trial:
    """The solution near a trial; the last change of an unknown was at most `exact`.

    Raises
    ------
    NotSolvedError
        No solution is found from there.
    """
    system = _System(problem, trial)
    last = np.inf
    for _ in range(_STEPS):
        change = system.newton()
        size = change.largest()
        if not np.isfinite(size):
            break
        if size <= exact or (size < 1e-9 and size > 0.3 * last):
            return system.moved(change, 1.0).trial
        system = _shorter(system, change, min(1.0, _LONGEST / size))
        last = size
    raise NotSolvedError("the equations of structure were not solved from here")


def _shorter(system: _System, change: _Change, factor: float) -> _System:
    """The system after a step that shrinks the residual, if any does."""
    before = system.size()
    for _ in range(_HALVINGS):
        try:
            after = system.moved(change, factor)
        except NotSolvedError:
            raise
        except ModelError:
            after = None
        if after is not None and after.size() < (1.0 - 0.1 * factor) * before + 1e-11:
            return after
        factor *= 0.5
    if after is None:
        raise NotSolvedError("the gas has no density where the Newton method leads")
    return after


@dataclass(frozen=True, eq=False)
class _Change:
    y: np.ndarray
    stages: np.ndarray
    depth: float
    level: float

    def largest(self) -> float:
        return float(max(np.max(np.abs(self.y)), abs(self.depth) / 10.0, abs(self.level) / 0.3))


class _System:
    """Residuals and derivatives at one trial."""

    def __init__(self, problem: Equations, trial: Trial) -> None:
        self.problem, self.trial = problem, trial
        nodes, self.inner, self.weights = gauss()
        s = trial.s
        self.h = np.diff(s)
        inside = np.arange(self.h.size) < trial.z.size - 1
        place = s[:-1, None] + self.h[:, None] * nodes
        base = np.append(trial.z, 1.0 + 0.0 * trial.above)
        by_depth = base[:-1, None] + np.diff(base)[:, None] * nodes
        by_depth = np.where(inside[:, None], by_depth, 1.0)
        ln_p = problem.ln_photosphere + trial.depth - place
        flat = trial.stages.reshape(-1, 3)
        f, by = problem.slopes(ln_p.ravel(), place.ravel(), flat, trial.level)
        cells = self.h.size
        self.f = f.reshape(cells, _STAGES, 3)
        self.by = by.reshape(cells, _STAGES, 3, 6)
        # s and ln P move with the depth, at fixed z.
        self.f_depth = self.by[..., 4] * by_depth[..., None]
        self.f_depth += self.by[..., 3] * (1.0 - by_depth)[..., None]
        self.h_depth = np.where(inside, np.diff(base), 0.0)
        self.off_stages = (
            trial.stages
            - trial.y[:-1, None]
            - self.h[:, None, None] * np.einsum("kl,ilm->ikm", self.inner, self.f)
        )
        self.off_nodes = np.diff(trial.y, axis=0) - self.h[:, None] * np.einsum(
            "l,ilm->im", self.weights, self.f
        )
        at = trial.z.size - 1
        self.off_surface = trial.y[at] + [np.log(trial.depth), 0.0, 0.0] - problem.surface
        c = float(trial.y[0, 2])
        value, self.by_centre = problem.centre(problem.ln_photosphere + trial.depth, c)
        self.off_centre = trial.y[0, :2] - value

    def size(self) -> float:
        """Root of the sum of squares of all residuals."""
        parts = (self.off_stages, self.off_nodes, self.off_surface, self.off_centre)
        total = float(np.sqrt(sum(float(np.sum(part**2)) for part in parts)))
        return total if np.isfinite(total) else np.inf

    def moved(self, change: _Change, factor: float) -> _System:
        trial = self.trial
        moved = replace(
            trial,
            y=trial.y + factor * change.y,
            stages=trial.stages + factor * change.stages,
            depth=trial.depth + factor * change.depth,
            level=trial.level + factor * change.level,
        )
        if not moved.depth > 0.0:
            raise ModelError("the Newton method leads to a star without depth")
        return _System(self.problem, moved)

    def newton(self) -> _Change:
        """The full Newton step."""
        cells = self.h.size
        k = _STAGES
        h = self.h[:, None, None]
        jac = self.by[..., :3]
        # (1 - h A J) dY = dy + h A (f_p dp) + h_p A f dp - residual.
        matrix = np.eye(3 * k) - (
            h[..., None, None]
            * self.inner[None, :, None, :, None]
            * jac.transpose(0, 2, 1, 3)[:, None]
        ).reshape(cells, 3 * k, 3 * k)
        depth = np.einsum(
            "kl,ilm->ikm", self.inner, h * self.f_depth + self.h_depth[:, None, None] * self.f
        )
        level = np.einsum("kl,ilm->ikm", self.inner, h * self.by[..., 5])
        right = np.concatenate(
            (
                np.tile(np.eye(3), (k, 1))[None].repeat(cells, axis=0),
                depth.reshape(cells, 3 * k, 1),
                level.reshape(cells, 3 * k, 1),
                -self.off_stages.reshape(cells, 3 * k, 1),
            ),
            axis=2,
        )
        solved = np.linalg.solve(matrix, right).reshape(cells, k, 3, 6)
        df = np.einsum("ilmn,ilnq->ilmq", jac, solved)
        df[..., 3] += self.f_depth
        df[..., 4] += self.by[..., 5]
        step = h * np.einsum("l,ilmq->imq", self.weights, df)
        step[..., 3] += self.h_depth[:, None] * np.einsum("l,ilm->im", self.weights, self.f)
        dy, d_depth, d_level = self._nodes(step)
        parts = np.concatenate((dy[:-1], np.tile([d_depth, d_level, 1.0], (cells, 1))), axis=1)
        return _Change(dy, np.einsum("ikmq,iq->ikm", solved, parts), d_depth, d_level)

    def _nodes(self, step: np.ndarray) -> tuple[np.ndarray, float, float]:
        """Changes at the nodes: -(1 + G) dy_i + dy_i+1 - parameters = step - residual."""
        cells, n = self.h.size, self.trial.y.size
        i = np.arange(cells)[:, None, None]
        row = 3 * i + np.arange(3)[None, :, None]
        entries: list[tuple[ArrayLike, ArrayLike, ArrayLike]] = [
            (row + 0 * np.arange(3), 3 * i + np.arange(3) + 0 * row, -np.eye(3) - step[..., :3]),
            (row[..., 0], row[..., 0] + 3, np.ones((cells, 3))),
            (row[..., 0], n + 0 * row[..., 0], -step[..., 3]),
            (row[..., 0], n + 1 + 0 * row[..., 0], -step[..., 4]),
        ]
        at = 3 * (self.trial.z.size - 1)
        last = 3 * cells
        entries.append(([last, last + 1, last + 2], [at, at + 1, at + 2], np.ones(3)))
        entries.append(([last], [n], [1.0 / self.trial.depth]))
        entries.append(([last + 3, last + 4], [0, 1], np.ones(2)))
        entries.append(([last + 3, last + 4], [2, 2], -self.by_centre[:, 1]))
        entries.append(([last + 3, last + 4], [n, n], -self.by_centre[:, 0]))
        rows, columns, values = (
            np.concatenate([np.ravel(entry[m]) for entry in entries]) for m in range(3)
        )
        right = np.concatenate(
            ((step[..., 5] - self.off_nodes).ravel(), -self.off_surface, -self.off_centre)
        )
        matrix = csc_matrix((values, (rows, columns)), shape=(n + 2, n + 2))
        try:
            found = splu(matrix).solve(right)
        except RuntimeError as error:
            raise NotSolvedError("the equations of structure are singular here") from error
        return found[:n].reshape(-1, 3), float(found[n]), float(found[n + 1])
