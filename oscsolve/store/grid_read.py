"""Reading a grid store: its table of models at once, the modes of its models one after another."""

from __future__ import annotations

import os
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import h5py
import numpy as np

from oscsolve.errors import InputError
from oscsolve.pulsation.modeset import Census, Eigenfunctions, ModeSet
from oscsolve.star.findings import Finding
from oscsolve.star.formats.files import checked_path, file_hash
from oscsolve.star.formats.recognise import read_model
from oscsolve.star.model import StarModel
from oscsolve.store import schema
from oscsolve.store.read import (
    check_content,
    check_schema,
    finding_of,
    read_columns,
    read_eigenfunctions,
    read_options,
)
from oscsolve.store.rows import MODE_COLUMNS, SECOND_COLUMNS, GridRow, Parameter

#: Modes read from the file in one go while iterating.
_MODES_AT_ONCE = 1 << 16
#: Options that a grid records and the mode list of one star does not.
_OF_THE_GRID = (
    "band_first", "band_second", "band_unit", "gravitational_constant", "eigenfunctions",
    "warm_start",
)  # fmt: skip


@dataclass(frozen=True, eq=False)
class Grid:
    """The table of models in a grid store; iterating gives a `GridRow` a model.

    Memory holds the table of models; their modes are read from the file in pieces, while iterating
    or on request. The file may be replaced meanwhile by a run that goes on: the rows of a `Grid`
    are looked up in the file that is there then, so load it again to see more.

    Attributes
    ----------
    path : the file
    name, source, source_hash, status, message : (n,) str, see `GridRow`
    total_mass, photospheric_radius, gravitational_constant : (n,) g, cm, cm^3 g^-1 s^-2; NaN for a
        model that could not be read
    points, first_mode, mode_count, doubts, defects : (n,) int
    band_low, band_high : (n,) uHz
    degree : (d,) int, the degrees that were asked for
    low, high, counted, listed, relabelled : (n, d) census, NaN and -1 where nothing was counted
    parameters : name of a parameter given with the models to its (n,) values
    finished : True where every model that was asked for has its row
    planned : models that were asked for; None while that is not known
    options : options of the run, name to plain value
    program_version : version of oscsolve that computed it
    """

    path: Path
    name: np.ndarray
    source: np.ndarray
    source_hash: np.ndarray
    status: np.ndarray
    message: np.ndarray
    total_mass: np.ndarray
    photospheric_radius: np.ndarray
    gravitational_constant: np.ndarray
    points: np.ndarray
    band_low: np.ndarray
    band_high: np.ndarray
    first_mode: np.ndarray
    mode_count: np.ndarray
    doubts: np.ndarray
    defects: np.ndarray
    degree: np.ndarray
    low: np.ndarray
    high: np.ndarray
    counted: np.ndarray
    listed: np.ndarray
    relabelled: np.ndarray
    parameters: Mapping[str, np.ndarray]
    finished: bool
    planned: int | None
    options: Mapping[str, object]
    program_version: str

    def __len__(self) -> int:
        return int(self.name.size)

    def __iter__(self) -> Iterator[GridRow]:
        """Every row in the order of the store, read from the file in pieces."""
        with _opened(self.path) as file:
            findings = _Findings(file, self.path)
            first = 0
            while first < len(self):
                last = self._piece(first)
                yield from self._rows(file, findings, first, last)
                first = last

    def row(self, model: int | str) -> GridRow:
        """One model, by its row or by its name or source.

        Raises
        ------
        InputError
            There is no such model, or several have that name; or the file is damaged.
        """
        place = self.find(model)
        with _opened(self.path) as file:
            return next(self._rows(file, _Findings(file, self.path), place, place + 1))

    def find(self, model: int | str) -> int:
        """The row of a model given by row, name or source.

        Raises
        ------
        InputError
            There is no such model, or several have that name.
        """
        if isinstance(model, str):
            rows = np.flatnonzero((self.name == model) | (self.source == os.path.abspath(model)))
            if rows.size == 0:
                raise InputError(f"{self.path}: no model is called {model!r}; see /models/name")
            if rows.size > 1:
                listed = ", ".join(str(row) for row in rows[:5]) + ", ..." * (rows.size > 5)
                raise InputError(
                    f"{self.path}: {rows.size} models are called {model!r}; give one of the rows "
                    f"{listed}"
                )
            return int(rows[0])
        if not 0 <= model < len(self):
            raise InputError(
                f"{self.path}: there is no row {model}; the store holds {len(self)} models, rows "
                f"from 0"
            )
        return int(model)

    def _piece(self, first: int) -> int:
        """End of the rows from `first` on that are read in one go."""
        ends = self.first_mode[first:] + self.mode_count[first:] - self.first_mode[first]
        return first + max(1, int(np.searchsorted(ends, _MODES_AT_ONCE, side="right")))

    def _rows(
        self, file: h5py.File, findings: _Findings, first: int, last: int
    ) -> Iterator[GridRow]:
        begin = int(self.first_mode[first])
        end = int(self.first_mode[last - 1] + self.mode_count[last - 1])
        columns = list(MODE_COLUMNS)
        if f"/modes/{SECOND_COLUMNS[0].name}" in file:
            columns += SECOND_COLUMNS
        modes = read_columns(
            file, self.path, "modes", [schema.MODEL_ROW, *columns], slice(begin, end)
        )
        self._check_piece(modes["model"], first, last)
        for place in range(first, last):
            part = slice(
                int(self.first_mode[place]) - begin,
                int(self.first_mode[place] + self.mode_count[place]) - begin,
            )
            yield self._row(
                place,
                {column.name: modes[column.name][part] for column in columns},
                findings.of(place),
                _eigenfunctions(file, self.path, place),
            )

    def _check_piece(self, model: np.ndarray, first: int, last: int) -> None:
        expected = np.repeat(np.arange(first, last), self.mode_count[first:last])
        if not np.array_equal(model, expected):
            raise InputError(
                f"{self.path}: /modes does not follow /models at row {first}: the store was "
                "replaced meanwhile or is damaged; load it again"
            )

    def _row(
        self,
        place: int,
        modes: Mapping[str, Any],
        findings: tuple[tuple[Finding, ...], tuple[Finding, ...]],
        eigenfunctions: Eigenfunctions | None,
    ) -> GridRow:
        about_star, about_run = findings
        counted = self.counted[place] >= 0
        census = {
            column.name: getattr(self, column.name)[place][counted] for column in schema.GRID_CENSUS
        }
        texts = ("name", "source", "source_hash", "status", "message")
        numbers = (
            "total_mass", "photospheric_radius", "gravitational_constant", "band_low", "band_high",
        )  # fmt: skip
        values: dict[str, Any] = {name: str(getattr(self, name)[place]) for name in texts}
        values |= {name: float(getattr(self, name)[place]) for name in numbers}
        return GridRow(
            **values,
            points=int(self.points[place]),
            **modes,
            census=Census(degree=self.degree[counted], **census),
            parameters=self._parameters_of(place),
            findings=about_run,
            star_findings=about_star,
            eigenfunctions=eigenfunctions,
            row=place,
        )

    def _parameters_of(self, place: int) -> dict[str, Parameter]:
        values = {}
        for name, column in self.parameters.items():
            value = column[place]
            plain = value.item() if isinstance(value, np.generic) else str(value)
            # What a row was not given is an empty text or NaN in the file.
            if plain != "" and plain == plain:
                values[name] = plain
        return values


