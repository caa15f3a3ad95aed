"""What a simple gas tells where a model leaves out a thermodynamic quantity."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oscsolve.star.electrons import electron_gas
from oscsolve.units import ATOMIC_MASS, BOLTZMANN, GAS_CONSTANT, RADIATION_CONSTANT


def gas_pressure_fraction(pressure: np.ndarray, temperature: np.ndarray) -> np.ndarray:
    """(n,) beta = P_gas / P = 1 - a T^4 / (3 P), with P the total pressure in cgs units."""
    return 1.0 - RADIATION_CONSTANT * temperature**4 / (3.0 * pressure)


def gamma1_gas_and_radiation(beta: np.ndarray) -> np.ndarray:
    """(n,) Gamma1 of a monatomic ideal gas with radiation; 5/3 at beta = 1, 4/3 at beta = 0.

    Notes
    -----
    Gamma1 = (32 - 24 beta - 3 beta^2) / (24 - 21 beta), which is
    beta + (4 - 3 beta)^2 (gamma - 1) / (beta + 12 (gamma - 1) (1 - beta)) at gamma = 5/3
    (Chandrasekhar 1939, An Introduction to the Study of Stellar Structure, ch. II). Limits:
    wrong where hydrogen or helium is partly ionised (the true value falls to about 1.2) and
    for relativistic electrons; non-relativistic degenerate electrons have 5/3 as well.
    """
    return (32.0 - 24.0 * beta - 3.0 * beta**2) / (24.0 - 21.0 * beta)


def ideal_pressure(
    density: np.ndarray, temperature: np.ndarray, hydrogen: np.ndarray, helium: np.ndarray
) -> np.ndarray:
    """(n,) pressure of a fully ionised ideal gas with radiation, dyn cm^-2.

    Notes
    -----
    P = rho R T / mu + a T^4 / 3 with 1/mu = 2 X + 3 Y / 4 + Z / 2 (Cox & Giuli 1968, ch. 15).
    Its distance from the P of a model shows where the gas is degenerate or not fully ionised.
    """
    metals = 1.0 - hydrogen - helium
    per_gram = 2.0 * hydrogen + 0.75 * helium + 0.5 * metals
    return density * GAS_CONSTANT * temperature * per_gram + RADIATION_CONSTANT * temperature**4 / 3


#: Mean mass number of metals where only their mass fraction is known: carbon and oxygen rule,
#: both in a solar mixture and in a white dwarf. An error of 2 in it matters only where ions
#: carry the pressure of matter that is nearly all metals.
METAL_MASS_NUMBER = 14.0


@dataclass(frozen=True, eq=False)
class GasState:
    """Thermodynamics of a completely ionised gas; (n,) arrays, cgs units.

    Attributes
    ----------
    eta : chemical potential of the electrons over kT
    pressure : dyn cm^-2
    gamma1, nabla_ad : first adiabatic exponent, (dlnT/dlnP) at constant entropy
    chi_rho, chi_t : (dlnP/dln rho) at constant T, (dlnP/dlnT) at constant rho
    by_electrons, by_ions : dlnP/dln of the numbers of electrons and of ions per gram at
        constant rho and T
    """

    eta: np.ndarray
    pressure: np.ndarray
    gamma1: np.ndarray
    nabla_ad: np.ndarray
    chi_rho: np.ndarray
    chi_t: np.ndarray
    by_electrons: np.ndarray
    by_ions: np.ndarray


def ionised_gas(
    density: np.ndarray, temperature: np.ndarray, electrons: np.ndarray, ions: np.ndarray
) -> GasState:
    """Ideal ions, electrons of any degeneracy and at relativistic speeds, and radiation.

    Parameters
    ----------
    density, temperature : (n,) g cm^-3, K
    electrons, ions : (n,) moles per gram, see `particles`

    Notes
    -----
    Gamma1 = chi_rho + chi_T^2 P/(c_V rho T) and nabla_ad = chi_T P/(c_V rho T)/Gamma1 (Cox &
    Giuli 1968, ch. 9). Limits: no partial ionisation, no Coulomb interaction (it lowers the
    pressure of a cool carbon-oxygen white dwarf by 3 to 5 percent), no crystals, no pairs.
    """
    moles = density / ATOMIC_MASS
    gas = electron_gas(moles * electrons, temperature)
    ion = moles * ions * BOLTZMANN * temperature
    radiation = RADIATION_CONSTANT * temperature**4 / 3.0
    pressure = gas.pressure + ion + radiation
    chi_rho = (gas.by_density + ion) / pressure
    chi_t = (gas.by_temperature + ion + 4.0 * radiation) / pressure
    heat = gas.heat + 1.5 * ion + 12.0 * radiation
    # Gamma3 - 1, the slope of ln T against ln rho at constant entropy.
    rise = pressure * chi_t / heat
    gamma1 = chi_rho + chi_t * rise
    return GasState(
        eta=gas.eta,
        pressure=pressure,
        gamma1=gamma1,
        nabla_ad=rise / gamma1,
        chi_rho=chi_rho,
        chi_t=chi_t,
        by_electrons=gas.by_density / pressure,
        by_ions=ion / pressure,
    )


def particles(
    hydrogen: np.ndarray, helium: np.ndarray, charge: np.ndarray | None = None
) -> tuple[np.ndarray, np.ndarray]:
    """Electrons and ions in moles per gram, of completely ionised matter.

    Parameters
    ----------
    hydrogen, helium : (n,) mass fractions; the rest is metals of `METAL_MASS_NUMBER`
    charge : (n,) mean of Z/A weighted with mass; None takes 1, 1/2 and 1/2
    """
    metals = np.maximum(1.0 - hydrogen - helium, 0.0)
    electrons = hydrogen + 0.5 * helium + 0.5 * metals if charge is None else charge
    return electrons, hydrogen + 0.25 * helium + metals / METAL_MASS_NUMBER
