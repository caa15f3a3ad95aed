"""The electron gas against high precision quadrature and the closed forms of its limits."""

from __future__ import annotations

import mpmath
import numpy as np
import pytest

from oscsolve.star.electrons import cold_pressure, electron_gas
from oscsolve.star.gas import gamma1_gas_and_radiation, ionised_gas, particles
from oscsolve.units import (
    ATOMIC_MASS,
    BOLTZMANN,
    COMPTON_DENSITY,
    ELECTRON_REST_ENERGY,
    GAS_CONSTANT,
    RADIATION_CONSTANT,
)

STATES = [(1e20, 1e4), (1e25, 1e7), (1e27, 2e7), (1e29, 4e6), (3e30, 1e8), (1e31, 1e9), (2e27, 1e5)]


def quadrature(eta, t):
    """n, P and U of the definitions, in N, N mc^2 and N mc^2: Fermi-Dirac integrals as such."""
    with mpmath.workdps(25):
        eta, t = mpmath.mpf(eta), mpmath.mpf(t)

        def integral(f):
            marks = {mpmath.mpf(0)} | {eta + d for d in (-60, -10, 0, 10, 60) if eta + d > 0}
            if eta < 0:
                marks |= {mpmath.mpf(v) for v in (1, 5, 50)}
            return mpmath.quad(lambda x: f(x) / (mpmath.exp(x - eta) + 1), sorted(marks))

        def y(x):
            return mpmath.sqrt(x * t * (x * t + 2))

        return (
            integral(lambda x: y(x) * (1 + x * t) * t),
            integral(lambda x: y(x) ** 3 / 3 * t),
            integral(lambda x: y(x) * (1 + x * t) * t * t * x),
        )


@pytest.mark.parametrize(("n", "temperature"), STATES)
def test_density_and_pressure_are_the_integrals(n, temperature):
    gas = electron_gas(np.array([n]), np.array([temperature]))
    number, pressure, _ = quadrature(
        float(gas.eta[0]), BOLTZMANN * temperature / ELECTRON_REST_ENERGY
    )
    # eta to 1e-13, which moves n by 1.5e-13 of itself at most where eta is large.
    assert float(number) * COMPTON_DENSITY == pytest.approx(n, rel=1e-12)
    expected = float(pressure) * COMPTON_DENSITY * ELECTRON_REST_ENERGY
    assert gas.pressure[0] == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize(("n", "temperature"), [(1e25, 1e7), (1e27, 2e7), (1e28, 4e7), (1e31, 1e9)])
def test_derivatives_are_those_of_the_pressure(n, temperature):
    gas = electron_gas(np.array([n]), np.array([temperature]))
    h = 1e-4
    up, down = (electron_gas(np.array([n * f]), np.array([temperature])) for f in (1 + h, 1 - h))
    hot, cold = (electron_gas(np.array([n]), np.array([temperature * f])) for f in (1 + h, 1 - h))
    # Central differences: h^2 and round-off over h.
    by_density = (up.pressure - down.pressure) / (2 * h)
    by_temperature = (hot.pressure - cold.pressure) / (2 * h)
    assert gas.by_density[0] == pytest.approx(by_density[0], rel=1e-6)
    assert gas.by_temperature[0] == pytest.approx(by_temperature[0], rel=1e-6)


def test_heat_is_the_slope_of_the_energy():
    n, temperature, h = 1e27, 2e7, 1e-3
    energies = []
    for factor in (1 + h, 1 - h):
        gas = electron_gas(np.array([n]), np.array([temperature * factor]))
        relative = BOLTZMANN * temperature * factor / ELECTRON_REST_ENERGY
        energies.append(float(quadrature(float(gas.eta[0]), relative)[2]))
    slope = (energies[0] - energies[1]) / (2 * h) * COMPTON_DENSITY * ELECTRON_REST_ENERGY
    gas = electron_gas(np.array([n]), np.array([temperature]))
    assert gas.heat[0] == pytest.approx(slope, rel=1e-5)


def test_cold_pressure_is_smooth_where_series_and_closed_form_meet():
    y = np.array([1e-4, 1e-3, 0.03, 0.0599999, 0.0600001, 0.3, 1.0, 30.0])
    with mpmath.workdps(60):
        exact = [
            float((v * (2 * v**2 - 3) * mpmath.sqrt(1 + v**2) + 3 * mpmath.asinh(v)) / 24)
            for v in map(mpmath.mpf, y.tolist())
        ]
    np.testing.assert_allclose(cold_pressure(y), exact, rtol=1e-10)


