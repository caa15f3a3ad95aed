"""Writing a whole grid store in one pass over its rows, in memory that does not grow with them."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from datetime import UTC, datetime
from pathlib import Path

import h5py
import numpy as np

from oscsolve.star.formats.files import replacing
from oscsolve.star.formats.hdf5_file import new_hdf5
from oscsolve.store import schema
from oscsolve.store.rows import MODE_COLUMNS, SECOND_COLUMNS, GridRow, period_of
from oscsolve.store.schema import Column
from oscsolve.store.write import attribute, write_eigenfunctions

#: Rows and modes gathered before they are written: large writes are fast, small ones fit memory.
_ROWS_AT_ONCE, _MODES_AT_ONCE = 1024, 1 << 16
#: Longest chunk of a column, in entries.
_CHUNK = 1 << 14
_TYPES = {"i": np.dtype(np.int64), "f": np.dtype(np.float64), "s": h5py.string_dtype()}


@dataclass(frozen=True)
class GridShape:
    """What must be known of the rows before the first of them is written.

    Attributes
    ----------
    models, modes, findings : how many there are in all
    parameters : name of a parameter to its kind, "i", "f" or "s"
    """

    models: int
    modes: int
    findings: int
    parameters: Mapping[str, str] = field(default_factory=dict)


@dataclass(frozen=True)
class GridHeader:
    """What holds for all rows.

    Attributes
    ----------
    options : options of the run, name to plain value; become root attributes
    degrees : the degrees that were asked for
    program_version : version of oscsolve that computed the rows
    verified : the rows have a second opinion
    """

    options: Mapping[str, object]
    degrees: tuple[int, ...]
    program_version: str
    verified: bool = False


def write_grid(
    path: Path, header: GridHeader, shape: GridShape, rows: Iterable[GridRow], planned: int | None
) -> None:
    """A grid store as one HDF5 file that replaces the one before it; complete or not at all.

    Parameters
    ----------
    path : file to make or replace
    header : options and degrees
    shape : totals over all `rows`
    rows : the rows, in the order of the store; read once
    planned : models asked for; equal to ``shape.models`` where the grid is finished, None while
        it is not known

    Raises
    ------
    InputError
        The disk is full, or the folder cannot be written.
    """
    with (
        replacing(path, overwrite=True) as temporary,
        new_hdf5(temporary) as (file, disk),
    ):
        _write_root(file, header, shape, planned)
        tables = _Tables(file, header, shape)
        for batch in _batches(rows):
            tables.write(batch)
            disk.check()
        tables.check_full()


def _write_root(file: h5py.File, header: GridHeader, shape: GridShape, planned: int | None) -> None:
    file.attrs["content"] = schema.GRID_CONTENT
    file.attrs["schema"] = schema.SCHEMA
    file.attrs["schema_since"] = schema.SCHEMA_SINCE
    file.attrs["program_version"] = header.program_version
    file.attrs["created"] = datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
    file.attrs["state"] = schema.FINISHED if planned == shape.models else schema.UNFINISHED
    file.attrs["planned"] = -1 if planned is None else planned
    file.attrs["rows"] = shape.models
    for name, value in header.options.items():
        file.attrs[schema.OPTION + name] = attribute(name, value)


def _batches(rows: Iterable[GridRow]) -> Iterator[list[GridRow]]:
    batch: list[GridRow] = []
    modes = 0
    for row in rows:
        batch.append(row)
        modes += len(row)
        if len(batch) == _ROWS_AT_ONCE or modes >= _MODES_AT_ONCE or row.eigenfunctions is not None:
            yield batch
            batch, modes = [], 0
    if batch:
        yield batch


class _Tables:
    """The datasets of a grid store, filled from the front."""

    def __init__(self, file: h5py.File, header: GridHeader, shape: GridShape) -> None:
        self._file, self._shape = file, shape
        self._degrees = header.degrees
        self._models = self._mode = self._finding = 0
        self._make_models()
        columns = [schema.MODEL_ROW, *schema.MODES]
        columns += SECOND_COLUMNS if header.verified else ()
        self._mode_columns = tuple(columns)
        self._make_table("modes", "mode", shape.modes, self._mode_columns)
        self._make_table("findings", "finding", shape.findings, schema.GRID_FINDINGS)

    def _make_models(self) -> None:
        group, size = self._file.create_group("models"), self._shape.models
        scale = _scale(group, "model", size)
        degree = _column(group, schema.GRID_DEGREE, (len(self._degrees),))
        degree[...] = self._degrees
        degree.make_scale("degree")
        given = [
            Column(name, kind, schema.UNITS_NOT_GIVEN, f"{name}, given with the models")
            for name, kind in self._shape.parameters.items()
        ]
        for column in (*schema.GRID_MODELS, *given):
            dataset = _column(group, column, (size,))
            dataset.dims[0].attach_scale(scale)
            if column in given:
                dataset.attrs["given"] = 1
        for column in schema.GRID_CENSUS:
            dataset = _column(group, column, (size, len(self._degrees)))
            dataset.dims[0].attach_scale(scale)
            dataset.dims[1].attach_scale(degree)

    def _make_table(self, name: str, dimension: str, size: int, columns: Sequence[Column]) -> None:
        group = self._file.create_group(name)
        scale = _scale(group, dimension, size)
        for column in columns:
            _column(group, column, (size,)).dims[0].attach_scale(scale)

    def write(self, batch: list[GridRow]) -> None:
        """Put rows behind those that are there."""
        first, last = self._models, self._models + len(batch)
        counts = np.array([len(row) for row in batch])
        model = np.arange(first, last)
        begins = self._mode + np.cumsum(counts) - counts
        group = self._file["models"]
        for column in schema.GRID_MODELS:
            values = _model_values(column, batch, begins, counts)
            group[column.name][first:last] = np.asarray(values, dtype=_memory(column.kind))
        for name, kind in self._shape.parameters.items():
            group[name][first:last] = _parameter_values(name, kind, batch)
        for column in schema.GRID_CENSUS:
            group[column.name][first:last] = self._census_values(column, batch)
        self._write_modes(batch, np.repeat(model, counts))
        self._write_findings(batch, first)
        for place, row in enumerate(batch, start=first):
            if row.eigenfunctions is not None:
                target = self._file.create_group(f"eigenfunctions/{place}")
                write_eigenfunctions(target, row.eigenfunctions)
        self._models = last

    def _write_modes(self, batch: list[GridRow], model: np.ndarray) -> None:
        group, first = self._file["modes"], self._mode
        last = first + model.size
        for column in self._mode_columns if model.size else ():
            if column is schema.MODEL_ROW:
                values = model
            else:
                values = np.concatenate([_mode_values(row, column) for row in batch])
            group[column.name][first:last] = values.astype(_memory(column.kind))
        self._mode = last

    def _write_findings(self, batch: list[GridRow], first: int) -> None:
        listed = [
            (place, about, item.severity, item.code, item.message, item.advice,
             np.nan if item.place is None else item.place,
             np.nan if item.size is None else item.size)
            for place, row in enumerate(batch, start=first)
            for about, items in (("star", row.star_findings), ("run", row.findings))
            for item in items
        ]  # fmt: skip
        group, last = self._file["findings"], self._finding + len(listed)
        for column, values in zip(
            schema.GRID_FINDINGS, zip(*listed, strict=True), strict=bool(listed)
        ):
            group[column.name][self._finding : last] = np.array(values, dtype=_memory(column.kind))
        self._finding = last

    def _census_values(self, column: Column, batch: list[GridRow]) -> np.ndarray:
        missing = np.nan if column.kind == "f" else -1
        values = np.full((len(batch), len(self._degrees)), missing, dtype=_TYPES[column.kind])
        place = {degree: at for at, degree in enumerate(self._degrees)}
        for line, row in zip(values, batch, strict=True):
            for degree, value in zip(
                row.census.degree, getattr(row.census, column.name), strict=True
            ):
                line[place[int(degree)]] = value
        return values

    def check_full(self) -> None:
        """Fail where the rows were not those that were announced."""
        written = (self._models, self._mode, self._finding)
        announced = (self._shape.models, self._shape.modes, self._shape.findings)
        if written != announced:
            raise AssertionError(f"{written} rows written, {announced} announced")


def _memory(kind: str) -> np.dtype:
    return np.dtype(object) if kind == "s" else _TYPES[kind]


def _model_values(
    column: Column, batch: list[GridRow], begins: np.ndarray, counts: np.ndarray
) -> Sequence[object] | np.ndarray:
    if column.name == "first_mode":
        return begins
    if column.name == "mode_count":
        return counts
    if column.name in ("doubts", "defects"):
        return [row.count(column.name.removesuffix("s")) for row in batch]
    return [getattr(row, column.name) for row in batch]


def _parameter_values(name: str, kind: str, batch: list[GridRow]) -> np.ndarray:
    """A row without the parameter has NaN, or an empty text."""
    values = [row.parameters.get(name) for row in batch]
    if kind == "s":
        return np.array(["" if value is None else str(value) for value in values], dtype=object)
    numbers = [np.nan if value is None else value for value in values]
    return np.array(numbers, dtype=_TYPES[kind])


def _mode_values(row: GridRow, column: Column) -> np.ndarray:
    if column not in (*MODE_COLUMNS, *SECOND_COLUMNS):
        return period_of(row.nu)
    values = getattr(row, column.name)
    return np.full(len(row), np.nan) if values is None else values


def _scale(group: h5py.Group, name: str, size: int) -> h5py.Dataset:
    first, meaning = schema.DIMENSIONS[name]
    column = Column(name, "i", "1", meaning)
    scale = _column(group, column, (size,))
    for begin in range(0, size, _MODES_AT_ONCE):
        end = min(size, begin + _MODES_AT_ONCE)
        scale[begin:end] = np.arange(first + begin, first + end)
    scale.make_scale(name)
    return scale


def _column(group: h5py.Group, column: Column, shape: tuple[int, ...]) -> h5py.Dataset:
    storage: dict[str, object] = {}
    if all(shape) and shape[0] > _CHUNK:
        storage["chunks"] = (_CHUNK, *shape[1:])
        # The last digits of a frequency are noise to a compressor; small whole numbers are not.
        if column.kind == "i":
            storage |= {"compression": "gzip", "compression_opts": 1, "shuffle": True}
    dataset = group.create_dataset(column.name, shape, dtype=_TYPES[column.kind], **storage)
    dataset.attrs["units"] = column.units
    dataset.attrs["long_name"] = column.long_name
    return dataset
