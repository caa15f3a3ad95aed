"""Observed frequencies of one star."""

from __future__ import annotations

import os
from dataclasses import dataclass

import numpy as np

from oscsolve.errors import InputError
from oscsolve.seismology.csv_table import read_csv_table
from oscsolve.seismology.frozen import freeze_arrays
from oscsolve.star.formats.files import checked_path

_NEEDED = ("degree", "nu", "nu_error")


@dataclass(frozen=True, eq=False)
class ObservedModes:
    """Observed modes of one star.

    Attributes
    ----------
    degree : (k,) int, spherical degree
    nu, nu_error : (k,) uHz, frequency and its standard error
    order : (k,) int, radial order as published, or None where the list has none
    name : where the list came from

    Raises
    ------
    InputError
        A degree or order is out of range, a frequency or an error is not above zero, or a mode
        comes twice; the message names the row, counted from 1.
    """

    degree: np.ndarray
    nu: np.ndarray
    nu_error: np.ndarray
    order: np.ndarray | None = None
    name: str = "the observed list"

    def __post_init__(self) -> None:
        freeze_arrays(self)
        columns = [self.degree, self.nu_error] + ([] if self.order is None else [self.order])
        if self.nu.ndim != 1 or any(np.shape(column) != self.nu.shape for column in columns):
            raise InputError("degree, nu, nu_error and order must hold one number a mode")
        if self.nu.size == 0:
            raise InputError("an observed list needs at least one mode")
        self._refuse(self.degree < 0, "degree must be 0 or above; got {:g}", self.degree)
        for values, what in ((self.nu, "nu"), (self.nu_error, "nu_error")):
            self._refuse(~(values > 0.0), what + " must be above zero; got {:g}", values)
            self._refuse(~np.isfinite(values), what + " must be finite; got {:g}", values)
        self._refuse_repeated(self.nu, "nu = {:g}")
        if self.order is not None:
            self._refuse_repeated(self.order, "n = {:g}")

    def __len__(self) -> int:
        return int(self.nu.size)

    def _refuse(self, wrong: np.ndarray, text: str, values: np.ndarray) -> None:
        if np.any(wrong):
            row = int(np.argmax(wrong))
            raise InputError(f"{self.name}, row {row + 1}: {text.format(values[row])}")

    def _refuse_repeated(self, values: np.ndarray, text: str) -> None:
        seen: dict[tuple[int, float], int] = {}
        for row, key in enumerate(zip(self.degree.tolist(), values.tolist(), strict=True)):
            if key in seen:
                raise InputError(
                    f"{self.name}: l = {key[0]}, {text.format(key[1])} is in rows "
                    f"{seen[key] + 1} and {row + 1}; each mode comes once"
                )
            seen[key] = row


def read_observed(path: str | os.PathLike[str]) -> ObservedModes:
    """Observed modes from a CSV table.

    Parameters
    ----------
    path : file with the columns degree, nu and nu_error (uHz) and, where known, order; lines that
        start with # are comments, other columns are left alone

    Raises
    ------
    InputError
        The file cannot be read, a column is missing, or a value cannot be used; the message says
        where.
    """
    table = read_csv_table(checked_path(path))
    missing = [name for name in _NEEDED if name not in table.names]
    if missing:
        raise InputError(
            f"{table.file}: column {missing[0]!r} is missing; expected degree, nu, nu_error (uHz) "
            f"and, where known, order; got {','.join(table.names)!r:.80}"
        )
    nu, error = table.numbers(("nu", "nu_error")).T
    order = table.whole_numbers("order") if "order" in table.names else None
    return ObservedModes(table.whole_numbers("degree"), nu, error, order, str(table.file))