def load_grid(path: str | os.PathLike[str]) -> Grid:
    """The models of a grid store, ready to be read one after another.

    Parameters
    ----------
    path : file that `solve_grid` or ``oscsolve grid`` wrote; it may be unfinished

    Returns
    -------
    Grid
        The table of models; iterate over it for their modes.

    Raises
    ------
    InputError
        The file is missing, is no grid store, is damaged, or was written with a newer layout.
    """
    file = Path(path)
    with _opened(file) as opened:
        columns = read_columns(opened, file, "models", schema.GRID_MODELS)
        columns |= read_columns(opened, file, "models", (schema.GRID_DEGREE, *schema.GRID_CENSUS))
        planned = int(opened.attrs.get("planned", -1))
        return Grid(
            path=file,
            **columns,
            parameters=_parameters(opened),
            finished=opened.attrs.get("state") == schema.FINISHED,
            planned=None if planned < 0 else planned,
            options=read_options(opened),
            program_version=str(opened.attrs.get("program_version", "")),
        )


def load_grid_modes(
    path: str | os.PathLike[str], model: int | str, star: StarModel | None = None
) -> ModeSet:
    """The mode list of one model of a grid store.

    A grid store keeps no structures: the star is read again from its file, which must be the one
    that was solved, or is given.

    Raises
    ------
    InputError
        There is no such model, it failed, or its file is gone or has changed.
    """
    grid = load_grid(path)
    row = grid.row(model)
    where = f"{grid.path}, row {row.row} ({row.name})"
    if row.status == "failed":
        raise InputError(f"{where}: this model failed and has no modes: {row.message}")
    star = _star_of(row, where) if star is None else star
    if star.radius.size != row.points or star.total_mass != row.total_mass:
        raise InputError(f"{where}: the star given is not the one that was solved")
    columns = {
        column.name: getattr(row, column.name) for column in (*MODE_COLUMNS, *SECOND_COLUMNS)
    }
    options = {name: value for name, value in grid.options.items() if name not in _OF_THE_GRID}
    options["band_chosen_by_program"] = grid.options.get("band_first") is None
    options |= {"band_low_uHz": row.band_low, "band_high_uHz": row.band_high}
    return ModeSet(
        **columns,
        census=row.census,
        star=star,
        eigenfunctions=row.eigenfunctions,
        options=options,
        findings=row.findings,
        program_version=grid.program_version,
    )


