"""A gas of hydrogen, helium and metals in which hydrogen and helium may be partly ionised.

Everything follows from one free energy per volume, so that all derivatives belong together:

    F = F_e(n_e, T) + nuclei + radiation + sum_j n_j (chi_j + kT phi_j - kT ln g_j),

with n_j the density of a state of ionisation of charge j, chi_j the energy to reach it, g_j its
weight and phi_j = rho/rho_j the part of the volume that its bound electrons keep to themselves.
F is least (Saha 1920, with electrons of any degeneracy) where, within an element,

    ln n_j = ln g_j - j eta - chi_j/kT - phi_j + constant.

Without phi the cool end of Saha's law would put bound electrons into the centre of the Sun.
"""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import NamedTuple

import numpy as np

from oscsolve.errors import ModelError
from oscsolve.star.electrons import Electrons, electrons_of_eta
from oscsolve.star.gas import METAL_MASS_NUMBER
from oscsolve.units import ATOMIC_MASS, BOLTZMANN, ELECTRON_VOLT, RADIATION_CONSTANT

#: rho_j, g cm^-3: an atom of hydrogen or helium and the ion He+ fill the volume of balls of
#: some two, and one, Bohr radii. The exact size matters little: matter is ionised there anyway.
_CROWDED_ATOM, _CROWDED_ION = 0.1, 1.0
#: Steps of the Newton method for density and degeneracy, and the relative step after which it
#: stops: it converges quadratically, so what is left is round-off.
_STEPS, _LAST = 80, 1e-7
#: Longest steps in eta and ln rho: in ionisation zones full steps overshoot.
_LONGEST_ETA, _LONGEST_LN_RHO = 2.0, 1.0


class _Element(NamedTuple):
    """States of one element by rising charge: 0, 1, ..."""

    mass_number: float
    log_weight: np.ndarray
    energy: np.ndarray
    crowded: np.ndarray


#: Energies of ionisation in eV: 13.598 (H), 24.587 and 54.418 (He): NIST, from memory.
_HYDROGEN = _Element(
    1.008,
    np.log([2.0, 1.0]),
    np.array([0.0, 13.598]) * ELECTRON_VOLT,
    np.array([1.0 / _CROWDED_ATOM, 0.0]),
)
_HELIUM = _Element(
    4.0026,
    np.log([1.0, 2.0, 1.0]),
    np.array([0.0, 24.587, 24.587 + 54.418]) * ELECTRON_VOLT,
    np.array([1.0 / _CROWDED_ATOM, 1.0 / _CROWDED_ION, 0.0]),
)


@dataclass(frozen=True, eq=False)
class Matter:
    """State of the gas at given pressure, temperature and composition; (n,) arrays, cgs units.

    Attributes
    ----------
    ln_rho, eta : density; chemical potential of the electrons over kT
    chi_rho, chi_t : (dlnP/dln rho) at constant T, (dlnP/dlnT) at constant rho
    by_hydrogen, by_metals : dlnP/dX and dlnP/dZ at constant rho and T, helium making up for it
    gamma1, nabla_ad : first adiabatic exponent, (dlnT/dlnP) at constant entropy
    electrons : free electrons in moles per gram
    """

    ln_rho: np.ndarray
    eta: np.ndarray
    chi_rho: np.ndarray
    chi_t: np.ndarray
    by_hydrogen: np.ndarray
    by_metals: np.ndarray
    gamma1: np.ndarray
    nabla_ad: np.ndarray
    electrons: np.ndarray

    def part(self, at: np.ndarray) -> Matter:
        """The state at some of the points."""
        return Matter(*(getattr(self, field.name)[at] for field in fields(self)))


