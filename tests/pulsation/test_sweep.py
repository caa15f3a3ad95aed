"""The compiled sweeps against a slow dense twin in plain NumPy."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from scipy.optimize import newton

from oscsolve import layered_sphere, polytrope
from oscsolve.pulsation.boundary import atmosphere_cutoff, surface_numbers, surface_term
from oscsolve.pulsation.compiled import LANES
from oscsolve.pulsation.inverse import Workspace
from oscsolve.pulsation.mesh import element
from oscsolve.pulsation.search import count_at
from oscsolve.star.build import layered
from oscsolve.star.profile import Profile

#: degree, gravity, surface, stages: every branch of the compiled code.
CASES = [
    (0, "full", "free", 3),
    (0, "cowling", "isothermal", 2),
    (1, "full", "free", 2),
    (1, "cowling", "free", 3),
    (2, "full", "isothermal", 4),
    (3, "full", "free", 3),
    (3, "cowling", "isothermal", 3),
]
TRIALS = np.array([0.3, 1.0, 2.2, 4.0, 7.9, 13.0, 22.0, 31.0])


def add_product(matrix: np.ndarray, factor: float, a: np.ndarray, b: np.ndarray) -> None:
    """Add the form factor (a.v)(b.v) to a symmetric matrix."""
    i, j = np.flatnonzero(a), np.flatnonzero(b)
    block = 0.5 * factor * np.outer(a[i], b[j])
    matrix[np.ix_(i, j)] += block
    matrix[np.ix_(j, i)] += block.T


class Dense:
    """The action as one matrix over all nodal q (but the centre) and all p at Gauss points.

    Nothing is eliminated: S = sum of w h (p q' - H(q, p)) is written down as it is defined, so
    the twin shares no formula with the compiled code but the Hamiltonian.
    """

    def __init__(self, action, stages: int) -> None:
        self.action, self.elem = action, element(stages)
        self.dof, self.cells, self.stages = action.dof, action.width.size, stages
        self.nodal = (self.cells * stages + 1) * self.dof
        self.momenta = self.cells * stages * self.dof
        self.kept = np.arange(self.dof, self.nodal + self.momenta)

    def points(self):
        """Coefficients, weight, rows that give q and q', and the place of p, point by point."""
        size = self.nodal + self.momenta
        for cell in range(self.cells):
            h = self.action.width[cell]
            for k in range(self.stages):
                value, slope = np.zeros((2, size)), np.zeros((2, size))
                for node in range(self.stages + 1):
                    for a in range(self.dof):
                        at = (cell * self.stages + node) * self.dof + a
                        value[a, at] = self.elem.value[k, node]
                        slope[a, at] = self.elem.slope[k, node] / h
                place = self.nodal + (cell * self.stages + k) * self.dof
                momentum = np.zeros((2, size))
                for a in range(self.dof):
                    momentum[a, place + a] = 1.0
                yield (
                    self.action.point[cell, k], self.elem.weight[k] * h,
                    value, slope, momentum, (cell, k),
                )  # fmt: skip

    def _surface(self, matrix: np.ndarray, lam: float, derivative: bool) -> int:
        """Add the surface and the node terms; returns the pivots hidden in an atmosphere."""
        mu = 1.0 / lam if self.action.ll > 0.0 else 0.0
        *terms, hidden = surface_term(self.action.top, lam, mu)
        k11, k12, k22 = terms[3:] if derivative else terms[:3]
        last = self.nodal - self.dof
        matrix[last, last] += k11
        if self.dof == 2:
            matrix[last, last + 1] += k12
            matrix[last + 1, last] += k12
            matrix[last + 1, last + 1] += k22
        if not derivative:
            for cell, term in enumerate(self.action.node_term):
                at = cell * self.stages * self.dof
                matrix[at, at] += term
        return hidden

    def saddle(self, lam: float) -> tuple[np.ndarray, int]:
        """Second derivative of 2 S in (q, p) at lam, and the hidden pivots."""
        mu = 1.0 / lam if self.action.ll > 0.0 else 0.0
        size = self.nodal + self.momenta
        matrix = np.zeros((size, size))
        for row, weight, q, slope, p, _ in self.points():
            b0, b1, s1, s2, b22, c11, c21, d0, d1, d2 = row
            shift = p[0] + s1 * q[0] + s2 * q[1]
            squares = [
                (b0, p[0], p[0]), (b1 * mu, shift, shift), (2 * c11, p[0], q[0]),
                (d0 + d1 * lam, q[0], q[0]), (-2.0, p[0], slope[0]),
            ]  # fmt: skip
            if self.dof == 2:
                squares += [
                    (b22, p[1], p[1]), (2 * c21, p[1], q[0]), (d2, q[1], q[1]),
                    (-2.0, p[1], slope[1]),
                ]  # fmt: skip
            for factor, a, b in squares:
                add_product(matrix, -weight * factor, a, b)
        hidden = self._surface(matrix, lam, derivative=False)
        return matrix[np.ix_(self.kept, self.kept)], hidden

    def pencil(self, lam: float) -> tuple[np.ndarray, np.ndarray]:
        """Second derivatives of S and T in (q, y), y = rho r xi_h, p2 eliminated point by point."""
        points = self.cells * self.stages if self.action.ll > 0.0 else 0
        size = self.nodal + points
        action, kinetic = np.zeros((size, size)), np.zeros((size, size))
        for row, weight, q, slope, _, (cell, k) in self.points():
            b0, b1, s1, s2, b22, c11, c21, d0, d1, d2 = row
            q, slope = (np.pad(part[:, : self.nodal], ((0, 0), (0, points))) for part in (q, slope))
            y = np.zeros(size)
            if points:
                y[self.nodal + cell * self.stages + k] = 1.0
            p1 = (slope[0] - c11 * q[0] - b1 * y) / b0
            z, field = s1 * q[0] + s2 * q[1], slope[1] - c21 * q[0]
            inertia = [(b1, y, y), (-d1, q[0], q[0])]
            terms = [(b0, p1, p1), (-2 * b1, y, z), (-d0, q[0], q[0])]
            if self.dof == 2:
                terms += [(1.0 / b22, field, field), (-d2, q[1], q[1])]
            for factor, a, b in inertia:
                add_product(kinetic, weight * factor, a, b)
            for factor, a, b in terms:
                add_product(action, weight * factor, a, b)
        action += lam * kinetic
        self._surface(action, lam, derivative=False)
        self._surface(kinetic, lam, derivative=True)
        return action[self.dof :, self.dof :], kinetic[self.dof :, self.dof :]


def negative_eigenvalues(matrix: np.ndarray) -> int:
    """After a congruence that gives the diagonal size one: it changes no sign, only scale."""
    for _ in range(3):
        scale = 1.0 / np.sqrt(np.abs(matrix).max(axis=1))
        matrix = scale[:, None] * matrix * scale
    values = np.linalg.eigvalsh(matrix)
    assert np.abs(values).min() > 1e-13, "too close to singular to have a sign"
    return int(np.sum(values < 0.0))


def star_of(surface: str, coarse_n3, stump):
    """An atmosphere needs a star without an edge."""
    return stump if surface == "isothermal" else coarse_n3


@pytest.mark.parametrize(("degree", "gravity", "surface", "stages"), CASES)
def test_counts_are_those_of_the_dense_matrix(
    degree, gravity, surface, stages, make_action, coarse_n3, stump
):
    _, action = make_action(star_of(surface, coarse_n3, stump), degree, gravity, surface, stages)
    dense = Dense(action, stages)
    limit = 0.9 * _cutoff(surface, degree, stump)
    trials = np.array([lam for lam in TRIALS if lam < limit])
    assert trials.size >= 4
    counts = count_at(action, trials)
    for lam, count in zip(trials, counts, strict=True):
        matrix, hidden = dense.saddle(float(lam))
        assert negative_eigenvalues(matrix) + hidden == count
    assert counts[0] > counts[-1]


def _cutoff(surface: str, degree: int, stump) -> float:
    return atmosphere_cutoff(Profile(stump), degree).high if surface == "isothermal" else np.inf


def test_counts_see_negative_radial_eigenvalues(make_action, thinned):
    unstable = thinned(polytrope(3, 1.2), 32)
    _, action = make_action(unstable, 0)
    dense = Dense(action, 3)
    trials = np.array([-30.0, -10.0, -0.5, 0.0, 0.5, 10.0])
    counts = count_at(action, trials)
    assert counts.tolist() == [negative_eigenvalues(dense.saddle(lam)[0]) for lam in trials]
    assert counts[0] == counts[3] + 1


def test_counts_see_the_interface_of_two_layers(make_action, monkeypatch):
    # Few points towards the edge keep the dense matrix small.
    monkeypatch.setattr(layered, "_EDGE", 1e-2)
    star = layered_sphere([(0.6, 3.0), (1.0, 1.0)], 5.0, points=6)
    _, action = make_action(star, 2, stages=2)
    dense = Dense(action, 2)
    trials = np.array([0.8, 1.2, 1.5, 40.0])
    counts = count_at(action, trials)
    assert counts.tolist() == [negative_eigenvalues(dense.saddle(lam)[0]) for lam in trials]
    assert np.count_nonzero(action.node_term) == 1 + np.any(action.point[:, :, 2] > 0.0)


def test_lanes_do_not_disturb_each_other(make_action, coarse_n3):
    _, action = make_action(coarse_n3, 2)
    together = count_at(action, np.linspace(1.0, 30.0, 3 * LANES + 1))
    alone = [int(count_at(action, np.array([lam]))[0]) for lam in np.linspace(1, 30, 3 * LANES + 1)]
    assert together.tolist() == alone


@pytest.mark.parametrize(("degree", "gravity", "surface", "stages"), CASES)
def test_inverse_step_solves_the_dense_system(
    degree, gravity, surface, stages, make_action, coarse_n3, stump
):
    _, action = make_action(star_of(surface, coarse_n3, stump), degree, gravity, surface, stages)
    dense = Dense(action, stages)
    lam = TRIALS[:3].repeat([3, 3, 2])
    work = Workspace(action, lam.size)
    generator = np.random.default_rng(4)
    radial = np.linspace(0.0, 1.0, work.vector.shape[0])[:, None]
    work.vector[:] = radial * generator.uniform(0.5, 1.5, work.vector.shape)
    work.vector[: action.dof] = 0.0
    if action.ll > 0.0:
        # Of about even kinetic energy: y = rho r xi_h is minute where density is.
        scale = 0.1 / np.sqrt(action.point[:, :, 1, None])
        work.swing[:] = scale * generator.uniform(0.5, 1.5, work.swing.shape)
    before = np.vstack((work.vector, work.swing.reshape(-1, lam.size)))
    work.iterate(action, lam)
    after = np.vstack((work.vector, work.swing.reshape(-1, lam.size)))
    for j in range(lam.size):
        matrix, kinetic = dense.pencil(float(lam[j]))
        size = matrix.shape[0]
        right_side = kinetic @ before[action.dof :, j][:size]
        scale = 1.0 / np.sqrt(np.abs(matrix).max(axis=1))
        solved = scale * np.linalg.solve(scale[:, None] * matrix * scale, scale * right_side)
        energy = solved @ kinetic @ solved
        # What lies on top is not linear in lam: the step goes to the zero of the whole.
        zero = newton(lambda trial, v=solved: v @ dense.pencil(trial)[0] @ v, float(lam[j]))
        found = after[action.dof :, j][:size] * np.sqrt(energy)
        # The dense solve loses about the condition of the scaled matrix, up to 1e9 here.
        found, solved = found / scale, solved / scale
        assert found == pytest.approx(solved, rel=1e-6, abs=1e-8 * np.abs(solved).max())
        assert work.step[j] == pytest.approx(zero - lam[j], rel=1e-6, abs=1e-9)
        assert work.negative[j] == count_at(action, lam[j : j + 1])[0]


@pytest.mark.parametrize("surface", ["free", "isothermal"])
@pytest.mark.parametrize(("degree", "gravity"), [(0, "full"), (1, "full"), (4, "cowling")])
def test_surface_terms_have_the_derivatives_they_claim(degree, gravity, surface, coarse_n3, stump):
    """Central difference over 1e-5 of lam: errors of 1e-10 in curvature, 1e-11 in rounding."""
    profile = Profile(star_of(surface, coarse_n3, stump))
    for lagrangian in (False, True):
        top = surface_numbers(profile, degree, gravity, surface, lagrangian)
        for lam in (0.7, 3.0, 9.0):
            sides = []
            for trial in (lam * (1.0 - 1e-5), lam, lam * (1.0 + 1e-5)):
                sides.append(surface_term(top, trial, 1.0 / trial if degree else 0.0))
            low, here, high = sides
            for a, b, slope, value in zip(low, high, here[3:6], here[:3], strict=False):
                difference = (b - a) / (2e-5 * lam)
                assert slope == pytest.approx(difference, rel=1e-6, abs=1e-9 * (1.0 + abs(value)))
            assert here[3] >= 0.0 and here[5] >= 0.0, "matter on top adds kinetic energy"


def test_isothermal_surface_is_the_decaying_wave(stump):
    """p1/q1 = rho (kappa - a)/B, kappa the smaller root of its quadratic (design notes, 2)."""
    profile = Profile(stump)
    x, last = profile.outermost()
    at = profile.at(np.array(x), np.array(last))
    height, a = float(at.w / at.g), float(at.g / at.c2)
    n2 = float(at.g / height * (1.0 - 1.0 / at.gamma1))
    for degree, lam in ((0, 1.0), (2, 4.0), (3, 0.5)):
        top = surface_numbers(profile, degree, "full", "isothermal", False)
        k11 = surface_term(top, lam, 1.0 / lam if degree else 0.0)[0]
        b = degree * (degree + 1) / lam - x**2 / float(at.c2)
        e = (lam - n2) / x**2
        kappa = 0.5 / height - np.sqrt(0.25 / height**2 - a * (1.0 / height - a) + b * e)
        assert -k11 == pytest.approx(float(at.rho) * (kappa - a) / b, rel=1e-12)


def test_waves_escape_outside_the_cutoffs(stump):
    profile = Profile(stump)
    for degree in (0, 2):
        cutoff = atmosphere_cutoff(profile, degree)
        top = surface_numbers(profile, degree, "full", "isothermal", False)
        inside = [0.999 * cutoff.high] + [1.001 * cutoff.low] * (degree > 0)
        outside = [1.001 * cutoff.high] + [0.999 * cutoff.low] * (degree > 0)
        for lam in inside:
            assert np.isfinite(surface_term(top, lam, 1.0 / lam if degree else 0.0)[0])
        for lam in outside:
            assert np.isnan(surface_term(top, lam, 1.0 / lam if degree else 0.0)[0])


def test_compiled_code_stays_inside_its_arrays(tmp_path):
    """One small run of every compiled function with bounds checked, compiled afresh."""
    code = """
from oscsolve import SolveOptions, polytrope, solve_modes
star, options = polytrope(3), SolveOptions(stages=3)
for gravity in ("full", "cowling"):
    modes = solve_modes(star, (0, 2), (3, 30), unit="sigma2", gravity=gravity, options=options)
    assert modes.complete and len(modes) > 5
print("inside")
"""
    environment = {
        **os.environ,
        "NUMBA_BOUNDSCHECK": "1",
        "NUMBA_CACHE_DIR": str(tmp_path),
        "PYTHONPATH": str(Path(__file__).parents[2]),
    }
    done = subprocess.run(
        [sys.executable, "-c", code], env=environment, capture_output=True, text=True, check=False
    )
    assert done.returncode == 0 and done.stdout.strip() == "inside", done.stderr
