"""Writing FGONG; see `fgong` for the layout."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from oscsolve.errors import InputError
from oscsolve.star.formats.fgong import PER_LINE, VARIABLES
from oscsolve.star.formats.files import replacing
from oscsolve.star.formats.points import GRAVITY_RANGE
from oscsolve.star.model import StarModel
from oscsolve.version import __version__

#: ln(m/M) written for a centre; exp of it is far below any mass in a model.
_LN_Q_CENTRE = -1e3
_WRITE_VERSION = 300


def write(star: StarModel, path: Path, *, overwrite: bool = False) -> None:
    """Write FGONG with 17 significant digits in fields of 26 characters, surface first.

    Parameters
    ----------
    star : model to write. Variables that it does not have are zero in the file.
    path : file to make.
    overwrite : replace an existing file.

    Notes
    -----
    The fields that are filled: globals 1 M, 2 R, 3 L, 15 G; variables 1 r, 2 ln(m/M), 3 T, 4 P,
    5 rho, 6 X, 10 Gamma1, 15 A*, 17 Z, 18 R - r. FGONG stores ln(m/M), so the mass comes back
    to a few units in the last digit, everything else exactly. FGONG has no place for the
    rotation and the effective temperature; the HDF5 file keeps them.

    Raises
    ------
    InputError
        G is not the cgs value, so readers of FGONG would misread it, or the file exists and
        `overwrite` is false, or cannot be written.
    """
    low, high = GRAVITY_RANGE
    if not low < star.gravitational_constant < high:
        raise InputError(
            f"{path}: G = {star.gravitational_constant:g} is not in cgs units, which FGONG "
            "takes for granted; write .h5 instead or rescale the model"
        )
    scale = np.zeros(15)
    scale[:3] = star.total_mass, star.photospheric_radius, star.luminosity or 0.0
    scale[14] = star.gravitational_constant
    table = _write_table(star)
    text = [
        star.name[:79],
        f"Written by oscsolve {__version__}; cgs units",
        f"Source: {star.source}"[:79],
        "Variables used: 1-6, 10, 15, 17, 18; the others are zero",
        f"{star.radius.size:10d}{scale.size:10d}{table.shape[1]:10d}{_WRITE_VERSION:10d}",
    ]
    lines = [_plain(line) for line in text]
    lines += _write_lines(scale)
    for row in table[::-1]:
        lines += _write_lines(row)
    with replacing(path, overwrite) as temporary:
        temporary.write_text("\n".join(lines) + "\n", encoding="ascii", newline="\n")


def _write_table(star: StarModel) -> np.ndarray:
    table = np.zeros((star.radius.size, 25))
    table[:, 0] = star.radius
    # A centre has m = 0 and no logarithm; the reader takes r = 0 as m = 0.
    with np.errstate(divide="ignore"):
        ln_q = np.log(star.mass / star.total_mass)
    table[:, 1] = np.maximum(ln_q, _LN_Q_CENTRE)
    for name, at in VARIABLES.items():
        values = getattr(star, name, None)
        if values is not None:
            table[:, at] = values
    if star.hydrogen is not None and star.helium is not None:
        table[:, VARIABLES["metals"]] = 1.0 - star.hydrogen - star.helium
    table[:, 17] = star.photospheric_radius - star.radius
    return table


def _write_lines(values: np.ndarray) -> list[str]:
    fields = [f"{value:26.16E}" for value in values.tolist()]
    return ["".join(fields[k : k + PER_LINE]) for k in range(0, len(fields), PER_LINE)]


def _plain(text: str) -> str:
    """Text on one line in ASCII: FGONG has no encoding."""
    return text.encode("ascii", "replace").decode("ascii").replace("\n", " ")
