"""The journal of a grid: rows as they come, safe from a kill at any moment.

HDF5 keeps its own tables half in memory while a file is open: a writer killed at the wrong moment
leaves a file that cannot be opened. So rows go to a journal first, one append each, and the HDF5
file is made anew from it now and then under a temporary name, then renamed. At every moment the
store is the file of the last time, whole, and says whether it is finished; what came since is in
the journal, from which the next run goes on.
"""

from __future__ import annotations

import contextlib
import json
import os
import re
import zlib
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import asdict, dataclass, fields
from pathlib import Path
from typing import Any

import numpy as np

from oscsolve.errors import InputError
from oscsolve.pulsation.modeset import Census, Eigenfunctions
from oscsolve.star.findings import Finding
from oscsolve.star.formats.files import replacing
from oscsolve.store.grid_read import Grid, load_grid
from oscsolve.store.grid_write import GridHeader, GridShape, write_grid
from oscsolve.store.records import pack_record, read_content, scan, unpack_record
from oscsolve.store.rows import MODE_COLUMNS, SECOND_COLUMNS, GridRow, Parameter, promoted

#: Raised by one whenever a program that reads the old layout would misread the new one.
_LAYOUT = 1
_SCALARS = (
    "name", "source", "source_hash", "status", "message", "total_mass", "photospheric_radius",
    "gravitational_constant", "points", "band_low", "band_high",
)  # fmt: skip
_COLUMNS = tuple(column.name for column in (*MODE_COLUMNS, *SECOND_COLUMNS))

#: Size and time of change (ns) of a model file when it was read.
Stamp = tuple[int, int]


@dataclass(frozen=True, slots=True)
class Entry:
    """What is kept in memory of a row that is in the journal."""

    offset: int
    modes: int
    findings: int
    status: str
    seconds: float
    stamp: Stamp | None
    source_hash: str
    label_mark: int
    parameter_kinds: tuple[tuple[str, str], ...]


def journal_path(store: Path) -> Path:
    """The journal of a store, beside it."""
    return store.with_name(f"{store.name}.journal")


def label_mark(name: str, parameters: Mapping[str, Parameter]) -> int:
    """A short mark that tells whether the name or a parameter of a model has changed."""
    return zlib.crc32(json.dumps([name, dict(parameters)], sort_keys=True).encode())


