"""Everything that asymptotic theory says of a mode list, in one result."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.depth import acoustic_depth
from oscsolve.seismology.large_separation import LargeSeparationFit, fit_large_separation
from oscsolve.seismology.mixed import MixedModeFit, fit_mixed_modes
from oscsolve.seismology.period_spacing import (
    PeriodSpacingFit,
    PeriodSpacings,
    fit_period_spacing,
    period_spacings,
)
from oscsolve.seismology.scaling import (
    effective_temperature,
    large_separation_scaling,
    nu_max_scaling,
)
from oscsolve.seismology.separations import Separation, separations
from oscsolve.star.inspection import convective_zones
from oscsolve.star.integrals import large_separation, period_spacing
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile

#: Mixed modes are fitted within so many large separations of nu_max, where it lies in the list.
_ORDERS_ABOUT_NU_MAX = 5.0
#: Highest degree whose p modes are fitted by a line in order.
_HIGHEST = 3
#: A convective zone that reaches beyond this fraction of the radius is an envelope.
_ENVELOPE = 0.95


@dataclass(frozen=True, eq=False)
class Asymptotics:
    """What asymptotic theory and scaling say of a star and of its mode list.

    Attributes
    ----------
    effective_temperature : K, or None where it is not known
    nu_max : uHz, by scaling from the Sun; None without a temperature or a convective envelope
    large_separation_scaled : uHz, by scaling from the Sun; None likewise
    large_separation_integral : uHz, [2 int dr/c]^-1 to the outermost point
    period_spacing_integral : (degree, s), 2 pi^2/(sqrt(l(l+1)) int N dr/r) over all stable layers,
        for every l > 0 of the list; infinite without stable layers
    acoustic_radius : s, int dr/c from the centre to the outermost point
    envelope_depth : s, acoustic depth of the bottom of the convective envelope, or None
    separations : name to `Separation`
    large_separations : one `LargeSeparationFit` for each degree up to 3 that has three p modes;
        at higher degrees the law holds for orders far above the degree only
    period_spacings : one `PeriodSpacings` for each degree that has pairs of g modes
    period_spacing_fits : one `PeriodSpacingFit` for each degree that has three g modes
    mixed : one `MixedModeFit` for each degree whose mixed modes follow the relation
    """

    effective_temperature: float | None
    nu_max: float | None
    large_separation_scaled: float | None
    large_separation_integral: float
    period_spacing_integral: tuple[tuple[int, float], ...]
    acoustic_radius: float
    envelope_depth: float | None
    separations: Mapping[str, Separation]
    large_separations: tuple[LargeSeparationFit, ...]
    period_spacings: tuple[PeriodSpacings, ...]
    period_spacing_fits: tuple[PeriodSpacingFit, ...]
    mixed: tuple[MixedModeFit, ...]


def asymptotics(modes: ModeSet) -> Asymptotics:
    """Everything that asymptotic theory and scaling say of a mode list.

    Parameters
    ----------
    modes : mode list, solved or read back

    Examples
    --------
    >>> import oscsolve
    >>> modes = oscsolve.solve_modes(oscsolve.polytrope(3), [0, 1, 2], (1, 200), unit="sigma2")
    >>> found = oscsolve.asymptotics(modes)
    >>> print(f"{found.large_separation_integral:.1f} uHz, {found.acoustic_radius:.0f} s")
    123.7 uHz, 4043 s
    >>> [fit.degree for fit in found.large_separations]
    [0, 1, 2]
    """
    star = modes.star
    profile = Profile(star)
    separation = large_separation(star, profile)
    nu_max = nu_max_scaling(star)
    degrees = [int(degree) for degree in np.unique(modes.degree)]
    nonradial = [degree for degree in degrees if degree > 0]
    low = [degree for degree in degrees if degree <= _HIGHEST]
    large = [fit_large_separation(modes, degree) for degree in low]
    periods = [fit_period_spacing(modes, degree) for degree in nonradial]
    mixed = [_fit_mixed(modes, degree, nu_max, separation) for degree in nonradial]
    return Asymptotics(
        effective_temperature=effective_temperature(star),
        nu_max=nu_max,
        large_separation_scaled=None if nu_max is None else large_separation_scaling(star),
        large_separation_integral=separation,
        period_spacing_integral=tuple((k, period_spacing(star, k, profile)) for k in nonradial),
        acoustic_radius=0.5e6 / separation,
        envelope_depth=_envelope_depth(star),
        separations=separations(modes),
        large_separations=tuple(fit for fit in large if fit is not None),
        period_spacings=period_spacings(modes),
        period_spacing_fits=tuple(fit for fit in periods if fit is not None),
        mixed=tuple(fit for fit in mixed if fit is not None),
    )


def _fit_mixed(
    modes: ModeSet, degree: int, nu_max: float | None, separation: float
) -> MixedModeFit | None:
    """Near nu_max where modes are listed there, for that is what observers fit; else all."""
    if nu_max is not None and math.isfinite(separation):
        reach = _ORDERS_ABOUT_NU_MAX * separation
        near = fit_mixed_modes(modes, degree, band=(nu_max - reach, nu_max + reach))
        if near is not None:
            return near
    return fit_mixed_modes(modes, degree)


def _envelope_depth(star: StarModel) -> float | None:
    zones = [zone for zone in convective_zones(star) if zone[1] > _ENVELOPE and zone[0] > 0.0]
    if not zones:
        return None
    deepest = min(zone[0] for zone in zones)
    inside = star.fractional_radius > 0.0
    return float(np.interp(deepest, star.fractional_radius[inside], acoustic_depth(star)[inside]))
