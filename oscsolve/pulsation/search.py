"""From counts to isolated, polished eigenvalues of one degree on one mesh."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from oscsolve.errors import IncompleteError
from oscsolve.pulsation.compiled import LANES, compiled, padded
from oscsolve.pulsation.inverse import Workspace
from oscsolve.pulsation.mesh import Element, Mesh, lagrange_basis
from oscsolve.pulsation.sweep import Action, count_negative
from oscsolve.star.profile import Profile

_MOST_STEPS = 60
#: An iteration that moves by less than this, relative, and no longer falls has met round-off.
_STALLED = 1e-10
#: What a fence forgives, relative: it may have been put right on a mode.
_SLACK = 3e-13
#: Memory that the factors of one batch of modes may take, bytes.
_FACTOR_BYTES = 128_000_000
#: Relative width of a bracket that cannot be split any further.
_NARROWEST = 4e-15


#: ``place(low, high, parts)`` returns where to cut a band into so many parts.
Place = Callable[[float, float, int], np.ndarray]


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
    vector : (nodes * dof, m) nodal q
    swing : (cells, s, m) y = rho r xi_h at the Gauss points
    noise : (m,) round-off of lam, absolute
    radius : (m,) an eigenvalue lies within this of lam (Weinstein 1934: the residual)
    """

    lam: np.ndarray
    negative: np.ndarray
    vector: np.ndarray
    swing: np.ndarray
    noise: np.ndarray
    radius: np.ndarray

    def select(self, keep: np.ndarray) -> Solution:
        """The solution restricted to some of its modes."""
        columns = (self.lam, self.negative, self.vector, self.swing, self.noise, self.radius)
        return Solution(*(column[..., keep] for column in columns))


def count_at(action: Action, lam: np.ndarray) -> np.ndarray:
    """(k,) int, negative eigenvalues of the action at each of the (k,) values of lam."""
    full = np.pad(lam, (0, padded(lam.size) - lam.size), "edge")
    counts = np.empty(full.size, np.int64)
    for first in range(0, full.size, LANES):
        batch = slice(first, first + LANES)
        count_negative(action, full[batch], counts[batch])
    return counts[: lam.size]


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
        at = mesh.at(profile, np.array([0.5]))
        x, c2, n2 = at.x[:, 0], at.c2[:, 0], at.n2[:, 0]
        width = np.diff(mesh.node)
        if low > 0.0:
            self.lam = np.geomspace(low, high, 129)
        else:
            self.lam = np.linspace(low, high, 129)
        self.phase = np.empty(self.lam.size)
        lamb = degree * (degree + 1) * c2 / x**2
        for i, lam in enumerate(self.lam):
            if degree == 0:
                waves = np.sqrt(np.maximum(lam / c2, 0.0))
            else:
                k2 = (lam - n2) * (lam - lamb) / (lam * c2)
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


@dataclass(frozen=True)
class Accuracy:
    """When to stop polishing.

    Attributes
    ----------
    value : largest error of lam, relative
    vector : largest error of the vector, in the norm of the kinetic energy
    """

    value: float = 3e-14
    vector: float = 1e-6


def isolate(action: Action, cuts: Sequence[float] | np.ndarray, place: Place) -> Brackets:
    """Cut a band until every piece holds one eigenvalue.

    Parameters
    ----------
    action : the discrete action
    cuts : the two ends of the band in lam and, where something is known, places between
    place : where to cut further

    Raises
    ------
    IncompleteError
        Two eigenvalues agree to round-off and cannot be told apart.
    """
    edges = [np.asarray(cuts, float)]
    counts = [count_at(action, edges[0])]
    done: list[tuple[float, float, int]] = []
    while edges:
        work = []
        for edge, count in zip(edges, counts, strict=True):
            for a, b, m, n in zip(edge[:-1], edge[1:], count[:-1], count[1:], strict=True):
                if m - n == 1:
                    done.append((a, b, m))
                elif m - n > 1:
                    work.append((a, b, m, n))
        edges, counts = _cut_further(action, work, place)
    done.sort()
    columns = list(zip(*done, strict=True)) if done else ([], [], [])
    return Brackets(
        np.array(columns[0], float), np.array(columns[1], float), np.array(columns[2], np.int64)
    )


