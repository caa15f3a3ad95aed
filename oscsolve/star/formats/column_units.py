"""The units of a column table, told by size and by what the laws of a star demand."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oscsolve.errors import InputError
from oscsolve.star.formats.staggered import mean_density_ratio
from oscsolve.units import SOLAR_GM, SOLAR_LUMINOSITY

#: Solar masses in use, g: the nominal G M over the G of CODATA 2018, 2014, 2010, 2006, 2002,
#: 1998 and 1986, and rounded values of the literature.
SOLAR_MASSES = (
    *(SOLAR_GM / g for g in (6.67430e-8, 6.67408e-8, 6.67384e-8, 6.67428e-8, 6.6742e-8)),
    *(SOLAR_GM / g for g in (6.673e-8, 6.67259e-8)),
    *(1.9892e33, 1.9891e33, 1.989e33, 1.9885e33, 1.98855e33, 1.9884e33, 1.98892e33, 1.99e33),
)
#: Solar radii in use, cm: IAU 2015 nominal, and values of the literature.
SOLAR_RADII = (6.957e10, 6.9598e10, 6.9599e10, 6.96e10, 6.9566e10, 6.95508e10, 6.9551e10)
#: 4/3 pi rho (r_o^3 - r_i^3) / dm may be off by this much before the units are refused.
_CONSISTENT = 0.05
_EXACT = 1e-6


@dataclass(frozen=True)
class Scale:
    """A way to read one column: multiply by `factor` to get cgs."""

    kind: str
    factor: float


@dataclass(frozen=True)
class Units:
    """The units chosen.

    Attributes
    ----------
    radius, mass : chosen scales
    solar_radius, solar_mass : cm, g; what one solar unit means in this file
    mismatch : |rho dV / dm - 1| with these units
    """

    radius: Scale
    mass: Scale
    solar_radius: float
    solar_mass: float
    mismatch: float

    def describe(self) -> str:
        """What was assumed, in words."""
        parts = []
        for name, scale in (("r", self.radius), ("m", self.mass)):
            if scale.kind == "cgs":
                parts.append(f"{name} in {'cm' if name == 'r' else 'g'}")
            else:
                unit = "cm" if name == "r" else "g"
                label = "solar units of" if scale.kind == "solar" else "fractions of"
                parts.append(f"{name} in {label} {scale.factor:.10g} {unit}")
        return " and ".join(parts)


def choose_units(
    where: str,
    columns: dict[str, np.ndarray],
    stated: dict[str, str],
    constants: dict[str, tuple[float, str]],
) -> Units:
    """The units of r and m with which the mass of the cells follows best from r and rho.

    Parameters
    ----------
    where : file name for the error
    columns : radius, mass (in their own units), density (g cm^-3), centre first
    stated : kind of unit that the name of a column states, "" if none
    constants : run constants and the kind of unit that they state

    Raises
    ------
    InputError
        No unit fits: r, m and rho do not belong together.
    """
    r, m, d = columns["radius"], columns["mass"], columns["density"]
    radii = _scales(r, stated["radius"], constants.get("photospheric_radius"), _RADIUS)
    masses = _scales(m, stated["mass"], constants.get("total_mass"), _MASS)
    if not radii or not masses:
        name, values = ("radius", r) if not radii else ("mass", m)
        raise InputError(
            f"{where}: the unit of the column of {name} (largest value {values.max():.6g}) cannot "
            "be told; write it in cgs units, or give the total in the lines above the table"
        )
    ratio = mean_density_ratio(r, m, d)
    best: Units | None = None
    for radius in radii:
        for mass in masses:
            off = min(abs(value * radius.factor**3 / mass.factor - 1.0) for value in ratio.values())
            if best is None or off < best.mismatch:
                best = Units(radius, mass, _solar(radius, 0), _solar(mass, 1), off)
    assert best is not None
    if not best.mismatch < _CONSISTENT:
        raise InputError(
            f"{where}: the masses do not follow from r and rho in any unit (off by "
            f"{best.mismatch:.2g} at best); check the columns of radius, mass and density"
        )
    return best


@dataclass(frozen=True)
class _Kind:
    cgs_above: float
    solar: tuple[float, ...]
    solar_range: tuple[float, float]


_RADIUS = _Kind(1e5, SOLAR_RADII, (1e-6, 1e5))
_MASS = _Kind(1e20, SOLAR_MASSES, (1e-5, 1e5))


def _scales(
    values: np.ndarray, stated: str, total: tuple[float, str] | None, kind: _Kind
) -> list[Scale]:
    top = float(values.max())
    scales: list[Scale] = []
    if stated in ("", "cgs") and top > kind.cgs_above:
        scales.append(Scale("cgs", 1.0))
    if stated in ("", "solar") and kind.solar_range[0] < top < kind.solar_range[1]:
        scales += [Scale("solar", unit) for unit in kind.solar]
    if stated in ("", "fraction") and total is not None and 0.9 < top < 1.2:
        scales += [Scale("fraction", value) for value in in_cgs(total, kind)]
    return scales


def in_cgs(constant: tuple[float, str], kind: _Kind) -> list[float]:
    """The values in cgs units that a run constant may mean."""
    value, unit = constant
    if unit == "cgs" or (unit == "" and value > kind.cgs_above):
        return [value]
    return [value * solar for solar in kind.solar]


def _solar(scale: Scale, which: int) -> float:
    if scale.kind == "solar":
        return scale.factor
    return (SOLAR_RADII, SOLAR_MASSES)[which][0]


def constant_in_cgs(constant: tuple[float, str], quantity: str, units: Units) -> float:
    """A run constant (M, R, L or T) in cgs units."""
    value, unit = constant
    solar, least = {
        "total_mass": (units.solar_mass, _MASS.cgs_above),
        "photospheric_radius": (units.solar_radius, _RADIUS.cgs_above),
        "luminosity": (SOLAR_LUMINOSITY, 1e20),
    }.get(quantity, (1.0, 0.0))
    if unit == "cgs" or (unit == "" and value > least):
        return value
    return value * solar
