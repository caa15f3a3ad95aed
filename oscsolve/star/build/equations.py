"""The equations of a star whose temperature gradient and composition are prescribed.

With s = ln(P_c/P), a = ln(r^2/s), b = ln(m/r^3), c = ln T and D = dln r/ds = P r/(G m rho):

    a' = 2 D - 1/s,    b' = (4 pi rho r^3/m - 3) D,    c' = -nabla.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oscsolve.star.build.runs import Run
from oscsolve.star.ionisation import Matter, matter_at
from oscsolve.units import RADIATION_CONSTANT

#: Optical depths at which the gradient of the atmosphere gives way to that of the interior, and
#: at which convection begins below the surface (common practice: at the photosphere, some two).
_DEEP, _CONVECTIVE_TOP = 10.0, 2.0
#: Optical depth down to which convection is far from adiabatic.
_INEFFICIENT = 3.0
#: Excess over nabla_ad deep in convection zones: tiny in real stars too, and enough for the zone
#: to show as one.
_DEEP_EXCESS = 1e-6
#: Optical depth of the photosphere (Eddington 1926).
_PHOTOSPHERE = 2.0 / 3.0
#: Steps of the differences that give derivatives for the Newton method, which corrects itself.
_STEP, _GAS_STEP = 1e-6, 1e-4
#: Share of convection below which its dependence on the gas is left out of the derivatives.
_STILL = 1e-3


@dataclass(frozen=True, eq=False)
class Recipe:
    """What makes a star: numbers in cgs units, and runs.

    Attributes
    ----------
    mass, radius, temperature : M, R and the effective temperature
    opacity : cm^2 g^-1, in the atmosphere
    superadiabatic : excess over nabla_ad just below the surface
    hydrogen, metals, gradient : runs of X, Z, and the shape of dlnT/dlnP where heat is radiated
    convection : runs from 0 to 1, the share of convection; where several overlap, it is all
        that none of them leaves over
    gravity : constant of gravity
    """

    mass: float
    radius: float
    temperature: float
    opacity: float
    superadiabatic: float
    hydrogen: Run
    metals: Run
    gradient: Run
    convection: tuple[Run, ...]
    gravity: float

    @property
    def radiation_above(self) -> float:
        """Pressure of radiation at optical depth zero, where T^4 is half that of the star."""
        return RADIATION_CONSTANT * self.temperature**4 / 6.0

    @property
    def photospheric_pressure(self) -> float:
        """P at optical depth 2/3: the weight of the atmosphere and of its radiation."""
        surface = self.gravity * self.mass / self.radius**2
        return self.radiation_above + _PHOTOSPHERE * surface / self.opacity


@dataclass(frozen=True, eq=False)
class Local:
    """What is known at some points; (n,) arrays.

    Attributes
    ----------
    ln_p, r, m : cgs
    hydrogen, metals, gas : composition and state of the gas
    nabla : dlnT/dlnP
    slope_x, slope_z : dX/dlnP and dZ/dlnP
    """

    ln_p: np.ndarray
    r: np.ndarray
    m: np.ndarray
    hydrogen: np.ndarray
    metals: np.ndarray
    gas: Matter
    nabla: np.ndarray
    slope_x: np.ndarray
    slope_z: np.ndarray

    @property
    def beta(self) -> np.ndarray:
        """dln rho/dlnP along the star."""
        gas = self.gas
        by_mixture = gas.by_hydrogen * self.slope_x + gas.by_metals * self.slope_z
        return (1.0 - gas.chi_t * self.nabla - by_mixture) / gas.chi_rho

    @property
    def excess(self) -> np.ndarray:
        """dln rho/dlnP - 1/Gamma1 = A*/V, free of their cancellation."""
        gas = self.gas
        by_mixture = gas.by_hydrogen * self.slope_x + gas.by_metals * self.slope_z
        return (gas.chi_t * (gas.nabla_ad - self.nabla) - by_mixture) / gas.chi_rho


class StarEquations:
    """The problem of one recipe, for `relaxation.relax`."""

    def __init__(self, recipe: Recipe) -> None:
        self.recipe = recipe
        self.ln_photosphere = float(np.log(recipe.photospheric_pressure))
        self.surface = np.array(
            [
                2.0 * np.log(recipe.radius),
                np.log(recipe.mass / recipe.radius**3),
                np.log(recipe.temperature),
            ]
        )
        self._last: dict[tuple[str, int], Matter] = {}

    def local(self, ln_p: np.ndarray, s: np.ndarray, y: np.ndarray, level: float) -> Local:
        """Everything at points off the centre or at it (s = 0)."""
        recipe = self.recipe
        r, m = _radius_and_mass(s, y)
        x, z = self._mixture(ln_p, r, m)
        gas = self._gas("local", ln_p, y[:, 2], x, z)
        with np.errstate(divide="ignore", invalid="ignore"):
            ln_r_slope = -np.exp(ln_p - gas.ln_rho) * r / (recipe.gravity * m)
            m_slope = 4.0 * np.pi * np.exp(gas.ln_rho) * r**3 * ln_r_slope
        # dlnr/dlnP is infinite at the centre, where no coordinate but the pressure changes.
        ln_r_slope, m_slope = (np.where(s > 0.0, v, 0.0) for v in (ln_r_slope, m_slope))
        place = {
            "mass": (m / recipe.mass, m_slope / recipe.mass),
            "radius": (r / recipe.radius, r * ln_r_slope / recipe.radius),
            "pressure": (self._weight(ln_p), np.full_like(r, 1.0 / np.log(10.0))),
        }
        slopes = []
        for run in (recipe.hydrogen, recipe.metals):
            at, by_ln_p = place[run.along]
            slopes.append(run.slope(at) * by_ln_p)
        nabla = self._nabla(ln_p, r, m, gas.nabla_ad, level)
        return Local(ln_p, r, m, x, z, gas, nabla, *slopes)

    def slopes(
        self, ln_p: np.ndarray, s: np.ndarray, y: np.ndarray, level: float
    ) -> tuple[np.ndarray, np.ndarray]:
        r, m = _radius_and_mass(s, y)
        x, z = self._mixture(ln_p, r, m)
        gas = self._gas("slopes", ln_p, y[:, 2], x, z)
        ad_p, ad_t = self._adiabat_slopes(ln_p, y[:, 2], x, z, r, m, gas)

        def value(dy: np.ndarray, dp: float, ds: float | np.ndarray, dl: float) -> np.ndarray:
            """The slopes at a point nearby, with the gas linear in its arguments."""
            yy, pp, ss = y + np.asarray(dy), ln_p + dp, s + ds
            rr, mm = _radius_and_mass(ss, yy)
            xx, zz = self._mixture(pp, rr, mm)
            dt = dy[2]
            rise = dp - gas.chi_t * dt - gas.by_hydrogen * (xx - x) - gas.by_metals * (zz - z)
            ln_rho = gas.ln_rho + rise / gas.chi_rho
            adiabat = gas.nabla_ad + ad_p * dp + ad_t * dt
            d = np.exp(pp - ln_rho) * rr / (self.recipe.gravity * mm)
            out = np.empty_like(yy)
            out[:, 0] = 2.0 * d - 1.0 / ss
            out[:, 1] = (4.0 * np.pi * np.exp(ln_rho - yy[:, 1]) - 3.0) * d
            out[:, 2] = -self._nabla(pp, rr, mm, adiabat, level + dl)
            return out

        by = np.empty((ln_p.size, 3, 6))
        for k in range(6):
            step = np.zeros(6)
            step[k] = _STEP
            # Steps in s are relative: it goes to zero at the centre.
            h = s * _STEP if k == 4 else np.full(s.size, _STEP)
            up, down = (
                value(
                    sign * step[:3],
                    float(sign * step[3]),
                    sign * h if k == 4 else 0.0,
                    float(sign * step[5]),
                )
                for sign in (1.0, -1.0)
            )
            by[:, :, k] = (up - down) / (2.0 * h[:, None])
        return value(np.zeros(3), 0.0, 0.0, 0.0), by

    def centre(self, ln_p: float, c: float) -> tuple[np.ndarray, np.ndarray]:
        zero = np.zeros(1)
        at = np.array([ln_p])
        x, z = self._mixture(at, zero, zero)
        gas = self._gas("centre", at, np.array([c]), x, z)
        ln_rho = float(gas.ln_rho[0])
        b = np.log(4.0 * np.pi / 3.0) + ln_rho
        a = np.log(2.0 / self.recipe.gravity) + ln_p - ln_rho - b
        rho_p, rho_t = 1.0 / gas.chi_rho[0], -gas.chi_t[0] / gas.chi_rho[0]
        return np.array([a, b]), np.array([[1.0 - 2.0 * rho_p, -2.0 * rho_t], [rho_p, rho_t]])

    def _mixture(
        self, ln_p: np.ndarray, r: np.ndarray, m: np.ndarray
    ) -> tuple[np.ndarray, np.ndarray]:
        recipe = self.recipe
        return self._along(recipe.hydrogen, ln_p, r, m), self._along(recipe.metals, ln_p, r, m)

    def _along(self, run: Run, ln_p: np.ndarray, r: np.ndarray, m: np.ndarray) -> np.ndarray:
        if run.along == "mass":
            return run.at(m / self.recipe.mass)
        return run.at(r / self.recipe.radius if run.along == "radius" else self._weight(ln_p))

    def _weight(self, ln_p: np.ndarray) -> np.ndarray:
        recipe = self.recipe
        unit = recipe.gravity * recipe.mass**2 / (4.0 * np.pi * recipe.radius**4)
        return (ln_p - np.log(unit)) / np.log(10.0)

    def _gas(
        self, use: str, ln_p: np.ndarray, c: np.ndarray, x: np.ndarray, z: np.ndarray
    ) -> Matter:
        """State of the gas, found from the last one that was asked for with so many points."""
        key = (use, ln_p.size)
        self._last[key] = matter_at(ln_p, c, x, z, self._last.get(key))
        return self._last[key]

    def _share(self, ln_p: np.ndarray, r: np.ndarray, m: np.ndarray) -> np.ndarray:
        """Share of convection, 0 to 1."""
        left = np.ones_like(ln_p)
        for run in self.recipe.convection:
            left *= 1.0 - self._along(run, ln_p, r, m)
        return (1.0 - left) / (1.0 + (_CONVECTIVE_TOP / self._optical_depth(ln_p)) ** 4)

    def _optical_depth(self, ln_p: np.ndarray) -> np.ndarray:
        """Optical depth if the opacity were that of the atmosphere everywhere."""
        recipe = self.recipe
        above = recipe.radiation_above
        weight = (np.exp(ln_p) - above) / (recipe.photospheric_pressure - above)
        # A trial of the Newton method may leave the atmosphere upward.
        return _PHOTOSPHERE * np.maximum(weight, 1e-12)

    def _nabla(
        self, ln_p: np.ndarray, r: np.ndarray, m: np.ndarray, nabla_ad: np.ndarray, level: float
    ) -> np.ndarray:
        recipe = self.recipe
        tau = self._optical_depth(ln_p)
        above = recipe.radiation_above
        # T^4 = (3/4) T_eff^4 (tau + 2/3) and P - P_0 proportional to tau.
        weight = _PHOTOSPHERE / (recipe.photospheric_pressure - above) * np.exp(ln_p)
        atmosphere = 0.25 * weight / (tau + _PHOTOSPHERE)
        deep = 1.0 / (1.0 + (_DEEP / tau) ** 2)
        shape = self._along(recipe.gradient, ln_p, r, m)
        radiative = atmosphere + deep * (level * shape - atmosphere)
        excess = _DEEP_EXCESS + recipe.superadiabatic / (1.0 + (tau / _INEFFICIENT) ** 1.5)
        share = self._share(ln_p, r, m)
        return radiative + share * (nabla_ad + excess - radiative)

    def _adiabat_slopes(
        self,
        ln_p: np.ndarray,
        c: np.ndarray,
        x: np.ndarray,
        z: np.ndarray,
        r: np.ndarray,
        m: np.ndarray,
        gas: Matter,
    ) -> tuple[np.ndarray, np.ndarray]:
        """d nabla_ad by ln P and ln T, where there is convection."""
        by_p, by_t = np.zeros_like(ln_p), np.zeros_like(ln_p)
        at = np.flatnonzero(self._share(ln_p, r, m) > _STILL)
        if at.size:
            start = gas.part(at)
            for out, dp, dt in ((by_p, _GAS_STEP, 0.0), (by_t, 0.0, _GAS_STEP)):
                moved = matter_at(ln_p[at] + dp, c[at] + dt, x[at], z[at], start)
                out[at] = (moved.nabla_ad - start.nabla_ad) / _GAS_STEP
        return by_p, by_t


def _radius_and_mass(s: np.ndarray, y: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    r = np.sqrt(s * np.exp(y[:, 0]))
    return r, np.exp(y[:, 1]) * r**3
