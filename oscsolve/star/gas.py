"""What a simple gas tells where a model leaves out a thermodynamic quantity."""

from __future__ import annotations

import numpy as np

from oscsolve.units import GAS_CONSTANT, RADIATION_CONSTANT


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
