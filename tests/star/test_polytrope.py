"""Polytropes and layered spheres against closed forms and the reference structure."""

from __future__ import annotations

import csv

import numpy as np
import pytest

from oscsolve import ModelError, StarModel, layered_sphere, polytrope, uniform_sphere
from oscsolve.errors import InputError
from oscsolve.units import NEWTON_G

#: A few roundings of double precision: what "exact" can mean for a product of several numbers.
ROUNDED = 4e-15


def dimensionless(star: StarModel) -> tuple[np.ndarray, ...]:
    """x, m/M, P R^4/(G M^2), rho R^3/M."""
    scale = star.gravitational_constant * star.total_mass**2 / star.photospheric_radius**4
    rho = star.density * star.photospheric_radius**3 / star.total_mass
    return star.fractional_radius, star.mass / star.total_mass, star.pressure / scale, rho


def test_edge_of_the_polytropes_is_that_of_the_reference(shared_reference):
    """xi1 and theta'(xi1) to 40 digits are in shared/reference/polytrope_structure.csv.

    Central condensation is xi1/(3 |theta1'|) and rho_c/P_c holds (n + 1) xi1 |theta1'| (M = R = 1):
    together they fix both numbers. 1e-13 is the accuracy that the builder promises.
    """
    with open(shared_reference / "polytrope_structure.csv", encoding="ascii") as file:
        rows = list(csv.DictReader(file))
    assert len(rows) == 7
    for row in rows:
        n, xi, slope = (float(row[key]) for key in ("n", "xi1", "dtheta_dxi_at_xi1"))
        _, _, pressure, rho = dimensionless(polytrope(n))
        assert 4.0 * np.pi * rho[0] / 3.0 == pytest.approx(-xi / (3.0 * slope), rel=1e-13)
        assert rho[0] / pressure[0] == pytest.approx(-(n + 1.0) * xi * slope, rel=1e-13)


def test_index_one_is_sin_over_xi():
    """theta = sin(xi)/xi (Chandrasekhar 1939, ch. IV), xi1 = pi."""
    x, m, pressure, rho = dimensionless(polytrope(1))
    xi = np.pi * x
    # At the edge theta is a difference of numbers near pi: its absolute error counts.
    assert rho == pytest.approx(np.pi / 4.0 * np.sinc(x), rel=1e-13, abs=1e-15)
    assert pressure == pytest.approx(np.pi / 8.0 * np.sinc(x) ** 2, rel=2e-13, abs=1e-15)
    # sin xi - xi cos xi cancels below xi = 0.3: compare where it does not.
    keep = xi > 0.3
    assert m[keep] == pytest.approx((np.sin(xi) - xi * np.cos(xi))[keep] / np.pi, rel=1e-13)


def test_index_zero_is_the_uniform_sphere():
    x, m, pressure, rho = dimensionless(polytrope(0))
    assert rho == pytest.approx(np.full_like(x, 0.75 / np.pi), rel=1e-13)
    assert m == pytest.approx(x**3, rel=1e-13)
    # 1 - x^2 has the rounding of x.
    assert pressure == pytest.approx(3.0 / (8.0 * np.pi) * (1.0 - x * x), rel=1e-13, abs=1e-15)
    assert uniform_sphere().name == "uniform sphere"


@pytest.mark.parametrize("index", [0.5, 1.5, 3, 4.5])
def test_pressure_follows_density_and_buoyancy_the_slope(index):
    """P ~ rho^(1 + 1/n), and A* = V (n/(n+1) - 1/Gamma1) with V = m rho/(r P)."""
    star = polytrope(index, 1.6)
    x, m, pressure, rho = dimensionless(star)
    inside = slice(1, -1)
    relation = (rho / rho[0]) ** (1.0 + 1.0 / index)
    # A power multiplies the relative error of density, 1e-13 near the edge.
    assert pressure[inside] / pressure[0] == pytest.approx(relation[inside], rel=1e-12)
    v = (m * rho)[inside] / (x * pressure)[inside]
    expected = v * (index / (index + 1.0) - 1.0 / 1.6)
    assert star.a_star[inside] == pytest.approx(expected, rel=1e-12)
    assert star.pressure[-1] == star.density[-1] == 0.0


