"""Isolation by counts, fenced polishing, transfer between meshes, and what is refused."""

from __future__ import annotations

import numpy as np
import pytest

from oscsolve import IncompleteError, polytrope, solve_modes, uniform_sphere
from oscsolve.errors import BandError
from oscsolve.pulsation import search
from oscsolve.pulsation.mesh import Ground, band_mesh, element, lagrange_basis, model_mesh
from oscsolve.pulsation.search import (
    Brackets,
    PhaseCoordinate,
    count_at,
    isolate,
    polish,
    transfer,
)
from oscsolve.pulsation.sweep import build_action
from oscsolve.star.profile import Profile


def halves(low: float, high: float, parts: int) -> np.ndarray:
    """Cuts without any idea of the spectrum."""
    return np.linspace(low, high, parts + 1)[1:-1]


@pytest.fixture
def problem(make_action, coarse_n3):
    """Mesh and action of l = 2 with twenty modes in 0.5 < sigma2 < 300."""
    return make_action(coarse_n3, 2)


def test_every_bracket_holds_one_mode_and_none_is_left_out(problem):
    _, action = problem
    brackets = isolate(action, (0.5, 300.0), halves)
    first, last = count_at(action, np.array([0.5, 300.0]))
    assert brackets.low.size == first - last >= 15
    assert np.array_equal(count_at(action, brackets.low), brackets.negative)
    assert np.array_equal(count_at(action, brackets.high), brackets.negative - 1)
    assert np.all(brackets.low[1:] >= brackets.high[:-1])
    assert np.array_equal(brackets.negative, np.arange(first, last, -1))


def test_where_trials_are_placed_does_not_change_what_is_found(problem, coarse_n3):
    mesh, action = problem
    place = PhaseCoordinate(Profile(coarse_n3), mesh, 2, 0.5, 300.0).between
    by_phase = polish(action, isolate(action, (0.5, 300.0), place))
    by_halves = polish(action, isolate(action, (0.5, 300.0), halves))
    assert np.array_equal(by_phase.negative, by_halves.negative)
    # Both end at round-off of the quotient.
    assert by_phase.lam == pytest.approx(by_halves.lam, rel=1e-12)


def test_cuts_of_the_phase_coordinate_lie_inside(coarse_n3, make_action):
    mesh, _ = make_action(coarse_n3, 2)
    coordinate = PhaseCoordinate(Profile(coarse_n3), mesh, 2, 0.5, 300.0)
    for low, high in ((0.5, 300.0), (0.5, 0.5000001), (7.0, 7.1), (299.0, 300.0)):
        cuts = coordinate.between(low, high, 7)
        assert cuts.size == 6 and np.all(np.diff([low, *cuts, high]) > 0.0)


def test_polishing_ends_at_a_zero_of_the_action(problem):
    """Just below and above each eigenvalue the counts differ by one."""
    _, action = problem
    found = polish(action, isolate(action, (0.5, 300.0), halves))
    below, above = (count_at(action, found.lam * (1.0 + side * 1e-11)) for side in (-1, 1))
    assert np.array_equal(below, found.negative) and np.array_equal(above, found.negative - 1)
    assert np.all(found.noise < 1e-11 * found.lam)


def test_polishing_needs_no_luck_with_the_start(problem):
    _, action = problem
    brackets = isolate(action, (0.5, 300.0), halves)
    expected = polish(action, brackets).lam
    for share in (0.001, 0.999):
        guess = brackets.low + share * (brackets.high - brackets.low)
        assert polish(action, brackets, guess).lam == pytest.approx(expected, rel=1e-12)


def test_a_start_on_the_eigenvalue_itself_is_no_accident(make_action):
    """Regression: a last pivot of exactly zero once turned the vector into NaN for good."""
    _, action = make_action(uniform_sphere(2.2), 8, stages=4)
    brackets = isolate(action, (3.0, 300.0), halves)
    exact = polish(action, brackets).lam
    for nudge in range(-3, 4):
        guess = exact + nudge * np.spacing(exact)
        assert polish(action, brackets, guess).lam == pytest.approx(exact, rel=1e-13)


def test_an_empty_band_has_an_empty_solution(problem):
    _, action = problem
    found = polish(action, isolate(action, (8.0, 8.001), halves))
    assert found.lam.size == 0 and found.vector.shape[-1] == 0 and found.swing.shape[-1] == 0


def test_modes_equal_to_round_off_are_refused(problem, monkeypatch):
    """No star here has two: the counts of a double eigenvalue at sigma2 = 2 stand in."""
    _, action = problem
    monkeypatch.setattr(search, "count_at", lambda _, lam: np.where(lam < 2.0, 7, 5))
    with pytest.raises(IncompleteError, match=r"2 modes agree to round-off near sigma2 = (2|1\.9)"):
        isolate(action, (1.0, 4.0), halves)


def test_a_bracket_without_a_mode_is_refused(problem):
    _, action = problem
    wrong = Brackets(np.array([8.0]), np.array([8.001]), count_at(action, np.array([8.0])))
    with pytest.raises(IncompleteError, match="between sigma2 = 8 and 8.001 did not settle"):
        polish(action, wrong)


