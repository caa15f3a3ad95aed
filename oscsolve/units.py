"""Constants with their source, and conversions between units of frequency.

Inside the package everything is dimensionless (G = M = R = 1) and the eigenvalue is
``sigma2 = omega^2 R^3 / (G M)``; this module is where it enters and leaves.
"""

from __future__ import annotations

import math

from oscsolve.errors import BandError, InputError

#: Newton's constant, cm^3 g^-1 s^-2 (CODATA 2018). Only a default: G belongs to the model.
NEWTON_G = 6.67430e-8
#: Nominal solar mass parameter G M, cm^3 s^-2 (IAU 2015 Resolution B3).
SOLAR_GM = 1.3271244e26
#: Solar mass, g: the nominal G M over CODATA 2018 G.
SOLAR_MASS = SOLAR_GM / NEWTON_G
#: Nominal solar radius, cm (IAU 2015 Resolution B3).
SOLAR_RADIUS = 6.957e10
#: Nominal solar luminosity, erg s^-1 (IAU 2015 Resolution B3).
SOLAR_LUMINOSITY = 3.828e33
#: Boltzmann constant, erg K^-1 (exact, SI 2019).
BOLTZMANN = 1.380649e-16
#: Atomic mass constant, g (CODATA 2018).
ATOMIC_MASS = 1.66053906660e-24
#: Molar gas constant over 1 g/mol, erg g^-1 K^-1 (exact constants, SI 2019).
GAS_CONSTANT = 8.31446261815324e7
#: Radiation density constant a, erg cm^-3 K^-4 (CODATA 2018).
RADIATION_CONSTANT = 7.565733e-15

#: Electron volt, erg (exact, SI 2019).
ELECTRON_VOLT = 1.602176634e-12
#: Stefan-Boltzmann constant, erg cm^-2 s^-1 K^-4 (CODATA 2018).
STEFAN_BOLTZMANN = 5.670374419e-5
#: Rest energy of the electron m c^2, erg (CODATA 2018).
ELECTRON_REST_ENERGY = 8.1871057769e-7
#: 8 pi (m c/h)^3, cm^-3: electrons of momentum below m c hold a third of it (CODATA 2018
#: Compton wavelength, 2.42631023867e-10 cm).
COMPTON_DENSITY = 8.0 * math.pi / 2.42631023867e-10**3

#: Frequency units: factor from the unit to hertz.
FREQUENCY_UNITS = {"uHz": 1e-6, "mHz": 1e-3, "c/d": 1.0 / 86400.0}
#: Period units: factor from the unit to seconds.
PERIOD_UNITS = {"s": 1.0, "min": 60.0, "h": 3600.0, "d": 86400.0}
#: Every name accepted as ``unit``; ``sigma2`` is omega^2 R^3 / (G M).
UNITS = (*FREQUENCY_UNITS, *PERIOD_UNITS, "sigma2")


def dynamical_frequency(g_newton: float, mass: float, radius: float) -> float:
    """sqrt(G M / R^3) / 2 pi in uHz, from G, M and R in cgs units."""
    return math.sqrt(g_newton * mass / radius**3) / (2.0 * math.pi) * 1e6


def frequency_from_sigma2(sigma2: float, nu_dynamical: float) -> float:
    """Cyclic frequency in uHz; negative (minus the growth rate / 2 pi) where sigma2 < 0."""
    return math.copysign(math.sqrt(abs(sigma2)), sigma2) * nu_dynamical


def sigma2_from_frequency(nu: float, nu_dynamical: float) -> float:
    """omega^2 R^3 / (G M) of a cyclic frequency in uHz; negative where nu < 0."""
    return math.copysign((nu / nu_dynamical) ** 2, nu)


def band_to_uhz(band: tuple[float, float], unit: str, nu_dynamical: float) -> tuple[float, float]:
    """The band as (low, high) in uHz.

    Parameters
    ----------
    band : two numbers in `unit`; periods may come in either order, frequencies low first.
    unit : one of `UNITS`.
    nu_dynamical : dynamical frequency of the star in uHz, used for ``sigma2``.

    Raises
    ------
    BandError
        A limit is not finite, a period or frequency is not positive, or the band is empty.
    InputError
        The unit is unknown.
    """
    if unit not in UNITS:
        raise InputError(f"unit {unit!r} is not known; use one of {', '.join(UNITS)}")
    try:
        first, second = (float(limit) for limit in band)
    except (TypeError, ValueError) as error:
        raise BandError(f"a band is two numbers, low and high; got {band!r}") from error
    if not (math.isfinite(first) and math.isfinite(second)):
        raise BandError(f"band {first:g}:{second:g} {unit} is not finite; give two numbers")
    if unit in PERIOD_UNITS:
        if min(first, second) <= 0.0:
            raise BandError(f"band {first:g}:{second:g} {unit}: a period must be above zero")
        first, second = (1e6 / (period * PERIOD_UNITS[unit]) for period in (first, second))
        first, second = min(first, second), max(first, second)
    elif unit == "sigma2":
        first, second = (frequency_from_sigma2(s, nu_dynamical) for s in (first, second))
    else:
        first, second = (nu * FREQUENCY_UNITS[unit] * 1e6 for nu in (first, second))
    if not first < second:
        raise BandError(
            f"band {band[0]:g}:{band[1]:g} {unit} holds nothing; the lower limit comes first"
        )
    return first, second