def _cut_further(
    action: Action, work: list[tuple[float, float, int, int]], place: Place
) -> tuple[list[np.ndarray], list[np.ndarray]]:
    """Every piece of `work` cut once more, with the counts at its ends and cuts."""
    share = max(1, LANES // max(1, len(work)))
    cuts = []
    for a, b, above, below in work:
        if b - a <= _NARROWEST * max(abs(a), abs(b)):
            raise IncompleteError(
                f"{above - below} modes agree to round-off near sigma2 = {a:.16g}; "
                "they cannot be told apart on this mesh"
            )
        cuts.append(place(a, b, max(2, min(share + 1, 2 * (above - below)))))
    counts = count_at(action, np.concatenate(cuts)) if cuts else np.empty(0)
    found = np.split(counts, np.cumsum([cut.size for cut in cuts])[:-1])
    return (
        [np.array([a, *cut, b]) for (a, b, _, _), cut in zip(work, cuts, strict=True)],
        [
            np.array([above, *count, below])
            for (_, _, above, below), count in zip(work, found, strict=bool(work))
        ],
    )


def empty_solution(action: Action) -> Solution:
    """A solution without modes, of the shapes that belong to an action."""
    vector, swing = random_start(action, 0)
    return Solution(np.empty(0), np.empty(0, np.int64), vector, swing, np.empty(0), np.empty(0))


def random_start(action: Action, modes: int) -> tuple[np.ndarray, np.ndarray]:
    """Vectors and swings of white noise in the metric of the kinetic energy, always the same."""
    generator = np.random.default_rng(20260101)
    cells, stages = action.width.size, action.weight.size

    def signs() -> np.ndarray:
        return generator.integers(0, 2, (cells, stages, modes), np.int8) * 2.0 - 1.0

    nodal = np.zeros((cells * stages + 1, action.dof, modes))
    inertia = np.sqrt(-action.point[:, :, 8, None])
    nodal[1:, 0] = (signs() / inertia).reshape(cells * stages, modes)
    swing = np.zeros((cells, stages, modes))
    if action.ll > 0.0:
        swing = signs() / np.sqrt(action.point[:, :, 1, None])
    return nodal.reshape((cells * stages + 1) * action.dof, modes), swing


def polish(
    action: Action,
    brackets: Brackets,
    guess: np.ndarray | None = None,
    start: tuple[np.ndarray, np.ndarray] | None = None,
    accuracy: Accuracy = Accuracy(),  # noqa: B008 (frozen)
) -> Solution:
    """Eigenvalues and eigenvectors inside brackets, by fenced inverse iteration.

    Parameters
    ----------
    action : the discrete action
    brackets : one eigenvalue each
    guess : (m,) starting values, the middle of each bracket where left out
    start : vectors and swings to start from, overwritten; white noise where left out
    accuracy : when to stop

    Raises
    ------
    IncompleteError
        An iteration did not settle.
    """
    modes = brackets.low.size
    if modes == 0:
        return empty_solution(action)
    guess = 0.5 * (brackets.low + brackets.high) if guess is None else guess
    vector, swing = random_start(action, modes) if start is None else start
    lam, noise, radius = np.empty((3, modes))
    out = Solution(lam, brackets.negative, vector, swing, noise, radius)
    for batch in batches(modes, _lanes_in_memory(action)):
        work = Workspace(action, batch.stop - batch.start)
        work.vector[:] = vector[:, batch]
        work.swing[:] = swing[:, :, batch]
        _iterate(action, work, brackets, batch, guess, accuracy, out)
    return out


def _lanes_in_memory(action: Action) -> int:
    """How many modes can be iterated side by side within the memory allowed for factors."""
    stages, nodes = action.value.shape
    one = 8 * action.width.size * action.dof * (nodes - 1) * action.dof * nodes
    return int(np.clip(_FACTOR_BYTES // one, 4, LANES))


def _iterate(
    action: Action,
    work: Workspace,
    brackets: Brackets,
    batch: slice,
    guess: np.ndarray,
    accuracy: Accuracy,
    out: Solution,
) -> None:
    """Rayleigh quotient iteration of some modes side by side, each leaving when it has settled.

    Iterates are fenced by the brackets, which the counts tighten. The other eigenvalues lie
    outside the bracket, so that the distance from its ends is a proven lower bound of the gap and
    residual^2/gap one of the error of lam.
    """
    modes = np.arange(batch.start, batch.stop)
    low, high = brackets.low[modes], brackets.high[modes]
    lam, last = guess[modes], np.full(modes.size, np.inf)
    for _ in range(_MOST_STEPS):
        work.iterate(action, lam)
        # Beside a neutral mode, lam = 0, only the terms that cancel there give a scale.
        scale = np.maximum(np.abs(lam), work.noise)
        step, new = np.abs(work.step) / scale, lam + work.step
        slack = np.maximum(scale * _SLACK, 3.0 * work.noise)
        slack = np.maximum(slack, 3.0 * scale * np.where(step < _STALLED, step, 0.0))
        outside = (new < low - slack) | (new > high + slack) | ~np.isfinite(new)
        gap = np.minimum(new - brackets.low[modes], brackets.high[modes] - new)
        vector_error = work.residual / np.maximum(gap, 1e-15 * scale)
        left = work.residual * vector_error
        settled = (left <= accuracy.value * scale) & (vector_error <= accuracy.vector)
        stalled = (step < _STALLED) & (step > 0.5 * last) & (step < 1e3 * work.noise / scale)
        done = ~outside & (settled | stalled | (np.abs(work.step) <= work.noise))
        if np.any(done):
            here = modes[done]
            out.lam[here] = new[done]
            rest = np.where(settled, left, np.where(stalled, np.abs(work.step), 0.0))
            out.noise[here] = np.maximum(work.noise, rest)[done]
            out.radius[here] = work.residual[done]
            out.vector[:, here] = work.vector[:, done]
            out.swing[:, :, here] = work.swing[:, :, done]
            if np.all(done):
                return
        below = work.negative >= brackets.negative[modes]
        low = np.where(below, np.maximum(low, lam), low)
        high = np.where(below, high, np.minimum(high, lam))
        lam, last = np.where(outside, 0.5 * (low + high), new), step
        if np.any(done):
            work.keep(~done)
            columns = (modes, low, high, lam, last)
            modes, low, high, lam, last = (column[~done] for column in columns)
    raise IncompleteError(
        f"the mode between sigma2 = {brackets.low[modes[0]]:.10g} and "
        f"{brackets.high[modes[0]]:.10g} did not settle"
    )


def transfer(
    solution: Solution, dof: int, old: tuple[Mesh, Element], new: tuple[Mesh, Element]
) -> tuple[np.ndarray, np.ndarray]:
    """Vectors and swings of a solution on another mesh or of another order, to start from.

    Every node of one of the two meshes is one of the other.
    """
    (old_mesh, old_element), (new_mesh, new_element) = old, new
    modes, stages = solution.lam.size, old_element.gauss.size
    cell, basis = _places(old_mesh, old_element.lobatto, new_mesh, new_element.lobatto[1:])
    vector = np.zeros((cell.size + 1, dof * modes))
    nodal = solution.vector.reshape(old_mesh.size * stages + 1, dof * modes)
    resample(cell * stages, basis, nodal, vector[1:])
    cell, basis = _places(old_mesh, old_element.gauss, new_mesh, new_element.gauss)
    swing = np.empty((cell.size, modes))
    resample(cell * stages, basis, solution.swing.reshape(old_mesh.size * stages, modes), swing)
    shape = new_mesh.size, new_element.gauss.size, modes
    return vector.reshape((cell.size + 1) * dof, modes), swing.reshape(shape)


@compiled
def resample(first, basis, source, target):
    """target[i] = sum over j of basis[i, j] source[first[i] + j], row by row.

    Parameters
    ----------
    first : (k,) int
    basis : (k, n)
    source, target : (., columns), (k, columns)
    """
    columns = source.shape[1]
    for i in range(first.size):
        for c in range(columns):
            target[i, c] = 0.0
        for j in range(basis.shape[1]):
            weight, row = basis[i, j], first[i] + j
            for c in range(columns):
                target[i, c] += weight * source[row, c]


def _places(
    old_mesh: Mesh, nodes: np.ndarray, new_mesh: Mesh, position: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """The old cell of each `position` of each new cell, and Lagrange polynomials of `nodes` there.

    A new cell inside an old one is told from its middle, so that its ends are on the right side.
    """
    width, old_width = np.diff(new_mesh.node), np.diff(old_mesh.node)
    middle = new_mesh.node[:-1] + 0.5 * width
    finer = new_mesh.size >= old_mesh.size
    x = new_mesh.node[:-1, None] + width[:, None] * position
    of = np.broadcast_to(middle[:, None], x.shape) if finer else x
    cell = np.searchsorted(old_mesh.node, of.ravel(), side="right") - 1
    cell = np.clip(cell, 0, old_mesh.size - 1)
    return cell, lagrange_basis(nodes, (x.ravel() - old_mesh.node[cell]) / old_width[cell])