def test_transfer_keeps_the_function(problem, coarse_n3):
    """The polynomials of a cell are carried over exactly: values at the new nodes tell."""
    mesh, action = problem
    old = element(3)
    solution = polish(action, isolate(action, (5.0, 60.0), halves))
    parts = np.array([1, 3, 2] * mesh.size)[: mesh.size]
    finer, new = mesh.split(parts), element(5)
    vector, swing = transfer(solution, 2, (mesh, old), (finer, new))
    assert vector.shape == ((finer.size * 5 + 1) * 2, solution.lam.size)
    nodal = vector.reshape(-1, 2, solution.lam.size)[::5]
    first = np.append(0, np.cumsum(parts))
    kept = solution.vector.reshape(-1, 2, solution.lam.size)[::3]
    size = np.abs(kept).max(axis=(0, 1))
    assert np.all(np.abs(nodal[first] - kept) <= 1e-13 * size)
    # Inside cell 4, cut in three: the middle of the old cell lies in the middle of the second.
    assert parts[4] == 3
    middle = np.array([0.5])
    before = np.einsum(
        "j,jdm->md", lagrange_basis(old.lobatto, middle)[0], _cell_values(solution.vector, 4, 3)
    )
    after = np.einsum(
        "j,jdm->md", lagrange_basis(new.lobatto, middle)[0], _cell_values(vector, first[4] + 1, 5)
    )
    assert after == pytest.approx(before, rel=1e-9, abs=1e-12)
    assert np.all(np.isfinite(swing))


def _cell_values(vector: np.ndarray, cell: int, stages: int) -> np.ndarray:
    """(stages + 1, 2, modes) nodal values of one cell."""
    nodal = vector.reshape(-1, 2, vector.shape[-1])
    return nodal[cell * stages : (cell + 1) * stages + 1]


def test_mesh_resolves_the_waves_of_the_band():
    """Phase per cell, from the local dispersion relation, stays below what is asked."""
    profile = Profile(polytrope(3))
    for degree, band in ((0, (1.0, 5e3)), (2, (0.02, 5e3)), (20, (1.0, 100.0))):
        mesh = band_mesh(Ground(profile), degree, band, 0.5, 10**6)
        ends = np.array([mesh.node[1:-1], mesh.node[2:]])
        at = profile.at(ends, np.broadcast_to(mesh.interval[1:], ends.shape))
        for lam in band:
            lamb = degree * (degree + 1) * at.c2 / at.x**2
            k2 = (lam - at.n2) * (lam - lamb) / (lam * at.c2)
            phase = np.sqrt(np.maximum(k2, 0.0)) * np.diff(mesh.node)[1:]
            # Taken in the middle of the model's own intervals: within them k varies, most at
            # the centre, where the second interval spans a factor of two in r.
            assert phase.max() < 0.5 * 2.0
        assert mesh.size > model_mesh(profile).size


def test_mesh_cells_keep_their_form_and_home_when_split():
    mesh = model_mesh(Profile(polytrope(3)))
    finer = mesh.split(np.full(mesh.size, 3))
    assert finer.size == 3 * mesh.size and np.array_equal(finer.node[::3], mesh.node)
    assert np.array_equal(finer.interval[1::3], mesh.interval)
    outer = finer.node[:-1] >= finer.node[np.argmax(finer.lagrangian)]
    assert np.array_equal(finer.lagrangian, outer)


def test_bands_that_need_too_many_cells_are_refused():
    with pytest.raises(BandError, match=r"l = 1 .* cells, more than 2000; choose a higher"):
        band_mesh(Ground(Profile(polytrope(3))), 1, (1e-6, 1.0), 0.5, 2000)


@pytest.mark.parametrize("stages", [2, 3, 4, 5, 6])
def test_reference_cell_is_gauss_and_lobatto(stages):
    """Exact quadrature to degree 2s - 1; slopes differentiate polynomials to degree s."""
    cell = element(stages)
    for power in range(2 * stages):
        assert cell.weight @ cell.gauss**power == pytest.approx(1.0 / (power + 1), rel=1e-13)
    for power in range(1, stages + 1):
        nodal = cell.lobatto**power
        assert cell.value @ nodal == pytest.approx(cell.gauss**power, rel=1e-12)
        assert cell.slope @ nodal == pytest.approx(power * cell.gauss ** (power - 1), rel=1e-12)
    assert (cell.lobatto[0], cell.lobatto[-1]) == (0.0, 1.0)


def test_two_runs_give_the_same_bits(coarse_n3):
    first, second = (solve_modes(coarse_n3, [0, 2], (1, 50), unit="sigma2") for _ in range(2))
    assert np.array_equal(first.sigma2, second.sigma2)
    assert np.array_equal(first.nu_error, second.nu_error)


def test_actions_of_one_mesh_differ_only_in_degree(coarse_n3):
    profile = Profile(coarse_n3)
    mesh = model_mesh(profile)
    low, high = (build_action(profile, mesh, element(3), ell, "full", "free") for ell in (2, 3))
    assert np.array_equal(low.width, high.width) and low.ll == 6.0 and high.ll == 12.0
