"""Our own HDF5 model file, and the ``/structure`` group that mode lists share with it.

Layout: one dataset per array of `StarModel`, named like the attribute, with ``units`` and
``long_name``, on the dimension scale ``point``; scalars, labels and findings are attributes of
the group. h5py, xarray (through h5netcdf) and any HDF5 viewer read it as it stands.
"""

from __future__ import annotations

import json
from dataclasses import asdict
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import h5py
import numpy as np

from oscsolve.errors import InputError, ModelError
from oscsolve.star.findings import Finding
from oscsolve.star.formats.files import file_hash, replacing
from oscsolve.star.formats.hdf5_file import new_hdf5
from oscsolve.star.model import StarModel
from oscsolve.version import __version__

SIGNATURE = b"\x89HDF\r\n\x1a\n"
CONTENT = "oscsolve stellar structure"
SCHEMA = 1
GROUP = "structure"

#: Array name: (units, long name, must be there).
ARRAYS = {
    "radius": ("cm", "radius", True),
    "mass": ("g", "mass inside the radius", True),
    "pressure": ("dyn cm-2", "pressure", True),
    "density": ("g cm-3", "density", True),
    "gamma1": ("1", "first adiabatic exponent", True),
    "a_star": ("1", "A* = dlnP/dlnr / Gamma1 - dln rho/dlnr", False),
    "brunt_n2": ("s-2", "squared buoyancy frequency", False),
    "temperature": ("K", "temperature", False),
    "hydrogen": ("1", "mass fraction of hydrogen", False),
    "helium": ("1", "mass fraction of helium", False),
    "rotation": ("rad s-1", "angular velocity", False),
}
#: Scalar name: (units, must be there).
SCALARS = {
    "total_mass": ("g", True),
    "photospheric_radius": ("cm", True),
    "gravitational_constant": ("cm3 g-1 s-2", True),
    "effective_temperature": ("K", False),
    "luminosity": ("erg s-1", False),
}
_LABELS = ("name", "source", "source_hash")


def recognise(head: bytes) -> bool:
    """True for any HDF5 file; `read` says so if it holds no stellar structure."""
    return head.startswith(SIGNATURE)


def read(path: Path, *, gravitational_constant: float | None = None) -> StarModel:
    """The star in ``/structure`` of a model file or of a mode list.

    Parameters
    ----------
    path : file to read.
    gravitational_constant : cm^3 g^-1 s^-2; replaces the value in the file, A* is kept.

    Raises
    ------
    InputError
        The file is damaged, has no ``/structure``, is of a newer schema, or lacks a dataset.
    """
    try:
        with h5py.File(path, "r") as file:
            if GROUP not in file or not isinstance(file[GROUP], h5py.Group):
                raise InputError(
                    f"{path}: this HDF5 file has no group /{GROUP}, so it holds no star; "
                    "give a model file or a mode list that carries its model"
                )
            star = read_structure(file[GROUP])
    except (OSError, RuntimeError, KeyError) as error:
        if isinstance(error, InputError):
            raise
        raise InputError(
            f"{path}: this HDF5 file is damaged or cut short; copy or write it again"
        ) from error
    changes: dict[str, Any] = {"source": str(path), "source_hash": file_hash(path)}
    findings = list(star.findings)
    if star.source and all(finding.code != "structure-origin" for finding in findings):
        findings.append(
            Finding(
                "note",
                "structure-origin",
                f"the model was first read from {star.source} "
                f"(sha256 {star.source_hash[:12] or 'unknown'})",
            )
        )
    if gravitational_constant is not None:
        findings.append(
            Finding(
                "note",
                "gravity-given",
                f"G = {gravitational_constant:.8g} was given by the caller; the file says "
                f"G = {star.gravitational_constant:.8g}",
            )
        )
        changes["gravitational_constant"] = gravitational_constant
        changes["a_star"] = star.a_star
    changes["findings"] = tuple(findings)
    if gravitational_constant is None:
        return _relabelled(star, changes)
    return star.with_changes(name=star.name or path.stem, **changes)


def _relabelled(star: StarModel, changes: dict[str, Any]) -> StarModel:
    """`star` with other labels, its buoyancy kept to the last bit (see `read_structure`)."""
    fields = {name: getattr(star, name) for name in (*ARRAYS, *SCALARS)}
    name = star.name or Path(changes["source"]).stem
    return _exact_star(fields, name=name, **changes)