class Journal:
    """Rows of a grid by their key, on disk as soon as they are added.

    Use as a context manager, under the lock of `only_writer`.

    Attributes
    ----------
    entries : key of a row to its `Entry`, in the order in which they came
    notes : what was noticed while opening
    """

    def __init__(self, store: Path, header: GridHeader) -> None:
        self.store, self.header = store, header
        self.path = journal_path(store)
        self.entries: dict[str, Entry] = {}
        self.notes: list[str] = []
        self._kinds: dict[tuple[tuple[str, str], ...], tuple[tuple[str, str], ...]] = {}
        self._handle = -1
        self._end = 0

    def __enter__(self) -> Journal:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def close(self) -> None:
        """Close the file; a second time does nothing."""
        if self._handle >= 0:
            os.close(self._handle)
            self._handle = -1

    def add(
        self, key: str, row: GridRow, *, stamp: Stamp | None = None, seconds: float = 0.0
    ) -> None:
        """Append a row; it replaces one of the same key.

        Raises
        ------
        InputError
            The disk is full or failing. Rows added before are safe.
        """
        record = _pack_row(key, row, stamp, seconds)
        offset = self._append(record)
        self.entries[key] = self._entry(offset, row, stamp, seconds)

    def row(self, key: str) -> GridRow:
        """A row read back.

        Raises
        ------
        InputError
            The disk does not give back what was written.
        """
        with self.path.open("rb") as stream:
            return self._read(stream, key)

    def rows(self, keys: list[str]) -> Iterator[GridRow]:
        """Rows of several keys, one after another."""
        with self.path.open("rb") as stream:
            for key in keys:
                yield self._read(stream, key)

    def sync(self) -> None:
        """Wait until everything added is on the disk itself, safe from a power cut."""
        try:
            os.fsync(self._handle)
        except OSError as error:
            raise self._failed(error) from error

    def publish(self, order: Iterable[str], planned: int | None, *, eigenfunctions: bool) -> None:
        """Make the HDF5 store anew from the rows.

        Parameters
        ----------
        order : keys in the order of the store; those without a row yet are left out, rows of other
            keys follow
        planned : models asked for, or None while it is not known
        eigenfunctions : write them too; they are large, and only the last store needs them

        Raises
        ------
        InputError
            The disk is full or the folder cannot be written. The journal still has every row.
        """
        self.sync()
        listed = [key for key in order if key in self.entries]
        known = set(listed)
        listed += [key for key in self.entries if key not in known]
        total = None if planned is None else planned + len(listed) - len(known)
        rows = self.rows(listed)
        if not eigenfunctions:
            rows = (_without_eigenfunctions(row) for row in rows)
        write_grid(self.store, self.header, self._shape(listed), rows, total)

    def remove(self) -> None:
        """Remove the journal, once the store holds everything."""
        self.close()
        self.path.unlink(missing_ok=True)

    def _shape(self, keys: list[str]) -> GridShape:
        entries = [self.entries[key] for key in keys]
        kinds: dict[str, str] = {}
        seen: dict[str, int] = {}
        for entry in entries:
            for name, kind in entry.parameter_kinds:
                kinds[name] = max(kinds.get(name, "i"), kind, key="ifs".index)
                seen[name] = seen.get(name, 0) + 1
        for name, count in seen.items():
            # Whole numbers have no NaN for the rows that lack them.
            if kinds[name] == "i" and count < len(entries):
                kinds[name] = "f"
        return GridShape(
            len(entries),
            sum(entry.modes for entry in entries),
            sum(entry.findings for entry in entries),
            kinds,
        )

    def _read(self, stream: Any, key: str) -> GridRow:
        content = read_content(stream, self.entries[key].offset)
        if content is None:
            raise InputError(
                f"{self.path}: the row of {key} cannot be read back; check the disk, then run again"
            )
        return _unpack_row(*unpack_record(content))

    def _append(self, record: bytes) -> int:
        offset, written = self._end, 0
        try:
            while written < len(record):
                written += os.write(self._handle, record[written:])
        except OSError as error:
            # Half a record would be stepped over by the next run; away with it all the same.
            with contextlib.suppress(OSError):
                os.ftruncate(self._handle, offset)
            raise self._failed(error) from error
        self._end = offset + written
        return offset

    def _failed(self, error: OSError) -> InputError:
        return InputError(
            f"{self.path}: cannot be written ({error.strerror or error}); the {len(self.entries)} "
            "rows before are safe. Make room, then run the same again to go on"
        )

    def _entry(self, offset: int, row: GridRow, stamp: Stamp | None, seconds: float) -> Entry:
        kinds = tuple(promoted({}, row.parameters).items())
        return Entry(
            offset,
            len(row),
            len(row.findings) + len(row.star_findings),
            row.status,
            seconds,
            stamp,
            row.source_hash,
            label_mark(row.name, row.parameters),
            self._kinds.setdefault(kinds, kinds),
        )

    def load(self) -> None:
        """Open the journal on disk, take in its rows and cut off a record that was not finished."""
        self._open(self._take_in())

    def _take_in(self) -> int:
        """Read every sound row of the journal; where the last of them ends."""
        end, gaps, first = 0, 0, True
        with self.path.open("rb") as stream:
            for begin, after, content in scan(stream):
                entry, arrays = unpack_record(content)
                if first:
                    self._check_head(entry, begin)
                    first = False
                else:
                    gaps += begin != end
                    self._take(begin, entry, arrays)
                end = after
            size = stream.seek(0, os.SEEK_END)
        if first:
            raise InputError(
                f"{self.path}: this is no journal of oscsolve, or its beginning is damaged; move "
                "it away, or give --overwrite to begin anew"
            )
        if gaps:
            self.notes.append(
                f"{self.path}: {gaps} damaged place(s); the rows there are computed again"
            )
        if size > end:
            self.notes.append(f"{self.path}: the last row was not finished and is computed again")
        return end

    def look(self) -> None:
        """Take in the rows of a journal or a store without changing anything on disk."""
        if self.path.exists():
            self._take_in()
        elif self.store.exists():
            grid = load_grid(self.store)
            check_same_run(self.store, grid.options, grid.program_version, self.header)
            for row in grid:
                self.entries[row_key(row)] = self._entry(0, row, None, 0.0)

    def begin(self) -> None:
        """Make an empty journal."""
        with replacing(self.path, overwrite=True) as temporary:
            temporary.write_bytes(pack_record(_head(self.header), {}))
        self._open(self.path.stat().st_size)

    def take_over(self, grid: Grid) -> None:
        """Make a journal from a store that has none."""
        with replacing(self.path, overwrite=True) as temporary, temporary.open("wb") as stream:
            stream.write(pack_record(_head(self.header), {}))
            for row in grid:
                offset = stream.tell()
                key = row_key(row)
                stream.write(_pack_row(key, row, None, 0.0))
                self.entries[key] = self._entry(offset, row, None, 0.0)
        self._open(self.path.stat().st_size)

    def _open(self, end: int) -> None:
        self._handle = os.open(self.path, os.O_RDWR | os.O_APPEND | getattr(os, "O_BINARY", 0))
        os.ftruncate(self._handle, end)
        self._end = end

    def _check_head(self, entry: dict[str, Any], begin: int) -> None:
        if entry.get("kind") != "run" or begin != 0:
            raise InputError(
                f"{self.path}: the beginning of this journal is damaged; move it away, or give "
                "--overwrite to begin anew"
            )
        if entry.get("layout") != _LAYOUT:
            raise InputError(
                f"{self.path}: this journal was written by another version of oscsolve "
                f"({entry.get('program_version')}); finish the run with that one, or give "
                "--overwrite to begin anew"
            )
        check_same_run(self.store, entry["options"], str(entry["program_version"]), self.header)

    def _take(self, offset: int, entry: dict[str, Any], arrays: dict[str, np.ndarray]) -> None:
        row = _unpack_row(entry, arrays)
        stamp = None if entry["stamp"] is None else (entry["stamp"][0], entry["stamp"][1])
        self.entries[entry["key"]] = self._entry(offset, row, stamp, entry["seconds"])


