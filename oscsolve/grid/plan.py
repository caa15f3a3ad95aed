"""What a grid is to run: models, their names and the parameters given with them, in order."""

from __future__ import annotations

import csv
import glob
import hashlib
import os
import re
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, fields
from pathlib import Path

import numpy as np

from oscsolve.errors import InputError
from oscsolve.star.formats.files import read_bytes
from oscsolve.star.model import StarModel
from oscsolve.store.rows import Parameter, check_parameter_name

#: Column of a table of parameters that says which model a line belongs to.
MODEL_COLUMN = "model"
_DIGITS = re.compile(r"(\d+)")
_WHOLE = re.compile(r"[+-]?\d{1,18}")
_BLANKS = " \t"


@dataclass(frozen=True)
class GridModel:
    """One model of a grid.

    Attributes
    ----------
    model : file to read, or the star itself
    name : what to call it; empty: the name of the file without its ending, or that of the star
    parameters : numbers or texts to be kept with the row, name to value
    """

    model: str | os.PathLike[str] | StarModel
    name: str = ""
    parameters: Mapping[str, Parameter] = field(default_factory=dict)


@dataclass(frozen=True)
class Planned:
    """One model, ready to be sent to a worker.

    Attributes
    ----------
    key : what its row is recognised by in the store, see `oscsolve.store.journal.row_key`
    name, source : label, and absolute path of the file (empty for a star made in memory)
    star : the star, where it was given itself
    star_hash : sha256 of its arrays and scales
    parameters : name to value
    """

    key: str
    name: str
    source: str
    star: StarModel | None
    star_hash: str
    parameters: Mapping[str, Parameter]


def plan_models(
    models: Iterable[str | os.PathLike[str] | StarModel | GridModel],
) -> Iterator[Planned]:
    """Models as they are sent to workers, one at a time.

    Raises
    ------
    InputError
        An item is neither a file nor a star, or a parameter has a name that cannot be kept.
    """
    for place, item in enumerate(models):
        if not isinstance(item, GridModel):
            item = GridModel(item)
        parameters = {
            name: _plain(value, f"model {place + 1}, parameter {name}")
            for name, value in item.parameters.items()
        }
        for name in parameters:
            check_parameter_name(name, f"model {place + 1}")
        if isinstance(item.model, StarModel):
            star, digest = item.model, star_hash(item.model)
            name = item.name or star.name
            yield Planned(f"{name}\n{digest}", name, "", star, digest, parameters)
        elif isinstance(item.model, str | os.PathLike):
            source = os.path.abspath(item.model)
            yield Planned(source, item.name or Path(source).stem, source, None, "", parameters)
        else:
            raise InputError(
                f"model {place + 1}: expected a file name, a StarModel or a GridModel; got "
                f"{type(item.model).__name__}"
            )


def _plain(value: object, where: str) -> Parameter:
    if isinstance(value, np.generic):
        value = value.item()
    if isinstance(value, bool) or not isinstance(value, int | float | str):
        raise InputError(f"{where}: expected a number or a text; got {value!r}")
    return value


def star_hash(star: StarModel) -> str:
    """sha256 of everything about a star that its modes depend on."""
    digest = hashlib.sha256()
    for item in fields(StarModel):
        value = getattr(star, item.name)
        if isinstance(value, np.ndarray):
            digest.update(item.name.encode() + value.tobytes())
        elif isinstance(value, float):
            digest.update(f"{item.name}={value!r}".encode())
    return digest.hexdigest()


def natural_order(path: str) -> list[tuple[int, str | int]]:
    """Sort key of a path: numbers in names by value, so that neighbours of a track stay together.

    Examples
    --------
    >>> sorted(["m10.fgong", "m9.fgong"], key=natural_order)
    ['m9.fgong', 'm10.fgong']
    """
    parts = _DIGITS.split(path)
    return [(0, int(part)) if part.isdigit() else (1, part) for part in parts]


def find_models(arguments: Sequence[str], *, skip: Iterable[Path] = ()) -> list[str]:
    """Model files that were named on a command line, each once, absolute.

    Parameters
    ----------
    arguments : files; folders, of which every file that is not hidden is meant; patterns such as
        ``track-*/*.fgong``; ``@list``, a text file with one of these a line, ``#`` for comments,
        paths relative to the list
    skip : files that may lie in one of the folders and are no models: the store, the table

    Returns
    -------
    list of str
        Files in the order of the arguments; those of a folder or pattern in natural order.

    Raises
    ------
    InputError
        An argument names nothing, or a list cannot be read.
    """
    found: dict[str, None] = {}
    other = {os.path.abspath(path) for path in skip}
    other |= {os.path.abspath(argument[1:]) for argument in arguments if argument.startswith("@")}
    for argument in arguments:
        for path in _expand(argument, "", ()):
            if path not in other:
                found[path] = None
    if not found:
        raise InputError(f"no model file in {', '.join(arguments)}; name files, folders or lists")
    return list(found)


def _expand(argument: str, folder: str, lists: tuple[str, ...]) -> Iterator[str]:
    if argument.startswith("@") and not os.path.exists(os.path.join(folder, argument)):
        yield from _listed(os.path.join(folder, argument[1:]), lists)
        return
    path = os.path.abspath(os.path.join(folder, os.path.expanduser(argument)))
    if os.path.isdir(path):
        inside = [entry for entry in Path(path).iterdir() if not entry.name.startswith(".")]
        files = [str(entry) for entry in inside if entry.is_file()]
        if not files:
            raise InputError(
                f"{path}: this folder holds no files; name the folders that do, or a pattern such "
                "as 'folder/*/*.fgong'"
            )
        yield from sorted(files, key=natural_order)
    elif os.path.exists(path) or not glob.has_magic(path):
        # A file that is missing is a failed row of the grid only where a list names it.
        if not lists and not os.path.exists(path):
            raise InputError(f"{argument}: no such file or folder; check the name")
        yield path
    else:
        files = [name for name in glob.glob(path, recursive=True) if os.path.isfile(name)]
        if not files:
            raise InputError(f"{argument}: no file fits this pattern; check it")
        yield from sorted(files, key=natural_order)


