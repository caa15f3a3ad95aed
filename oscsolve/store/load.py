"""`load_modes`: the mode list of one star, whichever kind of file holds it."""

from __future__ import annotations

import os

import h5py

from oscsolve.errors import InputError
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.star.formats.files import checked_path
from oscsolve.star.model import StarModel
from oscsolve.store import schema
from oscsolve.store.grid_read import load_grid_modes
from oscsolve.store.read import load_mode_file


def load_modes(
    path: str | os.PathLike[str], *, model: int | str | None = None, star: StarModel | None = None
) -> ModeSet:
    """The mode list in a file that `save_modes` wrote, or of one model of a grid store.

    Parameters
    ----------
    path : file to read
    model : for a grid store, which model: its row, its name or its source
    star : for a grid store, which keeps no structures, the star itself; None reads it again from
        the file that it came from

    Returns
    -------
    ModeSet
        With its star, census, options, findings and, where the file has them, eigenfunctions;
        equal bit by bit to the list that was saved.

    Raises
    ------
    InputError
        The file is missing, is no HDF5 file or not one of ours, is damaged or cut short, lacks a
        dataset, or was written with a newer layout; or there is no such model, it failed, or its
        file is gone or has changed. One line says which.
    """
    if model is not None:
        return load_grid_modes(path, model, star)
    if star is not None:
        raise InputError("star= goes with model=, for a grid store; a mode file holds its own star")
    return load_mode_file(path)


def is_grid_store(path: str | os.PathLike[str]) -> bool:
    """True for a grid store; False for any other file, readable or not."""
    return _content(path) == schema.GRID_CONTENT


def is_mode_file(path: str | os.PathLike[str]) -> bool:
    """True for the mode list of one star; False for any other file, readable or not."""
    return _content(path) == schema.CONTENT


def _content(path: str | os.PathLike[str]) -> str:
    try:
        with h5py.File(checked_path(path), "r") as opened:
            return str(opened.attrs.get("content", ""))
    except (OSError, InputError):
        return ""
