"""Labelled column tables: one row a point, names above, in cgs or solar units.

Nothing but the names, the numbers and the laws of a star tells how to read such a file, so
every choice (units, mesh, what was derived) is a finding.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np

from oscsolve.errors import InputError
from oscsolve.star.formats.column_names import COLUMNS, Spelling, match_names
from oscsolve.star.formats.column_units import Units, choose_units, constant_in_cgs
from oscsolve.star.formats.files import bytes_hash, read_bytes
from oscsolve.star.formats.numbers import is_number, parse_number, rounding
from oscsolve.star.formats.points import (
    GRAVITY_RANGE,
    Draft,
    make_star,
    merge_repeated_radii,
    order_outward,
    settle_centre,
    settle_gravity,
)
from oscsolve.star.formats.staggered import (
    buoyancy_at_faces,
    face_gravity,
    is_staggered,
    to_centres,
)
from oscsolve.star.formats.table_text import TableText, find_table, split_row
from oscsolve.star.formats.thermodynamics import settle_thermodynamics
from oscsolve.star.model import StarModel

#: Relative mismatch of rho dV and dm from which on the user should look at the file.
_MISMATCH = 1e-3
_NEEDED = ("radius", "mass", "pressure", "density")


def recognise(head: bytes) -> bool:
    """True if a run of rows stands under a line of names that has radius and one more of ours."""
    if b"\0" in head:
        return False
    # The last line of the head may be cut.
    lines = head.decode("latin-1").splitlines()
    try:
        table = find_table(lines[:-1] if len(lines) > 8 else lines, "")
    except InputError:
        # A table whose names cannot be told apart: let `read` say so.
        return True
    if table is None:
        return False
    found = match_names(table.names, COLUMNS)
    return "radius" in found and bool(found.keys() & {"pressure", "density", "mass"})


def read(path: Path, *, gravitational_constant: float | None = None) -> StarModel:
    """The star in a labelled column table.

    Parameters
    ----------
    path : file to read.
    gravitational_constant : cm^3 g^-1 s^-2; replaces the estimate.

    Raises
    ------
    InputError
        A column is missing, a row is damaged (the line is named), or the units cannot be told.
    """
    data = read_bytes(path)
    where = str(path)
    lines = data.decode("latin-1").splitlines()
    table = find_table(lines, where)
    if table is None:
        raise InputError(f"{where}: no table of numbers under a line of names was found")
    draft, units, digits = _make_draft(lines, table, where)
    order_outward(draft)
    settle_centre(draft)
    merge_repeated_radii(draft, max(digits.values()))
    stated = _stated_gravity(table)
    if is_staggered(draft):
        _settle_staggered(draft, gravitational_constant, stated)
    else:
        settle_gravity(draft, gravitational_constant, stated)
    settle_thermodynamics(draft, max(digits["pressure"], digits["density"]))
    return make_star(draft, name=path.stem, source=where, source_hash=bytes_hash(data))


def _make_draft(
    lines: list[str], table: TableText, where: str
) -> tuple[Draft, Units, dict[str, float]]:
    found = match_names(table.names, COLUMNS)
    for name in _NEEDED:
        if name not in found:
            accepted = ", ".join(spelling.name for spelling in COLUMNS[name][:6])
            raise InputError(
                f"{where}: no column of {name} among {', '.join(table.names[:12])}; name it one "
                f"of {accepted} (letters and digits count)"
            )
    columns, digits = _read_columns(lines, table, found, where)
    for name, column in columns.items():
        bad = np.flatnonzero(~np.isfinite(column))
        if bad.size:
            raise InputError(
                f"{where}: {table.names[found[name][0]]} is not a finite number in row "
                f"{bad[0] + 1} of the table; repair the file"
            )
    inward = columns["radius"][0] > columns["radius"][-1]
    outward = {name: c[::-1] if inward else c for name, c in columns.items()}
    stated = {name: found[name][1].unit for name in ("radius", "mass")}
    units = choose_units(where, outward, stated, table.constants)
    columns["radius"] = columns["radius"] * units.radius.factor
    columns["mass"] = columns["mass"] * units.mass.factor
    draft = Draft(where, columns, {})
    draft.note(
        "note" if units.mismatch < _MISMATCH else "doubt",
        "units-assumed",
        f"{units.describe()}: with these the mass of the cells follows from r and rho to "
        f"{units.mismatch:.1g}",
        ""
        if units.mismatch < _MISMATCH
        else "r, m and rho were scaled with constants that do not match; check them at the source",
        size=units.mismatch,
    )
    _settle_scales(draft, table, units)
    _settle_composition(draft)
    return draft, units, digits


def _read_columns(
    lines: list[str], table: TableText, found: dict[str, tuple[int, Spelling]], where: str
) -> tuple[dict[str, np.ndarray], dict[str, float]]:
    rows, numbers = [], []
    for k, line in enumerate(lines[table.first :], table.first + 1):
        text = line.strip()
        if not text or text[0] in "#!%":
            continue
        fields = split_row(text)
        if len(fields) != len(table.names):
            raise InputError(
                f"{where}, line {k}: expected {len(table.names)} numbers; got {len(fields)}. "
                "Repair the line or write the file again"
            )
        rows.append(fields)
        numbers.append(k)
    columns, digits = {}, {}
    for name, (at, spelling) in found.items():
        texts = [row[at] for row in rows]
        values = _parse(texts, numbers, table.names[at], where)
        digits[name] = rounding(texts)
        if spelling.log10:
            # An absolute rounding of the logarithm is a relative one of the quantity.
            digits[name] *= float(np.max(np.abs(values))) * np.log(10.0)
            # A damaged exponent becomes infinite here and is refused with its row below.
            with np.errstate(over="ignore"):
                values = 10.0**values
        columns[name] = values
    return columns, digits


def _parse(texts: list[str], numbers: list[int], name: str, where: str) -> np.ndarray:
    try:
        return np.array(texts, dtype=float)
    except ValueError:
        pass
    for text, line in zip(texts, numbers, strict=True):
        if not is_number(text):
            raise InputError(
                f"{where}, line {line}: expected a number for {name}; got {text[:40]!r}. "
                "Repair the line or write the file again"
            )
    return np.array([parse_number(text) for text in texts])


def _settle_scales(draft: Draft, table: TableText, units: Units) -> None:
    known = {
        name: constant_in_cgs(value, name, units)
        for name, value in table.constants.items()
        if name != "gravitational_constant"
    }
    outer = {
        "photospheric_radius": float(draft.columns["radius"].max()),
        "total_mass": float(draft.columns["mass"].max()),
    }
    for name, value in outer.items():
        stated = known.get(name)
        # The run constants of some files are those of the start of the run.
        near = stated is not None and abs(value / stated - 1.0) < 0.1
        draft.scalars[name] = float(stated) if near and stated is not None else value
        label = "R" if name == "photospheric_radius" else "M"
        draft.note(
            "note",
            f"{name.replace('_', '-')}-" + ("read" if near else "from-points"),
            f"{label} = {draft.scalars[name]:.10g} "
            + ("as stated above the table" if near else "is that of the outermost point"),
        )
    for name in ("effective_temperature", "luminosity"):
        if name in known and known[name] > 0.0:
            draft.scalars[name] = known[name]


def _settle_composition(draft: Draft) -> None:
    """Helium from X and Z where Y is missing; Z itself is not kept."""
    metals = draft.columns.pop("metals", None)
    if metals is not None and "helium" not in draft.columns and "hydrogen" in draft.columns:
        draft.columns["helium"] = 1.0 - draft.columns["hydrogen"] - metals


def _stated_gravity(table: TableText) -> float | None:
    value = table.constants.get("gravitational_constant", (0.0, ""))[0]
    return value if GRAVITY_RANGE[0] < value < GRAVITY_RANGE[1] else None


def _settle_staggered(draft: Draft, given: float | None, stated: float | None) -> None:
    c = draft.columns
    implied = face_gravity(c["radius"], c["mass"], c["pressure"], c["density"])
    gravity = given or stated or implied[0]
    at_faces = False
    if "brunt_n2" in c and "gamma1" in c:
        at_faces = buoyancy_at_faces(draft, gravity)
    to_centres(draft, at_faces)
    settle_gravity(draft, given, stated, implied)
