"""Large separation, epsilon, period spacing, scaling and acoustic depth."""

from __future__ import annotations

import math

import numpy as np
import pytest

import oscsolve
from oscsolve.seismology.large_separation import straight_line
from oscsolve.units import SOLAR_LUMINOSITY, SOLAR_RADIUS


@pytest.fixture(scope="module")
def observed_radial(shared_data) -> tuple[np.ndarray, ...]:
    """order, nu, nu_error of the radial modes of the observed Sun (Broomhall et al. 2009)."""
    path = shared_data / "solar" / "observed-low-degree.csv"
    lines = [line for line in path.read_text().splitlines() if not line.startswith("#")]
    table = np.array([line.split(",") for line in lines[1:]], dtype=float)
    return tuple(table[table[:, 0] == 0][:, 1:].T)


def test_a_straight_line_is_that_of_weighted_least_squares():
    rng = np.random.default_rng(4)
    n, weight = np.arange(12.0), rng.uniform(0.1, 1.0, 12)
    y = 135.0 * (n + 1.4) + rng.normal(size=12)
    line = straight_line(n, y, weight)
    # NumPy's own weighted fit takes the roots of the weights.
    slope, cut = np.polyfit(n, y, 1, w=np.sqrt(weight))
    assert (line.slope, line.ratio) == pytest.approx((slope, cut / slope), rel=1e-10)
    step = 1e-4 * np.eye(12)
    for name, by in (("slope", line.slope_by), ("ratio", line.ratio_by)):
        moved = [getattr(straight_line(n, y + row, weight), name) for row in step]
        # Second order of the ratio in the step.
        assert (np.array(moved) - getattr(line, name)) / 1e-4 == pytest.approx(by, abs=1e-6)


def test_the_scatter_of_a_line_is_found_from_its_own_residuals():
    rng = np.random.default_rng(5)
    n, weight = np.arange(20.0), np.ones(20)
    lines = [
        straight_line(n, 50.0 * (n + 1.2) + rng.normal(scale=0.3, size=20), weight)
        for _ in range(400)
    ]
    for name in ("slope", "ratio"):
        spread = np.std([getattr(line, name) for line in lines])
        stated = np.mean([getattr(line, f"{name}_error") for line in lines])
        # A spread from 400 draws is known to 1/sqrt(800) = 4 percent.
        assert stated == pytest.approx(spread, rel=0.15)


def test_the_observed_sun_has_its_published_separation(observed_radial):
    fit = oscsolve.fit_ridge(0, *observed_radial, nu_max=3090.0)
    # 134.9 to 135.1 uHz and 1.4 to 1.5: Huber et al. (2011), White et al. (2011), from memory.
    assert fit.separation == pytest.approx(135.0, abs=0.2)
    assert fit.epsilon == pytest.approx(1.46, abs=0.05)
    assert fit.separation_error < 0.3
    assert 0.0 < fit.separation_propagated < 0.01
    shuffled = oscsolve.fit_ridge(0, *(column[::-1] for column in observed_radial), nu_max=3090.0)
    assert shuffled.separation == fit.separation


def test_propagated_errors_are_those_of_noise(observed_radial):
    order, nu, _ = observed_radial
    error = np.full(nu.size, 0.5)
    fit = oscsolve.fit_ridge(0, order, nu, error, nu_max=3090.0)
    rng = np.random.default_rng(2)
    fits = [
        oscsolve.fit_ridge(0, order, rng.normal(nu, error), error, nu_max=3090.0)
        for _ in range(800)
    ]
    for name in ("separation", "epsilon"):
        spread = np.std([getattr(each, name) for each in fits])
        # 1/sqrt(1600) = 2.5 percent.
        assert getattr(fit, f"{name}_propagated") == pytest.approx(spread, rel=0.1)


def test_the_solar_model_is_off_the_observed_sun_by_the_surface_effect(
    solar_modes, observed_radial
):
    model = oscsolve.fit_large_separation(solar_modes)
    sun = oscsolve.fit_ridge(0, *observed_radial, nu_max=model.nu_max)
    # Models without a better surface have separations larger by 0.5 to 1 percent (common practice).
    assert 0.3 < model.separation - sun.separation < 1.5
    assert model.separation_propagated < 1e-5
    separations = [
        oscsolve.fit_large_separation(solar_modes, degree).separation for degree in range(4)
    ]
    # One large separation for all degrees but for the change of the small ones, which fall by
    # about 0.5 (d02) to 0.8 uHz (d03) an order.
    assert separations == pytest.approx(separations[:1] * 4, abs=0.9)


def test_high_orders_approach_the_integral(star_n3):
    off = []
    for band in ((1000, 3000), (3000, 8000)):
        modes = oscsolve.solve_modes(star_n3, (0,), band, unit="sigma2")
        fit = oscsolve.fit_large_separation(modes)
        off.append(fit.separation / oscsolve.asymptotics(modes).large_separation_integral - 1.0)
    # Tassoul (1980): what is left falls as 1/n^2; n = 33 and 56 here.
    assert 0.0 < off[1] < 2e-3
    assert off[0] / off[1] == pytest.approx((56.0 / 33.0) ** 2, rel=0.15)


def test_too_few_modes_make_no_fit(n3_modes, observed_radial):
    assert oscsolve.fit_large_separation(n3_modes, 7) is None
    assert oscsolve.fit_period_spacing(n3_modes, 7) is None
    order, nu, error = observed_radial
    with pytest.raises(oscsolve.InputError, match="3 modes or more; got 2"):
        oscsolve.fit_ridge(0, order[:2], nu[:2], error[:2])
    with pytest.raises(oscsolve.InputError, match="one number a mode"):
        oscsolve.fit_ridge(0, order, nu[:-1], error)
    with pytest.raises(oscsolve.InputError, match="each order comes once"):
        oscsolve.fit_ridge(0, order * 0, nu, error)
    with pytest.raises(oscsolve.InputError, match="each order comes once"):
        oscsolve.fit_ridge(0, order, np.where(order == order[3], np.nan, nu), error)


