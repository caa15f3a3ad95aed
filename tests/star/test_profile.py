"""The interpolated structure: exact at the points, consistent and convergent between them."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.interpolate import Akima1DInterpolator

from oscsolve import StarModel, layered_sphere, polytrope
from oscsolve.star.profile import Profile, gentle_slopes


def thinned(star: StarModel, step: int) -> StarModel:
    """Every `step`-th point of a star, its last two points kept."""
    keep = np.unique(
        np.append(np.arange(0, star.radius.size, step), np.arange(-2, 0) + star.radius.size)
    )
    names = ("radius", "mass", "pressure", "density", "gamma1", "a_star")
    return star.with_changes(**{name: getattr(star, name)[keep] for name in names})


def at_points(profile: Profile, x: np.ndarray):
    """Structure at radii, each in the interval that holds it."""
    interval = np.clip(np.searchsorted(profile.x, x, side="right") - 1, 0, profile.interval[-1])
    return profile.at(x, interval)


def test_points_of_the_model_are_met_exactly(star_n3):
    profile = Profile(star_n3)
    left = profile.interval[1:]
    at = profile.at(profile.x[left], left)
    rho = star_n3.density * star_n3.photospheric_radius**3 / star_n3.total_mass
    # Both ends of each interval; exp(log(rho)) costs a few roundings times ln rho.
    assert at.rho == pytest.approx(rho[left], rel=1e-13)
    assert at.g == pytest.approx(star_n3.mass[left] / star_n3.total_mass / profile.x[left] ** 2)
    again = profile.at(profile.x[left], left - 1)
    for name in ("rho", "g", "c2", "n2", "w", "gamma1"):
        assert getattr(again, name) == pytest.approx(getattr(at, name), rel=1e-11), name


@pytest.mark.parametrize("index", [1, 3])
def test_interpolation_converges_with_the_sixth_power(index):
    """Quintic Hermite with exact slopes: error h^6 where rho is smooth (0.1 < x < 0.9)."""
    star = polytrope(index)
    inside = (star.fractional_radius > 0.1) & (star.fractional_radius < 0.9)
    x = star.fractional_radius[inside]
    exact = star.density[inside] * star.photospheric_radius**3 / star.total_mass
    steps = np.array([64, 32, 16])
    errors = [
        np.max(np.abs(at_points(Profile(thinned(star, s)), x).rho / exact - 1.0)) for s in steps
    ]
    # beta is constant in a polytrope, so its Akima slope is exact too.
    fitted = np.polyfit(np.log(steps), np.log(errors), 1)[0]
    assert fitted == pytest.approx(6.0, abs=0.7)
    # About 25 points in that range; three times what was measured.
    assert errors[-1] < 2e-7


def test_density_gravity_and_pressure_stay_consistent_between_points(star_n3):
    """dm/dr = 4 pi r^2 rho and dP/dr = -rho g by central differences inside the cells.

    The five functions are interpolated one by one: what they hold against each other is their
    interpolation error, 3e-7 with half the points of the model. The difference over 2e-3 of a
    cell adds 1e-6 of the curvature in a cell, itself below a tenth.
    """
    profile = Profile(thinned(star_n3, 2))
    # Further out the mass hardly grows and its difference drowns in rounding.
    i = profile.interval[5:]
    i = i[profile.x[i] < 0.9]
    x, h = profile.x[i], profile.x[i + 1] - profile.x[i]
    middle, step = x + 0.37 * h, 1e-3 * h
    low, here, high = (profile.at(middle + k * step, i) for k in (-1.0, 0.0, 1.0))
    mass_slope = (high.g * high.x**2 - low.g * low.x**2) / (high.x - low.x)
    assert mass_slope == pytest.approx(4.0 * np.pi * here.x**2 * here.rho, rel=1e-6)
    pressure_slope = (high.w * high.rho - low.w * low.rho) / (high.x - low.x)
    assert pressure_slope == pytest.approx(-here.rho * here.g, rel=1e-6)
    # N^2 = g (dlnP/dr / Gamma1 - dlnrho/dr) of the very same functions.
    slope = (np.log(high.rho) - np.log(low.rho)) / (high.x - low.x)
    n2 = -here.g * (here.g / here.c2 + slope)
    assert here.n2 == pytest.approx(n2, rel=1e-5, abs=1e-6)


def test_a_missing_centre_is_added(star_n3):
    names = ("radius", "mass", "pressure", "density", "gamma1", "a_star")
    headless = star_n3.with_changes(**{name: getattr(star_n3, name)[2:] for name in names})
    profile, whole = Profile(headless), Profile(star_n3)
    assert profile.x[0] == 0.0 and profile.x.size == whole.x.size - 1
    x = np.linspace(0.05, 0.95, 7) * profile.x[1]
    # The series to x^2 at x1 = 0.003: x1^4 is left, times order-one coefficients of n = 3.
    a, b = at_points(profile, x), at_points(whole, x)
    assert a.rho == pytest.approx(b.rho, rel=1e-7) and a.g == pytest.approx(b.g, rel=1e-7)


def test_intervals_do_not_reach_across_a_density_jump():
    star = layered_sphere([(0.6, 3.0), (1.0, 1.0)])
    profile = Profile(star)
    jump = int(np.flatnonzero(np.diff(profile.x) == 0.0)[0])
    assert jump not in profile.interval
    inside, outside = (profile.at(np.array(0.6), np.array(i)) for i in (jump - 1, jump + 1))
    assert inside.rho / outside.rho == pytest.approx(3.0, rel=1e-13)
    assert inside.g == pytest.approx(float(outside.g), rel=1e-13)
    assert inside.w * inside.rho == pytest.approx(float(outside.w * outside.rho), rel=1e-13)


def test_an_edge_is_seen_and_left_out(star_n3):
    profile = Profile(star_n3)
    assert profile.has_edge and profile.outermost()[0] == profile.x[-2]
    # The shell outside carries the mass 4 pi r^2 rho w/g: P = g times the mass above unit area.
    at = at_points(profile, np.array([profile.x[-2]]))
    left_out = 1.0 - star_n3.mass[-2] / star_n3.total_mass
    assert 0.0 <= left_out < 1e-15 + 4.0 * np.pi * float(at.rho[0] * at.w[0] / at.g[0])


def test_a_star_without_an_edge_is_used_to_its_last_point(polytrope_n1):
    profile = Profile(polytrope_n1(100))
    assert not profile.has_edge and profile.outermost()[0] == profile.x[-1] == 1.0


def test_gentle_slopes_are_those_of_the_library():
    """Against scipy.interpolate.Akima1DInterpolator, method "makima" (a general library)."""
    generator = np.random.default_rng(3)
    for size in (3, 4, 50):
        x = np.cumsum(generator.uniform(0.1, 1.0, size))
        f = generator.normal(size=size)
        f[size // 2 :] = np.round(f[size // 2 :])
        expected = Akima1DInterpolator(x, f, method="makima")(x, nu=1)
        assert gentle_slopes(x, f) == pytest.approx(expected, rel=1e-12, abs=1e-13)


def test_a_repeated_first_radius_leaves_the_centre_finite():
    star = polytrope(3)
    twice = np.insert(np.arange(star.radius.size), 1, 1)
    names = ("radius", "mass", "pressure", "density", "gamma1", "a_star")
    profile = Profile(star.with_changes(**{name: getattr(star, name)[twice] for name in names}))
    inner = profile.at(np.array([0.5 * profile.x[1]]), np.array([0]))
    plain = Profile(star).at(inner.x, np.array([0]))
    assert inner.n2 == pytest.approx(plain.n2, rel=1e-6)