def open_journal(store: Path, header: GridHeader, *, overwrite: bool) -> Journal:
    """The journal of a store: the one that is there, one made from the store, or a new one.

    Call under the lock of `only_writer`.

    Parameters
    ----------
    store : the HDF5 file
    header : options of this run
    overwrite : begin anew, whatever is there

    Raises
    ------
    InputError
        The store was begun with other options or another version, or is no grid store.
    """
    journal = Journal(store, header)
    _sweep(store)
    if overwrite:
        journal.begin()
    elif journal.path.exists():
        journal.load()
    elif store.exists():
        grid = load_grid(store)
        check_same_run(store, grid.options, grid.program_version, header)
        journal.take_over(grid)
    else:
        journal.begin()
    return journal


def _sweep(store: Path) -> None:
    """Remove what a killed writer of this store left under a temporary name, see `replacing`."""
    ours = re.compile(rf"\.{re.escape(store.name)}(\.journal)?\.[a-z0-9_]{{8}}\.tmp")
    with contextlib.suppress(OSError):
        for entry in list(store.parent.iterdir()):
            if ours.fullmatch(entry.name):
                entry.unlink()


def check_same_run(
    store: Path, options: Mapping[str, object], version: str, header: GridHeader
) -> None:
    """Refuse to go on with a store that was begun in another way.

    Raises
    ------
    InputError
        An option or the version of the program differs.
    """
    advice = "give the same options to go on, another store, or --overwrite to begin anew"
    wanted = json.loads(json.dumps(dict(header.options)))
    different = [
        f"{name} {_shown(options.get(name))} (now {_shown(wanted.get(name))})"
        for name in {**options, **wanted}
        if options.get(name) != wanted.get(name)
    ]
    if different:
        raise InputError(f"{store}: this store was begun with {', '.join(different)}; {advice}")
    if version != header.program_version:
        raise InputError(
            f"{store}: this store was begun with oscsolve {version}, this is "
            f"{header.program_version}; rows of two versions do not mix. Use that version to go "
            "on, another store, or --overwrite to begin anew"
        )


def _shown(value: object) -> str:
    return "none" if value is None else str(value)


def row_key(row: GridRow) -> str:
    """What a row is recognised by when a run goes on: its file, or the content of its star."""
    return row.source or f"{row.name}\n{row.source_hash}"


def _head(header: GridHeader) -> dict[str, Any]:
    return {
        "kind": "run",
        "layout": _LAYOUT,
        "program_version": header.program_version,
        "options": dict(header.options),
        "degrees": list(header.degrees),
    }


def _pack_row(key: str, row: GridRow, stamp: Stamp | None, seconds: float) -> bytes:
    entry = {
        "kind": "row",
        "key": key,
        "stamp": stamp,
        "seconds": seconds,
        "row": {name: getattr(row, name) for name in _SCALARS},
        "parameters": dict(row.parameters),
        "findings": [asdict(found) for found in row.findings],
        "star_findings": [asdict(found) for found in row.star_findings],
    }
    arrays = {name: getattr(row, name) for name in _COLUMNS if getattr(row, name) is not None}
    arrays |= {f"census/{item.name}": getattr(row.census, item.name) for item in fields(Census)}
    if row.eigenfunctions is not None:
        arrays |= {
            f"eigenfunctions/{item.name}": getattr(row.eigenfunctions, item.name)
            for item in fields(Eigenfunctions)
        }
    return pack_record(entry, arrays)


def _unpack_row(entry: dict[str, Any], arrays: dict[str, np.ndarray]) -> GridRow:
    def part(name: str) -> dict[str, Any]:
        return {
            key.partition("/")[2]: array
            for key, array in arrays.items()
            if key.startswith(f"{name}/")
        }

    rows = part("eigenfunctions")
    columns: dict[str, Any] = {name: arrays[name] for name in _COLUMNS if name in arrays}
    return GridRow(
        **entry["row"],
        **columns,
        census=Census(**part("census")),
        parameters=entry["parameters"],
        findings=tuple(Finding(**found) for found in entry["findings"]),
        star_findings=tuple(Finding(**found) for found in entry["star_findings"]),
        eigenfunctions=Eigenfunctions(**rows) if rows else None,
    )


def _without_eigenfunctions(row: GridRow) -> GridRow:
    if row.eigenfunctions is None:
        return row
    return GridRow(
        **{
            name: getattr(row, name)
            for name in GridRow.__dataclass_fields__
            if name != "eigenfunctions"
        }
    )
