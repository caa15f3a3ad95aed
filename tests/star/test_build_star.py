"""Stars made to order: consistent to the last digits, and refused where they make no sense."""

from __future__ import annotations

import numpy as np
import pytest

import oscsolve
from oscsolve import InputError, ModelError, Run, StarModel, build_star
from oscsolve.star.ionisation import matter_at
from oscsolve.star.profile import Profile
from oscsolve.units import SOLAR_MASS, SOLAR_RADIUS


@pytest.fixture(scope="module")
def star() -> StarModel:
    hydrogen = Run((0.4, 0.7), [(0.085, 0.13)])
    return build_star(hydrogen=hydrogen, convective_core=0.085, convective_envelope=0.9, points=600)


def test_the_star_has_what_was_asked_for(star):
    assert star.total_mass == SOLAR_MASS and star.photospheric_radius == SOLAR_RADIUS
    zones = oscsolve.inspect_model(star).figures.convective_zones
    assert zones[0][0] == 0.0 and zones[-1][0] == pytest.approx(0.9, abs=0.01)
    assert star.hydrogen[0] == pytest.approx(0.4, abs=0.01)
    assert star.hydrogen[-1] == pytest.approx(0.7, abs=1e-9)
    at_photosphere = np.argmin(np.abs(star.radius - SOLAR_RADIUS))
    assert star.temperature[at_photosphere] == pytest.approx(5772.0, rel=1e-9)


def test_inspection_finds_nothing_wrong(star):
    severities = {finding.severity for finding in oscsolve.inspect_model(star)}
    assert severities == {"note"}


def test_structure_equations_hold_between_the_points(star):
    """m and P step from point to point as the density and the gravity between them say.

    The density between the points is interpolated with slopes that follow from A* and Gamma1, so
    that all columns have to fit each other; Gauss points integrate it.
    """
    profile = Profile(star)
    left, right = profile.x[profile.interval], profile.x[profile.interval + 1]
    place, weight = np.polynomial.legendre.leggauss(6)
    width = (right - left)[:, None]
    x = left[:, None] + 0.5 * (place + 1.0) * width
    at = profile.at(x, np.broadcast_to(profile.interval[:, None], x.shape))
    mass = np.sum(4.0 * np.pi * at.rho * x**2 * weight * width, axis=1) / 2.0
    weigh = np.sum(at.rho * at.g * weight * width, axis=1) / 2.0
    scale = star.gravitational_constant * SOLAR_MASS**2 / SOLAR_RADIUS**4
    inside = right < 0.999
    for found, expected in (
        (mass, np.diff(star.mass) / SOLAR_MASS),
        (weigh, -np.diff(star.pressure) / scale),
    ):
        off = np.abs(found / expected - 1.0)[inside]
        # Interpolation is worst in the few cells that hold the corners of the runs asked for.
        assert np.median(off) < 1e-8 and off.max() < 1e-4
    assert np.sum(mass) == pytest.approx(star.mass[-1] / SOLAR_MASS, abs=1e-7)


def test_frequencies_agree_with_their_energy_integrals(star):
    """Radial modes do not know N^2, the integral of nonradial ones does (Chandrasekhar 1964)."""
    modes = oscsolve.solve_modes(star, [0, 1, 2], (3.0, 100.0), unit="sigma2")
    check = oscsolve.integral_check(modes)
    assert modes.complete and np.max(np.abs(check.difference)) < 1e-6


def test_the_gas_obeys_its_own_derivatives():
    """Central differences of ln rho: errors of 1e-8 in the step of 1e-4, and of round-off."""
    ln_p = np.log([1e5, 1e8, 1e12, 2.4e17, 1e20])
    ln_t = np.log([5777.0, 1.6e4, 2e5, 1.57e7, 1e8])
    x, z, h = np.full(5, 0.7), np.full(5, 0.02), 1e-4
    here = matter_at(ln_p, ln_t, x, z)

    def slope(dp=0.0, dt=0.0, dx=0.0, dz=0.0):
        up, down = (
            matter_at(ln_p + k * dp, ln_t + k * dt, x + k * dx, z + k * dz).ln_rho for k in (1, -1)
        )
        return (up - down) / (2.0 * h)

    assert slope(dp=h) == pytest.approx(1.0 / here.chi_rho, rel=1e-5)
    assert slope(dt=h) == pytest.approx(-here.chi_t / here.chi_rho, rel=1e-5, abs=1e-7)
    assert slope(dx=h) == pytest.approx(-here.by_hydrogen / here.chi_rho, rel=1e-4, abs=1e-6)
    assert slope(dz=h) == pytest.approx(-here.by_metals / here.chi_rho, rel=1e-4, abs=1e-6)


def test_ionised_gas_is_ideal_and_ionisation_lowers_gamma1():
    """Common practice: 5/3 where all is ionised, well below that where hydrogen is half so."""
    hot = matter_at(np.log([1e15]), np.log([3e6]), np.array([0.7]), np.array([0.0]))
    assert hot.gamma1[0] == pytest.approx(5.0 / 3.0, abs=0.01)
    warm = matter_at(np.log([2e5]), np.log([1.2e4]), np.array([0.7]), np.array([0.0]))
    assert warm.gamma1[0] < 1.3


def test_a_sharper_step_of_composition_has_deeper_dips():
    """Common practice: g modes feel a step of mu, and the sharper it is the more."""
    depths = []
    for width in (0.1, 0.01):
        star = build_star(
            mass=4.0 * SOLAR_MASS,
            radius=2.9 * SOLAR_RADIUS,
            effective_temperature=14500.0,
            hydrogen=Run((0.4, 0.7), [(0.17, 0.17 + width)]),
            convective_core=0.16,
            points=500,
        )
        modes = oscsolve.solve_modes(star, [1], (1.0, 3.0), unit="d")
        spacing = np.abs(np.diff(modes.period))
        depths.append(np.ptp(spacing) / np.median(spacing))
    assert depths[1] > 1.3 * depths[0]


@pytest.mark.parametrize(
    ("asked", "message"),
    [
        ({"mass": -1.0}, "mass of a star must be above zero; got -1"),
        ({"convective_core": 1.0}, "convective_core is m/M, from 0 to below 1; got 1"),
        ({"convective_envelope": 0.0}, "convective_envelope is r/R, above 0 and up to 1; got 0"),
        ({"points": 10}, "a star needs at least 200 points; got 10"),
        ({"hydrogen": 1.5}, "hydrogen is a mass fraction, from 0 to 1"),
        ({"gradient": -0.1}, "gradient must be above zero"),
    ],
)
def test_numbers_out_of_range_are_refused(asked, message):
    with pytest.raises(InputError, match=message):
        build_star(**asked)


def test_a_star_that_cannot_be_is_refused():
    with pytest.raises(ModelError):
        build_star(mass=60.0 * SOLAR_MASS, radius=SOLAR_RADIUS, effective_temperature=2e5)


@pytest.mark.parametrize(
    ("values", "steps", "along", "message"),
    [
        ((0.7, 0.3), [], "mass", "needs 1 steps; got 0"),
        ((0.7, 0.3), [(0.2, 0.1)], "mass", "outward"),
        ((0.7, 0.3), [(0.1, 0.2)], "depth", "a run goes along mass, radius, pressure"),
        ((0.7, float("nan")), [(0.1, 0.2)], "mass", "finite"),
    ],
)
def test_runs_that_make_no_sense_are_refused(values, steps, along, message):
    with pytest.raises(InputError, match=message):
        Run(values, steps, along)