def write(star: StarModel, path: Path, *, overwrite: bool = False) -> None:
    """Write a model file that `read` gives back bit by bit.

    Raises
    ------
    InputError
        The file exists and `overwrite` is false, or cannot be written.
    """
    with replacing(path, overwrite) as temporary, new_hdf5(temporary) as (file, _):
        file.attrs["content"] = CONTENT
        file.attrs["schema"] = SCHEMA
        file.attrs["program_version"] = __version__
        file.attrs["created"] = datetime.now(UTC).isoformat(timespec="seconds")
        write_structure(file.create_group(GROUP), star)


def write_structure(group: h5py.Group, star: StarModel) -> None:
    """Put a star into an empty group: arrays as datasets, everything else as attributes."""
    point = group.create_dataset("point", data=np.arange(1, star.radius.size + 1))
    point.attrs["units"] = "1"
    point.attrs["long_name"] = "number of the point, from the centre"
    point.make_scale("point")
    for name, (units, long_name, _) in ARRAYS.items():
        values = getattr(star, name)
        if values is None:
            continue
        dataset = group.create_dataset(name, data=values)
        dataset.attrs["units"] = units
        dataset.attrs["long_name"] = long_name
        dataset.dims[0].attach_scale(point)
    for name, (units, _) in SCALARS.items():
        value = getattr(star, name)
        if value is not None:
            group.attrs[name] = float(value)
            group.attrs[f"{name}_units"] = units
    for name in _LABELS:
        group.attrs[name] = getattr(star, name)
    findings = json.dumps([asdict(finding) for finding in star.findings])
    group.attrs["findings"] = findings
    group.attrs["structure_schema"] = SCHEMA


def read_structure(group: h5py.Group) -> StarModel:
    """The star in a group written by `write_structure`, equal to it bit by bit.

    Raises
    ------
    InputError
        A dataset or attribute is missing, has no numbers, or is of a newer schema.
    """
    where = f"{group.file.filename}: {group.name}"
    schema = group.attrs.get("structure_schema", SCHEMA)
    if not isinstance(schema, (int, np.integer)) or not 1 <= schema <= SCHEMA:
        raise InputError(
            f"{where}: schema {schema!r} is not known here (up to {SCHEMA}); update oscsolve"
        )
    fields: dict[str, Any] = {
        name: _array(group, name, needed, where) for name, (_, _, needed) in ARRAYS.items()
    }
    fields |= {name: _scalar(group, name, needed, where) for name, (_, needed) in SCALARS.items()}
    labels = {name: str(group.attrs.get(name, "")) for name in _LABELS}
    try:
        return _exact_star(fields, findings=_findings(group, where), **labels)
    except ModelError as error:
        raise ModelError(f"{where}: {error}") from error


def _exact_star(fields: dict[str, Any], **labels: Any) -> StarModel:
    """A star from both forms of the buoyancy, neither changed in its last bit if they agree.

    A StarModel derives N^2 from A* or A* from N^2; deriving in the other direction may round
    differently, so the direction that reproduces the stored pair is taken.
    """
    a_star, brunt_n2 = fields["a_star"], fields["brunt_n2"]
    if a_star is None or brunt_n2 is None:
        return StarModel(**fields, **labels)
    star = StarModel(**{**fields, "brunt_n2": None}, **labels)
    if np.array_equal(np.asarray(star.brunt_n2), brunt_n2):
        return star
    other = StarModel(**{**fields, "a_star": None}, **labels)
    return other if np.array_equal(np.asarray(other.a_star), a_star) else star


def _array(group: h5py.Group, name: str, needed: bool, where: str) -> np.ndarray | None:
    if name not in group:
        if needed:
            raise InputError(f"{where}: the dataset {name!r} is missing; write the file again")
        return None
    dataset = group[name]
    if not isinstance(dataset, h5py.Dataset) or dataset.dtype.kind not in "fiu":
        raise InputError(f"{where}: {name!r} is no dataset of numbers; write the file again")
    return np.asarray(dataset[()], dtype=np.float64)


def _scalar(group: h5py.Group, name: str, needed: bool, where: str) -> float | None:
    if name not in group.attrs:
        if needed:
            raise InputError(f"{where}: the attribute {name!r} is missing; write the file again")
        return None
    try:
        return float(group.attrs[name])
    except (TypeError, ValueError) as error:
        raise InputError(
            f"{where}: the attribute {name!r} is not one number; write the file again"
        ) from error


def _findings(group: h5py.Group, where: str) -> tuple[Finding, ...]:
    try:
        return tuple(Finding(**entry) for entry in json.loads(group.attrs.get("findings", "[]")))
    except (TypeError, ValueError) as error:
        raise InputError(
            f"{where}: the attribute 'findings' is not the list it should be; write the file again"
        ) from error
