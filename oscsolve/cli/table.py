"""The mode list as text for people, and for grep and awk.

Lines that begin with ``#`` are for people; every other line is one mode, its fields separated by
blanks. Remarks on a mode stand behind a ``#`` at the end of its line.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from oscsolve.cli.numbers import aligned, fixed
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.star.model import StarModel
from oscsolve.units import PERIOD_UNITS, SOLAR_MASS, SOLAR_RADIUS

#: Unit of the periods: the first whose limit (s) the median period does not reach.
_PERIOD_LIMITS = (("s", 2000.0), ("min", 3.0 * 3600.0), ("h", 3.0 * 86400.0), ("d", np.inf))
_SURFACES = {
    "free": "free: no pressure perturbation at the outermost point",
    "isothermal": "isothermal atmosphere above the outermost point",
}
_GRAVITIES = {
    "full": "full",
    "cowling": "Cowling approximation: its perturbation is neglected",
}


def mode_table(modes: ModeSet) -> Iterator[str]:
    """The lines of the table: header, one block a degree, census, verdict."""
    yield from _header(modes)
    unit = period_unit(modes.period)
    for degree, counted in zip(modes.census.degree, modes.census.counted, strict=True):
        yield "#"
        yield from _degree_block(modes, int(degree), int(counted), unit)
    yield "#"
    yield from _census(modes)


def period_unit(period: np.ndarray) -> str:
    """The unit that suits most periods of a list: s, min, h or d."""
    finite = period[np.isfinite(period)]
    typical = float(np.median(finite)) if finite.size else 0.0
    return next(unit for unit, limit in _PERIOD_LIMITS if typical < limit)


def star_lines(star: StarModel) -> Iterator[str]:
    """What a reader must know of the star to trust a frequency: its scales and its G."""
    yield _entry("star", star.name or "without a name")
    if star.source:
        checksum = f"  (sha256 {star.source_hash[:12]})" if star.source_hash else ""
        yield _entry("source", f"{star.source}{checksum}")
    yield _entry("M", f"{star.total_mass:.8g} g = {star.total_mass / SOLAR_MASS:.5g} solar")
    radius = star.photospheric_radius
    yield _entry("R", f"{radius:.8g} cm = {radius / SOLAR_RADIUS:.5g} solar")
    yield _entry("G", f"{star.gravitational_constant:.8g} cm^3 g^-1 s^-2")
    yield _entry("nu_dyn", f"{star.nu_dynamical:.8g} uHz = sqrt(G M / R^3) / 2 pi")


def _entry(name: str, text: str) -> str:
    return f"# {name:<9}{' '.join(text.split())}"


def _header(modes: ModeSet) -> Iterator[str]:
    yield f"# oscsolve {modes.program_version}: oscillation modes"
    yield from star_lines(modes.star)
    yield _entry("band", _band_text(modes))
    gravity, surface = (str(modes.options.get(name, "")) for name in ("gravity", "surface"))
    yield _entry("gravity", _GRAVITIES.get(gravity, gravity or "not recorded"))
    yield _entry("surface", _SURFACES.get(surface, surface or "not recorded"))


def _band_text(modes: ModeSet) -> str:
    low, high = modes.census.low, modes.census.high
    if low.size == 0:
        return "no degree was searched"
    chosen = ", chosen by the program" if modes.options.get("band_chosen_by_program") else ""
    text = f"{low.min():.7g} to {high.max():.7g} uHz"
    if low.min() < low.max() or high.min() < high.max():
        text += " (differs between degrees, see the census)"
    if low.min() > 0.0:
        first, last = 1e6 / high.max(), 1e6 / low.min()
        unit = period_unit(np.array([np.sqrt(first * last)]))
        scale = PERIOD_UNITS[unit]
        text += f", periods {first / scale:.5g} to {last / scale:.5g} {unit}"
    return text + chosen


def _degree_block(modes: ModeSet, degree: int, counted: int, unit: str) -> Iterator[str]:
    rows = np.flatnonzero(modes.degree == degree)
    short = "" if rows.size == counted else f", {counted} COUNTED"
    yield f"# l = {degree}: {rows.size} mode{'s' * (rows.size != 1)}{short}"
    if rows.size == 0:
        return
    columns = _columns(modes, rows, unit)
    names = [
        name.rjust(len(cells[0])) if name != "kind" else name.ljust(len(cells[0]))
        for name, cells in columns.items()
    ]
    # The leading "# " of the headings is as wide as the two blanks before each row.
    yield "# " + "  ".join(names).rstrip()
    for place, row in enumerate(rows):
        line = "  " + "  ".join(cells[place] for cells in columns.values())
        yield line + _remark(modes, int(row))


def _columns(modes: ModeSet, rows: np.ndarray, unit: str) -> dict[str, list[str]]:
    """Heading to cells of equal width."""
    nu, error, period = modes.nu[rows], modes.nu_error[rows], modes.period[rows]
    with np.errstate(invalid="ignore"):
        # The period is there for the eye: no more digits than nu has, and seven at most.
        relative = np.maximum(np.nan_to_num(error / np.abs(nu), posinf=1e-6, nan=1e-6), 1e-6)
        period = period / PERIOD_UNITS[unit]
        period_error = np.where(np.isfinite(period), relative * period, np.nan)
    texts = {
        "l": [str(value) for value in modes.degree[rows]],
        "n": [str(value) for value in modes.order[rows]],
        "kind": [str(value) for value in modes.kind[rows]],
        "n_p": [str(value) for value in modes.n_p[rows]],
        "n_g": [str(value) for value in modes.n_g[rows]],
        "nu/uHz": [fixed(*pair) for pair in zip(nu, error, strict=True)],
        "error": [f"{value:.0e}" for value in error],
        f"period/{unit}": [fixed(*pair) for pair in zip(period, period_error, strict=True)],
        "inertia": [f"{value:.4e}" for value in modes.inertia[rows]],
    }
    least = {"l": 2, "n": 5, "kind": 6}
    return {
        name: [cell.rjust(least.get(name, 0)) for cell in aligned(cells, name)]
        if name != "kind"
        else [cell.ljust(least[name]) for cell in cells]
        for name, cells in texts.items()
    }


def _remark(modes: ModeSet, row: int) -> str:
    remarks = []
    if modes.relabelled[row]:
        remarks.append(f"nodes give n = {modes.n_p[row] - modes.n_g[row]}")
    if modes.sigma2[row] < 0.0:
        remarks.append("grows")
    return f"  # {', '.join(remarks)}" if remarks else ""


def _census(modes: ModeSet) -> Iterator[str]:
    census = modes.census
    yield "# census: modes counted in the band by the law of inertia, and modes listed"
    lows = aligned([f"{value:.6f}" for value in census.low], "low/uHz")
    highs = aligned([f"{value:.6f}" for value in census.high], "high/uHz")
    if lows:
        heads = ("low/uHz".rjust(len(lows[0])), "high/uHz".rjust(len(highs[0])))
        yield f"#    l  {heads[0]}  {heads[1]}  counted  listed"
    for degree, low, high, counted, listed in zip(
        census.degree, lows, highs, census.counted, census.listed, strict=True
    ):
        verdict = "closes" if counted == listed else "DOES NOT CLOSE"
        yield f"# {degree:>4}  {low}  {high}  {counted:>7}  {listed:>6}  {verdict}"
    relabelled = int(np.sum(modes.relabelled))
    if relabelled:
        yield (
            f"# {relabelled} mode{'s' * (relabelled != 1)} whose node counts disagree with the "
            "order; n follows the spectrum and holds"
        )
        yield (
            "# (nodes can fail for l >= 2 in condensed stars, and for l = 1 where N^2 does not "
            "quite fit the density)"
        )
    yield f"# {verdict_sentence(modes)}"


def verdict_sentence(modes: ModeSet) -> str:
    """Whether the list is complete, in one sentence."""
    counted, listed = int(modes.census.counted.sum()), int(modes.census.listed.sum())
    if modes.complete:
        if counted == 0:
            return "Complete: the band holds no mode of these degrees."
        return f"Complete: {counted} counted, {listed} listed, none missing and none twice."
    open_degrees = modes.census.degree[modes.census.counted != modes.census.listed]
    degrees = ", ".join(str(degree) for degree in open_degrees)
    return (
        f"NOT COMPLETE: {counted} counted, {listed} listed; l = {degrees} "
        f"do{'es' * (open_degrees.size == 1)} not close."
    )
