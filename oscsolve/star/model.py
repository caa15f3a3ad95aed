"""The structure model of one star, as handed over by an evolution code or built here."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from oscsolve.errors import ModelError
from oscsolve.star.findings import Finding
from oscsolve.units import NEWTON_G, dynamical_frequency

_REQUIRED = ("radius", "mass", "pressure", "density", "gamma1")
_OPTIONAL = ("temperature", "hydrogen", "helium", "rotation")


@dataclass(frozen=True, eq=False)
class StarModel:
    """A spherical star in hydrostatic balance on a list of points, centre to surface.

    Attributes
    ----------
    radius : (n,) cm, never decreasing; two points at one radius mark a density jump. The
        first point may be the centre (0) or the innermost one that the model has.
    mass : (n,) g, mass inside `radius`
    pressure, density : (n,) dyn cm^-2, g cm^-3; above zero, except that both may vanish at
        the last point (a star with a true edge)
    gamma1 : (n,) first adiabatic exponent
    a_star : (n,) A* = r N^2/g = dln P/dln r / Gamma1 - dln rho/dln r; give this or `brunt_n2`
    brunt_n2 : (n,) N^2 in s^-2, squared buoyancy frequency; the one left out is derived
    total_mass, photospheric_radius : g, cm; the scales M and R. The points may go above R.
    gravitational_constant : cm^3 g^-1 s^-2, the G that the model was computed with
    name, source, source_hash : label, file and sha256 of the file it came from
    temperature, hydrogen, helium, rotation : (n,) K, mass fraction, mass fraction, rad s^-1,
        or None
    effective_temperature, luminosity : K, erg s^-1, or None
    findings : what the reader noticed or had to decide

    Raises
    ------
    ModelError
        Shapes differ, a value is not finite or out of range, or radius falls.
    """

    radius: np.ndarray
    mass: np.ndarray
    pressure: np.ndarray
    density: np.ndarray
    gamma1: np.ndarray
    total_mass: float
    photospheric_radius: float
    a_star: np.ndarray | None = None
    brunt_n2: np.ndarray | None = None
    gravitational_constant: float = NEWTON_G
    name: str = ""
    source: str = ""
    source_hash: str = ""
    temperature: np.ndarray | None = None
    hydrogen: np.ndarray | None = None
    helium: np.ndarray | None = None
    rotation: np.ndarray | None = None
    effective_temperature: float | None = None
    luminosity: float | None = None
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        for name in (*_REQUIRED, "a_star", "brunt_n2", *_OPTIONAL):
            self._freeze(name)
        self._check_scales()
        self._check_points()
        self._derive_buoyancy()

    def _freeze(self, name: str) -> None:
        value = getattr(self, name)
        if value is None:
            if name in _REQUIRED:
                raise ModelError(f"{name} is missing; a model needs {', '.join(_REQUIRED)}")
            return
        array = np.array(value, dtype=np.float64, order="C")
        size = np.size(self.radius)
        if array.ndim != 1 or array.size != size:
            raise ModelError(f"{name} has shape {array.shape}; expected ({size},) like radius")
        bad = np.flatnonzero(~np.isfinite(array))
        if bad.size:
            raise ModelError(
                f"{name} is not a finite number at point {bad[0] + 1} of {size}; repair the model"
            )
        array.setflags(write=False)
        object.__setattr__(self, name, array)

    def _check_scales(self) -> None:
        for name in ("total_mass", "photospheric_radius", "gravitational_constant"):
            value = float(getattr(self, name))
            if not (np.isfinite(value) and value > 0.0):
                raise ModelError(f"{name} must be above zero; got {value:g}")
            object.__setattr__(self, name, value)

    def _check_points(self) -> None:
        radius = self.radius
        if radius.size < 5:
            raise ModelError(f"a model needs at least 5 points; got {radius.size}")
        if radius[0] < 0.0:
            raise ModelError(f"radius is negative at point 1 ({radius[0]:g} cm)")
        step = np.diff(radius)
        if np.any(step < 0.0):
            self._refuse_point(
                int(np.flatnonzero(step < 0.0)[0]) + 1,
                "radius must increase outward; it falls",
            )
        triple = np.flatnonzero((step[1:] == 0.0) & (step[:-1] == 0.0))
        if triple.size:
            self._refuse_point(int(triple[0]) + 2, "three points share one radius")
        self._check_positive()

    def _check_positive(self) -> None:
        last = self.radius.size - 1
        edge = self.pressure[last] == 0.0
        for name in ("pressure", "density", "gamma1"):
            low = np.flatnonzero(getattr(self, name) <= 0.0)
            if edge and name != "gamma1":
                low = low[low != last]
            if low.size:
                self._refuse_point(int(low[0]), f"{name} must be above zero; it is not")
        low = np.flatnonzero((self.mass <= 0.0) & (self.radius > 0.0))
        if low.size:
            self._refuse_point(int(low[0]), "mass must be above zero outside the centre; it is not")
        if self.radius[0] == 0.0 and self.radius[1] == 0.0:
            self._refuse_point(1, "two points sit at the centre")

    def _refuse_point(self, index: int, what: str) -> None:
        x = self.radius[index] / self.photospheric_radius
        raise ModelError(
            f"{what} at point {index + 1} (x = {x:.6g}). Drop that point or repair the file"
        )

    def _derive_buoyancy(self) -> None:
        if (self.a_star is None) == (self.brunt_n2 is None):
            raise ModelError("give exactly one of a_star and brunt_n2; the other follows from it")
        r, m = self.radius, self.mass
        inside = r > 0.0
        g_over_r = np.zeros_like(r)
        g_over_r[inside] = self.gravitational_constant * m[inside] / r[inside] ** 3
        if self.a_star is not None:
            name, derived = "brunt_n2", self.a_star * g_over_r
        else:
            name = "a_star"
            assert self.brunt_n2 is not None
            derived = np.divide(self.brunt_n2, g_over_r, out=np.zeros_like(r), where=inside)
        derived.setflags(write=False)
        object.__setattr__(self, name, derived)

    @property
    def fractional_radius(self) -> np.ndarray:
        """(n,) x = r/R with R the photospheric radius; may exceed 1 in the atmosphere."""
        return self.radius / self.photospheric_radius

    @property
    def nu_dynamical(self) -> float:
        """sqrt(G M / R^3) / 2 pi in uHz: the unit in which ``sqrt(sigma2)`` is counted."""
        return dynamical_frequency(
            self.gravitational_constant, self.total_mass, self.photospheric_radius
        )

    def with_changes(self, **changes: Any) -> StarModel:
        """A copy with some attributes replaced, checked anew.

        Changing one of `a_star`, `brunt_n2`, `mass`, `radius` or the constant of gravity
        derives the other form of the buoyancy again; A* is kept unless `brunt_n2` is given.
        """
        if "brunt_n2" in changes:
            changes.setdefault("a_star", None)
        else:
            changes["brunt_n2"] = None
        return replace(self, **changes)

    def with_findings(self, *findings: Finding) -> StarModel:
        """A copy that carries further findings after those it has."""
        return self.with_changes(findings=(*self.findings, *findings))