def matter_at(
    ln_pressure: np.ndarray,
    ln_temperature: np.ndarray,
    hydrogen: np.ndarray,
    metals: np.ndarray,
    start: Matter | None = None,
) -> Matter:
    """State of matter of given pressure and temperature.

    Parameters
    ----------
    ln_pressure, ln_temperature : (n,) natural logarithms of P in dyn cm^-2 and T in K
    hydrogen, metals : (n,) mass fractions X and Z; the rest is helium. Metals of
        `METAL_MASS_NUMBER` and of half as many electrons are ionised completely.
    start : a state nearby, from which fewer steps are needed

    Raises
    ------
    ModelError
        No density gives this pressure: radiation alone exceeds it.

    Notes
    -----
    Gamma1 = chi_rho + chi_T^2 P/(c_V rho T), nabla_ad = chi_T P/(c_V rho T)/Gamma1 (Cox & Giuli
    1968, ch. 9). Limits: no molecules, no Coulomb interaction, no crystals, no pairs; metals are
    ionised even in a cool atmosphere, which makes electrons a little too many there.
    """
    temperature = np.exp(ln_temperature)
    radiation = RADIATION_CONSTANT * temperature**4 / 3.0
    gas = np.exp(ln_pressure) - radiation
    if np.any(gas <= 0.0):
        at = int(np.argmin(gas))
        raise ModelError(
            f"radiation alone exceeds the pressure of {np.exp(ln_pressure[at]):.3g} dyn cm^-2 at "
            f"{temperature[at]:.4g} K; no gas is left"
        )
    mixture = _Mixture(temperature, hydrogen, metals)
    if start is None:
        per_gram = hydrogen + 0.25 * (1.0 - hydrogen - metals) + 0.5 * metals
        ln_rho = np.log(gas * ATOMIC_MASS / (BOLTZMANN * temperature * 1.3 * per_gram))
        # Degenerate electrons are less dense than an ideal gas; begin from the cold law.
        ln_rho = np.minimum(ln_rho, 0.6 * np.log(gas / 3.2e12))
        eta = mixture.dilute_eta(ln_rho)
    else:
        ln_rho, eta = start.ln_rho.copy(), start.eta.copy()
    for _ in range(_STEPS):
        state = mixture.at(ln_rho, eta)
        off_e = np.log(state.free.number) - state.ln_demand
        off_p = np.log(state.gas_pressure / gas)
        step_rho, step_eta = state.newton(off_e, off_p)
        ln_rho += np.clip(step_rho, -_LONGEST_LN_RHO, _LONGEST_LN_RHO)
        eta += np.clip(step_eta, -_LONGEST_ETA, _LONGEST_ETA)
        if max(np.max(np.abs(step_rho)), np.max(np.abs(step_eta / np.maximum(eta, 1.0)))) < _LAST:
            break
    else:
        raise ModelError("no density was found for a pressure and a temperature of the model")
    return mixture.at(ln_rho, eta).matter(radiation)


class _Mixture:
    """Matter of given temperature and composition, as a function of density and eta."""

    def __init__(self, temperature: np.ndarray, hydrogen: np.ndarray, metals: np.ndarray) -> None:
        self.temperature = temperature
        self.kt = BOLTZMANN * temperature
        helium = 1.0 - hydrogen - metals
        self.abundance = (hydrogen / _HYDROGEN.mass_number, helium / _HELIUM.mass_number)
        self.metal_charge = 0.5 * metals
        self.nuclei = sum(self.abundance) + metals / METAL_MASS_NUMBER

    def dilute_eta(self, ln_rho: np.ndarray) -> np.ndarray:
        """Eta of so many electrons as half of the nuclei, were they dilute and slow."""
        n = np.exp(ln_rho) / ATOMIC_MASS * 0.5 * self.nuclei
        return np.log(n / (4.829e15 * self.temperature**1.5))

    def at(self, ln_rho: np.ndarray, eta: np.ndarray) -> _State:
        return _State(self, ln_rho, eta)


