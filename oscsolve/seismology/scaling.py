"""What scaling from the Sun says of a star: frequency of greatest power, large separation."""

from __future__ import annotations

import math

from oscsolve.star.likely_band import has_convective_envelope
from oscsolve.star.model import StarModel
from oscsolve.units import SOLAR_LUMINOSITY, SOLAR_MASS, SOLAR_RADIUS

#: Observed Sun: nu_max and large separation in uHz (Huber et al. 2011, ApJ 743, 143; from memory).
NU_MAX_SUN, LARGE_SEPARATION_SUN = 3090.0, 135.1
#: Nominal effective temperature of the Sun, K (IAU 2015 Resolution B3).
TEMPERATURE_SUN = 5772.0


def effective_temperature(star: StarModel) -> float | None:
    """Effective temperature in K: the star's own, or from luminosity and radius, or None."""
    if star.effective_temperature is not None:
        return star.effective_temperature
    if star.luminosity is None or not star.luminosity > 0.0:
        return None
    flux = star.luminosity / SOLAR_LUMINOSITY / (star.photospheric_radius / SOLAR_RADIUS) ** 2
    return TEMPERATURE_SUN * flux**0.25


def nu_max_scaling(star: StarModel) -> float | None:
    """Frequency of greatest power in uHz by the scaling relation.

    None where no effective temperature is known, and where the envelope is not convective:
    nothing excites such modes there.

    Notes
    -----
    nu_max/3090 uHz = (M/M_sun) (R/R_sun)^-2 (T_eff/5772 K)^(-1/2) (Kjeldsen & Bedding 1995, A&A
    293, 87; solar value of Huber et al. 2011). Good to a few percent (common practice).
    """
    temperature = effective_temperature(star)
    if temperature is None or not has_convective_envelope(star):
        return None
    mass, radius = star.total_mass / SOLAR_MASS, star.photospheric_radius / SOLAR_RADIUS
    return NU_MAX_SUN * mass / radius**2 / math.sqrt(temperature / TEMPERATURE_SUN)


def large_separation_scaling(star: StarModel) -> float:
    """Large separation in uHz scaled from the Sun: 135.1 uHz times the root of M/R^3.

    Kjeldsen & Bedding (1995); solar value of Huber et al. (2011), which is observed.
    """
    mass, radius = star.total_mass / SOLAR_MASS, star.photospheric_radius / SOLAR_RADIUS
    return LARGE_SEPARATION_SUN * math.sqrt(mass / radius**3)
