"""Gamma1 and buoyancy of files that leave them out."""

from __future__ import annotations

import numpy as np
import pytest

from oscsolve.star.formats.points import Draft
from oscsolve.star.formats.thermodynamics import settle_thermodynamics
from oscsolve.star.gas import ionised_gas, particles
from oscsolve.units import NEWTON_G


def cold_star(points=60, *, helium_jump=False):
    """A draft of a degenerate isothermal ball whose pressure is that of the gas, and the gas.

    Half-way the mixture turns from helium to half hydrogen, at the same number of electrons, if
    asked.
    """
    temperature = np.full(points, 5e6)
    helium = np.ones(points)
    if helium_jump:
        helium = 0.75 - 0.25 * np.tanh((np.arange(points) - points // 2) / 6.0)
    hydrogen = 1.0 - helium
    density = np.geomspace(1e6, 1e4, points) * 0.5 / (1.0 - 0.5 * helium)
    gas = ionised_gas(density, temperature, *particles(hydrogen, helium))
    # Radius and mass only scale A*; any pair that is consistent in sign serves.
    radius = np.linspace(1e8, 6e8, points)
    mass = 1e33 * (radius / 6e8) ** 2
    columns = {
        "radius": radius,
        "mass": mass,
        "pressure": gas.pressure,
        "density": density,
        "temperature": temperature,
        "hydrogen": hydrogen,
        "helium": helium,
    }
    scalars = {"photospheric_radius": 6e8, "total_mass": 1e33, "gravitational_constant": NEWTON_G}
    return Draft("ball.txt", columns, scalars), gas


def excess(draft):
    """A*/V."""
    c = draft.columns
    return c["a_star"] * c["radius"] * c["pressure"] / (NEWTON_G * c["mass"] * c["density"])


def test_isothermal_degenerate_matter_has_the_buoyancy_of_its_ions():
    draft, gas = cold_star()
    settle_thermodynamics(draft, 1e-15)
    np.testing.assert_array_equal(draft.columns["gamma1"], gas.gamma1)
    # nabla = 0 and one mixture: A*/V = chi_T nabla_ad/chi_rho, exactly in the thermal form.
    expected = gas.chi_t * gas.nabla_ad / gas.chi_rho
    np.testing.assert_allclose(excess(draft), expected, rtol=1e-9)
    codes = [finding.code for finding in draft.findings]
    assert codes == ["gamma1-electron-gas", "a-star-derived", "a-star-thermal"]
    # The P of the draft is that of the gas.
    assert draft.findings[0].size < 1e-12


def test_both_forms_agree_where_the_pressure_is_that_of_the_gas():
    draft, gas = cold_star(points=400)
    settle_thermodynamics(draft, 1e-15)
    slope = np.gradient(np.log(draft.columns["density"]), np.log(draft.columns["pressure"]))
    # Second-order differences on 400 points: 1e-5 of a slope of 0.6.
    np.testing.assert_allclose(
        excess(draft)[1:-1], (slope - 1.0 / gas.gamma1)[1:-1], atol=1e-5, rtol=0.0
    )


def test_a_lighter_mixture_above_is_stable():
    draft, _ = cold_star(points=400, helium_jump=True)
    settle_thermodynamics(draft, 1e-15)
    values = excess(draft)
    step = slice(170, 231)
    assert values[step].max() > 0.5
    assert np.all(np.abs(values[:150]) < 0.05)
    # Nothing is lost: the sum over the step is the change of ln rho at given P and T.
    lnp, lnd = (np.log(draft.columns[name]) for name in ("pressure", "density"))
    gained = np.trapezoid(values[step], lnp[step])
    straight = np.trapezoid(1.0 / draft.columns["gamma1"][step], lnp[step])
    assert gained + straight == pytest.approx(lnd[step][-1] - lnd[step][0], rel=0.01)


def test_a_mean_charge_that_no_mixture_has_is_not_used():
    draft, gas = cold_star()
    draft.columns["mean_charge"] = np.full(60, 26.0)
    settle_thermodynamics(draft, 1e-15)
    assert "charge-ignored" in [finding.code for finding in draft.findings]
    np.testing.assert_array_equal(draft.columns["gamma1"], gas.gamma1)


def test_a_mean_charge_changes_the_number_of_electrons():
    draft, _ = cold_star()
    draft.columns["mean_charge"] = np.full(60, 0.46)
    settle_thermodynamics(draft, 1e-15)
    c = draft.columns
    number = particles(c["hydrogen"], c["helium"], np.full(60, 0.46))
    expected = ionised_gas(c["density"], c["temperature"], *number)
    np.testing.assert_array_equal(c["gamma1"], expected.gamma1)
    assert "mean_charge" not in c


def test_degeneracy_is_named_where_the_composition_is_missing():
    draft, _ = cold_star()
    del draft.columns["hydrogen"], draft.columns["helium"]
    settle_thermodynamics(draft, 1e-15)
    finding = next(f for f in draft.findings if f.code == "gamma1-ideal-gas")
    assert "electrons are degenerate" in finding.message
    assert finding.size > 2.2
