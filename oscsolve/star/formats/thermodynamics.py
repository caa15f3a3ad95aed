"""Gamma1 and buoyancy where a file leaves them out: the best that its other columns allow."""

from __future__ import annotations

import numpy as np

from oscsolve.errors import InputError
from oscsolve.star.derive import slope_over
from oscsolve.star.formats.points import Draft, settle_a_star
from oscsolve.star.gas import (
    GasState,
    gamma1_gas_and_radiation,
    gas_pressure_fraction,
    ideal_pressure,
    ionised_gas,
    particles,
)
from oscsolve.units import GAS_CONSTANT

#: eta from which electrons count as degenerate, and from which A* takes the thermal form alone.
_DEGENERATE, _FULLY = 0.0, 5.0
#: Relative mismatch of pressure up to which the ionised gas is trusted, and from which not.
_TRUSTED, _DISTRUSTED = 0.2, 0.5
#: Mean Z/A that any mixture of stars can have; a column outside holds something else.
_CHARGE = (0.3, 1.0 + 1e-6)
#: P/(rho R T) of an ionised gas that is neither degenerate nor radiating is at most 2.
_IDEAL_MOST = 2.2


def settle_thermodynamics(draft: Draft, digits: float) -> None:
    """Gamma1 and A* of a draft, each as given or derived with a finding.

    Parameters
    ----------
    digits : relative rounding of P and rho in the file
    """
    charge = draft.columns.pop("mean_charge", None)
    gas = _settle_gamma1(draft, charge)
    _settle_buoyancy(draft, gas, charge, digits)


def _settle_gamma1(draft: Draft, charge: np.ndarray | None) -> GasState | None:
    """Gamma1 of a gas; its state too if that was needed because electrons are degenerate."""
    c = draft.columns
    if "gamma1" in c:
        return None
    if "temperature" not in c:
        raise InputError(
            f"{draft.where}: no column of gamma1, and none of temperature to derive it from; "
            "export gamma1"
        )
    beta = gas_pressure_fraction(c["pressure"], c["temperature"])
    if np.any(beta < 0.0):
        at = int(np.argmin(beta))
        x = c["radius"][at] / draft.scalars["photospheric_radius"]
        raise InputError(
            f"{draft.where}: the radiation pressure of the temperature exceeds the pressure at "
            f"point {at + 1} from the centre (x = {x:.6g}), so gamma1 cannot be derived; "
            "export gamma1"
        )
    if "hydrogen" in c and "helium" in c:
        number = _particles(draft, charge)
        gas = ionised_gas(c["density"], c["temperature"], *number)
        if np.any(gas.eta > _DEGENERATE):
            c["gamma1"] = gas.gamma1
            _note_degenerate(draft, gas)
            return gas
    c["gamma1"] = gamma1_gas_and_radiation(beta)
    _note_ideal(draft, beta)
    return None


def _particles(draft: Draft, charge: np.ndarray | None) -> tuple[np.ndarray, np.ndarray]:
    c = draft.columns
    if charge is not None and not (charge.min() > _CHARGE[0] and charge.max() < _CHARGE[1]):
        draft.note(
            "note",
            "charge-ignored",
            f"the column of the mean charge runs from {charge.min():.3g} to {charge.max():.3g}, "
            "which no mixture has per nucleon; it was not used",
        )
        charge = None
    return particles(c["hydrogen"], c["helium"], charge)


def _note_degenerate(draft: Draft, gas: GasState) -> None:
    c = draft.columns
    x = c["radius"] / draft.scalars["photospheric_radius"]
    off = np.abs(gas.pressure / c["pressure"] - 1.0)
    inside = gas.eta > _DEGENERATE
    # By mass, not by point: the envelope of a white dwarf has most points and no mass.
    shell = np.where(inside, np.diff(c["mass"], prepend=0.0), 0.0)
    order = np.argsort(off)
    middle = order[np.searchsorted(np.cumsum(shell[order]), 0.5 * shell.sum())]
    worst = int(np.argmax(off))
    draft.note(
        "doubt",
        "gamma1-electron-gas",
        f"the file has no Gamma1, and its electrons are degenerate (eta up to "
        f"{float(gas.eta.max()):.3g}, out to x = {float(x[inside].max()):.4g}); that of completely "
        "ionised ideal ions, an ideal electron gas of any degeneracy and speed, and radiation "
        f"(Cox & Giuli 1968) was used, {float(gas.gamma1.min()):.4f} to "
        f"{float(gas.gamma1.max()):.4f}. Its pressure differs from the file's by "
        f"{float(off[middle]):.2g} in the degenerate part (median by mass), and by at most "
        f"{float(off[worst]):.2g} at x = {float(x[worst]):.4g}",
        "export Gamma1: Coulomb interaction and partial ionisation are missing",
        float(x[worst]),
        float(off[worst]),
    )


