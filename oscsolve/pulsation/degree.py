"""All modes of one degree: searched on a rough mesh, polished, certified by counts, refined."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from oscsolve.errors import IncompleteError
from oscsolve.pulsation.estimate import cells_to_split, changes, error_estimate, rounding
from oscsolve.pulsation.mesh import Element, Ground, Mesh, band_mesh, element, rough_mesh
from oscsolve.pulsation.options import SolveOptions
from oscsolve.pulsation.search import (
    Accuracy,
    Brackets,
    PhaseCoordinate,
    Place,
    Solution,
    count_at,
    empty_solution,
    isolate,
    polish,
    random_start,
    transfer,
)
from oscsolve.pulsation.sweep import Action, build_action
from oscsolve.star.profile import Profile

#: The search band reaches this much further, relative, so that modes at its ends do not change
#: sides between meshes.
_MARGIN = 2e-3
_MOST_ROUNDS = 8
#: Modes of one degree that are held in memory with their vectors: at most so many, and at most so
#: many bytes of them, about 400 bytes to a mode and cell (s = 4, vectors, starts and workspace).
_MODES_AT_ONCE, _BYTES_AT_ONCE, _BYTES_PER_CELL = 300, 1_500_000_000, 400
#: Time that a mode takes per cell, by Gauss points: two passes and a step of inverse iteration.
_COST = {3: 1.0, 4: 1.6}
#: Phase per cell of meshes at the default tolerance, radian.
_COARSEST = 0.45
#: Gauss points on the rough mesh, and how well its modes need to be known.
_ROUGH_STAGES = 3
_ROUGH_ACCURACY = Accuracy(value=1e-13, vector=1e-9)


NO_GUESSES = np.empty(0)


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

    @property
    def search_band(self) -> tuple[float, float]:
        """A band a little wider, within the limits."""
        margin = _MARGIN * max(abs(self.low), abs(self.high))
        low = self.low - (margin if self.degree == 0 else _MARGIN * self.low)
        high = min(self.high + _MARGIN * abs(self.high), self.limit)
        return min(max(low, self.floor), self.low), max(high, self.high)

    @property
    def accuracy(self) -> Accuracy:
        """How well eigenvalues and vectors of one mesh are to be polished."""
        return Accuracy(max(3e-14, 1e-3 * self.tolerance), max(1e-10, min(1e-6, self.tolerance)))


@dataclass(frozen=True, eq=False)
class DegreeSolution:
    """Modes of one degree inside the band.

    Attributes
    ----------
    solution : the modes
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
class _Discrete:
    """The action of a problem on one mesh, and its modes, none until they are found."""

    mesh: Mesh
    element: Element
    action: Action
    solution: Solution

    def number(self, negative: np.ndarray) -> np.ndarray:
        """(m,) int, the number of a mode with so many negative eigenvalues just below it.

        Comparable between meshes: the part that a uniform medium has is taken away.
        """
        return self.action.dof * self.mesh.size * self.element.gauss.size + 1 - negative


def solve_degree(
    profile: Profile,
    ground: Ground,
    problem: Problem,
    options: SolveOptions,
    guesses: np.ndarray = NO_GUESSES,
) -> DegreeSolution:
    """Find, certify and refine all modes of one degree in the band.

    `guesses` are values of lam, rising, that speed up the search and change nothing else.
    """
    band = problem.search_band
    mesh, stages = _cheapest_mesh(ground, problem, options)
    rough = rough_mesh(ground, problem.degree, band)
    place = PhaseCoordinate(profile, rough, problem.degree, *band).between
    known = _discretise(profile, problem, rough, _ROUGH_STAGES)
    known = _search(known, band, place, guesses)
    for rounds in range(_MOST_ROUNDS + 1):
        here = _discretise(profile, problem, mesh, stages)
        edges = np.array([band[0], problem.low, problem.high, band[1]])
        first, *ends, beyond = here.number(count_at(here.action, edges))
        here = _take_on(here, band, place, known, problem.accuracy, (first, beyond))
        solution = here.solution
        upper = _discretise(profile, problem, mesh, stages + 1)
        change = changes(upper.action, stages, solution)
        error = error_estimate(solution, change)
        number = here.number(solution.negative)
        inside = (number >= ends[0]) & (number < ends[1])
        scale = 2.0 * problem.tolerance * np.abs(solution.lam)
        late = inside & (error > np.maximum(scale, 2.0 * rounding(solution)))
        parts = cells_to_split(here.action, upper.action, solution, change, late)
        parts = np.maximum(parts, _crowded_cells(here, inside))
        if np.all(parts == 1) or rounds == _MOST_ROUNDS:
            break
        if mesh.size + np.sum(parts - 1) > options.most_cells:
            break
        known, mesh = here, mesh.split(parts)
    return DegreeSolution(
        solution=solution.select(inside),
        error=error[inside],
        first=int(ends[0]),
        beyond=int(ends[1]),
        mesh=here.mesh,
        element=here.element,
        action=here.action,
        refined=rounds,
    )


def _cheapest_mesh(ground: Ground, problem: Problem, options: SolveOptions) -> tuple[Mesh, int]:
    """The mesh, and the Gauss points per cell, that reach the tolerance at the least cost."""
    choices = _COST if options.stages is None else {options.stages: 1.0}
    meshes = {}
    for stages in choices:
        phase = options.phase_limit(problem.tolerance, stages)
        meshes[stages] = band_mesh(
            ground, problem.degree, problem.search_band, phase, options.most_cells
        )
    best = min(choices, key=lambda stages: choices[stages] * meshes[stages].size)
    mesh = meshes[best]
    return mesh.split(np.full(mesh.size, options.cells_factor)), best


