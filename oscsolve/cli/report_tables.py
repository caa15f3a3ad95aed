"""The tables of a report as HTML: the star, its findings, the census, asymptotics, modes."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from oscsolve.cli.asymptotic_rows import (
    COMBINATIONS,
    Row,
    asymptotic_groups,
    separation_rows,
    short,
)
from oscsolve.cli.markup import Html, formula, join, symbol, tag
from oscsolve.cli.numbers import aligned, fixed
from oscsolve.cli.table import period_unit
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.asymptotics import Asymptotics
from oscsolve.seismology.separations import Separation
from oscsolve.star.findings import SEVERITIES, Finding
from oscsolve.star.inspection import Inspection
from oscsolve.star.model import StarModel
from oscsolve.units import PERIOD_UNITS, SOLAR_LUMINOSITY, SOLAR_MASS, SOLAR_RADIUS

MICRO = "\u03bcHz"
_UNITS = {"uHz": MICRO, "": ""}


def power(value: float, digits: int) -> Html:
    """A number as a decimal times a power of ten."""
    mantissa, _, exponent = f"{value:.{digits - 1}e}".partition("e")
    if -3 <= int(exponent) < 5:
        return Html(f"{value:.{digits}g}")
    return join(
        (mantissa, "\u00a0\u00d7\u00a010", tag("sup", str(int(exponent)).replace("-", "\u2212")))
    )


def star_table(star: StarModel, found: Inspection) -> Html:
    """Figures of the star as a whole."""
    rows = [
        tag("tr", tag("th", name, scope="row"), tag("td", value))
        for name, value in _star(star, found)
    ]
    return tag("div", tag("table", tag("tbody", *rows)), class_="box")


def _star(star: StarModel, found: Inspection) -> Iterator[tuple[Html, object]]:
    f = found.figures
    yield symbol("M"), join((power(f.total_mass, 8), f" g = {f.total_mass / SOLAR_MASS:.5g} solar"))
    radius = f.photospheric_radius
    yield symbol("R"), join((power(radius, 8), f" cm = {radius / SOLAR_RADIUS:.5g} solar"))
    if star.luminosity is not None:
        luminosity = star.luminosity
        solar = f" erg/s = {luminosity / SOLAR_LUMINOSITY:.5g} solar"
        yield symbol("L"), join((power(luminosity, 5), solar))
    newton = f.gravitational_constant
    yield symbol("G"), join((power(newton, 8), " cm\u00b3 g\u207b\u00b9 s\u207b\u00b2"))
    off = f.gravity_implied / newton - 1.0
    if math.isfinite(off):
        yield (
            join(("balance implies ", symbol("G"))),
            join((power(f.gravity_implied, 7), formula(f", {off:+.0e} from the one in use"))),
        )
    yield (
        Html("points"),
        f"{f.points}, from r/R = {f.innermost:.3g} to {f.outermost:.8g}",
    )
    yield symbol("rho_c over mean"), f"{f.central_density_ratio:.5g}"
    yield symbol("nu_dyn"), f"{f.nu_dynamical:.8g} {MICRO} = \u221a(GM/R\u00b3)/2\u03c0"
    if math.isinf(f.acoustic_cutoff):
        yield Html("acoustic cut-off"), "none: pressure vanishes at the outermost point"
    else:
        yield Html("acoustic cut-off"), f"{f.acoustic_cutoff:.5g} {MICRO}, outermost layer"
    if math.isnan(f.buoyancy_range[0]):
        yield symbol("N"), "nowhere above zero"
    else:
        low, high = f.buoyancy_range
        yield symbol("N"), f"{low:.4g} to {high:.5g} {MICRO} where stable, below the photosphere"
    zones = ", ".join(f"{a:.4g} to {b:.6g}" for a, b in f.convective_zones)
    yield Html("convective, r/R"), zones or "nowhere"
    if math.isfinite(found.points_per_wavelength):
        yield Html("mesh"), f"{found.points_per_wavelength:.3g} points per wavelength or more"


def findings_list(findings: list[Finding]) -> Html:
    """Findings, worst first."""
    if not findings:
        return tag("p", "Nothing to remark.", class_="soft")
    ordered = sorted(findings, key=lambda each: -SEVERITIES.index(each.severity))
    items = []
    for each in ordered:
        text = "; ".join(part.rstrip(".") for part in (each.message, each.advice) if part)
        items.append(
            tag(
                "li",
                tag("b", each.severity),
                text.replace(" uHz", f" {MICRO}"),
                " ",
                tag("span", f"[{each.code}]", class_="soft"),
                class_=each.severity,
            )
        )
    return tag("ul", *items, class_="findings")


def census_table(modes: ModeSet) -> Html:
    """Modes counted and modes listed, degree by degree."""
    census = modes.census
    heads = (
        ("l", "n"),
        (f"from / {MICRO}", "n"),
        (f"to / {MICRO}", "n"),
        ("counted", "n"),
        ("listed", "n"),
        ("verdict", None),
    )
    rows = []
    lows = aligned([f"{value:.6g}" for value in census.low])
    highs = aligned([f"{value:.7g}" for value in census.high])
    for degree, low, high, counted, listed in zip(
        census.degree, lows, highs, census.counted, census.listed, strict=True
    ):
        closes = counted == listed
        verdict = tag(
            "td",
            "closes" if closes else "DOES NOT CLOSE",
            class_="good" if closes else "bad verdict",
        )
        cells = [tag("td", value, class_="n") for value in (degree, low, high, counted, listed)]
        rows.append(tag("tr", *cells, verdict))
    head = tag("tr", *(tag("th", name, scope="col", class_=kind) for name, kind in heads))
    return tag("div", tag("table", tag("thead", head), tag("tbody", *rows)), class_="box")


def asymptotics_table(found: Asymptotics) -> Html:
    """Fitted and integrated quantities with their errors, in groups."""
    bodies = []
    for heading, rows in asymptotic_groups(found):
        title = tag("tr", tag("th", heading, colspan="4", scope="rowgroup"), class_="group")
        bodies.append(tag("tbody", title, *(_quantity(row) for row in rows)))
    return tag("div", tag("table", *bodies, class_="wide-remarks"), class_="box")


def separations_table(found: Asymptotics) -> Html:
    """Each separation and ratio at one order, with its definition."""
    where = "middle of the list" if found.nu_max is None else join(("near ", symbol("nu_max")))
    rows = []
    for row, order, count in separation_rows(found):
        place = tag("td", f"n = {order}, {count} in all", class_="k soft")
        rows.append(_quantity(row, place))
    heads = [
        tag("th", "", scope="col"),
        tag("th", where, scope="col"),
        tag("th", "", scope="col"),
        tag("th", "order", scope="col"),
        tag("th", "definition", scope="col"),
    ]
    table = tag(
        "table", tag("thead", tag("tr", *heads)), tag("tbody", *rows), class_="wide-remarks"
    )
    return tag("div", table, class_="box")


def _quantity(row: Row, place: Html | None = None) -> Html:
    value = f"{row.value} \u00b1 {row.error}" if row.error else row.value
    value = f"\u2212{value[1:]}" if value.startswith("-") else value
    return tag(
        "tr",
        tag("th", symbol(row.symbol), scope="row"),
        tag("td", formula(value), class_="k"),
        tag("td", _UNITS.get(row.unit, row.unit), class_="unit"),
        place,
        tag("td", formula(row.remark), class_="remark"),
    )


def orders_tables(found: Asymptotics) -> Html:
    """All separations and ratios by order, in tables that fit a sheet; mixed ones are marked."""
    parts = found.separations
    groups = [
        [name for name in parts if name.startswith(("large", "small", "five"))],
        [name for name in parts if name.startswith(("ratio", "second"))],
    ]
    return join(_orders_table([parts[name] for name in group]) for group in groups if group)


def _orders_table(parts: list[Separation]) -> Html:
    orders = sorted({int(n) for part in parts for n in part.order})
    columns = [_cells_by_order(part, orders) for part in parts]
    heads = [tag("th", symbol("n"), scope="col", class_="n")]
    for part in parts:
        unit = "" if part.unit == "1" else f" / {MICRO}"
        heads.append(tag("th", symbol(COMBINATIONS[part.name][0]), unit, scope="col", class_="n"))
    rows = [
        tag("tr", tag("td", n, class_="n"), *(cells[place] for cells in columns))
        for place, n in enumerate(orders)
    ]
    table = tag("table", tag("thead", tag("tr", *heads)), tag("tbody", *rows), class_="all-orders")
    return tag("div", table, class_="box long")


def _cells_by_order(part: Separation, orders: list[int]) -> list[Html]:
    texts = [
        short(float(v), float(e), part.unit) for v, e in zip(part.value, part.error, strict=True)
    ]
    known = dict(zip(part.order.tolist(), aligned(texts), strict=True))
    mixed = dict(zip(part.order.tolist(), part.mixed.tolist(), strict=True))
    return [tag("td", known.get(n, ""), class_="n other" if mixed.get(n) else "n") for n in orders]


def mode_table(modes: ModeSet) -> Html:
    """The whole list; the script makes it sortable."""
    unit = period_unit(modes.period)
    columns = list(_mode_columns(modes, unit))
    heads = [
        tag("th", heading, scope="col", class_="n" if numeric else None)
        for heading, numeric, _, _ in columns
    ]
    rows = []
    for row in range(len(modes)):
        cells = []
        for _, numeric, texts, values in columns:
            value = None if values is None else _script_number(float(values[row]))
            class_ = "n" if numeric else "k"
            cells.append(tag("td", texts[row], class_=class_, data_value=value))
        rows.append(tag("tr", *cells))
    table = tag(
        "table",
        tag("thead", tag("tr", *heads)),
        tag("tbody", *rows),
        class_="sortable",
        id="all-modes",
    )
    return tag("div", table, class_="box long")


_Column = tuple[Html, bool, list[str], np.ndarray | None]


def _mode_columns(modes: ModeSet, unit: str) -> Iterator[_Column]:
    """Heading, whether it is a number, cells, and what to sort by if not the cells."""
    for name in ("degree", "order"):
        values = getattr(modes, name)
        yield symbol("l" if name == "degree" else "n"), True, [str(v) for v in values], None
    yield Html("kind"), False, [str(kind) for kind in modes.kind], None
    for name, label in (("n_p", "n_p"), ("n_g", "n_g")):
        yield symbol(label), True, [str(v) for v in getattr(modes, name)], None
    nu, error = modes.nu, modes.nu_error
    texts = aligned([fixed(*pair) for pair in zip(nu, error, strict=True)])
    yield join((symbol("nu"), f" / {MICRO}")), True, texts, nu
    yield Html("error"), True, [f"{value:.0e}" for value in error], error
    yield Html(f"period / {unit}"), True, _periods(modes, unit), modes.period
    yield Html("inertia"), True, [f"{value:.4e}" for value in modes.inertia], modes.inertia
    if modes.nu_second is not None:
        off = modes.nu_second - nu
        yield Html("second \u2212 first"), True, [f"{v:+.0e}" for v in off], np.abs(off)
    remarks = [", ".join(_remarks(modes, row)) for row in range(len(modes))]
    if any(remarks):
        yield Html("remark"), False, remarks, None


def _periods(modes: ModeSet, unit: str) -> list[str]:
    scale = PERIOD_UNITS[unit]
    return aligned(
        [
            f"{value / scale:#.7g}".rstrip(".") if math.isfinite(value) else "\u2013"
            for value in modes.period.tolist()
        ]
    )


def _remarks(modes: ModeSet, row: int) -> Iterator[str]:
    if modes.relabelled[row]:
        yield f"nodes give n = {modes.n_p[row] - modes.n_g[row]}"
    if modes.sigma2[row] < 0.0:
        yield "grows"
    confirmed = modes.confirmed
    if confirmed is not None and not confirmed[row]:
        yield "second opinion differs"


def _script_number(value: float) -> str:
    """A number that the script of the page reads back exactly."""
    if math.isinf(value):
        return "Infinity" if value > 0.0 else "-Infinity"
    return repr(value)
