"""The canonical coefficients against the equations written out, and the signs counting needs."""

from __future__ import annotations

import numpy as np
import pytest

from oscsolve import polytrope
from oscsolve.pulsation.equations import FIELDS, coefficients, degrees_of_freedom
from oscsolve.star.profile import Profile, Structure

FOUR_PI = 4.0 * np.pi


def random_structure(generator: np.random.Generator) -> Structure:
    """Independent positive numbers (N^2 of either sign): the equations are algebra in them."""
    x, rho, g, c2, w = generator.uniform(0.1, 3.0, 5)
    n2 = generator.normal()
    return Structure(x=x, rho=rho, g=g, c2=c2, n2=n2, gamma1=np.float64(1.6), w=w)


def from_coefficients(row: np.ndarray, lam: float, q1, p1, q2, p2) -> np.ndarray:
    """q' = dH/dp and p' = -dH/dq of the Hamiltonian in the docstring of `equations`."""
    b0, b1, s1, s2, b22, c11, c21, d0, d1, d2 = row
    swing = b1 / lam * (p1 + s1 * q1 + s2 * q2) if b1 else 0.0
    return np.array(
        [
            b0 * p1 + swing + c11 * q1,
            -(s1 * swing + c11 * p1 + c21 * p2 + (d0 + d1 * lam) * q1),
            b22 * p2 + c21 * q1,
            -(s2 * swing + d2 * q2),
        ]
    )


def written_out(at: Structure, degree: int, lam: float, q1, p1, q2, p2, full=True) -> np.ndarray:
    """q1', p1', q2', p2' as in Unno et al. (1989), ch. III, arranged as in the design notes."""
    r, rho, g, c2, n2 = at.x, at.rho, at.g, at.c2, at.n2
    ll = degree * (degree + 1)
    own = FOUR_PI * rho**2 if full else 0.0
    dq1 = g / c2 * q1 + (ll / lam - r**2 / c2) * p1 / rho + ll / lam * q2
    dp1 = (rho * (lam - n2) + own) * q1 / r**2 - g / c2 * p1 + FOUR_PI * rho / r**2 * p2
    dq2 = -FOUR_PI / r**2 * p2 - FOUR_PI * rho / r**2 * q1
    dp2 = -ll / FOUR_PI * q2 - ll / lam * (p1 + rho * q2)
    return np.array([dq1, dp1, dq2, dp2])


@pytest.mark.parametrize("degree", [1, 2, 7])
def test_full_equations_are_those_of_the_textbook(degree):
    generator = np.random.default_rng(degree)
    for _ in range(50):
        at, state = random_structure(generator), generator.normal(size=4)
        lam = generator.uniform(0.1, 10.0)
        found = from_coefficients(coefficients(at, degree, "full", False), lam, *state)
        expected = written_out(at, degree, lam, *state)
        # The same products, grouped otherwise; terms are at most some 1e4 here.
        assert found == pytest.approx(expected, rel=1e-12, abs=1e-11)


def test_cowling_drops_the_potential_and_keeps_the_rest():
    generator = np.random.default_rng(5)
    for degree in (0, 1, 3):
        at, (q1, p1) = random_structure(generator), generator.normal(size=2)
        row = coefficients(at, degree, "cowling", False)
        found = from_coefficients(row, 2.5, q1, p1, 0.0, 0.0)
        expected = written_out(at, degree, 2.5, q1, p1, 0.0, 0.0, full=False)
        assert found[:2] == pytest.approx(expected[:2], rel=1e-12)
        assert row[FIELDS.index("s2")] == 0.0


def test_radial_equations_hold_without_buoyancy():
    """q1' = -r^2 P1/(rho c^2), P1' = (rho lam/r^2 + 4 rho g/r^3) q1 (full gravity)."""
    generator = np.random.default_rng(6)
    for lam in (3.0, -3.0):
        at, (q1, p1) = random_structure(generator), generator.normal(size=2)
        row = coefficients(at, 0, "full", True)
        found = from_coefficients(row, lam, q1, p1, 0.0, 0.0)
        rho, r = at.rho, at.x
        expected = [
            -(r**2) * p1 / (rho * at.c2),
            (rho * lam / r**2 + 4 * rho * at.g / r**3) * q1,
        ]
        assert found[:2] == pytest.approx(expected, rel=1e-12)


