"""How likely a star is, given its observed modes: for samplers and optimisers."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np

from oscsolve.errors import InputError, OscsolveError
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.pulsation.options import SolveOptions
from oscsolve.pulsation.solve import solve_modes
from oscsolve.seismology.match import Match, match_observed
from oscsolve.seismology.observed import ObservedModes
from oscsolve.seismology.surface import LAWS
from oscsolve.star.model import StarModel

#: What is compared.
MEASURES = ("frequencies", "ratios")


@dataclass(frozen=True, eq=False)
class Likelihood:
    """Log-likelihood of a star from observed frequencies or ratios; call it with a `StarModel`.

    Parameters
    ----------
    observed : the observed list
    measure : "frequencies", with the surface law fitted anew for every star (a profile
        likelihood), or "ratios", which need none
    surface : law for frequencies, see `oscsolve.seismology.surface`
    atmosphere : "isothermal" or "free", the outer boundary in `solve_modes`
    tolerance : relative error of computed frequencies; 1e-7 is far below the best data
    model_error : uHz, added in quadrature to the errors of frequencies; what one does not trust
        the models to reproduce
    margin : the computed band reaches this fraction beyond the observed one at either end

    Notes
    -----
    ln L = -chi2/2 - sum ln(error sqrt(2 pi)) for frequencies, -chi2/2 - ln det(2 pi C)/2 for
    ratios, the determinant taken over the directions that have variance. A star that leaves an
    observed mode without a partner has ln L = -inf: otherwise losing a mode would help. Only the
    observed degrees, and radial modes for the surface law, are solved, in the observed band. The
    modes of the last star are the first guesses for the next; results do not depend on that. It can
    be pickled, which leaves the last star out.

    Examples
    --------
    >>> import numpy as np, oscsolve
    >>> star = oscsolve.polytrope(3)
    >>> modes = oscsolve.solve_modes(star, [0, 1], (20, 400), unit="sigma2")
    >>> seen = oscsolve.ObservedModes(modes.degree, modes.nu, np.full(len(modes), 0.1))
    >>> likely = oscsolve.Likelihood(seen, surface="none", atmosphere="free")
    >>> likely(star) > likely(oscsolve.polytrope(3.01))
    True
    """

    observed: ObservedModes
    measure: str = "frequencies"
    surface: str = "two-term"
    atmosphere: str = "isothermal"
    tolerance: float = 1e-7
    model_error: float = 0.0
    margin: float = 0.07
    _last: dict[str, ModeSet] = field(default_factory=dict, init=False, repr=False)

    def __post_init__(self) -> None:
        if self.measure not in MEASURES:
            raise InputError(f"measure must be one of {', '.join(MEASURES)}; got {self.measure!r}")
        if self.surface not in LAWS:
            raise InputError(f"surface must be one of {', '.join(LAWS)}; got {self.surface!r}")
        if not self.model_error >= 0.0 or not 0.0 < self.margin < 1.0:
            raise InputError("model_error must be 0 or above, margin between 0 and 1")

    def __call__(self, star: StarModel) -> float:
        """ln L of the star; -inf where it cannot be compared with the list."""
        try:
            found = self.match(self.modes(star))
        except OscsolveError:
            return -np.inf
        if found.unmatched_observed.size:
            return -np.inf
        if self.measure == "ratios":
            return _ratio_likelihood(found)
        return float(-0.5 * found.chi2 - np.sum(np.log(found.error * np.sqrt(2.0 * np.pi))))

    def modes(self, star: StarModel) -> ModeSet:
        """The modes of a star that the list asks for."""
        degrees = sorted({0, *(int(degree) for degree in self.observed.degree)})
        low, high = float(self.observed.nu.min()), float(self.observed.nu.max())
        modes = solve_modes(
            star,
            degrees,
            (low * (1.0 - self.margin), high * (1.0 + self.margin)),
            surface=self.atmosphere,
            tolerance=self.tolerance,
            similar=self._last.get("modes"),
            options=SolveOptions(eigenfunctions=False, threads=1),
        )
        self._last["modes"] = modes
        return modes

    def match(self, modes: ModeSet) -> Match:
        """The comparison behind the number."""
        errors = np.hypot(self.observed.nu_error, self.model_error)
        return match_observed(modes, replace(self.observed, nu_error=errors), surface=self.surface)

    def __getstate__(self) -> dict[str, Any]:
        return {**self.__dict__, "_last": {}}

    def __setstate__(self, state: dict[str, Any]) -> None:
        self.__dict__.update(state)


def _ratio_likelihood(found: Match) -> float:
    ratios = found.ratios
    if ratios.freedom == 0:
        return -np.inf
    values = np.sort(np.linalg.eigvalsh(ratios.covariance))[-ratios.freedom :]
    return float(-0.5 * ratios.chi2 - 0.5 * np.sum(np.log(2.0 * np.pi * values)))
