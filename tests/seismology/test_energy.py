"""Energies: inertia from the eigenfunctions, densities, and the share of the g-mode cavity."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.interpolate import CubicSpline

import oscsolve


def test_inertia_from_the_points_is_that_of_the_solver(n3_modes, lantern_modes):
    for modes in (n3_modes, lantern_modes):
        # Tolerance of the solver 1e-8, of the photospheric normalisation the same.
        np.testing.assert_allclose(oscsolve.mode_inertia(modes), modes.inertia, rtol=1e-7)


def test_mode_mass_is_in_grams(n3_modes):
    np.testing.assert_allclose(
        oscsolve.mode_mass(n3_modes), n3_modes.inertia * n3_modes.star.total_mass
    )


def test_energy_density_has_unit_integral(n3_modes):
    x = n3_modes.star.fractional_radius
    for row in (0, 10, 40, len(n3_modes) - 1):
        density = oscsolve.energy_density(n3_modes, row)
        assert density.min() >= 0.0
        # An independent rule, good to the fourth order of the spacing.
        assert CubicSpline(x, density).integrate(0.0, 1.0) == pytest.approx(1.0, abs=2e-5)


def test_share_goes_from_0_to_1(n3_modes):
    share = oscsolve.energy_share(n3_modes)
    assert np.all((share >= 0.0) & (share <= 1.0))
    assert np.all(share[n3_modes.degree == 0] == 0.0)
    assert np.all(share[n3_modes.order > 3] == 0.0)
    assert np.all(share[n3_modes.order < -1] > 0.8)


def test_share_is_the_integral_of_the_density_over_the_cavity(lantern_modes):
    star, modes = lantern_modes.star, lantern_modes
    x = star.fractional_radius
    unit = (2e-6 * np.pi * star.nu_dynamical) ** 2
    shares = oscsolve.energy_share(modes)
    for row in np.flatnonzero((shares > 0.1) & (shares < 0.95))[:3]:
        ll = modes.degree[row] * (modes.degree[row] + 1)
        fine = np.linspace(0.001, 1.0, 200_001)
        c2 = star.gamma1 * star.pressure / star.density / star.photospheric_radius**2 / unit
        n2 = np.interp(fine, x, star.brunt_n2 / unit)
        lamb2 = ll * np.interp(fine, x, c2) / fine**2
        inside = (n2 > modes.sigma2[row]) & (lamb2 > modes.sigma2[row])
        density = CubicSpline(x, oscsolve.energy_density(modes, row))(fine)
        # The comparison is of first order in its own steps and linear between the points.
        assert np.trapezoid(density * inside, fine) == pytest.approx(shares[row], abs=2e-4)


def test_share_tells_the_ledoux_constant_of_mixed_modes(giant_modes):
    """1 - beta of a dipole g mode is 1/2, of a p mode near 0: so zeta = 2 (1 - beta).

    Goupil et al. 2013 and Deheuvels et al. 2015 give the relation; xi_r in the core and xi_h in
    the envelope, which it neglects, carry some percent of the energy of p-like modes.
    """
    share, ledoux = oscsolve.energy_share(giant_modes), oscsolve.ledoux_constant(giant_modes)
    assert len(giant_modes) > 20
    assert share.min() < 0.75
    assert share.max() > 0.98
    np.testing.assert_allclose(2.0 * ledoux, share, atol=0.045)
    g_like = share > 0.95
    np.testing.assert_allclose(2.0 * ledoux[g_like], share[g_like], atol=0.012)