def test_g_modes_of_a_polytrope_have_the_spacing_of_tassoul(star_n3):
    modes = oscsolve.solve_modes(star_n3, (1, 2), (1e-3, 1e-2), unit="sigma2")
    integral = dict(oscsolve.asymptotics(modes).period_spacing_integral)
    for spacings in oscsolve.period_spacings(modes):
        fit = oscsolve.fit_period_spacing(modes, spacings.degree)
        off = spacings.spacing / integral[spacings.degree] - 1.0
        # Tassoul (1980): what is left falls as 1/n^2; n = 39 to 125 for l = 1, 68 to 218 for l = 2.
        assert np.all(
            off * spacings.order**2 == pytest.approx(off[-1] * spacings.order[-1] ** 2, rel=0.4)
        )
        assert 0.0 < off[-1] < 1e-3
        assert fit.spacing == pytest.approx(integral[spacings.degree], rel=2e-3)
        assert np.all(spacings.error < 1e-5 * spacings.spacing)
        assert not np.any(spacings.dip)
        assert np.all(np.diff(spacings.period) > 0.0)
    ratio = integral[1] / integral[2]
    assert ratio == pytest.approx(math.sqrt(3.0), rel=1e-12)


def test_dips_are_where_p_modes_are(red_giant_modes):
    (dipole, quadrupole) = oscsolve.period_spacings(red_giant_modes)
    nu0 = red_giant_modes.nu[red_giant_modes.degree == 0]
    n0 = np.arange(nu0.size)
    for spacings, place in ((dipole, 0.5), (quadrupole, 0.86)):
        nu = 1e6 / spacings.period[spacings.dip]
        inside = (nu > nu0[0]) & (nu < nu0[-1])
        assert np.count_nonzero(inside) > 5
        phase = np.interp(nu[inside], nu0, n0) % 1.0
        # Between two radial modes for l = 1, just below the next for l = 2 (Mosser et al. 2012).
        assert np.median(phase) == pytest.approx(place, abs=0.15)


def test_growing_modes_have_no_period(handmade_modes):
    modes = handmade_modes()
    assert oscsolve.period_spacings(modes) == ()
    assert oscsolve.asymptotics(modes).large_separations == ()


def test_scaling_relations_give_the_sun_back(shared_data):
    star = oscsolve.read_model(shared_data / "solar" / "standard.fgong")
    # The model is a Sun: 3090 uHz and 135.1 uHz (Huber et al. 2011), M, R and L to a percent.
    assert oscsolve.nu_max_scaling(star) == pytest.approx(3090.0, rel=5e-3)
    assert oscsolve.large_separation_scaling(star) == pytest.approx(135.1, rel=2e-3)
    # T_eff of the Sun: 5772 K (IAU 2015 Resolution B3).
    assert oscsolve.effective_temperature(star) == pytest.approx(5772.0, rel=3e-3)


def test_temperature_follows_from_the_luminosity(star_n3):
    assert oscsolve.effective_temperature(star_n3) is None
    assert oscsolve.nu_max_scaling(star_n3) is None
    bright = star_n3.with_changes(
        luminosity=16.0 * SOLAR_LUMINOSITY * (star_n3.photospheric_radius / SOLAR_RADIUS) ** 2
    )
    assert oscsolve.effective_temperature(bright) == pytest.approx(2.0 * 5772.0, rel=1e-12)
    given = bright.with_changes(effective_temperature=6000.0)
    assert oscsolve.effective_temperature(given) == 6000.0
    # Nothing excites such modes in a radiative envelope.
    assert oscsolve.nu_max_scaling(given) is None


def test_acoustic_depth_of_a_uniform_sphere_is_known():
    star = oscsolve.uniform_sphere()
    # P ~ 1 - x^2, so c ~ sqrt(1 - x^2) and the depth is arccos(x)/c(0), c(0)^2 = Gamma1/2 G M/R.
    omega = 2.0 * math.pi * star.nu_dynamical * 1e-6
    exact = np.arccos(np.minimum(star.fractional_radius, 1.0)) / math.sqrt(star.gamma1[0] / 2.0)
    # The last interval, where c falls to zero, is taken to leading order.
    assert oscsolve.acoustic_depth(star) * omega == pytest.approx(exact, rel=1e-6, abs=1e-6)


def test_the_convective_envelope_of_the_sun_has_its_acoustic_depth(solar_modes):
    found = oscsolve.asymptotics(solar_modes)
    # Base of the solar convection zone at an acoustic depth of 2000 to 2300 s, depending on where
    # the surface is put (Monteiro et al. 1994 and later, from memory).
    assert 2000.0 < found.envelope_depth < 2300.0
    assert found.acoustic_radius == pytest.approx(0.5e6 / found.large_separation_integral)
    assert found.acoustic_radius == pytest.approx(
        oscsolve.acoustic_depth(solar_modes.star)[0], rel=1e-9
    )
    assert found.mixed == ()


def test_everything_works_on_a_list_read_back(red_giant_modes, tmp_path):
    oscsolve.save_modes(red_giant_modes, tmp_path / "giant.h5")
    again = oscsolve.asymptotics(oscsolve.load_modes(tmp_path / "giant.h5"))
    before = oscsolve.asymptotics(red_giant_modes)
    assert [fit.coupling for fit in again.mixed] == [fit.coupling for fit in before.mixed]
    assert again.nu_max == before.nu_max
    with pytest.raises(ValueError, match="read-only"):
        again.period_spacings[0].spacing[0] = 0.0