class _State:
    """Numbers, pressure and derivatives at one density and eta (not yet in balance)."""

    def __init__(self, mixture: _Mixture, ln_rho: np.ndarray, eta: np.ndarray) -> None:
        self.mixture, self.ln_rho, self.eta = mixture, ln_rho, eta
        self.free: Electrons = electrons_of_eta(eta, mixture.temperature)
        self.moles = np.exp(ln_rho) / ATOMIC_MASS
        self.parts = [
            _Stages(element, abundance, np.exp(ln_rho), eta, mixture.kt)
            for element, abundance in zip((_HYDROGEN, _HELIUM), mixture.abundance, strict=True)
        ]
        self.charge = mixture.metal_charge + sum(part.charge for part in self.parts)
        self.ln_demand = ln_rho - np.log(ATOMIC_MASS) + np.log(self.charge)
        self.crowding = sum(part.crowding for part in self.parts)
        unit = self.moles * mixture.kt
        self.gas_pressure = self.free.pressure + unit * (mixture.nuclei + self.crowding)

    def newton(self, off_e: np.ndarray, off_p: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Changes of ln rho and eta that would bring both residuals to zero."""
        e_eta = self.free.by_eta - self._sum("charge_by_eta") / self.charge
        e_rho = -1.0 - self._sum("charge_by_rho") / self.charge
        unit = self.moles * self.mixture.kt
        p_eta = self.free.number * self.mixture.kt + unit * self._sum("crowding_by_eta")
        p_rho = unit * (self.mixture.nuclei + self.crowding + self._sum("crowding_by_rho"))
        p_eta, p_rho = p_eta / self.gas_pressure, p_rho / self.gas_pressure
        det = e_rho * p_eta - e_eta * p_rho
        return (off_p * e_eta - off_e * p_eta) / det, (off_e * p_rho - off_p * e_rho) / det

    def _sum(self, name: str) -> np.ndarray:
        return sum(getattr(part, name) for part in self.parts)

    def matter(self, radiation: np.ndarray) -> Matter:
        """All derivatives, once density and eta are in balance."""
        mixture, free = self.mixture, self.free
        kt = mixture.kt
        unit = self.moles * kt
        pressure = self.gas_pressure + radiation
        slope = free.by_eta - self._sum("charge_by_eta") / self.charge
        # eta at constant T, at constant rho, and with the composition.
        eta_rho = (1.0 + self._sum("charge_by_rho") / self.charge) / slope
        eta_t = (self._sum("charge_by_t") / self.charge - free.by_t) / slope
        p_eta = free.number * kt + unit * self._sum("crowding_by_eta")
        p_rho = unit * (mixture.nuclei + self.crowding + self._sum("crowding_by_rho"))
        p_rho = p_rho + p_eta * eta_rho
        p_t = free.pressure_by_t + unit * (
            mixture.nuclei + self.crowding + self._sum("crowding_by_t")
        )
        p_t = p_t + p_eta * eta_t + 4.0 * radiation
        heat = free.energy_by_t + free.energy_by_eta * eta_t + 1.5 * unit * mixture.nuclei
        heat = heat + 12.0 * radiation
        heat = heat + self.moles * (self._sum("bound_by_t") + self._sum("bound_by_eta") * eta_t)
        by_x, by_z = self._by_composition(p_eta / slope, unit)
        chi_rho, chi_t = p_rho / pressure, p_t / pressure
        rise = pressure * chi_t / heat
        gamma1 = chi_rho + chi_t * rise
        return Matter(
            ln_rho=self.ln_rho,
            eta=self.eta,
            chi_rho=chi_rho,
            chi_t=chi_t,
            by_hydrogen=by_x / pressure,
            by_metals=by_z / pressure,
            gamma1=gamma1,
            nabla_ad=rise / gamma1,
            electrons=self.charge,
        )

    def _by_composition(self, p_charge: np.ndarray, unit: np.ndarray) -> list[np.ndarray]:
        """dP/dX and dP/dZ at constant rho and T; `p_charge` is dP/dln(charge)."""
        hydrogen, helium = self.parts
        less = np.array([helium.mean_charge, 1.0 + 0.0 * unit, helium.mean_crowding])
        less = less / _HELIUM.mass_number
        more_x = np.array([hydrogen.mean_charge, 1.0 + 0.0 * unit, hydrogen.mean_crowding])
        more_x = more_x / _HYDROGEN.mass_number
        more_z = np.array([0.5 + 0.0 * unit, 1.0 / METAL_MASS_NUMBER + 0.0 * unit, 0.0 * unit])
        out = []
        for more in (more_x, more_z):
            charge, nuclei, crowding = more - less
            out.append(p_charge * charge / self.charge + unit * (nuclei + crowding))
        return out


class _Stages:
    """Occupation of the states of one element, moments of it per gram, and their slopes.

    charge = sum n_j j, crowding = sum n_j phi_j, bound = sum n_j chi_j; by eta, ln rho, ln T.
    """

    def __init__(
        self,
        element: _Element,
        abundance: np.ndarray,
        rho: np.ndarray,
        eta: np.ndarray,
        kt: np.ndarray,
    ) -> None:
        charge = np.arange(element.energy.size, dtype=float)[:, None]
        phi = element.crowded[:, None] * rho
        energy = element.energy[:, None]
        warm = energy / kt
        log = element.log_weight[:, None] - charge * eta - warm - phi
        share = np.exp(log - log.max(axis=0))
        share /= share.sum(axis=0)

        def mean(f: np.ndarray) -> np.ndarray:
            return np.sum(share * f, axis=0)

        def along(f: np.ndarray, g: np.ndarray) -> np.ndarray:
            """Change of the mean of f where the logarithms of the shares change by g."""
            return abundance * (mean(f * g) - mean(f) * mean(g))

        self.mean_charge, self.mean_crowding = mean(charge), mean(phi)
        self.charge = abundance * self.mean_charge
        self.crowding = abundance * self.mean_crowding
        self.charge_by_eta = along(charge, -charge)
        self.charge_by_rho = along(charge, -phi)
        self.charge_by_t = along(charge, warm)
        self.crowding_by_eta = along(phi, -charge)
        self.crowding_by_rho = along(phi, -phi) + self.crowding
        self.crowding_by_t = along(phi, warm)
        self.bound_by_eta = along(energy, -charge)
        self.bound_by_t = along(energy, warm)
