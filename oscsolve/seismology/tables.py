"""Small CSV tables that users hand in: rotation profiles and measured splittings.

Lines that start with # are comments, the first other line holds the names of the columns.
"""

from __future__ import annotations

import csv
import math
import os
from collections.abc import Sequence
from pathlib import Path

import numpy as np

from oscsolve.errors import InputError
from oscsolve.seismology.rotation import Rotation
from oscsolve.seismology.two_zones import MeasuredSplittings
from oscsolve.star.formats.files import checked_path, unreadable
from oscsolve.star.model import StarModel

#: Column of a rotation table: factor from its unit to nHz.
RATE_COLUMNS = {"omega": 1e9 / (2.0 * math.pi), "rate_nHz": 1.0, "rate_uHz": 1e3}
_SPLITTING_COLUMNS = ("degree", "order", "splitting", "splitting_error")


def read_rotation(path: str | os.PathLike[str], star: StarModel) -> Rotation:
    """A rotation profile from a CSV table.

    Parameters
    ----------
    path : file with a column `x` (r/R) or `radius` (cm) and a column `omega` (rad/s), `rate_nHz`
        or `rate_uHz` (Omega/2 pi); other columns are left alone
    star : star it belongs to, for its radius

    Raises
    ------
    InputError
        The file cannot be read, a column is missing or doubled, or a value cannot be used; the
        message says at which line.
    """
    file = checked_path(path)
    names, rows, lines = _read(file)
    place = _one_of(file, names, ("x", "radius"))
    rate = _one_of(file, names, tuple(RATE_COLUMNS))
    values = _numbers(file, names, rows, lines, (place, rate))
    scale = star.photospheric_radius if place == "radius" else 1.0
    try:
        return Rotation(values[:, 0] / scale, values[:, 1] * RATE_COLUMNS[rate], f"from {file}")
    except InputError as error:
        raise InputError(f"{file}: {error}") from error


def read_splittings(path: str | os.PathLike[str]) -> MeasuredSplittings:
    """Measured splittings from a CSV table.

    Parameters
    ----------
    path : file with the columns degree, order, splitting and splitting_error (nHz); other columns
        are left alone

    Raises
    ------
    InputError
        The file cannot be read, a column is missing, or a value cannot be used; the message says
        at which line.
    """
    file = checked_path(path)
    names, rows, lines = _read(file)
    missing = [name for name in _SPLITTING_COLUMNS if name not in names]
    if missing:
        raise InputError(
            f"{file}: column {missing[0]!r} is missing; expected degree, order, splitting and "
            "splitting_error (nHz)"
        )
    values = _numbers(file, names, rows, lines, _SPLITTING_COLUMNS)
    for name, column in zip(("degree", "order"), values.T[:2], strict=True):
        broken = np.flatnonzero(column != np.rint(column))
        if broken.size:
            raise InputError(
                f"{file}, line {lines[broken[0]]}: {name} must be a whole number; got "
                f"{column[broken[0]]:g}"
            )
    try:
        return MeasuredSplittings(*values.T)
    except InputError as error:
        raise InputError(f"{file}: {error}") from error


def _read(file: Path) -> tuple[list[str], list[list[str]], list[int]]:
    """Names, rows as texts, and the number of the line each stands in."""
    try:
        text = file.read_text(encoding="utf-8-sig")
    except OSError as error:
        raise unreadable(file, error) from error
    except UnicodeDecodeError as error:
        raise InputError(f"{file}: not a text file; expected a CSV table") from error
    kept = [
        (number, line)
        for number, line in enumerate(text.splitlines(), start=1)
        if line.strip() and not line.lstrip().startswith("#")
    ]
    if len(kept) < 2:
        raise InputError(f"{file}: holds no table; expected a line of names and lines of numbers")
    table = [[cell.strip() for cell in next(csv.reader([line]))] for _, line in kept]
    return table[0], table[1:], [number for number, _ in kept[1:]]


def _one_of(file: Path, names: Sequence[str], wanted: Sequence[str]) -> str:
    found = [name for name in wanted if name in names]
    if len(found) != 1:
        what = "more than one of them" if found else "none of them"
        raise InputError(
            f"{file}: expected one column of {', '.join(wanted)}; got {what} in "
            f"{','.join(names)!r:.80}"
        )
    return found[0]


def _numbers(
    file: Path,
    names: Sequence[str],
    rows: Sequence[Sequence[str]],
    lines: Sequence[int],
    wanted: Sequence[str],
) -> np.ndarray:
    """(rows, wanted) finite numbers."""
    values = np.empty((len(rows), len(wanted)))
    for place, (row, line) in enumerate(zip(rows, lines, strict=True)):
        if len(row) != len(names):
            raise InputError(
                f"{file}, line {line}: {len(row)} fields where the heading has {len(names)}; "
                "repair the line"
            )
        for column, name in enumerate(wanted):
            text = row[list(names).index(name)]
            try:
                values[place, column] = float(text)
            except ValueError:
                values[place, column] = np.nan
            if not np.isfinite(values[place, column]):
                raise InputError(
                    f"{file}, line {line}: {name} is {text!r}, expected a number; repair the line"
                )
    return values
