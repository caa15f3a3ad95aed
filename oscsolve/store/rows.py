"""What a grid store keeps of one model: the light table that workers send and readers get."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Any

import numpy as np

from oscsolve.errors import InputError
from oscsolve.pulsation.modeset import Census, Eigenfunctions, ModeSet
from oscsolve.star.findings import Finding
from oscsolve.star.model import StarModel
from oscsolve.store import schema
from oscsolve.units import dynamical_frequency

#: A value of a parameter that came with a model.
Parameter = float | int | str

_TYPES = {"i": np.dtype(np.int64), "f": np.dtype(np.float64), "s": np.dtype("<U6")}
_DERIVED = ("period",)
#: Columns of modes that a row holds, and those that it may hold.
MODE_COLUMNS = tuple(column for column in schema.MODES if column.name not in _DERIVED)
SECOND_COLUMNS = schema.SECOND_OPINION


def _no_integers() -> np.ndarray:
    return np.zeros(0, np.int64)


def _no_numbers() -> np.ndarray:
    return np.zeros(0)


def _no_texts() -> np.ndarray:
    return np.zeros(0, "<U6")


def empty_census() -> Census:
    """The census of a model of which nothing was counted."""
    return Census(*(np.zeros(0) for _ in schema.CENSUS))


@dataclass(frozen=True, eq=False)
class GridRow:
    """One model of a grid: what became of it, its scales, its modes and its census.

    The attributes of modes are those of `ModeSet`; the structure is not held.

    Attributes
    ----------
    name, source, source_hash : label of the model, file it was read from (absolute path, empty for
        one made in memory), sha256 of that file or of its arrays
    status : "complete" (census closes, and the second opinion agrees where it was asked for),
        "incomplete" or "failed" (no modes); `message` tells why it is not complete
    total_mass, photospheric_radius, gravitational_constant : g, cm, cm^3 g^-1 s^-2; NaN for a model
        that could not be read
    points : points of the model; 0 for one that could not be read
    band_low, band_high : uHz, the band asked for or chosen; NaN for a failed model
    degree, order, n_p, n_g, kind, nu, nu_error, sigma2, inertia : (m,) as in `ModeSet`
    nu_second, nu_second_error : (m,) uHz, or None where no second opinion was asked for
    census : per degree: band, counted, listed, relabelled; no degrees for a failed model
    parameters : what was given beside the model, name to number or text
    findings : what the run noticed
    star_findings : doubts and defects of the model itself
    eigenfunctions : or None where they were not kept
    row : row of ``/models`` this was read from; -1 before it has one
    """

    name: str
    source: str
    source_hash: str
    status: str
    message: str = ""
    total_mass: float = np.nan
    photospheric_radius: float = np.nan
    gravitational_constant: float = np.nan
    points: int = 0
    band_low: float = np.nan
    band_high: float = np.nan
    degree: np.ndarray = field(default_factory=_no_integers)
    order: np.ndarray = field(default_factory=_no_integers)
    n_p: np.ndarray = field(default_factory=_no_integers)
    n_g: np.ndarray = field(default_factory=_no_integers)
    kind: np.ndarray = field(default_factory=_no_texts)
    nu: np.ndarray = field(default_factory=_no_numbers)
    nu_error: np.ndarray = field(default_factory=_no_numbers)
    sigma2: np.ndarray = field(default_factory=_no_numbers)
    inertia: np.ndarray = field(default_factory=_no_numbers)
    nu_second: np.ndarray | None = None
    nu_second_error: np.ndarray | None = None
    census: Census = field(default_factory=empty_census)
    parameters: Mapping[str, Parameter] = field(default_factory=dict)
    findings: tuple[Finding, ...] = ()
    star_findings: tuple[Finding, ...] = ()
    eigenfunctions: Eigenfunctions | None = None
    row: int = -1

    def __post_init__(self) -> None:
        if self.status not in schema.STATUS:
            raise ValueError(f"status must be one of {', '.join(schema.STATUS)}: {self.status!r}")
        for column in (*MODE_COLUMNS, *SECOND_COLUMNS):
            values = getattr(self, column.name)
            if values is None:
                continue
            array = np.array(values, dtype=_TYPES[column.kind], order="C")
            array.setflags(write=False)
            if array.ndim != 1 or array.size != np.size(self.nu):
                raise ValueError(f"mode column {column.name} differs in shape from nu")
            object.__setattr__(self, column.name, array)
        object.__setattr__(self, "parameters", MappingProxyType(dict(self.parameters)))

    def __len__(self) -> int:
        return int(self.nu.size)

    def __reduce__(self) -> tuple[object, ...]:
        # A mapping proxy cannot be sent to another process.
        values = {name: getattr(self, name) for name in self.__dataclass_fields__}
        return _rebuild, ({**values, "parameters": dict(self.parameters)},)

    @property
    def period(self) -> np.ndarray:
        """(m,) period in s; infinite for a growing mode."""
        return period_of(self.nu)

    @property
    def complete(self) -> bool:
        """True where every mode of the band is proved to be listed."""
        return self.status == "complete"

    @property
    def nu_dynamical(self) -> float:
        """sqrt(G M / R^3) / 2 pi in uHz; NaN for a model that could not be read."""
        return dynamical_frequency(
            self.gravitational_constant, self.total_mass, self.photospheric_radius
        )

    def count(self, severity: str) -> int:
        """Findings of one severity, of the model and of the run."""
        return sum(item.severity == severity for item in (*self.findings, *self.star_findings))


def _rebuild(values: dict[str, Any]) -> GridRow:
    return GridRow(**values)


def period_of(nu: np.ndarray) -> np.ndarray:
    """(m,) periods in s of frequencies in uHz; infinite for growing modes."""
    period = np.full(nu.shape, np.inf)
    np.divide(1e6, nu, out=period, where=nu > 0.0)
    return period


def scales_of(star: StarModel) -> dict[str, Any]:
    """What a row holds of the star itself, as keywords of `GridRow`."""
    return {
        "total_mass": star.total_mass,
        "photospheric_radius": star.photospheric_radius,
        "gravitational_constant": star.gravitational_constant,
        "points": int(star.radius.size),
        "star_findings": tuple(item for item in star.findings if item.severity != "note"),
    }


def row_of_modes(modes: ModeSet, **labels: Any) -> GridRow:
    """The row of a model that was solved; `labels` are name, source, source_hash, parameters."""
    status, message = _verdict(modes)
    columns = {column.name: getattr(modes, column.name) for column in MODE_COLUMNS}
    columns |= {column.name: getattr(modes, column.name) for column in SECOND_COLUMNS}
    return GridRow(
        status=status,
        message=message,
        band_low=_number(modes.options.get("band_low_uHz")),
        band_high=_number(modes.options.get("band_high_uHz")),
        census=modes.census,
        findings=modes.findings,
        eigenfunctions=modes.eigenfunctions,
        **columns,
        **scales_of(modes.star),
        **labels,
    )


def _number(value: object) -> float:
    return float(value) if isinstance(value, int | float) else np.nan


def _verdict(modes: ModeSet) -> tuple[str, str]:
    census = modes.census
    if not census.closes:
        short = census.degree[census.counted != census.listed]
        degrees = ", ".join(str(degree) for degree in short)
        return "incomplete", (
            f"the census does not close for l = {degrees}: {census.counted.sum()} modes counted, "
            f"{census.listed.sum()} listed"
        )
    if modes.confirmed is not None and not modes.confirmed.all():
        return "incomplete", (
            f"the second opinion differs for {np.sum(~modes.confirmed)} of {len(modes)} modes"
        )
    return "complete", ""


def promoted(kinds: Mapping[str, str], parameters: Mapping[str, Parameter]) -> dict[str, str]:
    """Kinds of parameter columns ("i", "f", "s") once one more row has been seen."""
    order = "ifs"
    known = dict(kinds)
    for name, value in parameters.items():
        kind = "s" if isinstance(value, str) else "f" if isinstance(value, float) else "i"
        known[name] = max(known.get(name, "i"), kind, key=order.index)
    return known


#: Names that a parameter cannot have, for `/models` uses them.
RESERVED = frozenset(
    [
        "model",
        "degree",
        *(column.name for column in (*schema.GRID_MODELS, *schema.GRID_CENSUS)),
    ]
)


def check_parameter_name(name: str, where: str) -> None:
    """Refuse the name of a parameter that the store cannot hold.

    Raises
    ------
    InputError
        The name is empty, holds a slash, or is one of the store's own.
    """
    if not name or "/" in name or name == ".":
        raise InputError(f"{where}: {name!r} cannot name a parameter; use a word without slashes")
    if name in RESERVED:
        raise InputError(
            f"{where}: the name {name!r} is taken by the store itself; rename that column"
        )
