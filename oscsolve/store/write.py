"""Writing mode lists."""

from __future__ import annotations

import os
from collections.abc import Iterable, Mapping, Sequence
from datetime import UTC, datetime
from pathlib import Path

import h5py
import numpy as np

from oscsolve.errors import InputError
from oscsolve.pulsation.modeset import Eigenfunctions, ModeSet
from oscsolve.star.findings import Finding
from oscsolve.star.formats.files import replacing
from oscsolve.star.formats.hdf5 import write_structure
from oscsolve.star.formats.hdf5_file import new_hdf5
from oscsolve.store import schema
from oscsolve.store.schema import Column

#: Size of a compressed chunk of eigenfunctions: a few modes, each read in one go.
_CHUNK_BYTES = 1 << 20


def save_modes(modes: ModeSet, path: str | os.PathLike[str], *, overwrite: bool = False) -> None:
    """A mode list as one self-describing HDF5 file; it appears complete or not at all.

    Parameters
    ----------
    modes : the list, with the star, the census and, where kept, the eigenfunctions
    path : file to make; the layout is told in `oscsolve.store.schema`
    overwrite : replace an existing file

    Raises
    ------
    InputError
        The file exists and `overwrite` is false, it cannot be written, or an option of the run is
        no plain value.

    Examples
    --------
    >>> import oscsolve, os, tempfile
    >>> modes = oscsolve.solve_modes(oscsolve.polytrope(3), [0], (9, 17), unit="sigma2")
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     oscsolve.save_modes(modes, os.path.join(folder, "n3.h5"))
    ...     back = oscsolve.load_modes(os.path.join(folder, "n3.h5"))
    >>> bool((back.nu == modes.nu).all())
    True
    """
    target = Path(path)
    with replacing(target, overwrite) as temporary, new_hdf5(temporary) as (file, _):
        _write_root(file, modes)
        columns = schema.MODES + (schema.SECOND_OPINION if modes.nu_second is not None else ())
        write_columns(file.create_group("modes"), "mode", _columns_of(modes, columns), columns)
        write_columns(
            file.create_group("census"),
            "degree",
            _columns_of(modes.census, schema.CENSUS),
            schema.CENSUS,
        )
        write_structure(file.create_group("structure"), modes.star)
        write_findings(file.create_group("findings"), modes.findings)
        if modes.eigenfunctions is not None:
            write_eigenfunctions(file.create_group("eigenfunctions"), modes.eigenfunctions)


def write_columns(
    group: h5py.Group,
    dimension: str,
    values: Mapping[str, np.ndarray | Sequence[object]],
    columns: Iterable[Column],
) -> None:
    """Put columns of one length into an empty group, on a named dimension.

    Parameters
    ----------
    group : group to fill
    dimension : name of the dimension; a column of that name becomes its scale, otherwise one is
        made that counts from 0
    values : (m,) for each name in `columns`
    columns : what to write
    """
    columns = tuple(columns)
    first = _dataset(group, columns[0], values[columns[0].name])
    if dimension == columns[0].name:
        scale = first
        scale.make_scale(dimension)
    else:
        scale = make_dimension(group, dimension, first.shape[0])
        first.dims[0].attach_scale(scale)
    for column in columns[1:]:
        _dataset(group, column, values[column.name]).dims[0].attach_scale(scale)


def make_dimension(group: h5py.Group, name: str, size: int) -> h5py.Dataset:
    """A dimension scale of a group that counts its rows."""
    first, meaning = schema.DIMENSIONS[name]
    scale = _dataset(group, Column(name, "i", "1", meaning), np.arange(first, first + size))
    scale.make_scale(name)
    return scale


def write_findings(group: h5py.Group, findings: Sequence[Finding]) -> None:
    """Put findings into an empty group, one row each; None becomes NaN."""
    values: dict[str, list[object]] = {
        column.name: [getattr(finding, column.name) for finding in findings]
        for column in schema.FINDINGS
    }
    for name in ("place", "size"):
        values[name] = [np.nan if value is None else value for value in values[name]]
    write_columns(group, "finding", values, schema.FINDINGS)


def _write_root(file: h5py.File, modes: ModeSet) -> None:
    file.attrs["content"] = schema.CONTENT
    file.attrs["schema"] = schema.SCHEMA
    file.attrs["schema_since"] = schema.SCHEMA_SINCE
    file.attrs["program_version"] = modes.program_version
    file.attrs["created"] = datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
    file.attrs["model_name"] = modes.star.name
    file.attrs["model_source"] = modes.star.source
    file.attrs["model_hash"] = modes.star.source_hash
    for name, value in modes.options.items():
        file.attrs[schema.OPTION + name] = attribute(name, value)


def attribute(name: str, value: object) -> object:
    """An option as HDF5 holds it: texts, numbers, booleans, rows of them; empty for None."""
    if value is None:
        return h5py.Empty("f8")
    if isinstance(value, str | bool | int | float | np.generic):
        return value
    if isinstance(value, list | tuple | np.ndarray) and len(value) > 0:
        if all(isinstance(item, str) for item in value):
            return np.array(value, dtype=h5py.string_dtype())
        row = np.array(value)
        if row.ndim == 1 and row.dtype.kind in "bif":
            return row
    raise InputError(
        f"option {name} cannot be saved: expected a text, a number or a row of them; got {value!r}"
    )


def _columns_of(source: object, columns: Iterable[Column]) -> dict[str, np.ndarray]:
    return {column.name: getattr(source, column.name) for column in columns}


def _dataset(
    group: h5py.Group, column: Column, values: np.ndarray | Sequence[object], **storage: object
) -> h5py.Dataset:
    types = {"i": np.dtype(np.int64), "f": np.dtype(np.float64), "s": h5py.string_dtype()}
    data = np.asarray(values, dtype=object if column.kind == "s" else types[column.kind])
    dataset = group.create_dataset(column.name, data=data, dtype=types[column.kind], **storage)
    dataset.attrs["units"] = column.units
    dataset.attrs["long_name"] = column.long_name
    return dataset


def write_eigenfunctions(group: h5py.Group, rows: Eigenfunctions) -> None:
    """Put eigenfunctions of one model into an empty group, compressed."""
    modes, points = rows.xi_r.shape
    mode = make_dimension(group, "mode", modes)
    point = make_dimension(group, "point", points)
    _dataset(group, schema.EIGENFUNCTION_RADIUS, rows.radius).dims[0].attach_scale(point)
    storage: dict[str, object] = {}
    if rows.xi_r.size:
        chunk = (min(modes, max(1, _CHUNK_BYTES // (8 * points))), points)
        storage = {"chunks": chunk, "compression": "gzip", "shuffle": True}
    for column in schema.EIGENFUNCTIONS:
        dataset = _dataset(group, column, getattr(rows, column.name), **storage)
        dataset.dims[0].attach_scale(mode)
        dataset.dims[1].attach_scale(point)
