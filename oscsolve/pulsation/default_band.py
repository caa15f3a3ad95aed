"""The band that is searched when the user names none."""

from __future__ import annotations

import numpy as np

from oscsolve.pulsation.boundary import atmosphere_cutoff
from oscsolve.star.findings import Finding
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


def choose_band(star: StarModel, profile: Profile) -> tuple[tuple[float, float], Finding]:
    """Limits in uHz and the finding that tells them.

    A star with a convective envelope and an atmosphere gets 0.25 to 0.9 of the acoustic cut-off
    of its outermost layer, the range excited by convection. Any other star gets about a dozen
    g and p orders around its dynamical frequency, from the asymptotic spacings.
    """
    if not profile.has_edge and _has_convective_envelope(star):
        cutoff = np.sqrt(atmosphere_cutoff(profile, 0).high) * star.nu_dynamical
        limits = tuple(share * cutoff for share in _CONVECTIVE_BAND)
        why = "0.25 to 0.9 of the acoustic cut-off, for a convective envelope"
    else:
        limits = _asymptotic_band(star)
        why = f"about {_ORDERS} orders of l = 1 g modes and of p modes"
    low, high = (
        float(np.format_float_positional(v, precision=3, fractional=False)) for v in limits
    )
    finding = Finding(
        "note", "band-chosen", f"no band was given; {low:g} to {high:g} uHz was chosen ({why})"
    )
    return (low, high), finding


def _has_convective_envelope(star: StarModel) -> bool:
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


def _asymptotic_band(star: StarModel) -> tuple[float, float]:
    """From the large separation, [2 int dr/c]^-1, and the period spacing of l = 1."""
    keep = (star.pressure > 0.0) & (star.radius > 0.0)
    r = star.radius[keep]
    slowness = np.sqrt(star.density[keep] / (star.gamma1[keep] * star.pressure[keep]))
    separation = 1e6 / (2.0 * np.trapezoid(slowness, r))
    assert star.brunt_n2 is not None
    buoyancy = np.trapezoid(np.sqrt(np.maximum(star.brunt_n2[keep], 0.0)) / r, r)
    high = (_ORDERS + 1.0) * separation
    low = 0.3 * star.nu_dynamical
    if buoyancy > 0.0:
        spacing = 2.0 * np.pi**2 / (np.sqrt(2.0) * buoyancy)
        low = min(star.nu_dynamical, 1e6 / (_ORDERS * spacing))
    return low, high
