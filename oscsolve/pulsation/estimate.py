"""How wrong a frequency is: the same mode seen by collocation of the next higher order.

Let q solve the problem with s Gauss points per cell. With s + 1 points the same values at the
ends of the cells, and inside each cell whatever makes its action stationary, give an action
S'(lam) that differs from zero, and

    lam' = lam - S'/T

is the eigenvalue that the higher order would have found, up to the square of the difference of
the two vectors. That takes one pass over the cells and no iteration, and shows at once which
cells the difference comes from.
"""

from __future__ import annotations

import numpy as np

from oscsolve.pulsation.boundary import surface_term
from oscsolve.pulsation.compiled import LANES, compiled
from oscsolve.pulsation.search import Solution, batches
from oscsolve.pulsation.sweep import Action, _assemble

#: Round-off of an eigenvalue, relative: a few times what the exact spectra show.
ROUND_OFF = 1e-13
#: The change to the next order holds at least half of the error as long as that order errs by no
#: more than half of what this one does.
_CAUTION = 2.0
#: Memory of one batch of forms by cell, bytes.
_FORM_BYTES = 16_000_000


def changes(action: Action, stages: int, solution: Solution) -> np.ndarray:
    """(m,) lam' - lam for the modes of a solution with `stages` points, on an action with more."""
    found = [-np.sum(form, axis=0) for form in _forms(action, stages, solution)]
    return np.concatenate(found) if found else np.empty(0)


def _forms(action: Action, stages: int, solution: Solution) -> list[np.ndarray]:
    """(cells + 1, lanes) twice the action of each cell and of the top, batch after batch."""
    cells, dof = action.width.size, action.dof
    lanes = int(np.clip(_FORM_BYTES // (8 * (cells + 1)), 1, LANES))
    out: list[np.ndarray] = []
    if solution.lam.size == 0:
        return out
    for batch in batches(solution.lam.size, lanes):
        nodal = solution.vector.reshape(cells * stages + 1, dof, solution.lam.size)
        ends = np.ascontiguousarray(nodal[::stages, :, batch])
        form = np.empty((cells + 1, ends.shape[2]))
        condensed_action(action, solution.lam[batch], ends, form)
        out.append(form)
    return out


@compiled
def condensed_action(action, lam, ends, form):
    """Twice the action of every cell, stationary inside, for given values at its ends.

    Parameters
    ----------
    action : `Action`
    lam : (lanes,) sigma2
    ends : (cells + 1, dof, lanes) q at the ends of the cells
    form : (cells + 1, lanes), receives the forms; the last is that of the top
    """
    dof, lanes = action.dof, lam.size
    nodes = action.value.shape[1]
    cells = action.width.size
    size, inner = dof * nodes, dof * (nodes - 2)
    matrix = np.empty((size, size, lanes))
    scratch = np.empty((4, lanes))
    value = np.empty((2 * dof, lanes))
    mu, inverse, factor = np.empty(lanes), np.empty(lanes), np.empty(lanes)
    negative = np.zeros(lanes, np.int64)
    for j in range(lanes):
        mu[j] = 1.0 / lam[j] if action.ll > 0.0 else 0.0
    for cell in range(cells):
        _assemble(action, cell, lam, mu, scratch, matrix, negative)
        for p in range(inner):
            for j in range(lanes):
                inverse[j] = 1.0 / matrix[p, p, j]
            for a in range(p + 1, size):
                for j in range(lanes):
                    factor[j] = matrix[p, a, j] * inverse[j]
                for b in range(a, size):
                    for j in range(lanes):
                        matrix[a, b, j] -= factor[j] * matrix[p, b, j]
        for a in range(dof):
            for j in range(lanes):
                value[a, j] = ends[cell, a, j] - ends[cell + 1, a, j]
                value[dof + a, j] = ends[cell + 1, a, j]
        for j in range(lanes):
            form[cell, j] = action.node_term[cell] * ends[cell, 0, j] ** 2
        for a in range(2 * dof):
            for j in range(lanes):
                form[cell, j] += matrix[inner + a, inner + a, j] * value[a, j] ** 2
            for b in range(a + 1, 2 * dof):
                for j in range(lanes):
                    form[cell, j] += (
                        2.0 * matrix[inner + a, inner + b, j] * value[a, j] * value[b, j]
                    )
    for j in range(lanes):
        k11, k12, k22, _, _, _, _ = surface_term(action.top, lam[j], mu[j])
        q1 = ends[cells, 0, j]
        form[cells, j] = k11 * q1 * q1
        if dof == 2:
            q2 = ends[cells, 1, j]
            form[cells, j] += 2.0 * k12 * q1 * q2 + k22 * q2 * q2


def error_estimate(solution: Solution, change: np.ndarray) -> np.ndarray:
    """(m,) error of the eigenvalues, absolute, from their changes to the next order.

    Lucky dips are filled. Round-off is added: a floor, or what the last step of polishing shows.
    """
    if solution.lam.size == 0:
        return np.empty(0)
    left = _CAUTION * np.nan_to_num(np.abs(change), nan=np.inf)
    return _without_lucky_dips(solution.lam, left) + rounding(solution)


def _without_lucky_dips(lam: np.ndarray, error: np.ndarray) -> np.ndarray:
    """The largest relative error of each mode and its two neighbours on either side.

    The change of a mode can vanish by chance on its way through zero, its error does not; modes
    beside it are of a like kind and do not share the chance.
    """
    scale = np.maximum(np.abs(lam), 1e-300)
    padded = np.pad(error / scale, 2, mode="edge")
    return scale * np.max([padded[k : k + lam.size] for k in range(5)], axis=0)


def rounding(solution: Solution) -> np.ndarray:
    """(m,) the part of the error that no refinement takes away."""
    return np.maximum(ROUND_OFF * np.abs(solution.lam), 2.0 * solution.noise)


def cells_to_split(
    lower: Action, upper: Action, solution: Solution, change: np.ndarray, late: np.ndarray
) -> np.ndarray:
    """(cells,) int, 2 for the cells that hold the error of the modes that need it, else 1.

    Of what the cells add to the change of a mode of `lower` the largest are taken, until what the
    others hold is small beside the change itself.
    """
    marked = np.zeros(upper.width.size, bool)
    stages, few, rest = lower.weight.size, solution.select(late), np.abs(change[late])
    forms = zip(_forms(lower, stages, few), _forms(upper, stages, few), strict=True)
    for first, second in forms:
        share = np.abs(first - second)[:-1]
        for row, left in zip(share.T, rest, strict=False):
            order = np.argsort(row)[::-1]
            running = np.cumsum(row[order])
            if not np.isfinite(running[-1]):
                return np.full(marked.size, 2)
            needed = running[-1] - min(0.02 * running[-1], 0.1 * left)
            marked[order[: int(np.searchsorted(running, needed)) + 1]] = True
        rest = rest[share.shape[1] :]
    return np.where(marked, 2, 1)
