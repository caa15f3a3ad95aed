"""Rotation profiles and measured splittings from CSV tables."""

from __future__ import annotations

import math
import os

from oscsolve.errors import InputError
from oscsolve.seismology.csv_table import read_csv_table
from oscsolve.seismology.rotation import Rotation
from oscsolve.seismology.two_zones import MeasuredSplittings
from oscsolve.star.formats.files import checked_path
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
    table = read_csv_table(checked_path(path))
    place = table.one_of(("x", "radius"))
    rate = table.one_of(tuple(RATE_COLUMNS))
    values = table.numbers((place, rate))
    scale = star.photospheric_radius if place == "radius" else 1.0
    name = f"from {table.file}"
    try:
        return Rotation(values[:, 0] / scale, values[:, 1] * RATE_COLUMNS[rate], name)
    except InputError as error:
        raise InputError(f"{table.file}: {error}") from error


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
    table = read_csv_table(checked_path(path))
    missing = [name for name in _SPLITTING_COLUMNS if name not in table.names]
    if missing:
        raise InputError(
            f"{table.file}: column {missing[0]!r} is missing; expected degree, order, splitting "
            "and splitting_error (nHz)"
        )
    whole = (table.whole_numbers(name) for name in _SPLITTING_COLUMNS[:2])
    try:
        return MeasuredSplittings(*whole, *table.numbers(_SPLITTING_COLUMNS[2:]).T)
    except InputError as error:
        raise InputError(f"{table.file}: {error}") from error
