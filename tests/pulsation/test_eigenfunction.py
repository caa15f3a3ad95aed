"""Eigenfunctions: normalisation, boundary conditions, Poisson's equation, centre, closed form."""

from __future__ import annotations

import numpy as np
import pytest

from oscsolve import ModeSet, SolveOptions, polytrope, solve_modes, uniform_sphere
from oscsolve.errors import InputError


@pytest.fixture(scope="module")
def modes() -> ModeSet:
    """l = 0 to 3 of n = 3, from g to p modes."""
    return solve_modes(polytrope(3), (0, 1, 2, 3), (2.0, 80.0), unit="sigma2", tolerance=1e-11)


@pytest.fixture(scope="module")
def structure(modes) -> tuple[np.ndarray, ...]:
    """x, rho, g and sound speed squared on the points, in G = M = R = 1."""
    star = modes.star
    x = star.fractional_radius
    rho = star.density * star.photospheric_radius**3 / star.total_mass
    mass = star.mass / star.total_mass
    g = np.divide(mass, x**2, out=np.zeros_like(x), where=x > 0.0)
    scale = star.gravitational_constant * star.total_mass**2 / star.photospheric_radius**4
    c2 = np.divide(star.gamma1 * star.pressure / scale, rho, out=np.zeros_like(x), where=rho > 0)
    return x, rho, g, c2


def test_columns_are_on_the_points_of_the_model(modes):
    f = modes.eigenfunctions
    assert np.array_equal(f.radius, modes.star.fractional_radius)
    names = ("xi_r", "xi_h", "p_prime", "phi_prime", "dphi_prime")
    for name in names:
        column = getattr(f, name)
        assert column.shape == (len(modes), f.radius.size) and np.all(np.isfinite(column)), name
        assert not column.flags.writeable
    one = modes.eigenfunction(3)
    assert all(np.array_equal(getattr(one, name), getattr(f, name)[3]) for name in names)
    assert np.array_equal(modes.eigenfunction(-1).xi_r, f.xi_r[-1])


def test_total_displacement_is_one_at_the_photosphere(modes):
    f = modes.eigenfunctions
    ll = modes.degree * (modes.degree + 1)
    total = f.xi_r[:, -1] ** 2 + ll * f.xi_h[:, -1] ** 2
    # Taken at the last point that carries matter, 1e-9 inside.
    assert total == pytest.approx(np.ones(len(modes)), rel=1e-9)
    assert np.all(f.xi_r[:, -1] > 0.0)


def test_pressure_perturbation_vanishes_with_the_displaced_surface(modes, structure):
    """delta p = p' - rho g xi_r = 0 where rho -> 0: small beside its terms close to the edge."""
    _, rho, g, _ = structure
    f = modes.eigenfunctions
    delta_p = f.p_prime - rho * g * f.xi_r
    inner = np.abs(delta_p[:, :-200]).max(axis=1)
    assert np.all(np.abs(delta_p[:, -1]) <= 1e-12 * inner)
    # p' itself is not small beside rho g xi_r there: the terms cancel to the depth, 1e-6 R.
    near = int(np.searchsorted(f.radius, 1.0 - 1e-6))
    ratio = np.abs(delta_p[:, near]) / np.abs(rho[near] * g[near] * f.xi_r[:, near])
    assert np.all(ratio < 1e-6 * 10.0 * (modes.sigma2 + modes.degree**2))


def test_gravity_goes_over_into_the_field_outside(modes, structure):
    """dPhi'/dr + (l + 1) Phi'/r + 4 pi rho xi_r = 0 at the surface; radial: Phi' = 0 outside."""
    _, rho, _, _ = structure
    f = modes.eigenfunctions
    at = -2
    field = f.dphi_prime[:, at] + 4.0 * np.pi * rho[at] * f.xi_r[:, at]
    inner = (modes.degree + 1) * f.phi_prime[:, at] / f.radius[at]
    # The outermost cell is 1e-10 R wide: differences of Phi' over it keep six digits.
    size = np.abs(f.phi_prime).max(axis=1)
    assert np.all(np.abs(field + inner) <= 1e-5 * np.abs(inner) + 1e-12 * size)
    assert np.all(f.phi_prime[modes.degree == 0, at] == 0.0)


def test_poisson_equation_holds_between_the_points(modes, structure):
    """(r^2 Phi'')' - l(l+1) Phi' = 4 pi r^2 rho', rho' = p'/c^2 + rho N^2 xi_r/g.

    Integrated from one point to the next but one by Simpson's rule, which errs by the fourth
    power of the spacing: 1e-6 of the terms for the modes with most nodes.
    """
    star = modes.star
    x, rho, g, c2 = structure
    f = modes.eigenfunctions
    keep = (x > 0.05) & (x < 0.9)
    n2_over_g = np.divide(star.a_star, x, out=np.zeros_like(x), where=x > 0.0)
    with np.errstate(divide="ignore", invalid="ignore"):
        density = f.p_prime / c2 + rho * n2_over_g * f.xi_r
    ll = (modes.degree * (modes.degree + 1))[:, None]
    source = 4.0 * np.pi * x**2 * density + ll * f.phi_prime
    flux = x**2 * f.dphi_prime
    left = np.flatnonzero(keep)[:-2:2]
    even = np.isclose(x[left + 2] - x[left + 1], x[left + 1] - x[left], rtol=1e-9)
    left = left[even]
    step = x[left + 2] - x[left]
    simpson = step / 6.0 * (source[:, left] + 4.0 * source[:, left + 1] + source[:, left + 2])
    change = flux[:, left + 2] - flux[:, left]
    size = np.abs(change).max(axis=1)
    assert left.size > 100
    assert np.all(np.abs(change - simpson).max(axis=1) <= 1e-5 * size)


