"""Integrals over the star against closed forms and against the modes they describe."""

from __future__ import annotations

import numpy as np
import pytest

import oscsolve
from oscsolve.star.integrals import (
    acoustic_cutoff,
    acoustic_radius,
    buoyancy_integral,
    period_spacing,
)
from oscsolve.star.likely_band import likely_band
from oscsolve.star.profile import Profile


def test_acoustic_radius_of_the_uniform_sphere():
    # c^2 = Gamma1 (1 - x^2)/2 with G = M = R = 1: int dr/c = (pi/2) sqrt(2/Gamma1).
    profile = Profile(oscsolve.uniform_sphere())
    assert acoustic_radius(profile) == pytest.approx(np.pi / 2 * np.sqrt(6 / 5), rel=1e-6)


def test_acoustic_radius_of_the_polytrope_of_index_one():
    # theta = sin(pi x)/(pi x) and P/rho = theta/2: int dr/c by quadrature in 1 - x = u^2.
    u = np.polynomial.legendre.leggauss(60)
    s, weight = 0.5 * (u[0] + 1), 0.5 * u[1]
    x = 1.0 - s**2
    expected = np.sum(weight * 2 * s / np.sqrt(5 / 3 * 0.5 * np.sinc(x)))
    assert acoustic_radius(Profile(oscsolve.polytrope(1))) == pytest.approx(expected, rel=1e-6)


def test_nothing_is_stable_in_a_neutral_star():
    star = oscsolve.polytrope(1.5)
    assert buoyancy_integral(Profile(star)) == 0.0
    assert period_spacing(star, 1) == np.inf


def test_period_spacings_of_degrees_differ_by_the_root_of_l():
    star = oscsolve.polytrope(3)
    assert period_spacing(star, 1) / period_spacing(star, 3) == pytest.approx(np.sqrt(6.0))


@pytest.mark.parametrize("degree", [1, 2])
def test_high_order_g_modes_have_the_asymptotic_spacing(degree):
    star = oscsolve.polytrope(3)
    spacing = period_spacing(star, degree)
    modes = oscsolve.solve_modes(star, (degree,), (30.0 * spacing, 43.0 * spacing), unit="s")
    wanted = (modes.order <= -29) & (modes.order >= -41)
    order, period = modes.order[wanted], modes.period[wanted]
    assert order.size >= 11
    ratio = np.abs(np.diff(period)) / spacing
    middle = np.abs(0.5 * (order[1:] + order[:-1]))
    # Tassoul 1980: corrections fall with the order; here from 0.6 to 0.4 percent, and what is
    # left when a term in n^-2 is fitted is below 0.15 percent.
    assert np.all(np.abs(ratio - 1.0) < 0.01)
    assert np.all(np.diff(ratio[np.argsort(middle)]) < 0.0)
    limit = np.polyfit(middle**-2.0, ratio, 1)[1]
    assert limit == pytest.approx(1.0, abs=1.5e-3)


def test_cutoff_of_the_outermost_layer():
    star = oscsolve.polytrope(3)
    keep = star.fractional_radius <= 0.999
    names = ("radius", "mass", "pressure", "density", "gamma1", "a_star")
    cut = star.with_changes(**{name: getattr(star, name)[keep] for name in names})
    r, m, p, d = (getattr(cut, name)[-1] for name in names[:4])
    height = p * r**2 / (cut.gravitational_constant * m * d)
    expected = np.sqrt(5 / 3 * p / d) / (4.0 * np.pi * height) * 1e6
    assert acoustic_cutoff(Profile(cut)) * cut.nu_dynamical == pytest.approx(expected, rel=1e-6)


@pytest.mark.parametrize("index", [1, 1.5, 3, 4.5])
def test_likely_band_of_a_polytrope_holds_its_fundamental(index):
    star = oscsolve.polytrope(index)
    (low, high), _ = likely_band(star, Profile(star))
    assert 0.0 < low <= star.nu_dynamical < high