def test_mass_radius_and_gravity_are_those_asked_for():
    star = polytrope(3, mass=4e33, radius=1e11, gravitational_constant=6.67e-8)
    assert (star.total_mass, star.photospheric_radius) == (4e33, 1e11)
    assert (
        star.gravitational_constant == 6.67e-8 and polytrope(3).gravitational_constant == NEWTON_G
    )
    assert star.mass[-1] == pytest.approx(4e33, rel=1e-13) and star.radius[-1] == 1e11
    shape, other = dimensionless(star), dimensionless(polytrope(3))
    for a, b in zip(shape, other, strict=True):
        assert a == pytest.approx(b, rel=ROUNDED)


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ((5,), "0 <= index < 5; got 5"),
        ((-0.1,), "0 <= index < 5; got -0.1"),
        ((4.99999,), "too close to 5"),
        ((3, 0.0), "gamma1 of a polytrope must be above zero; got 0"),
        ((3, float("nan")), "gamma1 of a polytrope must be above zero; got nan"),
    ],
)
def test_polytrope_refuses(arguments, message):
    with pytest.raises(InputError, match=message):
        polytrope(*arguments)


@pytest.mark.parametrize("name", ["mass", "radius"])
def test_polytrope_refuses_scales(name):
    with pytest.raises(InputError, match=f"{name} of a polytrope must be above zero; got -1"):
        polytrope(3, **{name: -1.0})


LAYERS = [(0.25, 9.0), (0.6, 3.0), (1.0, 1.0)]


def test_layers_are_in_hydrostatic_balance():
    """P(x_i) - P(x_i+1) = integral of rho m/x^2, by Gauss-Legendre with m in closed form."""
    x, m, pressure, rho = dimensionless(layered_sphere(LAYERS, 2.0))
    nodes, weights = np.polynomial.legendre.leggauss(5)
    for i in np.flatnonzero(np.diff(x) > 0.0):
        assert rho[i] == rho[i + 1]
        h, middle = x[i + 1] - x[i], 0.5 * (x[i] + x[i + 1])
        at = middle + 0.5 * h * nodes
        inside = m[i] + 4.0 * np.pi / 3.0 * rho[i] * (at**3 - x[i] ** 3)
        fall = 0.5 * h * np.sum(weights * rho[i] * inside / at**2)
        # Subtracting two pressures, or two radii, costs what their rounding is.
        slack = fall * (1e-12 + 1e-15 / h) + 1e-15 * pressure[i]
        assert abs(pressure[i] - pressure[i + 1] - fall) < slack


def test_layers_meet_at_double_points():
    x, m, pressure, rho = dimensionless(layered_sphere(LAYERS))
    double = np.flatnonzero(np.diff(x) == 0.0)
    assert x[double] == pytest.approx([0.25, 0.6], abs=0.0)
    assert rho[double] / rho[double + 1] == pytest.approx([3.0, 3.0], rel=ROUNDED)
    assert m[double] == pytest.approx(m[double + 1], rel=ROUNDED)
    assert pressure[double] == pytest.approx(pressure[double + 1], rel=ROUNDED)
    assert m[-1] == pytest.approx(1.0, rel=ROUNDED) and pressure[-1] == 0.0


def test_layers_of_one_density_are_a_uniform_sphere():
    x, m, pressure, rho = dimensionless(layered_sphere([(0.3, 5.0), (1.0, 5.0)], 1.5))
    assert rho == pytest.approx(np.full_like(x, 0.75 / np.pi), rel=ROUNDED)
    assert pressure == pytest.approx(3.0 / (8.0 * np.pi) * (1.0 - x * x), rel=1e-14, abs=1e-15)
    assert m == pytest.approx(x**3, rel=1e-14)


@pytest.mark.parametrize(
    ("layers", "changes", "message"),
    [
        ([], {}, "at least one; got"),
        ([(0.5, 1.0, 2.0)], {}, "layers are pairs"),
        (["ab"], {}, "layers are pairs"),
        ([(0.5, 1.0)], {}, "must rise from above 0 to 1; got .0.5"),
        ([(0.5, 1.0), (0.5, 2.0), (1.0, 1.0)], {}, "must rise from above 0 to 1"),
        ([(0.5, 0.0), (1.0, 1.0)], {}, "densities of layers must be above zero"),
        ([(1.0, np.inf)], {}, "densities of layers must be above zero"),
        ([(1.0, 1.0)], {"gamma1": 0.0}, "gamma1 of a layered sphere must be above zero; got 0"),
        ([(1.0, 1.0)], {"mass": -1.0}, "mass of a layered sphere must be above zero"),
        ([(1.0, 1.0)], {"radius": np.nan}, "radius of a layered sphere must be above zero"),
        ([(1.0, 1.0)], {"points": 4}, "at least 5 points; got 4"),
    ],
)
def test_layered_sphere_refuses(layers, changes, message):
    with pytest.raises(InputError, match=message):
        layered_sphere(layers, **changes)


def test_a_star_of_three_points_at_one_radius_is_refused(star_n3):
    radius = np.array(star_n3.radius)
    radius[10:12] = radius[9]
    with pytest.raises(ModelError, match=r"three points share one radius at point 12"):
        star_n3.with_changes(radius=radius)
