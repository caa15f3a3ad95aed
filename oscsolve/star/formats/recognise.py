"""Which format a file is in, told by its content, and the public read and write functions."""

from __future__ import annotations

import os
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from oscsolve.errors import InputError
from oscsolve.star.formats import columns, fgong, fgong_write, hdf5
from oscsolve.star.formats.files import checked_path, read_head
from oscsolve.star.model import StarModel


@dataclass(frozen=True)
class Format:
    """One file format: how it is recognised, read and written.

    Attributes
    ----------
    name : short name, used as `format`
    recognise : head of a file (bytes) to bool
    read : ``read(path, *, gravitational_constant=None) -> StarModel``
    write : ``write(star, path, *, overwrite=False)``, or None if the format is only read
    suffixes : file endings that choose the format on writing
    """

    name: str
    recognise: Callable[[bytes], bool]
    read: Callable[..., StarModel]
    write: Callable[..., None] | None = None
    suffixes: tuple[str, ...] = ()


FORMATS = (
    Format("hdf5", hdf5.recognise, hdf5.read, hdf5.write, (".h5", ".hdf5")),
    Format("fgong", fgong.recognise, fgong.read, fgong_write.write, (".fgong",)),
    Format("columns", columns.recognise, columns.read),
)


def read_model(
    path: str | os.PathLike[str], *, gravitational_constant: float | None = None
) -> StarModel:
    """The star in a file of any known format, recognised by what the file holds.

    Parameters
    ----------
    path : file to read.
    gravitational_constant : cm^3 g^-1 s^-2; replaces the G in the file or the estimated one.

    Raises
    ------
    InputError
        The file cannot be opened, is in no known format, or is damaged; the message names the
        line or point.
    ModelError
        The numbers can be read but make no star.
    """
    file = checked_path(path)
    head = read_head(file)
    for known in FORMATS:
        if known.recognise(head):
            # Arithmetic with absurd columns gives NaN or infinity, which no test passes and no
            # star accepts: the message comes from there, not from a warning on the way.
            with np.errstate(all="ignore"):
                return known.read(file, gravitational_constant=gravitational_constant)
    kind = "binary" if b"\0" in head else "text"
    raise InputError(
        f"{file}: this {kind} file is in no known format "
        f"({', '.join(known.name for known in FORMATS)}); export the model as FGONG"
    )


def write_model(
    star: StarModel,
    path: str | os.PathLike[str],
    *,
    format: str | None = None,
    overwrite: bool = False,
) -> None:
    """Write a star to a file; the file appears complete or not at all.

    Parameters
    ----------
    star : model to write.
    path : file to make.
    format : "fgong" or "hdf5"; None takes it from the ending (.fgong, .h5, .hdf5).
    overwrite : replace an existing file.

    Raises
    ------
    InputError
        The format is not known or not written here, the file exists and `overwrite` is false,
        or the folder cannot be written.
    """
    file = Path(path)
    writers = {known.name: known for known in FORMATS if known.write is not None}
    if format is None:
        chosen = [k for k in writers.values() if file.suffix.lower() in k.suffixes]
        if not chosen:
            raise InputError(
                f"{file}: the ending {file.suffix!r} names no format; end the name in .fgong or "
                f".h5, or give format ({' or '.join(writers)})"
            )
        known = chosen[0]
    elif format in writers:
        known = writers[format]
    else:
        raise InputError(f"format {format!r} cannot be written; use {' or '.join(writers)}")
    assert known.write is not None
    known.write(star, file, overwrite=overwrite)