def _note_ideal(draft: Draft, beta: np.ndarray) -> None:
    c = draft.columns
    x = c["radius"] / draft.scalars["photospheric_radius"]
    tail, size, at = "", None, None
    if "hydrogen" in c and "helium" in c:
        ideal = ideal_pressure(c["density"], c["temperature"], c["hydrogen"], c["helium"])
        off = np.abs(ideal / c["pressure"] - 1.0)
        at, size = int(np.argmax(off)), float(off.max())
        tail = (
            f"; that gas has another pressure than the file, by {float(np.median(off)):.2g} "
            f"(median) and at most {size:.2g} at x = {x[at]:.4g}"
        )
    else:
        excess = beta * c["pressure"] / (GAS_CONSTANT * c["density"] * c["temperature"])
        at, size = int(np.argmax(excess)), float(excess.max())
        if size > _IDEAL_MOST:
            tail = (
                f"; P/(rho R T) is {size:.3g} at x = {x[at]:.4g}, more than any ideal gas has: "
                "electrons are degenerate there, and without a composition Gamma1 of relativistic "
                "ones is not known"
            )
        else:
            at, size = None, None
    draft.note(
        "doubt",
        "gamma1-ideal-gas",
        "the file has no Gamma1; that of a fully ionised monatomic gas with radiation was used, "
        f"with P_rad = a T^4/3 and the P of the file{tail}",
        "export Gamma1: ionisation zones are missing, which shifts p modes",
        None if at is None else float(x[at]),
        size,
    )


def _settle_buoyancy(
    draft: Draft, gas: GasState | None, charge: np.ndarray | None, digits: float
) -> None:
    """One form of the buoyancy: A* of the file, else its N^2, else derived."""
    c = draft.columns
    if "a_star" in c:
        c.pop("brunt_n2", None)
        return
    if "brunt_n2" in c:
        return
    settle_a_star(draft, digits, "no buoyancy")
    if gas is not None:
        _use_thermal_form(draft, gas, charge, digits)


def _use_thermal_form(
    draft: Draft, gas: GasState, charge: np.ndarray | None, digits: float
) -> None:
    """A* from the temperature gradient where electrons are degenerate.

    Notes
    -----
    A* = V (chi_T/chi_rho) (nabla_ad - nabla + B), B = -dC/dlnP/chi_T, C the change of ln P with
    composition at constant rho and T (Brassard et al. 1991). In degenerate matter A*/V is
    1e-5 to 1e-2, less than the error of dln rho/dlnP - 1/Gamma1 if Gamma1 is not that of the
    equation of state of the file to as many digits; the factor chi_T makes the thermal form
    exact in that limit. Composition jumps are kept: C is summed from point to point.
    """
    c = draft.columns
    electrons, ions = (np.log(number) for number in _particles(draft, charge))
    a, b = gas.by_electrons, gas.by_ions
    steps = 0.5 * (a[1:] + a[:-1]) * np.diff(electrons) + 0.5 * (b[1:] + b[:-1]) * np.diff(ions)
    mixture = np.concatenate(([0.0], np.cumsum(steps)))
    jumps = np.diff(c["radius"]) == 0.0
    nabla = slope_over(c["pressure"], np.log(c["temperature"]), jumps, digits)
    by_mixture = slope_over(c["pressure"], mixture, jumps, digits)
    excess = (gas.chi_t * (gas.nabla_ad - nabla) - by_mixture) / gas.chi_rho
    strength = draft.scalars["gravitational_constant"] * c["mass"] * c["density"]
    scale = c["radius"] * c["pressure"]
    thermal = np.divide(strength, scale, out=np.zeros_like(scale), where=scale > 0.0) * excess
    off = np.abs(gas.pressure / c["pressure"] - 1.0)
    share = _ramp(gas.eta, _DEGENERATE, _FULLY) * (1.0 - _ramp(off, _TRUSTED, _DISTRUSTED))
    c["a_star"] = share * thermal + (1.0 - share) * c["a_star"]
    x = c["radius"] / draft.scalars["photospheric_radius"]
    used = np.flatnonzero(share > 0.0)
    if used.size:
        draft.note(
            "note",
            "a-star-thermal",
            f"where electrons are degenerate (x = {x[used[0]]:.4g} to {x[used[-1]]:.4g}) A* was "
            "taken from dlnT/dlnP and the composition instead (Brassard et al. 1991), with the "
            "gas that gave Gamma1; the two forms join between eta = 0 and 5",
            "export A* or N^2 if the code knows it better",
            float(x[used[-1]]),
        )


def _ramp(values: np.ndarray, low: float, high: float) -> np.ndarray:
    """0 below `low`, 1 above `high`, and smooth between."""
    t = np.clip((values - low) / (high - low), 0.0, 1.0)
    return t * t * (3.0 - 2.0 * t)
