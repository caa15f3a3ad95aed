"""All modes of one degree: searched, polished at three orders, certified by counts, refined."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from oscsolve.pulsation.mesh import Element, Mesh, band_mesh, element, model_mesh
from oscsolve.pulsation.options import SolveOptions
from oscsolve.pulsation.search import (
    Brackets,
    PhaseCoordinate,
    Solution,
    count_at,
    empty_solution,
    isolate,
    polish,
    transfer,
)
from oscsolve.pulsation.sweep import Action, build_action
from oscsolve.star.profile import Profile

#: Round-off of an eigenvalue, relative: a few times what the exact spectra show.
ROUND_OFF = 1e-13
#: The search band reaches this much further, relative, so that modes at its ends do not change
#: sides between orders.
_MARGIN = 2e-3
_MOST_ROUNDS = 8
#: Modes of one degree that are held in memory with their vectors.
_MODES_AT_ONCE = 300


@dataclass(frozen=True)
class Problem:
    """What is to be solved for one degree.

    Attributes
    ----------
    degree, gravity, surface : as in `solve_modes`
    low, high : the band in sigma2
    floor, limit : sigma2 that no trial value may pass (cut-offs), or infinities
    tolerance : largest relative error of a frequency
    """

    degree: int
    gravity: str
    surface: str
    low: float
    high: float
    floor: float
    limit: float
    tolerance: float


@dataclass(frozen=True, eq=False)
class DegreeSolution:
    """Modes of one degree inside the band.

    Attributes
    ----------
    solution : modes at the reported order
    error : (m,) estimated error of lam, absolute
    first, beyond : number of the first mode above the lower end of the band, and of the first one
        above its upper end, by the counts there; comparable between meshes
    mesh, element, action : what they were computed on
    refined : rounds of refinement made
    """

    solution: Solution
    error: np.ndarray
    first: int
    beyond: int
    mesh: Mesh
    element: Element
    action: Action
    refined: int


@dataclass(frozen=True, eq=False)
class _Order:
    """One solution of the ladder of orders on a mesh."""

    mesh: Mesh
    element: Element
    action: Action
    solution: Solution

    @property
    def uniform(self) -> int:
        """Negative eigenvalues that the action of this size has in a uniform medium."""
        return self.action.dof * self.mesh.size * self.element.gauss.size

    @property
    def index(self) -> np.ndarray:
        """(m,) int, the number of each mode, comparable between orders and meshes."""
        return self.uniform + 1 - self.solution.negative


def solve_degree(profile: Profile, problem: Problem, options: SolveOptions) -> DegreeSolution:
    """Find, certify and refine all modes of one degree in the band."""
    low, high = _search_band(problem)
    phase = options.phase_limit(problem.tolerance)
    mesh = band_mesh(profile, problem.degree, (low, high), phase, options.most_cells)
    mesh = mesh.split(np.full(mesh.size, options.cells_factor))
    previous: _Order | None = None
    for rounds in range(_MOST_ROUNDS + 1):
        ladder = _climb(profile, problem, mesh, options.stages, previous)
        error = _error_estimate(ladder)
        ends = (
            ladder[2].uniform
            + 1
            - count_at(ladder[2].action, np.array([problem.low, problem.high]))
        )
        inside = (ladder[2].index >= ends[0]) & (ladder[2].index < ends[1])
        scale = 2.0 * problem.tolerance * np.abs(ladder[2].solution.lam)
        late = inside & (error > np.maximum(scale, 2.0 * _rounding(ladder[2].solution)))
        parts = np.maximum(_cells_to_split(ladder, late), _crowded_cells(ladder[2], inside))
        if np.all(parts == 1) or rounds == _MOST_ROUNDS:
            break
        if mesh.size + np.sum(parts - 1) > options.most_cells:
            break
        previous, mesh = ladder[2], mesh.split(parts)
    best = ladder[2]
    return DegreeSolution(
        solution=best.solution.select(inside),
        error=error[inside],
        first=int(ends[0]),
        beyond=int(ends[1]),
        mesh=best.mesh,
        element=best.element,
        action=best.action,
        refined=rounds,
    )


def sub_bands(profile: Profile, problem: Problem) -> list[Problem]:
    """The problem in pieces of some hundred modes each, which bounds the memory of a run.

    Pieces are cut where the phase of the waves says; which mode lies on which side is settled by
    the counts of each piece, whose numbers must join.
    """
    low, high = problem.low, problem.high
    coordinate = PhaseCoordinate(profile, model_mesh(profile), problem.degree, low, high)
    expected = coordinate.phase[-1] - coordinate.phase[0]
    parts = int(np.ceil(expected / _MODES_AT_ONCE))
    if parts <= 1:
        return [problem]
    edges = [low, *coordinate.between(low, high, parts), high]
    return [
        replace(problem, low=float(a), high=float(b))
        for a, b in zip(edges[:-1], edges[1:], strict=True)
    ]


def _search_band(problem: Problem) -> tuple[float, float]:
    margin = _MARGIN * max(abs(problem.low), abs(problem.high))
    low = problem.low - (margin if problem.degree == 0 else _MARGIN * problem.low)
    high = min(problem.high + _MARGIN * abs(problem.high), problem.limit)
    return min(max(low, problem.floor), problem.low), max(high, problem.high)


def _climb(
    profile: Profile, problem: Problem, mesh: Mesh, stages: int, previous: _Order | None
) -> list[_Order]:
    """Solutions with stages - 2, stages - 1 and `stages` Gauss points on one mesh."""
    ladder: list[_Order] = []
    for s in range(stages - 2, stages + 1):
        elem = element(s)
        action = build_action(profile, mesh, elem, problem.degree, problem.gravity, problem.surface)
        known = ladder[-1] if ladder else previous
        start = _Order(mesh, elem, action, empty_solution(action))
        solution = _solve_order(profile, problem, start, known)
        ladder.append(replace(start, solution=solution))
    return ladder


def _solve_order(
    profile: Profile, problem: Problem, order: _Order, known: _Order | None
) -> Solution:
    """Solve one action, from what is known on another where its counts bear that out."""
    low, high = _search_band(problem)
    action = order.action
    if known is not None and known.solution.lam.size:
        lam = known.solution.lam
        cuts = np.concatenate(([low], 0.5 * (lam[1:] + lam[:-1]), [high]))
        counts = count_at(action, cuts)
        expected = order.uniform + 1 - known.index
        if np.array_equal(counts[:-1], expected) and counts[-1] == counts[-2] - 1:
            start = transfer(
                known.solution,
                action.dof,
                (known.mesh, known.element),
                (order.mesh, order.element),
            )
            return polish(action, Brackets(cuts[:-1], cuts[1:], counts[:-1]), lam, start)
    place = PhaseCoordinate(profile, order.mesh, problem.degree, low, high).between
    return polish(action, isolate(action, low, high, place))


def _error_estimate(ladder: list[_Order]) -> np.ndarray:
    """(m,) error of the eigenvalues of highest order.

    With d1 and d2 the changes from the first to the second and the second to the third order,
    errors fall about geometrically and d2 * (d2/d1) estimates what is left; the ratio is
    enlarged by 6 and kept between 0.06 and 1. Modes that a lower order does not hold get the
    change they do have, and lucky dips are filled. Round-off is added: a floor, or what the last
    polishing step shows.
    """
    top = ladder[2]
    lam = top.solution.lam
    if lam.size == 0:
        return np.empty(0)
    d1, d2 = (_change(ladder[k], ladder[k + 1]) for k in (0, 1))
    d1 = _follow(ladder[1], top, d1)
    missing = np.isnan(d1) | (d1 == 0.0)
    ratio = np.clip(6.0 * np.divide(d2, d1, out=np.ones_like(d2), where=~missing), 0.06, 1.0)
    unknown = np.isnan(d2)
    worst = np.nanmax(d2 / np.abs(lam)) if not np.all(unknown) else np.inf
    d2 = np.where(unknown, worst * np.abs(lam), d2)
    left = d2 * np.where(unknown, 1.0, ratio) / np.maximum(np.abs(lam), 1e-300)
    return _without_lucky_dips(left) * np.abs(lam) + _rounding(top.solution)


def _without_lucky_dips(values: np.ndarray) -> np.ndarray:
    """The largest of each value and its two neighbours on either side.

    The change of a mode can vanish by chance on its way through zero, its error does not; modes
    beside it are of a like kind and do not share the chance.
    """
    padded = np.pad(values, 2, mode="edge")
    return np.max([padded[k : k + values.size] for k in range(5)], axis=0)


def _rounding(solution: Solution) -> np.ndarray:
    """(m,) the part of the error that no refinement takes away."""
    return np.maximum(ROUND_OFF * np.abs(solution.lam), 2.0 * solution.noise)


def _change(lower: _Order, upper: _Order) -> np.ndarray:
    """(m,) |change of lam| of the modes of `upper` since `lower`; NaN where that lacks a mode."""
    return np.abs(_follow(lower, upper, lower.solution.lam) - upper.solution.lam)


def _follow(lower: _Order, upper: _Order, values: np.ndarray) -> np.ndarray:
    """Values of the modes of `lower` in the places that these modes have in `upper`."""
    found = dict(zip(lower.index.tolist(), values.tolist(), strict=True))
    return np.array([found.get(i, np.nan) for i in upper.index.tolist()], dtype=float)


def _crowded_cells(order: _Order, inside: np.ndarray) -> np.ndarray:
    """(cells,) int, 3 for a cell that holds most of the energy of a mode, else 1.

    Such a mode is a defect of the mesh until a finer one shows it again.
    """
    action = order.action
    stages, width = order.element.gauss.size, np.diff(order.mesh.node)[:, None]
    weight = order.element.weight * width
    swing = action.point[:, :, 1] * weight
    lift = np.mean(-action.point[:, :, 8], axis=1) * width[:, 0]
    parts = np.ones(order.mesh.size, np.int64)
    for i in np.flatnonzero(inside):
        q1 = order.solution.vector[i].reshape(-1, action.dof)[::stages, 0]
        energy = np.sum(swing * order.solution.swing[i] ** 2, axis=1)
        energy += lift * 0.5 * (q1[1:] ** 2 + q1[:-1] ** 2)
        parts[energy > 0.5 * np.sum(energy)] = 3
    return parts


def _cells_to_split(ladder: list[_Order], late: np.ndarray) -> np.ndarray:
    """(cells,) int, 2 for the cells that hold the error of the modes that need it, else 1.

    The action of the difference of two solutions is the difference of their eigenvalues; taken
    cell by cell, with absolute values, it shows where that comes from. Absolute terms can exceed
    the difference by far (at the centre they do), so cells are taken, largest first, until what
    the others hold is small beside the difference itself.
    """
    lower, upper = ladder[1], ladder[2]
    if not np.any(late):
        return np.ones(upper.mesh.size, np.int64)
    places = {number: i for i, number in enumerate(lower.index.tolist())}
    vector, _ = transfer(
        lower.solution, upper.action.dof, (lower.mesh, lower.element), (upper.mesh, upper.element)
    )
    marked = np.zeros(upper.mesh.size, bool)
    for i in np.flatnonzero(late):
        j = places.get(int(upper.index[i]))
        if j is None:
            return np.full(upper.mesh.size, 2)
        sign = np.sign(np.dot(vector[j], upper.solution.vector[i]))
        difference = sign * vector[j] - upper.solution.vector[i]
        share = _absolute_action(upper, difference, upper.solution.lam[i])
        order = np.argsort(share)[::-1]
        running = np.cumsum(share[order])
        change = abs(lower.solution.lam[j] - upper.solution.lam[i])
        rest = min(0.02 * running[-1], 0.1 * change)
        needed = int(np.searchsorted(running, running[-1] - rest)) + 1
        marked[order[:needed]] = True
    return np.where(marked, 2, 1)


def _absolute_action(order: _Order, vector: np.ndarray, lam: float) -> np.ndarray:
    """(cells,) sum of the absolute terms of the action in each cell."""
    action, elem = order.action, order.element
    b0, b1, s1, s2, b22, c11, c21, d0, d1, d2 = np.moveaxis(action.point, -1, 0)
    beta = b1 / lam if action.ll > 0.0 else np.zeros_like(b1)
    b11 = b0 + beta
    # Where b0 and beta cancel the terms below are large and cancel too: keep them in proportion.
    b11 = np.copysign(np.maximum(np.abs(b11), 0.1 * (np.abs(b0) + np.abs(beta))), b11)
    h = np.diff(order.mesh.node)[:, None]
    stages = elem.gauss.size
    cell = np.arange(order.mesh.size)[:, None] * stages + np.arange(stages + 1)
    nodal = vector.reshape(-1, action.dof)
    q1 = nodal[cell, 0] @ elem.value.T
    e = nodal[cell, 0] @ elem.slope.T / h - c11 * q1
    z = s1 * q1
    total = np.abs((d0 + d1 * lam) * q1 * q1)
    if action.dof == 2:
        q2 = nodal[cell, 1] @ elem.value.T
        z = z + s2 * q2
        f = nodal[cell, 1] @ elem.slope.T / h - c21 * q1
        total += np.abs(f * f / b22) + np.abs(d2 * q2 * q2)
    total += np.abs(e * e / b11) + np.abs(b0 * beta * z * z / b11)
    return np.sum(total * elem.weight * h, axis=1)