@pytest.mark.parametrize("y", [0.05, 0.5, 1.0, 3.0, 20.0])
def test_cold_limit_is_that_of_chandrasekhar(y):
    # Chandrasekhar 1939, ch. X: P = p0(y), n = y^3/3, so dlnP/dln n = y^5/(9 p0 sqrt(1 + y^2)).
    n = COMPTON_DENSITY * y**3 / 3
    fermi = ELECTRON_REST_ENERGY * (np.sqrt(1 + y**2) - 1)
    gas = electron_gas(np.array([n]), np.array([fermi / BOLTZMANN / 1e5]))
    p0 = (y * (2 * y**2 - 3) * np.sqrt(1 + y**2) + 3 * np.arcsinh(y)) / 24
    # What heat adds is of the order of eta^-2.
    assert gas.pressure[0] == pytest.approx(COMPTON_DENSITY * ELECTRON_REST_ENERGY * p0, rel=1e-8)
    slope = y**5 / (9 * p0 * np.sqrt(1 + y**2))
    assert gas.by_density[0] / gas.pressure[0] == pytest.approx(slope, rel=1e-8)
    # Sommerfeld: heat = pi^2 kT/E_F' ... for a slow gas (pi^2/2) n kT/eta.
    if y < 0.1:
        expected = np.pi**2 / 2 * n * BOLTZMANN * fermi / BOLTZMANN / 1e5 / 1e5
        assert gas.heat[0] == pytest.approx(expected, rel=3e-3)


def test_dilute_limit_is_an_ideal_gas():
    n, temperature = np.array([1e15]), np.array([1e5])
    gas = electron_gas(n, temperature)
    ideal = n * BOLTZMANN * temperature
    # Relativistic corrections are of the order of kT/mc^2 = 2e-5.
    np.testing.assert_allclose(gas.pressure, ideal, rtol=1e-8)
    np.testing.assert_allclose(gas.by_temperature, ideal, rtol=1e-8)
    np.testing.assert_allclose(gas.heat, 1.5 * ideal, rtol=1e-4)


def test_gamma1_runs_from_five_thirds_to_four_thirds_with_density():
    density = np.geomspace(1e3, 1e12, 40)
    gas = ionised_gas(density, np.full(40, 1e4), *particles(np.zeros(40), np.zeros(40)))
    assert np.all(np.diff(gas.gamma1) < 0.0)
    assert gas.gamma1[0] == pytest.approx(5 / 3, abs=2e-3)
    assert gas.gamma1[-1] == pytest.approx(4 / 3, abs=2e-4)


def test_ionised_gas_joins_the_ideal_gas_with_radiation():
    density, temperature = np.array([1e-6, 1e-4, 1e-2]), np.array([3e6, 1e7, 2e6])
    hydrogen, helium = np.full(3, 0.7), np.full(3, 0.28)
    gas = ionised_gas(density, temperature, *particles(hydrogen, helium))
    radiation = RADIATION_CONSTANT * temperature**4 / 3
    np.testing.assert_allclose(
        gas.gamma1, gamma1_gas_and_radiation(1.0 - radiation / gas.pressure), rtol=2e-3
    )
    per_gram = 0.7 + 0.14 + 0.01 + 0.7 + 0.07 + 0.02 / 14
    ideal = density * GAS_CONSTANT * temperature * per_gram + radiation
    np.testing.assert_allclose(gas.pressure, ideal, rtol=1e-3)


def test_identity_between_the_exponents():
    density, temperature = np.geomspace(1e-2, 1e8, 12), np.geomspace(1e6, 3e8, 12)
    gas = ionised_gas(density, temperature, *particles(np.full(12, 0.1), np.full(12, 0.8)))
    # 1/Gamma1 = (1 - chi_T nabla_ad)/chi_rho: two ways along an adiabat (Cox & Giuli 1968, ch. 9).
    np.testing.assert_allclose(
        (1.0 - gas.chi_t * gas.nabla_ad) / gas.chi_rho, 1.0 / gas.gamma1, rtol=1e-10
    )


def test_adiabat_is_followed_by_the_exponents():
    # First law along a small step: dU/d ln rho at fixed entropy = U + P (per volume), with U from
    # independent quadrature of the electrons.
    rho, temperature = 1e4, 5e7
    electrons, ions = np.array([0.5]), np.array([0.1])
    one = np.array([1.0])
    gas = ionised_gas(rho * one, temperature * one, electrons, ions)
    rise = float(gas.nabla_ad[0] * gas.gamma1[0])

    def energy(ln_rho):
        density, heat = rho * np.exp(ln_rho), temperature * np.exp(rise * ln_rho)
        moles = density / ATOMIC_MASS
        state = electron_gas(np.array([moles * 0.5]), np.array([heat]))
        relative = BOLTZMANN * heat / ELECTRON_REST_ENERGY
        kinetic = float(quadrature(float(state.eta[0]), relative)[2])
        return (
            kinetic * COMPTON_DENSITY * ELECTRON_REST_ENERGY
            + 1.5 * moles * 0.1 * BOLTZMANN * heat
            + RADIATION_CONSTANT * heat**4
        )

    h = 1e-3
    slope = (energy(h) - energy(-h)) / (2 * h)
    assert slope == pytest.approx(energy(0.0) + float(gas.pressure[0]), rel=1e-5)