def test_slope_of_the_potential_is_its_derivative(modes, structure):
    """Central differences over neighbouring points, second order: 1e-3 of the largest slope."""
    x, *_ = structure
    f = modes.eigenfunctions
    inside = slice(20, 600)
    difference = np.gradient(f.phi_prime, x, axis=1)[:, inside]
    size = np.abs(f.dphi_prime).max(axis=1, keepdims=True)
    assert np.all(np.abs(difference - f.dphi_prime[:, inside]) <= 2e-3 * size)


def test_horizontal_displacement_balances_pressure_and_gravity(modes, structure):
    """sigma2 r xi_h = p'/rho + Phi'."""
    x, rho, _, _ = structure
    f = modes.eigenfunctions
    inside = slice(1, -1)
    nonradial = modes.degree > 0
    for i in np.flatnonzero(nonradial):
        force = f.p_prime[i, inside] / rho[inside] + f.phi_prime[i, inside]
        size = np.abs(force).max()
        found = modes.sigma2[i] * x[inside] * f.xi_h[i, inside]
        assert found == pytest.approx(force, rel=1e-9, abs=1e-10 * size)
    assert np.all(f.xi_h[~nonradial] == 0.0)


@pytest.mark.parametrize("degree", [0, 1, 2, 3])
def test_displacement_grows_from_the_centre_as_it_must(modes, degree):
    """xi_r ~ r^(l-1), and r for l = 0; xi_h = xi_r/l there. Finite and smooth at r = 0."""
    f = modes.eigenfunctions
    power = degree - 1 if degree else 1
    few = (modes.degree == degree) & (np.abs(modes.order) <= 2)
    assert np.any(few)
    x, near = f.radius[2:6], f.xi_r[few][:, 2:6]
    fitted = np.array([np.polyfit(np.log(x), np.log(np.abs(row)), 1)[0] for row in near])
    # Corrections are of relative order (k r)^2 at r = 0.01, k up to 50 in condensed centres.
    assert fitted == pytest.approx(np.full(fitted.size, power), abs=0.05)
    if degree:
        assert f.xi_h[few][:, 2] == pytest.approx(f.xi_r[few][:, 2] / degree, rel=0.05)
    centre = f.xi_r[few][:, 0]
    if degree == 1:
        assert centre == pytest.approx(f.xi_r[few][:, 1], rel=0.05)
        assert f.xi_h[few][:, 0] == pytest.approx(centre, rel=1e-12)
    elif degree != 2:
        assert np.all(centre == 0.0)


def test_dipole_modes_leave_the_centre_of_mass_in_place(modes, structure):
    """l = 1: int rho (xi_r + 2 xi_h) r^2 dr = 0, an exact integral of the full equations."""
    x, rho, _, _ = structure
    f = modes.eigenfunctions
    for i in np.flatnonzero(modes.degree == 1):
        parts = rho * x**2 * f.xi_r[i], 2.0 * rho * x**2 * f.xi_h[i]
        total = np.trapezoid(sum(parts), x)
        size = np.trapezoid(np.abs(parts[0]) + np.abs(parts[1]), x)
        # The trapezoidal rule on 900 points.
        assert abs(total) < 1e-3 * size


def test_kelvin_mode_is_a_solid_harmonic():
    """The f mode of the uniform sphere: xi = grad r^l, so xi_r ~ r^(l-1) and xi_h = xi_r/l."""
    for degree in (2, 5):
        modes = solve_modes(uniform_sphere(), [degree], (0.5, 5.0), unit="sigma2", tolerance=1e-12)
        f = modes.eigenfunction(int(np.flatnonzero(modes.order == 0)[0]))
        total = np.sqrt(1.0 + (degree + 1) / degree)
        expected = f.radius ** (degree - 1) / total
        # Scaled at the last point inside the edge, 1e-9 R below it; round-off of q1 = r^2 xi_r
        # of 1e-14 is what xi_r shows near the centre.
        inside = slice(1, -1)
        assert f.xi_r[inside] == pytest.approx(expected[inside], rel=1e-8, abs=1e-10)
        assert f.xi_h[inside] == pytest.approx(expected[inside] / degree, rel=1e-8, abs=1e-10)


def test_fundamental_of_the_neutral_gas_is_homologous():
    """n = 3, Gamma1 -> 4/3: xi_r = r (every shell keeps its share of the radius)."""
    modes = solve_modes(polytrope(3, 4.0 / 3.0 + 1e-7), [0], (-0.1, 0.1), unit="sigma2")
    f = modes.eigenfunction(0)
    assert f.xi_r == pytest.approx(f.radius, abs=1e-5)


def test_cowling_leaves_the_potential_out():
    modes = solve_modes(polytrope(3), [0, 2], (5.0, 30.0), unit="sigma2", gravity="cowling")
    f = modes.eigenfunctions
    assert not np.any(f.phi_prime) and not np.any(f.dphi_prime) and np.any(f.p_prime)


def test_eigenfunctions_are_kept_only_where_asked():
    modes = solve_modes(
        polytrope(3), [2], (5.0, 30.0), unit="sigma2", options=SolveOptions(eigenfunctions=False)
    )
    assert modes.eigenfunctions is None
    with pytest.raises(InputError, match="holds no eigenfunctions"):
        modes.eigenfunction(0)


def test_a_mode_outside_the_list_is_refused(modes):
    with pytest.raises(InputError, match=f"mode index 99 is outside the list of {len(modes)} mo"):
        modes.eigenfunction(99)