def _star_of(row: GridRow, where: str) -> StarModel:
    if not row.source:
        raise InputError(f"{where}: this model was made in memory; give the star itself")
    source = Path(row.source)
    if not source.is_file():
        raise InputError(
            f"{where}: the model file {source} is gone; put it back, or give the star itself"
        )
    if file_hash(source) != row.source_hash:
        raise InputError(
            f"{where}: the model file {source} has changed since it was solved; put the old one "
            "back, or solve the grid again"
        )
    star = read_model(source)
    if star.gravitational_constant != row.gravitational_constant:
        star = read_model(source, gravitational_constant=row.gravitational_constant)
    return star


class _Findings:
    """The findings of a store, row by row; they are few beside the modes."""

    def __init__(self, file: h5py.File, path: Path) -> None:
        self._columns = read_columns(file, path, "findings", schema.GRID_FINDINGS)
        self._path = path

    def of(self, place: int) -> tuple[tuple[Finding, ...], tuple[Finding, ...]]:
        """Findings about the star and about the run of one model."""
        model = self._columns["model"]
        first, last = np.searchsorted(model, [place, place + 1])
        found: dict[str, list[Finding]] = {"star": [], "run": []}
        for at in range(int(first), int(last)):
            values = [self._columns[column.name][at] for column in schema.FINDINGS]
            found.setdefault(self._columns["about"][at], []).append(finding_of(values, self._path))
        return tuple(found["star"]), tuple(found["run"])


def _parameters(opened: h5py.File) -> dict[str, np.ndarray]:
    given = {
        name: dataset
        for name, dataset in opened["models"].items()
        if dataset.attrs.get("given", 0) == 1
    }
    return {
        name: dataset.asstr()[()] if h5py.check_string_dtype(dataset.dtype) else dataset[()]
        for name, dataset in given.items()
    }


def _eigenfunctions(file: h5py.File, path: Path, place: int) -> Eigenfunctions | None:
    group = f"eigenfunctions/{place}"
    return read_eigenfunctions(file, path, group) if group in file else None


@contextmanager
def _opened(path: Path) -> Iterator[h5py.File]:
    """A grid store, open for reading; whatever is wrong with it is one `InputError`."""
    file = checked_path(path)
    if not h5py.is_hdf5(file):
        raise InputError(
            f"{file}: not an HDF5 file; expected a grid store written by oscsolve "
            "(oscsolve grid MODEL... --store FILE.h5)"
        )
    try:
        with h5py.File(file, "r") as opened:
            check_content(opened, file, schema.GRID_CONTENT)
            check_schema(opened, file)
            yield opened
    except InputError:
        raise
    except (OSError, RuntimeError, KeyError) as error:
        raise InputError(
            f"{file}: this grid store is damaged or cut short; copy it again, or repeat the run"
        ) from error
