"""CSV tables that users hand in: comments behind #, a line of names, lines of numbers."""

from __future__ import annotations

import csv
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from oscsolve.errors import InputError
from oscsolve.star.formats.files import unreadable

#: Larger files are no table of modes or of a profile that a person hands in.
_MOST_BYTES = 100_000_000


@dataclass(frozen=True)
class CsvTable:
    """A table as texts.

    Attributes
    ----------
    file : where it came from
    names : of the columns
    rows : cells as texts, each row as long as `names`
    lines : number of the line each row stands in
    """

    file: Path
    names: Sequence[str]
    rows: Sequence[Sequence[str]]
    lines: Sequence[int]

    def one_of(self, wanted: Sequence[str]) -> str:
        """The one name among `wanted` that the table has."""
        found = [name for name in wanted if name in self.names]
        if len(found) != 1:
            what = "more than one of them" if found else "none of them"
            raise InputError(
                f"{self.file}: expected one column of {', '.join(wanted)}; got {what} in "
                f"{','.join(self.names)!r:.80}"
            )
        return found[0]

    def numbers(self, wanted: Sequence[str]) -> np.ndarray:
        """(rows, wanted) finite numbers."""
        values = np.empty((len(self.rows), len(wanted)))
        for place, (row, line) in enumerate(zip(self.rows, self.lines, strict=True)):
            for column, name in enumerate(wanted):
                text = row[list(self.names).index(name)]
                try:
                    values[place, column] = float(text)
                except ValueError:
                    values[place, column] = np.nan
                if not np.isfinite(values[place, column]):
                    raise InputError(
                        f"{self.file}, line {line}: {name} is {text!r:.40}, expected a number; "
                        "repair the line"
                    )
        return values

    def whole_numbers(self, name: str) -> np.ndarray:
        """(rows,) int64."""
        values = self.numbers((name,))[:, 0]
        broken = np.flatnonzero((values != np.rint(values)) | (np.abs(values) > 1e9))
        if broken.size:
            raise InputError(
                f"{self.file}, line {self.lines[broken[0]]}: {name} must be a whole number; got "
                f"{values[broken[0]]:g}"
            )
        return values.astype(np.int64)


def read_csv_table(file: Path) -> CsvTable:
    """Names and rows of a CSV file.

    Raises
    ------
    InputError
        The file cannot be read, is no text, is too large, holds no table, or a row has another
        number of fields than the heading.
    """
    try:
        if file.stat().st_size > _MOST_BYTES:
            raise InputError(f"{file}: larger than {_MOST_BYTES // 10**6} MB; expected a CSV table")
        text = file.read_text(encoding="utf-8-sig")
    except OSError as error:
        raise unreadable(file, error) from error
    except UnicodeDecodeError as error:
        raise InputError(f"{file}: not a text file; expected a CSV table") from error
    kept = [
        (number, line)
        for number, line in enumerate(text.splitlines(), start=1)
        if line.strip() and not line.lstrip().startswith("#")
    ]
    if len(kept) < 2:
        raise InputError(f"{file}: holds no table; expected a line of names and lines of numbers")
    table = [_cells(file, number, line) for number, line in kept]
    for row, (number, _) in zip(table[1:], kept[1:], strict=True):
        if len(row) != len(table[0]):
            raise InputError(
                f"{file}, line {number}: {len(row)} fields where the heading has "
                f"{len(table[0])}; repair the line"
            )
    return CsvTable(file, table[0], table[1:], [number for number, _ in kept[1:]])


def _cells(file: Path, number: int, line: str) -> list[str]:
    try:
        return [cell.strip() for cell in next(csv.reader([line]))]
    except csv.Error as error:
        raise InputError(f"{file}, line {number}: no line of a CSV table ({error})") from error