def sub_bands(profile: Profile, ground: Ground, problem: Problem) -> list[Problem]:
    """The problem in pieces of some hundred modes each, which bounds the memory of a run.

    Pieces are cut where the phase of the waves says; which mode lies on which side is settled by
    the counts of each piece, whose numbers must join.
    """
    low, high = problem.low, problem.high
    mesh = rough_mesh(ground, problem.degree, (low, high))
    coordinate = PhaseCoordinate(profile, mesh, problem.degree, low, high)
    expected = coordinate.phase[-1] - coordinate.phase[0]
    cells = ground.mesh.size + np.sum(ground.phase(problem.degree, (low, high))) / _COARSEST
    at_once = min(_MODES_AT_ONCE, max(20.0, _BYTES_AT_ONCE / (_BYTES_PER_CELL * cells)))
    parts = int(np.ceil(expected / at_once))
    if parts <= 1:
        return [problem]
    edges = [low, *coordinate.between(low, high, parts), high]
    return [
        replace(problem, low=float(a), high=float(b))
        for a, b in zip(edges[:-1], edges[1:], strict=True)
    ]


def _discretise(profile: Profile, problem: Problem, mesh: Mesh, stages: int) -> _Discrete:
    elem = element(stages)
    action = build_action(profile, mesh, elem, problem.degree, problem.gravity, problem.surface)
    return _Discrete(mesh, elem, action, empty_solution(action))


def _search(
    here: _Discrete, band: tuple[float, float], place: Place, guesses: np.ndarray
) -> _Discrete:
    """Find all modes of an action from nothing, or from guesses of any quality."""
    guesses = guesses[(guesses > band[0]) & (guesses < band[1])]
    middles = 0.5 * (guesses[1:] + guesses[:-1])
    brackets = isolate(here.action, [band[0], *middles, band[1]], place)
    start = 0.5 * (brackets.low + brackets.high)
    if guesses.size:
        nearest = guesses[np.argmin(np.abs(guesses - start[:, None]), axis=1)]
        inside = (nearest > brackets.low) & (nearest < brackets.high)
        start = np.where(inside, nearest, start)
    return replace(here, solution=polish(here.action, brackets, start, accuracy=_ROUGH_ACCURACY))


def _take_on(
    here: _Discrete,
    band: tuple[float, float],
    place: Place,
    known: _Discrete,
    accuracy: Accuracy,
    ends: tuple[int, int],
) -> _Discrete:
    """Find all modes of an action, from those on another mesh.

    Each is expected between the middles to its neighbours. By Weinstein (1934) an eigenvalue lies
    within the residual of each that was polished; if these intervals lie inside their own
    brackets, and the counts at the two ends of the band allow no more, then every bracket holds
    exactly one. Where that fails, counts at all middles show which brackets to search anew.
    `ends` are the numbers of the first mode in the band and the first beyond it, by those counts.
    """
    lam = known.solution.lam
    cuts = np.concatenate((band[:1], 0.5 * (lam[1:] + lam[:-1]), band[1:]))
    numbers = known.number(known.solution.negative)
    if np.array_equal(numbers, np.arange(*ends)):
        if numbers.size == 0:
            return here
        expected = Brackets(cuts[:-1], cuts[1:], here.number(numbers))
        try:
            solution = _polish_from(here, expected, known, accuracy)
        except IncompleteError:
            pass
        else:
            reach = 2.0 * solution.radius + solution.noise
            if np.all((solution.lam - reach > cuts[:-1]) & (solution.lam + reach < cuts[1:])):
                return replace(here, solution=solution)
    brackets = isolate(here.action, cuts, place)
    return replace(here, solution=_polish_from(here, brackets, known, accuracy))


def _polish_from(
    here: _Discrete, brackets: Brackets, known: _Discrete, accuracy: Accuracy
) -> Solution:
    """Modes in brackets, started from those of the same number where these lie inside."""
    if brackets.low.size == 0:
        return here.solution
    lam, numbers = known.solution.lam, known.number(known.solution.negative)
    _, old, new = np.intersect1d(numbers, here.number(brackets.negative), return_indices=True)
    fits = (lam[old] > brackets.low[new]) & (lam[old] < brackets.high[new])
    old, new = old[fits], new[fits]
    guess = 0.5 * (brackets.low + brackets.high)
    guess[new] = lam[old]
    meshes = (known.mesh, known.element), (here.mesh, here.element)
    start = transfer(known.solution.select(old), here.action.dof, *meshes)
    if new.size < guess.size:
        # Columns of `start` in the places of their modes, white noise in the others.
        whole = random_start(here.action, guess.size)
        for columns, found in zip(whole, start, strict=True):
            columns[..., new] = found
        start = whole
    return polish(here.action, brackets, guess, start, accuracy)


def _crowded_cells(here: _Discrete, inside: np.ndarray) -> np.ndarray:
    """(cells,) int, 3 for a cell that holds most of the energy of a mode, else 1.

    Such a mode is a defect of the mesh until a finer one shows it again.
    """
    action, stages = here.action, here.element.gauss.size
    width = np.diff(here.mesh.node)[:, None]
    lift = np.mean(-action.point[:, :, 8], axis=1)[:, None] * width
    nodal = here.solution.vector.reshape(here.mesh.size * stages + 1, action.dof, inside.size)
    q1 = nodal[::stages, 0][:, inside]
    energy = lift * 0.5 * (q1[1:] ** 2 + q1[:-1] ** 2)
    for k in range(stages):
        factor = action.point[:, k, 1, None] * here.element.weight[k] * width
        energy += factor * here.solution.swing[:, k][:, inside] ** 2
    crowded = np.any(energy > 0.5 * np.sum(energy, axis=0), axis=1)
    return np.where(crowded, 3, 1)