def test_canonical_pairs_per_radius():
    assert [degrees_of_freedom(degree, "full") for degree in (0, 1, 2)] == [1, 2, 2]
    assert [degrees_of_freedom(degree, "cowling") for degree in (0, 1, 2)] == [1, 1, 1]


@pytest.mark.parametrize("gravity", ["full", "cowling"])
@pytest.mark.parametrize("degree", [0, 1, 4])
def test_lagrangian_and_eulerian_form_are_one_problem(degree, gravity):
    """P1 = p1 - (rho g/r^2) q1 turns one into the other, in a star in hydrostatic balance.

    The slope of rho g/r^2 comes from a central difference over 2e-3 of a cell, itself a fifth of
    the radius at most: relative error (2e-4)^2 times the 2 of an inverse square, about 1e-7.
    """
    profile = Profile(polytrope(3))
    i = profile.interval[[5, 60, 150, 300]]
    h = profile.x[i + 1] - profile.x[i]
    x = profile.x[i] + 0.4 * h

    def shift(at: Structure) -> np.ndarray:
        return at.rho * at.g / at.x**2

    low, at, high = (profile.at(x + k * h, i) for k in (-1e-3, 0.0, 1e-3))
    slope = (shift(high) - shift(low)) / (high.x - low.x)
    generator, lam = np.random.default_rng(7), 7.5
    eulerian = coefficients(at, degree, gravity, False)
    lagrangian = coefficients(at, degree, gravity, True)
    if degree == 0 and gravity == "full":
        # Phi' of radial motion is known: dPhi'/dr = -4 pi rho xi_r, that is p2 = 0.
        eulerian[:, FIELDS.index("s2")] = 0.0
    for k in range(i.size):
        q1, p1, q2, p2 = generator.normal(size=4)
        if degree == 0 or gravity == "cowling":
            q2 = p2 = 0.0
        kappa = shift(at)[k]
        a = from_coefficients(eulerian[k], lam, q1, p1 + kappa * q1, q2, p2)
        b = from_coefficients(lagrangian[k], lam, q1, p1, q2, p2)
        a[1] -= slope[k] * q1 + kappa * a[0]
        active = 2 if degree == 0 or gravity == "cowling" else 4
        size = np.abs(eulerian[k]).max() * np.abs([q1, p1, q2, p2]).max()
        assert a[:active] == pytest.approx(b[:active], rel=1e-6, abs=1e-7 * size)


@pytest.mark.parametrize("gravity", ["full", "cowling"])
@pytest.mark.parametrize("lagrangian", [False, True])
def test_action_grows_with_frequency_by_the_kinetic_energy(gravity, lagrangian):
    """-dH/dlam = rho (r^2 xi_r^2 + L^2 r^2 xi_h^2)/2 >= 0: why negative eigenvalues count modes."""
    generator = np.random.default_rng(8)

    def hamiltonian(row, lam, q1, p1, q2, p2) -> float:
        b0, b1, s1, s2, b22, c11, c21, d0, d1, d2 = row
        z = s1 * q1 + s2 * q2
        return (
            0.5 * b0 * p1**2 + 0.5 * b1 / lam * (p1 + z) ** 2 + 0.5 * b22 * p2**2
            + c11 * p1 * q1 + c21 * p2 * q1 + 0.5 * (d0 + d1 * lam) * q1**2 + 0.5 * d2 * q2**2
        )  # fmt: skip

    for degree in (0, 1, 5):
        at, (q1, p1, q2, p2) = random_structure(generator), generator.normal(size=4)
        if gravity == "cowling" or degree == 0:
            q2 = p2 = 0.0
        row = coefficients(at, degree, gravity, lagrangian)
        lam, step = 2.0, 1e-4
        slope = hamiltonian(row, lam + step, q1, p1, q2, p2)
        slope = -(slope - hamiltonian(row, lam - step, q1, p1, q2, p2)) / (2.0 * step)
        xi_r = q1 / at.x**2
        eulerian = p1 + at.rho * at.g / at.x**2 * q1 if lagrangian else p1
        xi_h = (eulerian / at.rho + q2) / (lam * at.x) if degree else 0.0
        kinetic = 0.5 * at.rho * at.x**2 * (xi_r**2 + degree * (degree + 1) * xi_h**2)
        # The difference errs by (step/lam)^2 = 2.5e-9 and by rounding, 1e-16/step.
        assert slope == pytest.approx(kinetic, rel=1e-7, abs=1e-10)
        assert kinetic >= 0.0
