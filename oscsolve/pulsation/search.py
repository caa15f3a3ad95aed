"""From counts to isolated, polished eigenvalues of one degree on one mesh."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from oscsolve.errors import IncompleteError
from oscsolve.pulsation.compiled import LANES
from oscsolve.pulsation.inverse import Workspace
from oscsolve.pulsation.mesh import Element, Mesh, lagrange_basis
from oscsolve.pulsation.sweep import Action, count_negative
from oscsolve.star.profile import Profile

#: Polishing stops when the next change of the Rayleigh quotient will be below this, relative, or
#: when it moves by less than the second number and no longer falls: what is left is round-off.
_SETTLED = 3e-14
_STALLED = 1e-10
_MOST_STEPS = 60
#: Memory that the factors of one batch of modes may take, bytes.
_FACTOR_BYTES = 32_000_000
#: Relative width of a bracket that cannot be split any further.
_NARROWEST = 4e-15


@dataclass(frozen=True, eq=False)
class Brackets:
    """Intervals of lam that hold exactly one eigenvalue each, in rising order.

    Attributes
    ----------
    low, high : (m,) limits
    negative : (m,) int, negative eigenvalues of the action at `low`; one less at `high`
    """

    low: np.ndarray
    high: np.ndarray
    negative: np.ndarray


@dataclass(frozen=True, eq=False)
class Solution:
    """Eigenvalues and eigenvectors of one action.

    Attributes
    ----------
    lam : (m,) eigenvalues, sigma2
    negative : (m,) int, negative eigenvalues of the action just below each
    vector : (m, nodes * dof) nodal q
    swing : (m, cells, s) y = rho r xi_h at the Gauss points
    noise : (m,) round-off of lam, absolute
    """

    lam: np.ndarray
    negative: np.ndarray
    vector: np.ndarray
    swing: np.ndarray
    noise: np.ndarray

    def select(self, keep: np.ndarray) -> Solution:
        """The solution restricted to some of its modes."""
        columns = (self.lam, self.negative, self.vector, self.swing, self.noise)
        return Solution(*(column[keep] for column in columns))


def count_at(action: Action, lam: np.ndarray) -> np.ndarray:
    """(k,) int, negative eigenvalues of the action at each of the (k,) values of lam."""
    counts = np.empty(lam.size, np.int64)
    for batch in batches(lam.size, LANES):
        count_negative(action, lam[batch], counts[batch])
    return counts


def batches(items: int, most: int) -> list[slice]:
    """Slices that cut `items` into the fewest batches of at most `most`, of even size."""
    number = max(1, -(-items // most))
    edges = [items * i // number for i in range(number + 1)]
    return [slice(a, b) for a, b in zip(edges[:-1], edges[1:], strict=True)]


class PhaseCoordinate:
    """A coordinate in which modes are about evenly spaced: phase of p waves minus phase of g waves.

    Only where trial frequencies are placed depends on it, never what is found.
    """

    def __init__(self, profile: Profile, mesh: Mesh, degree: int, low: float, high: float) -> None:
        at = profile.at(0.5 * (mesh.node[:-1] + mesh.node[1:]), mesh.interval)
        width = np.diff(mesh.node)
        if low > 0.0:
            self.lam = np.geomspace(low, high, 129)
        else:
            self.lam = np.linspace(low, high, 129)
        self.phase = np.empty(self.lam.size)
        lamb = degree * (degree + 1) * at.c2 / at.x**2
        for i, lam in enumerate(self.lam):
            if degree == 0:
                waves = np.sqrt(np.maximum(lam / at.c2, 0.0))
            else:
                k2 = (lam - at.n2) * (lam - lamb) / (lam * at.c2)
                waves = np.sqrt(np.maximum(k2, 0.0)) * np.where(lam > lamb, 1.0, -1.0)
            self.phase[i] = np.sum(waves * width) / np.pi
        self.phase = np.maximum.accumulate(self.phase) + np.linspace(0.0, 1.0, self.lam.size)

    def between(self, low: float, high: float, parts: int) -> np.ndarray:
        """(parts - 1,) values of lam that cut (low, high) evenly; always strictly inside."""
        ends = np.interp((low, high), self.lam, self.phase)
        share = np.arange(1, parts) / parts
        cuts = np.interp(ends[0] + share * (ends[1] - ends[0]), self.phase, self.lam)
        even = low + share * (high - low)
        least = 1e-13 * max(abs(low), abs(high))
        inside = np.all(np.diff(np.concatenate(([low], cuts, [high]))) > least)
        return cuts if inside else even


def isolate(
    action: Action, low: float, high: float, place: Callable[[float, float, int], np.ndarray]
) -> Brackets:
    """Cut the band until every piece holds one eigenvalue.

    Parameters
    ----------
    action : the discrete action
    low, high : the band in lam
    place : ``place(low, high, parts)`` returns where to cut

    Raises
    ------
    IncompleteError
        Two eigenvalues agree to round-off and cannot be told apart.
    """
    first, last = count_at(action, np.array([low, high]))
    done: list[tuple[float, float, int]] = []
    work = [(low, high, int(first), int(last))]
    while work:
        share = max(1, LANES // len(work))
        cuts = []
        for a, b, above, below in work:
            if b - a <= _NARROWEST * max(abs(a), abs(b)):
                raise IncompleteError(
                    f"{above - below} modes agree to round-off near sigma2 = {a:.16g}; "
                    "they cannot be told apart on this mesh"
                )
            parts = max(2, min(share + 1, 2 * (above - below)))
            cuts.append(place(a, b, parts))
        counts = count_at(action, np.concatenate(cuts))
        position, pieces = 0, []
        for (a, b, above, below), cut in zip(work, cuts, strict=True):
            edges = [a, *cut, b]
            values = [above, *counts[position : position + cut.size], below]
            position += cut.size
            pieces += list(zip(edges[:-1], edges[1:], values[:-1], values[1:], strict=True))
        work = [(a, b, int(m), int(n)) for a, b, m, n in pieces if m - n > 1]
        done += [(a, b, int(m)) for a, b, m, n in pieces if m - n == 1]
    done.sort()
    columns = list(zip(*done, strict=True)) if done else ([], [], [])
    return Brackets(
        np.array(columns[0], float), np.array(columns[1], float), np.array(columns[2], np.int64)
    )


def empty_solution(action: Action) -> Solution:
    """A solution without modes, of the shapes that belong to an action."""
    cells, stages = action.width.size, action.weight.size
    return Solution(
        np.empty(0),
        np.empty(0, np.int64),
        np.empty((0, (cells * stages + 1) * action.dof)),
        np.empty((0, cells, stages)),
        np.empty(0),
    )


def random_start(action: Action, modes: int) -> tuple[np.ndarray, np.ndarray]:
    """Vectors and swings of white noise in the metric of the kinetic energy, always the same."""
    generator = np.random.default_rng(20260101)
    stages = action.weight.size
    cells = action.width.size
    inertia = np.sqrt(-action.point[:, :, 8])
    nodal = np.zeros((modes, cells * stages + 1, action.dof))
    signs = generator.choice((-1.0, 1.0), size=(modes, cells, stages))
    nodal[:, 1:, 0] = (signs / inertia).reshape(modes, -1)
    swing = np.zeros((modes, cells, stages))
    if action.ll > 0.0:
        signs = generator.choice((-1.0, 1.0), size=(modes, cells, stages))
        swing = signs / np.sqrt(action.point[:, :, 1])
    return nodal.reshape(modes, -1), swing


def polish(
    action: Action,
    brackets: Brackets,
    guess: np.ndarray | None = None,
    start: tuple[np.ndarray, np.ndarray] | None = None,
) -> Solution:
    """Eigenvalues and eigenvectors inside brackets, by fenced inverse iteration.

    Parameters
    ----------
    action : the discrete action
    brackets : one eigenvalue each
    guess : (m,) starting values, the middle of each bracket where left out
    start : vectors and swings to start from, white noise where left out

    Raises
    ------
    IncompleteError
        An iteration did not settle.
    """
    modes = brackets.low.size
    if modes == 0:
        return empty_solution(action)
    if guess is None:
        guess, gap = 0.5 * (brackets.low + brackets.high), np.zeros(modes)
    else:
        gap = _gaps(guess, brackets)
    vector, swing = random_start(action, modes) if start is None else start
    out = Solution(
        lam=np.empty(modes),
        negative=brackets.negative,
        vector=np.empty_like(vector),
        swing=np.empty_like(swing),
        noise=np.empty(modes),
    )
    for batch in batches(modes, _lanes_in_memory(action)):
        work = Workspace(action, batch.stop - batch.start)
        work.vector[:] = vector[batch].T
        work.swing[:] = np.moveaxis(swing[batch], 0, -1)
        _iterate(action, work, brackets, np.arange(batch.start, batch.stop), guess, gap, out)
    return out


def _gaps(guess: np.ndarray, brackets: Brackets) -> np.ndarray:
    """(m,) distance of each guess to its neighbours, or to the end of the band."""
    padded = np.concatenate(([brackets.low[0]], guess, [brackets.high[-1]]))
    steps = np.abs(np.diff(padded))
    return np.minimum(steps[:-1], steps[1:])


def _lanes_in_memory(action: Action) -> int:
    """How many modes can be iterated side by side within the memory allowed for factors."""
    stages, nodes = action.value.shape
    one = 8 * action.width.size * action.dof * (nodes - 1) * action.dof * nodes
    return int(np.clip(_FACTOR_BYTES // one, 4, LANES))


def _iterate(
    action: Action,
    work: Workspace,
    brackets: Brackets,
    modes: np.ndarray,
    guess: np.ndarray,
    gap: np.ndarray,
    out: Solution,
) -> None:
    """Rayleigh quotient iteration of some modes side by side, each leaving when it has settled.

    Iterates are fenced by the brackets, which the counts tighten. Near a mode the vector improves
    by (step/gap) in each iteration and the quotient by its square, so that step^2/gap is a safe
    bound of the step to come; `gap`, the distance to the next eigenvalue, is 0 where not known.
    """
    low, high = brackets.low[modes], brackets.high[modes]
    lam, gap, last = guess[modes], gap[modes], np.full(modes.size, np.inf)
    for _ in range(_MOST_STEPS):
        work.iterate(action, lam)
        # Beside a neutral mode, lam = 0, only the terms that cancel there give a scale.
        scale = np.maximum(np.abs(lam), work.noise)
        step, new = np.abs(work.step) / scale, lam + work.step
        slack = scale * np.maximum(10.0 * _SETTLED, 3.0 * np.where(step < _STALLED, step, 0.0))
        slack = np.maximum(slack, 3.0 * work.noise)
        outside = (new < low - slack) | (new > high + slack) | ~np.isfinite(new)
        stalled = (step < _STALLED) & (step > 0.5 * last) & (step < 1e3 * work.noise / scale)
        to_come = step * np.minimum(1.0, np.abs(work.step) / np.maximum(gap, 1e-300))
        quiet = np.abs(work.step) <= work.noise
        done = ~outside & ((to_come <= _SETTLED) | stalled | quiet)
        if np.any(done):
            here = modes[done]
            out.lam[here] = new[done]
            rounding = np.where(stalled, np.abs(work.step), 0.0)
            out.noise[here] = np.maximum(work.noise, rounding)[done]
            out.vector[here] = work.vector[:, done].T
            out.swing[here] = np.moveaxis(work.swing[:, :, done], -1, 0)
            if np.all(done):
                return
        below = work.negative >= brackets.negative[modes]
        low = np.where(below, np.maximum(low, lam), low)
        high = np.where(below, high, np.minimum(high, lam))
        lam, last = np.where(outside, 0.5 * (low + high), new), step
        if np.any(done):
            work.keep(~done)
            columns = (modes, low, high, gap, lam, last)
            modes, low, high, gap, lam, last = (column[~done] for column in columns)
    raise IncompleteError(
        f"the mode between sigma2 = {brackets.low[modes[0]]:.10g} and "
        f"{brackets.high[modes[0]]:.10g} did not settle"
    )


def transfer(
    solution: Solution, dof: int, old: tuple[Mesh, Element], new: tuple[Mesh, Element]
) -> tuple[np.ndarray, np.ndarray]:
    """Vectors and swings of a solution on another mesh or of another order, to start from.

    The new mesh holds every node of the old one.
    """
    (old_mesh, old_element), (new_mesh, new_element) = old, new
    width = np.diff(old_mesh.node)
    home = np.searchsorted(old_mesh.node, new_mesh.node[:-1] * (1.0 + 1e-15), side="right") - 1
    home = np.clip(home, 0, old_mesh.size - 1)
    step = np.diff(new_mesh.node)
    offset = (new_mesh.node[:-1] - old_mesh.node[home]) / width[home]
    ratio = step / width[home]
    stages = old_element.gauss.size
    modes = solution.lam.size
    nodal = solution.vector.reshape(modes, -1, dof)
    index = home[:, None] * stages + np.arange(stages + 1)
    nodes = nodal[:, index]
    vector = np.zeros((modes, new_mesh.size * new_element.gauss.size + 1, dof))
    swing = np.empty((modes, new_mesh.size, new_element.gauss.size))
    shapes = np.round(np.stack((offset, ratio), axis=1), 12)
    kinds, kind = np.unique(shapes, axis=0, return_inverse=True)
    for number, (shift, scale) in enumerate(kinds):
        cells = np.flatnonzero(kind.ravel() == number)
        inner = lagrange_basis(old_element.lobatto, shift + scale * new_element.lobatto[1:])
        where = cells[:, None] * new_element.gauss.size + np.arange(1, new_element.lobatto.size)
        vector[:, where] = np.einsum("kj,mcjd->mckd", inner, nodes[:, cells])
        gauss = lagrange_basis(old_element.gauss, shift + scale * new_element.gauss)
        swing[:, cells] = np.einsum("kj,mcj->mck", gauss, solution.swing[:, home[cells]])
    return vector.reshape(modes, -1), swing
