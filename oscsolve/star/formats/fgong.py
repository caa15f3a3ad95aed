"""FGONG, the open exchange format for stellar models, read in every field width in use.

Layout: four lines of text; one line ``nn iconst ivar ivers``; `iconst` numbers for the whole
star and `ivar` numbers for each of `nn` points, five to a line, each point on a new line.
Source: the format description of the GONG solar model project (Christensen-Dalsgaard), with
later widths of the fields. Fields may touch and three-digit exponents may lack their letter.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from oscsolve.errors import InputError
from oscsolve.star.formats.files import bytes_hash, read_bytes
from oscsolve.star.formats.numbers import is_number, parse_number, rounding
from oscsolve.star.formats.points import (
    GRAVITY_RANGE,
    Draft,
    make_star,
    merge_repeated_radii,
    order_outward,
    settle_a_star,
    settle_centre,
    settle_gravity,
)
from oscsolve.star.model import StarModel

PER_LINE = 5
_TEXT_LINES = 4
_FIRST_NUMBER_LINE = _TEXT_LINES + 2
_COUNTS = re.compile(rb"^\s*(\d+)\s+(\d+)\s+(\d+)(?:\s+(-?\d+))?\s*$")

#: Place (from 0) of the point variables used here.
VARIABLES = {
    "radius": 0,
    "ln_q": 1,
    "temperature": 2,
    "pressure": 3,
    "density": 4,
    "hydrogen": 5,
    "gamma1": 9,
    "a_star": 14,
    "metals": 16,
}
#: Median |A*| below which a star counts as neutrally stratified.
_NEUTRAL = 1e-2
_MIN_VARIABLES = 15
_MIN_GLOBALS = 3


@dataclass(frozen=True)
class _Layout:
    """Sizes from the fifth line; `start` is where the numbers begin in the file."""

    points: int
    globals_: int
    variables: int
    version: int
    start: int

    @property
    def global_lines(self) -> int:
        return -(-self.globals_ // PER_LINE)

    @property
    def point_lines(self) -> int:
        return -(-self.variables // PER_LINE)

    @property
    def lines(self) -> int:
        return self.global_lines + self.points * self.point_lines


def recognise(head: bytes) -> bool:
    """True if the fifth line is nothing but the counts of an FGONG file."""
    lines = head.split(b"\n", _TEXT_LINES + 1)
    if len(lines) <= _TEXT_LINES or b"\0" in head:
        return False
    found = _COUNTS.match(lines[_TEXT_LINES])
    return bool(found and int(found[2]) >= _MIN_GLOBALS and int(found[3]) >= 10)


def read(path: Path, *, gravitational_constant: float | None = None) -> StarModel:
    """The star in an FGONG file.

    Parameters
    ----------
    path : file to read.
    gravitational_constant : cm^3 g^-1 s^-2; replaces the value in the file or the estimate.

    Raises
    ------
    InputError
        The file is cut short, a field is no number (the line is named), or the model makes
        no sense.
    """
    data = read_bytes(path)
    digest = bytes_hash(data)
    if b"\r" in data:
        data = data.replace(b"\r\n", b"\n")
    where = str(path)
    layout = _read_layout(data, where)
    scale, columns, digits = _read_numbers(data, layout, where)
    draft = _make_draft(scale, columns, where)
    if data[layout.start :].count(b"\n") > layout.lines:
        _note_trailing(data, layout, draft)
    order_outward(draft)
    settle_centre(draft)
    merge_repeated_radii(draft, digits)
    settle_gravity(draft, gravitational_constant, _stated_gravity(scale))
    _settle_empty_a_star(draft, digits)
    return make_star(draft, name=path.stem, source=where, source_hash=digest)


def _read_layout(data: bytes, where: str) -> _Layout:
    at = 0
    for _ in range(_TEXT_LINES):
        at = data.find(b"\n", at) + 1
        if at == 0:
            raise InputError(f"{where}: ends before line 5; an FGONG file has four text lines")
    end = data.find(b"\n", at)
    end = len(data) if end < 0 else end
    found = _COUNTS.match(data[at:end])
    if not found:
        raise InputError(
            f"{where}, line 5: expected four whole numbers (points, globals, variables, "
            f"version); got {data[at:end].decode('latin-1').strip()[:60]!r}"
        )
    points, globals_, variables = (int(found[k]) for k in (1, 2, 3))
    layout = _Layout(points, globals_, variables, int(found[4] or 0), end + 1)
    if points < 5 or globals_ < _MIN_GLOBALS or variables < _MIN_VARIABLES:
        raise InputError(
            f"{where}, line 5: {points} points, {globals_} globals and {variables} variables; "
            f"at least 5, {_MIN_GLOBALS} and {_MIN_VARIABLES} are needed"
        )
    # Compared before anything is allocated: a damaged count must not ask for gigabytes.
    body = data[layout.start :].rstrip()
    have = body.count(b"\n") + 1 if body else 0
    if have < layout.lines:
        raise InputError(
            f"{where}, line {_TEXT_LINES + 1 + have}: the file ends here; line 5 declares "
            f"{points} points of {variables} variables, that is {layout.lines - have} more "
            "lines. Copy or write the file again"
        )
    return layout


def _read_numbers(
    data: bytes, layout: _Layout, where: str
) -> tuple[np.ndarray, dict[str, np.ndarray], float]:
    """Globals, the columns used, and the relative rounding of the fields."""
    lines = data[layout.start :].split(b"\n", layout.global_lines)
    head, body = lines[: layout.global_lines], lines[layout.global_lines]
    width = _field_width(head, layout.globals_, where)
    scale = np.array(
        _parse_lines(head, layout.globals_, width, _FIRST_NUMBER_LINE, where), dtype=float
    )
    fields = _cut_fields(body, layout, width)
    first = _FIRST_NUMBER_LINE + layout.global_lines
    columns = {}
    if fields is None:
        table = _parse_uneven(body, layout, width, first, where)
        for name, at in VARIABLES.items():
            if at < layout.variables:
                columns[name] = table[:, at].copy()
    else:
        for name, at in VARIABLES.items():
            if at < layout.variables:
                columns[name] = _parse_column(fields, at, layout, first, where)
    texts = [field.decode("latin-1") for field in _cut_line(head[0], PER_LINE, width)]
    return scale, columns, rounding(texts)


def _field_width(head: list[bytes], count: int, where: str) -> int:
    """Width of one field, from the first full line of numbers; 0 means blank-separated."""
    line = head[0].rstrip()
    number = min(count, PER_LINE)
    width, rest = divmod(len(line), number)
    tokens = line.split()
    if rest == 0 and width >= 8:
        cut = [line[k * width : (k + 1) * width] for k in range(number)]
        if all(_is_number(field) for field in cut):
            return width
    if len(tokens) == number:
        return 0
    raise InputError(
        f"{where}, line {_FIRST_NUMBER_LINE}: expected {number} numbers in fields of one width; "
        f"got {line.decode('latin-1')[:60]!r}"
    )


def _number(field: bytes) -> float:
    return parse_number(field.decode("latin-1"))


def _is_number(field: bytes) -> bool:
    return is_number(field.decode("latin-1"))


def _cut_line(line: bytes, number: int, width: int) -> list[bytes]:
    if width == 0:
        return line.split()
    return [line[k * width : (k + 1) * width] for k in range(number)]


def _parse_lines(lines: list[bytes], count: int, width: int, first: int, where: str) -> list[float]:
    """`count` numbers from a few lines, one field at a time; names the line of a bad one."""
    values: list[float] = []
    for k, line in enumerate(lines):
        number = min(PER_LINE, count - len(values))
        text = line.rstrip()
        cut = _cut_line(text, number, width)
        try:
            if len(cut) != number or (width and len(text) > number * width):
                raise ValueError
            values.extend(_number(field) for field in cut)
        except ValueError as error:
            bad = next((field for field in cut if not _is_number(field)), text)
            raise InputError(
                f"{where}, line {first + k}: expected {number} numbers; got "
                f"{bad.decode('latin-1').strip()[:60]!r}. Repair the line or write the file again"
            ) from error
    return values


def _cut_fields(body: bytes, layout: _Layout, width: int) -> np.ndarray | None:
    """(points, variables, width) bytes if all lines have the exact width, else None."""
    if width == 0:
        return None
    counts = [PER_LINE] * (layout.variables // PER_LINE)
    if layout.variables % PER_LINE:
        counts.append(layout.variables % PER_LINE)
    length = layout.variables * width + len(counts)
    size = layout.points * length
    if len(body) == size - 1:
        body += b"\n"
    if len(body) < size:
        return None
    block = np.frombuffer(body, np.uint8, size).reshape(layout.points, length)
    ends = np.cumsum(np.array(counts) * width + 1) - 1
    is_newline = np.zeros(length, dtype=bool)
    is_newline[ends] = True
    if not np.all((block == 10) == is_newline):
        return None
    return block[:, ~is_newline].reshape(layout.points, layout.variables, width)


def _parse_column(
    fields: np.ndarray, at: int, layout: _Layout, first: int, where: str
) -> np.ndarray:
    """(points,) numbers of variable `at`. Columns not used are never converted."""
    width = fields.shape[2]
    text = np.ascontiguousarray(fields[:, at, :])
    text[(text == ord("D")) | (text == ord("d"))] = ord("E")
    strings = text.view(f"S{width}").ravel()
    try:
        return strings.astype(np.float64)
    except ValueError:
        pass
    values = np.empty(layout.points)
    for k, field in enumerate(strings.tolist()):
        try:
            values[k] = _number(field)
        except ValueError as error:
            line = first + k * layout.point_lines + at // PER_LINE
            raise InputError(
                f"{where}, line {line}: expected a number in field {at % PER_LINE + 1}; got "
                f"{field.decode('latin-1').strip()!r}. Repair the line or write the file again"
            ) from error
    return values


def _parse_uneven(body: bytes, layout: _Layout, width: int, first: int, where: str) -> np.ndarray:
    """(points, variables) numbers of a file whose lines differ in length."""
    lines = body.split(b"\n")
    per_point = layout.point_lines
    rows = [
        _parse_lines(
            lines[k * per_point : (k + 1) * per_point],
            layout.variables,
            width,
            first + k * per_point,
            where,
        )
        for k in range(layout.points)
    ]
    return np.array(rows, dtype=float)


def _make_draft(scale: np.ndarray, columns: dict[str, np.ndarray], where: str) -> Draft:
    total, radius, luminosity = (float(value) for value in scale[:3])
    for name, value in (("mass", total), ("radius", radius)):
        if not (np.isfinite(value) and value > 0.0):
            raise InputError(
                f"{where}, line {_FIRST_NUMBER_LINE}: the {name} of the star must be above zero; "
                f"got {value:g}"
            )
    outer = float(np.max(columns["radius"]))
    if not 0.5 < outer / radius < 2.0:
        raise InputError(
            f"{where}, line {_FIRST_NUMBER_LINE}: the radius of the star is {radius:g} cm, but its "
            f"points reach {outer:g} cm; repair one of them"
        )
    ln_q = columns["ln_q"]
    above = np.flatnonzero(ln_q > 1.0)
    if above.size:
        raise InputError(
            f"{where}: variable 2 must be ln(m/M), which is not above zero; it is "
            f"{ln_q[above[0]]:g} at point {above[0] + 1} of the file. Repair or write it again"
        )
    columns["mass"] = total * np.exp(columns.pop("ln_q"))
    metals = columns.pop("metals", None)
    hydrogen = columns["hydrogen"]
    scalars = {"total_mass": total, "photospheric_radius": radius}
    if np.isfinite(luminosity) and luminosity > 0.0:
        scalars["luminosity"] = luminosity
    draft = Draft(where, columns, scalars)
    if not np.any(hydrogen > 0.0) and (metals is None or not np.any(metals > 0.0)):
        del columns["hydrogen"]
    elif metals is not None and np.any(metals > 0.0):
        columns["helium"] = 1.0 - hydrogen - metals
    if not np.all(columns["temperature"] > 0.0):
        del columns["temperature"]
    _check_mass(draft)
    return draft


def _check_mass(draft: Draft) -> None:
    excess = float(np.max(draft.columns["mass"])) / draft.scalars["total_mass"] - 1.0
    if excess > 1e-8:
        draft.note(
            "doubt",
            "mass-above-total",
            f"the mass inside a point exceeds the total mass by {excess:.2g} of it",
            "check the mass of the star on line 6 against the second variable",
            size=excess,
        )


def _stated_gravity(scale: np.ndarray) -> float | None:
    low, high = GRAVITY_RANGE
    if scale.size >= 15 and low < scale[14] < high:
        return float(scale[14])
    return None


def _note_trailing(data: bytes, layout: _Layout, draft: Draft) -> None:
    rest = data[layout.start :].split(b"\n", layout.lines)[layout.lines].strip()
    if rest:
        count = rest.count(b"\n") + 1
        draft.note(
            "doubt",
            "lines-ignored",
            f"{count} lines follow the {layout.points} declared points and were ignored",
            "check the number of points on line 5",
        )


def _settle_empty_a_star(draft: Draft, digits: float) -> None:
    """Derive A* if the file leaves it zero everywhere although the star is stratified."""
    zeros = draft.columns["a_star"]
    if np.any(zeros != 0.0):
        return
    kept = list(draft.findings)
    settle_a_star(draft, digits, "A* = 0 everywhere, which its P, rho and Gamma1 contradict")
    # A star of neutral stratification has A* = 0 in truth; differences only add noise to it.
    if float(np.median(np.abs(draft.columns["a_star"]))) < _NEUTRAL:
        draft.columns["a_star"], draft.findings = zeros, kept