def _listed(name: str, lists: tuple[str, ...]) -> Iterator[str]:
    path = os.path.abspath(os.path.expanduser(name))
    if path in lists:
        raise InputError(f"{path}: this list names itself; take that line out")
    if not os.path.isfile(path):
        raise InputError(f"@{name}: there is no list {path}; give a text file, one model a line")
    lines = _text(Path(path)).splitlines()
    for number, line in enumerate(lines, start=1):
        entry = line.strip(_BLANKS)
        if not entry or entry.startswith("#"):
            continue
        try:
            yield from _expand(entry, os.path.dirname(path), (*lists, path))
        except InputError as error:
            raise InputError(f"{path}, line {number}: {error}") from error


def _text(path: Path) -> str:
    try:
        return read_bytes(path).decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise InputError(f"{path}: this is no text in UTF-8; expected one") from error


@dataclass(frozen=True)
class ParameterTable:
    """Parameters of the models of a grid, as a table beside their list gives them.

    Attributes
    ----------
    of : absolute path of a model to its parameters
    strangers : entries of the column ``model`` that are no model of this grid
    """

    of: Mapping[str, Mapping[str, Parameter]]
    strangers: tuple[str, ...]


def read_parameters(path: Path, files: Sequence[str]) -> ParameterTable:
    """Parameters of models from a table beside their list.

    Parameters
    ----------
    path : CSV with one line of headings, of which one is ``model``; lines that start with ``#``
        are comments. An entry of that column is a path, relative to the table or absolute, or the
        name of a file, with or without its ending, that only one model has. A column in which
        every entry is a whole number, or a number, is one; others are texts; empty entries are
        left out.
    files : absolute paths of the models

    Raises
    ------
    InputError
        The table cannot be read, lacks the column, names a model twice, or fits no model.
    """
    (first, names), *rows = _table_rows(path)
    names = _headings(path, first, names)
    place = names.index(MODEL_COLUMN)
    finder = _Finder(path, files)
    cells_of: dict[str, list[str]] = {}
    strangers = []
    for number, cells in rows:
        if len(cells) != len(names):
            raise InputError(
                f"{path}, line {number}: expected {len(names)} entries as in the headings; got "
                f"{len(cells)}"
            )
        file = finder.find(cells[place], number)
        if file is None:
            strangers.append(cells[place])
        elif file in cells_of:
            raise InputError(f"{path}, line {number}: the model {file} has a line already")
        else:
            cells_of[file] = cells
    if not cells_of:
        raise InputError(
            f"{path}: no line fits a model; the column 'model' must hold their file names"
        )
    of: dict[str, dict[str, Parameter]] = {file: {} for file in cells_of}
    for at, name in enumerate(names):
        if at != place:
            column = _column([cells[at] for cells in cells_of.values()])
            for file, value in zip(cells_of, column, strict=True):
                if value is not None:
                    of[file][name] = value
    return ParameterTable(of, tuple(strangers))


def _table_rows(path: Path) -> list[tuple[int, list[str]]]:
    """Lines of a table that are no comments: number in the file, and entries."""
    lines = [
        (number, line)
        for number, line in enumerate(_text(path).splitlines(), start=1)
        if line.strip() and not line.lstrip().startswith("#")
    ]
    reader = csv.reader(line for _, line in lines)
    try:
        rows = [
            (lines[reader.line_num - 1][0], [cell.strip() for cell in cells]) for cells in reader
        ]
    except csv.Error as error:
        raise InputError(f"{path}: this is no CSV table ({error}); expected one") from error
    if not rows:
        raise InputError(f"{path}: the table is empty; expected a line of headings and lines below")
    return rows


def _headings(path: Path, number: int, names: list[str]) -> list[str]:
    where = f"{path}, line {number}"
    if MODEL_COLUMN not in names:
        raise InputError(
            f"{where}: expected headings, one of them 'model' (file names); got {', '.join(names)}"
        )
    for name in names:
        if names.count(name) > 1:
            raise InputError(f"{where}: the heading {name!r} stands there twice; rename one")
        if name != MODEL_COLUMN:
            check_parameter_name(name, where)
    return names


class _Finder:
    """Looks up the file that an entry of the column ``model`` means."""

    def __init__(self, table: Path, files: Sequence[str]) -> None:
        self._table = table
        self._files = set(files)
        self._names: dict[str, list[str]] = {}
        for file in files:
            for name in {os.path.basename(file), Path(file).stem}:
                self._names.setdefault(name, []).append(file)

    def find(self, entry: str, number: int) -> str | None:
        """The file, or None for a model that is not in this grid."""
        path = os.path.abspath(os.path.join(self._table.absolute().parent, entry))
        if path in self._files:
            return path
        known = self._names.get(entry, [])
        if len(known) > 1:
            raise InputError(
                f"{self._table}, line {number}: {len(known)} models are called {entry!r}; give "
                f"the path of one, such as {known[0]}"
            )
        return known[0] if known else None


def _column(cells: list[str]) -> list[Parameter | None]:
    filled = [cell for cell in cells if cell]
    if filled and all(_WHOLE.fullmatch(cell) for cell in filled):
        return [int(cell) if cell else None for cell in cells]
    try:
        return [float(cell) if cell else None for cell in cells]
    except ValueError:
        return [cell or None for cell in cells]
