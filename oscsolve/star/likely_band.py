"""The band of frequencies that a user would want to see of a star."""

from __future__ import annotations

import numpy as np

from oscsolve.star.integrals import acoustic_cutoff, large_separation, period_spacing
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile

#: Share of the acoustic cut-off that bounds the modes excited by convection (common practice).
_CONVECTIVE_BAND = (0.25, 0.9)
#: Stars with a cooler surface have convective envelopes, K (common practice).
_COOL = 6800.0
#: Surface gravities above this belong to white dwarfs, cm s^-2 (common practice).
_WHITE_DWARF_GRAVITY = 1e7
#: Orders of p and g modes that the band reaches to in other stars.
_ORDERS = 12


def likely_band(star: StarModel, profile: Profile) -> tuple[tuple[float, float], str]:
    """Limits in uHz, of three digits, and the reason for them.

    A star with a convective envelope and an atmosphere gets 0.25 to 0.9 of the acoustic cut-off
    of its outermost layer, the range excited by convection. Any other star gets about a dozen
    g and p orders around its dynamical frequency, from the asymptotic spacings.
    """
    if not profile.has_edge and has_convective_envelope(star):
        cutoff = acoustic_cutoff(profile) * star.nu_dynamical
        limits = tuple(share * cutoff for share in _CONVECTIVE_BAND)
        why = "0.25 to 0.9 of the acoustic cut-off, for a convective envelope"
    else:
        limits = _asymptotic_band(star, profile)
        why = f"about {_ORDERS} orders of l = 1 g modes and of p modes"
    low, high = (
        float(np.format_float_positional(v, precision=3, fractional=False)) for v in limits
    )
    return (low, high), why


def has_convective_envelope(star: StarModel) -> bool:
    """By A* in the outer layers, or by the temperature of a star that is no white dwarf.

    Temperature is asked because A* of ionisation zones is wrong in files that lack Gamma1.
    """
    x = star.fractional_radius
    assert star.a_star is not None
    envelope = (x > 0.8) & (x < 0.98)
    if np.any(envelope) and np.median(star.a_star[envelope]) < 1e-2:
        return True
    if star.temperature is None:
        return False
    gravity = star.gravitational_constant * star.total_mass / star.photospheric_radius**2
    surface = float(np.interp(1.0, x, star.temperature))
    return surface < _COOL and gravity < _WHITE_DWARF_GRAVITY


def _asymptotic_band(star: StarModel, profile: Profile) -> tuple[float, float]:
    """From the large separation and the period spacing of l = 1."""
    high = (_ORDERS + 1.0) * large_separation(star, profile)
    spacing = period_spacing(star, 1, profile)
    low = min(star.nu_dynamical, 1e6 / (_ORDERS * spacing))
    # Without g modes: below the fundamental, and not at zero.
    return (low if low > 0.0 else 0.3 * star.nu_dynamical), high
