"""Corrections for what adiabatic models get wrong near the surface of stars like the Sun.

With I the inertia of a mode, I0 that of a radial mode of the same frequency, Q = I/I0, and
x = nu/nu_ref, the difference observed - computed is modelled as

    none         0
    power        a x^b / Q,  b = 4.90              Kjeldsen, Bedding & Christensen-Dalsgaard 2008,
                                                   ApJ 683, L175
    cubic        a3 x^3 Iref/I                     Ball & Gizon 2014, A&A 568, A123, eq. 3
    two-term     (a_1 x^-1 + a3 x^3) Iref/I        the same, eq. 4
    lorentzian   a [1 - 1/(1 + (nu/nu_max)^b)]/Q   Sonoi et al. 2015, A&A 583, A112, eq. 9

(forms and references from memory; the factor 1/Q of the first and the last is common practice).
nu_ref is the mean observed frequency and Iref the inertia of a radial mode there, so that every
amplitude is the correction in uHz of a radial mode at nu_ref, or for the last one far above
nu_max; other choices change the amplitudes and nothing else.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from scipy.optimize import minimize_scalar

from oscsolve.errors import InputError
from oscsolve.seismology.frozen import freeze_arrays

#: Exponent of the power law, calibrated on the Sun (Kjeldsen et al. 2008).
POWER_EXPONENT = 4.90
#: Range in which the exponent of the modified Lorentzian is looked for.
_LORENTZIAN_EXPONENTS = (0.5, 25.0)

#: Law: names of its amplitudes, which are linear.
LAWS = {
    "none": (),
    "power": ("a",),
    "cubic": ("a3",),
    "two-term": ("a_1", "a3"),
    "lorentzian": ("a",),
}


@dataclass(frozen=True, eq=False)
class Layer:
    """What the laws need to know of some computed modes.

    Attributes
    ----------
    nu : (k,) uHz, computed
    inertia : (k,) of the modes, any unit
    radial_inertia : (k,) of radial modes of the same frequencies
    reference : uHz, nu_ref
    reference_inertia : of a radial mode at nu_ref
    nu_max : uHz, of the lorentzian law
    """

    nu: np.ndarray
    inertia: np.ndarray
    radial_inertia: np.ndarray
    reference: float
    reference_inertia: float
    nu_max: float

    def __post_init__(self) -> None:
        freeze_arrays(self)

    def select(self, rows: np.ndarray) -> Layer:
        """The same for some of the modes."""
        columns = ("nu", "inertia", "radial_inertia")
        return replace(self, **{name: getattr(self, name)[rows] for name in columns})


@dataclass(frozen=True, eq=False)
class SurfaceFit:
    """A law fitted to differences observed - computed.

    Attributes
    ----------
    law : one of `LAWS`
    names : of the coefficients
    values : (c,) amplitudes in uHz, exponents of unit 1
    covariance : (c, c) of the values as if the errors of the frequencies were all there is
    fixed : what was not fitted: exponent of the power law, nu_ref, nu_max
    """

    law: str
    names: tuple[str, ...]
    values: np.ndarray
    covariance: np.ndarray
    fixed: dict[str, float]

    def __post_init__(self) -> None:
        freeze_arrays(self)

    @property
    def coefficients(self) -> dict[str, float]:
        """Name to value, fitted and fixed ones."""
        return {**dict(zip(self.names, self.values.tolist(), strict=True)), **self.fixed}

    def correction(self, layer: Layer) -> np.ndarray:
        """(k,) uHz to add to the computed frequencies."""
        shapes, _ = _slopes(self.law, layer, self.values)
        return shapes @ self.values[: len(LAWS[self.law])]

    def correction_error(self, layer: Layer) -> np.ndarray:
        """(k,) uHz, standard error of the correction."""
        _, slopes = _slopes(self.law, layer, self.values)
        return np.sqrt(np.maximum(np.einsum("ki,ij,kj->k", slopes, self.covariance, slopes), 0.0))


def fit_surface(law: str, layer: Layer, difference: np.ndarray, error: np.ndarray) -> SurfaceFit:
    """The law that fits differences observed - computed best, by weighted least squares.

    Parameters
    ----------
    law : one of `LAWS`
    layer : of the computed modes
    difference, error : (k,) uHz

    Raises
    ------
    InputError
        There is no such law, or fewer modes than coefficients.
    """
    if law not in LAWS:
        raise InputError(f"surface must be one of {', '.join(LAWS)}; got {law!r}")
    names = LAWS[law] + (("b",) if law == "lorentzian" else ())
    fixed = {} if law == "none" else {"nu_ref": layer.reference}
    if difference.size < len(names):
        raise InputError(
            f"the {law} law has {len(names)} coefficients, and {difference.size} pairs of modes "
            "cannot fix them; choose another law"
        )
    if law == "power":
        fixed["b"] = POWER_EXPONENT
    values = _linear(law, layer, difference, error, np.empty(0))
    if law == "lorentzian":
        fixed["nu_max"] = layer.nu_max

        def misfit(exponent: float) -> float:
            trial = np.array([0.0, exponent])
            amplitude = _linear(law, layer, difference, error, trial)
            shapes, _ = _slopes(law, layer, trial)
            return float(np.sum(((difference - shapes @ amplitude) / error) ** 2))

        best = minimize_scalar(misfit, bounds=_LORENTZIAN_EXPONENTS, method="bounded").x
        values = np.append(
            _linear(law, layer, difference, error, np.array([0.0, best])), float(best)
        )
    _, slopes = _slopes(law, layer, values)
    weighted = slopes / error[:, None]
    return SurfaceFit(law, names, values, np.linalg.pinv(weighted.T @ weighted), fixed)


def _linear(
    law: str, layer: Layer, difference: np.ndarray, error: np.ndarray, values: np.ndarray
) -> np.ndarray:
    """Amplitudes for given exponents."""
    shapes, _ = _slopes(law, layer, values)
    scaled = shapes / error[:, None]
    return np.linalg.lstsq(scaled, difference / error, rcond=None)[0]


def _slopes(law: str, layer: Layer, values: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """(k, a) factors of the amplitudes, and (k, c) derivatives by all coefficients."""
    x = layer.nu / layer.reference
    light = layer.reference_inertia / layer.inertia
    inverse_q = layer.radial_inertia / layer.inertia
    if law == "none":
        shapes = np.empty((x.size, 0))
    elif law == "power":
        shapes = (x**POWER_EXPONENT * inverse_q)[:, None]
    elif law == "cubic":
        shapes = (x**3 * light)[:, None]
    elif law == "two-term":
        shapes = np.column_stack((light / x, x**3 * light))
    else:
        amplitude, exponent = values if values.size else (0.0, 1.0)
        power = (layer.nu / layer.nu_max) ** exponent
        shapes = ((1.0 - 1.0 / (1.0 + power)) * inverse_q)[:, None]
        by_exponent = power * np.log(layer.nu / layer.nu_max) / (1.0 + power) ** 2 * inverse_q
        return shapes, np.column_stack((shapes, amplitude * by_exponent))
    return shapes, shapes
