"""Reading mode lists back."""

from __future__ import annotations

import os
from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import Any

import h5py
import numpy as np

from oscsolve.errors import InputError
from oscsolve.pulsation.modeset import Census, Eigenfunctions, ModeSet
from oscsolve.star.findings import Finding
from oscsolve.star.formats.files import checked_path
from oscsolve.star.formats.hdf5 import read_structure
from oscsolve.store import schema
from oscsolve.store.schema import Column

#: Kind of a column: numpy kinds that fit it, and their name in an error.
_KINDS = {"i": ("iu", "whole numbers"), "f": ("iuf", "numbers"), "s": ("O", "texts")}
#: Columns that `ModeSet` derives from others; stored for other readers of the file.
_DERIVED = ("period",)


def load_mode_file(path: str | os.PathLike[str]) -> ModeSet:
    """The mode list in a file that `save_modes` wrote, equal to it bit by bit.

    Parameters
    ----------
    path : file to read

    Returns
    -------
    ModeSet
        With its star, census, options, findings and, where the file has them, eigenfunctions.

    Raises
    ------
    InputError
        The file is missing, is no HDF5 file or not one of ours, is damaged or cut short, lacks a
        dataset, or was written with a newer layout; one line says which.
    """
    file = checked_path(path)
    if not h5py.is_hdf5(file):
        raise InputError(
            f"{file}: not an HDF5 file; expected a mode list written by oscsolve "
            "(oscsolve modes MODEL --out FILE.h5)"
        )
    try:
        with h5py.File(file, "r") as opened:
            check_content(opened, file, schema.CONTENT)
            check_schema(opened, file)
            return _read_modes(opened, file)
    except InputError:
        raise
    except (OSError, RuntimeError, KeyError) as error:
        raise InputError(
            f"{file}: this HDF5 file is damaged or cut short; copy it again or repeat the run"
        ) from error


def check_content(opened: h5py.File, path: Path, content: str) -> None:
    """Refuse a file that is something else."""
    found = opened.attrs.get("content")
    if found == content:
        return
    if found == schema.GRID_CONTENT:
        raise InputError(
            f"{path}: this file holds a grid of {opened.attrs.get('rows', '?')} models; say which "
            "one (model=, by row or name), or read the table with load_grid"
        )
    holds = f"holds {found!r}" if isinstance(found, str) else "was not written by oscsolve"
    made_by = "grid MODEL... --store" if content == schema.GRID_CONTENT else "modes MODEL --out"
    raise InputError(
        f"{path}: this HDF5 file {holds}; expected {content!r} (oscsolve {made_by} FILE.h5)"
    )


def check_schema(opened: h5py.File, path: Path) -> None:
    """Refuse a file that is laid out in a way not known yet."""
    number = opened.attrs.get("schema")
    if not isinstance(number, int | np.integer) or number < 1:
        raise InputError(f"{path}: the attribute 'schema' is no whole number; repeat the run")
    if number > schema.SCHEMA:
        since = opened.attrs.get("schema_since", "a newer version")
        raise InputError(
            f"{path}: schema {number} needs oscsolve {since} or later; this version reads up to "
            f"schema {schema.SCHEMA}: update oscsolve"
        )


def read_columns(
    opened: h5py.File,
    path: Path,
    group: str,
    columns: Iterable[Column],
    rows: slice | tuple[()] = (),
) -> dict[str, np.ndarray]:
    """Datasets of one group, or some rows of them, name to array; texts as str objects.

    Raises
    ------
    InputError
        The group or a dataset is missing, or a dataset does not hold what its column should.
    """
    values = {}
    for column in columns:
        place = f"/{group}/{column.name}"
        dataset = opened.get(place)
        if not isinstance(dataset, h5py.Dataset):
            raise InputError(f"{path}: the dataset {place} is missing; repeat the run")
        kinds, wanted = _KINDS[column.kind]
        text = h5py.check_string_dtype(dataset.dtype) is not None
        if dataset.dtype.kind not in kinds or text != (column.kind == "s"):
            raise InputError(
                f"{path}: {place} holds {dataset.dtype}, expected {wanted}; repeat the run"
            )
        values[column.name] = dataset.asstr()[rows] if text else dataset[rows]
    return values


def read_findings(opened: h5py.File, path: Path) -> tuple[Finding, ...]:
    """The findings in ``/findings``; NaN becomes None."""
    columns = read_columns(opened, path, "findings", schema.FINDINGS)
    try:
        rows = list(zip(*columns.values(), strict=True))
    except ValueError as error:
        raise InputError(f"{path}: /findings does not fit together: {error}") from error
    return tuple(finding_of(row, path) for row in rows)


def finding_of(values: Sequence[Any], path: Path) -> Finding:
    """One finding from the values of its columns; NaN becomes None.

    Raises
    ------
    InputError
        The severity is none that is known.
    """
    severity, code, message, advice, place, size = values
    try:
        return Finding(severity, code, message, advice, _known(place), _known(size))
    except ValueError as error:
        raise InputError(f"{path}: /findings does not fit together: {error}") from error


def _known(value: float) -> float | None:
    return None if np.isnan(value) else float(value)


def read_options(opened: h5py.File) -> dict[str, object]:
    """The options of the run, as plain values; rows come back as tuples."""
    return {
        name.removeprefix(schema.OPTION): _plain(value)
        for name, value in opened.attrs.items()
        if str(name).startswith(schema.OPTION)  # a damaged name comes as bytes
    }


def _plain(value: object) -> object:
    if isinstance(value, h5py.Empty):
        return None
    if isinstance(value, np.ndarray):
        return tuple(value.tolist())
    return value.item() if isinstance(value, np.generic) else value


def _read_modes(opened: h5py.File, path: Path) -> ModeSet:
    stored = [column for column in schema.MODES if column.name not in _DERIVED]
    if any(f"/modes/{column.name}" in opened for column in schema.SECOND_OPINION):
        stored += schema.SECOND_OPINION
    columns = read_columns(opened, path, "modes", stored)
    census = read_columns(opened, path, "census", schema.CENSUS)
    if not isinstance(opened.get("structure"), h5py.Group):
        raise InputError(f"{path}: the group /structure is missing; repeat the run")
    try:
        modes = ModeSet(
            **columns,
            census=Census(**census),
            star=read_structure(opened["structure"]),
            eigenfunctions=read_eigenfunctions(opened, path),
            options=read_options(opened),
            findings=read_findings(opened, path),
            program_version=str(opened.attrs.get("program_version", "")),
        )
    except InputError:
        raise
    except ValueError as error:
        raise InputError(f"{path}: the datasets do not fit together: {error}") from error
    if modes.eigenfunctions is not None and modes.eigenfunctions.xi_r.shape[0] != len(modes):
        raise InputError(
            f"{path}: {modes.eigenfunctions.xi_r.shape[0]} eigenfunctions for {len(modes)} modes; "
            "repeat the run"
        )
    return modes


def read_eigenfunctions(
    opened: h5py.File, path: Path, group: str = "eigenfunctions"
) -> Eigenfunctions | None:
    """The eigenfunctions in a group, or None where there is none."""
    if group not in opened:
        return None
    columns = (schema.EIGENFUNCTION_RADIUS, *schema.EIGENFUNCTIONS)
    return Eigenfunctions(**read_columns(opened, path, group, columns))
