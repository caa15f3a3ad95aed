"""The names under which column tables store each quantity: data, no logic.

A name is compared after `plain_name`: a unit in brackets is cut off, letters are lowered and
everything but letters and digits is dropped, so "Radius Frac." is "radiusfrac".
"""

from __future__ import annotations

import re
from dataclasses import dataclass


@dataclass(frozen=True)
class Spelling:
    """One accepted name.

    Attributes
    ----------
    name : the plain name
    unit : "cgs", "solar", "fraction" (of the star's M or R), or "" if the values must tell
    log10 : the column holds the decimal logarithm
    """

    name: str
    unit: str = ""
    log10: bool = False


def _spell(names: str, unit: str = "", log10: bool = False) -> tuple[Spelling, ...]:
    return tuple(Spelling(name, unit, log10) for name in names.split())


#: Quantity (attribute of StarModel, "metals" or "mean_charge") to accepted names, the best first.
COLUMNS: dict[str, tuple[Spelling, ...]] = {
    "radius": (
        *_spell("radiuscm rcm", "cgs"),
        *_spell("radius r"),
        *_spell("radiusrsun rrsun rsun", "solar"),
        *_spell("radiusfrac radiusfraction fracradius fractionalradius rfrac rr", "fraction"),
        *_spell("logr logradius log10r lgr", log10=True),
    ),
    "mass": (
        *_spell("massg massgrams", "cgs"),
        *_spell("mass m enclosedmass mr"),
        *_spell("massmsun mmsun msun", "solar"),
        *_spell("massfrac massfraction fracmass fractionalmass q moverm mm", "fraction"),
        *_spell("logm logmass log10m", log10=True),
        *_spell("logq log10q", "fraction", log10=True),
    ),
    "pressure": (
        *_spell("pressure p pres press ptot"),
        *_spell("logp logpressure lgp log10p", log10=True),
    ),
    "density": (
        *_spell("density rho dens"),
        *_spell("logrho logdensity logd lgrho log10rho", log10=True),
    ),
    "temperature": (
        *_spell("temperature t temp"),
        *_spell("logt logtemperature lgt log10t", log10=True),
    ),
    "gamma1": _spell("gamma1 gam1 firstadiabaticexponent adiabaticexponent"),
    "a_star": _spell("astar ledouxa"),
    "brunt_n2": _spell("bruntn2 bruntvsq n2 nsq nsquared bruntvaisala2 bruntvaisalasq brunt2"),
    "hydrogen": _spell("xmassfractionh hydrogen x h1 xh xhydrogen"),
    "helium": _spell("ymassfractionhe helium y he4 yhe xhelium"),
    "metals": _spell("zmassfractionmetals metals z metallicity"),
    "mean_charge": _spell("zbardivabar electronspernucleon"),
    "rotation": _spell("omega angularvelocity rotation"),
}

#: Run constants in the lines above the table.
CONSTANTS: dict[str, tuple[Spelling, ...]] = {
    "total_mass": _spell("starmass totalmass mass m"),
    "photospheric_radius": _spell("photospherer photosphericradius starradius radius r"),
    "effective_temperature": _spell("teff effectivetemperature"),
    "luminosity": _spell("photospherel luminosity starluminosity lum l"),
    "gravitational_constant": _spell("gravitationalconstant newtong bigg"),
}

#: Spelling of a unit (in brackets after a name, or after a constant) to the kind of unit.
UNIT_WORDS = {
    **dict.fromkeys(("cm", "g", "gm", "gram", "grams", "cgs", "erg/s", "ergs"), "cgs"),
    **dict.fromkeys(("rsun", "msun", "lsun", "r_sun", "m_sun", "l_sun", "solar"), "solar"),
    **dict.fromkeys(("r/r", "m/m", "fraction", "r_star", "m_star"), "fraction"),
}

_UNIT = re.compile(r"^\s*(\S.*?)[\s_]*[(\[]([^)\]]*)[)\]]\s*$")


def plain_name(name: str) -> tuple[str, str]:
    """A column name as compared, and the kind of unit it states ("" if none)."""
    unit = ""
    found = _UNIT.match(name)
    if found and re.search(r"[A-Za-z]", found[1]):
        name, unit = found[1], UNIT_WORDS.get(found[2].strip().lower(), "")
    return re.sub(r"[^a-z0-9]", "", name.lower()), unit


def match_names(
    names: list[str], table: dict[str, tuple[Spelling, ...]]
) -> dict[str, tuple[int, Spelling]]:
    """Quantity to (index in `names`, spelling with its unit); the best spelling wins."""
    plain = [plain_name(name) for name in names]
    found: dict[str, tuple[int, Spelling]] = {}
    for quantity, spellings in table.items():
        for spelling in spellings:
            at = next((k for k, (name, _) in enumerate(plain) if name == spelling.name), None)
            if at is not None:
                unit = spelling.unit or plain[at][1]
                found[quantity] = (at, Spelling(spelling.name, unit, spelling.log10))
                break
    return found
