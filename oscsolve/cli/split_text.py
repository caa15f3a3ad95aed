"""Rotational splittings as text: a table for people, CSV and JSON for other programs."""

from __future__ import annotations

import json
from collections.abc import Iterator

import numpy as np

from oscsolve.cli.documents import STAR, plain, rows_of
from oscsolve.cli.numbers import aligned, fixed
from oscsolve.cli.table import star_lines
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.rotation import Splittings, rotation_kernel
from oscsolve.seismology.two_zones import MeanRotation, MeasuredSplittings

#: Column: unit.
COLUMNS = {
    "degree": "1",
    "order": "1",
    "kind": "1",
    "nu": "uHz",
    "beta": "1",
    "ledoux": "1",
    "splitting": "nHz",
    "mean_rate": "nHz",
}
_MEAN = {
    "core": "nHz",
    "core_error": "nHz",
    "envelope": "nHz",
    "envelope_error": "nHz",
    "correlation": "1",
    "radius": "1",
    "chi2": "1",
    "freedom": "1",
}
_FRAME = "inertial frame: nu(m) = nu + m splitting, m > 0 with the rotation"

Mean = tuple[MeasuredSplittings, MeanRotation]


def split_table(modes: ModeSet, found: Splittings | None, mean: Mean | None) -> Iterator[str]:
    """The lines of the table: header, one line a mode, and the mean rotation."""
    yield f"# oscsolve {modes.program_version}: rotational splittings, first order"
    yield from star_lines(modes.star)
    if found is not None:
        yield f"# rotation {found.rotation.name}"
        yield f"# frame    {_FRAME}"
        yield "#"
        columns = _cells(modes, found)
        yield "# " + "  ".join(_headings(columns)).rstrip()
        for cells in zip(*columns.values(), strict=True):
            yield "  " + "  ".join(cells)
    if mean is not None:
        yield "#"
        yield from _mean_lines(*mean)


def split_csv(modes: ModeSet, found: Splittings, mean: Mean | None) -> Iterator[str]:
    """The list as CSV: comments behind ``#``, a line of names, one line a mode, all digits."""
    yield f"# oscsolve {modes.program_version}: rotational splittings, first order"
    yield from star_lines(modes.star)
    yield f"# rotation {found.rotation.name}"
    yield f"# {_FRAME}"
    if mean is not None:
        yield from _mean_lines(*mean)
    yield "# nu in uHz, splitting and mean_rate in nHz"
    yield ",".join(COLUMNS)
    for row in rows_of(_columns(modes, found)):
        yield ",".join(str(value) for value in row.values())


def split_document(modes: ModeSet, found: Splittings | None, mean: Mean | None) -> str:
    """Everything as one JSON document; what was not asked for is null."""
    document: dict[str, object] = {
        "program": f"oscsolve {modes.program_version}",
        "star": {name: getattr(modes.star, name) for name in STAR},
        "frame": _FRAME,
        "units": {
            "splittings": COLUMNS,
            "rotation": {"radius": "1", "rate": "nHz"},
            "mean_rotation": _MEAN,
            "star": STAR,
        },
        "rotation": None,
        "splittings": None,
        "mean_rotation": None,
    }
    if found is not None:
        profile = found.rotation
        document["rotation"] = {
            "name": profile.name,
            "radius": profile.radius,
            "rate": profile.rate,
        }
        document["splittings"] = rows_of(_columns(modes, found))
    if mean is not None:
        measured, result = mean
        rows = {
            "degree": measured.degree,
            "order": measured.order,
            "splitting": measured.splitting,
            "splitting_error": measured.splitting_error,
            "fitted": result.fitted,
            "core_share": result.core_share,
        }
        document["mean_rotation"] = {
            **{name: getattr(result, name) for name in _MEAN},
            "measured": rows_of(rows),
        }
    return json.dumps(plain(document), allow_nan=False, ensure_ascii=False, indent=1)


def kernel_lines(modes: ModeSet) -> Iterator[str]:
    """Rotation kernels as CSV: x, then a column K_l_n for every nonradial mode."""
    rows = np.flatnonzero(modes.degree > 0)
    yield f"# oscsolve {modes.program_version}: rotation kernels, int K dx = 1, x = r/R"
    yield from star_lines(modes.star)
    names = [f"K_{modes.degree[row]}_{modes.order[row]}" for row in rows]
    yield ",".join(["x", *names])
    table = [modes.star.fractional_radius, *(rotation_kernel(modes, int(row)) for row in rows)]
    for values in zip(*(column.tolist() for column in table), strict=True):
        yield ",".join(map(repr, values))


def _columns(modes: ModeSet, found: Splittings) -> dict[str, np.ndarray]:
    of_modes = {name: getattr(modes, name)[found.row] for name in tuple(COLUMNS)[:4]}
    return {**of_modes, **{name: getattr(found, name) for name in tuple(COLUMNS)[4:]}}


def _cells(modes: ModeSet, found: Splittings) -> dict[str, list[str]]:
    """Heading to cells of equal width."""
    c = _columns(modes, found)
    nu = [fixed(*p) for p in zip(c["nu"], modes.nu_error[found.row], strict=True)]
    numbers = {
        "l": [str(value) for value in c["degree"]],
        "n": [str(value) for value in c["order"]],
        "nu/uHz": nu,
        "beta": [f"{value:.6f}" for value in c["beta"]],
        "C": [f"{value:.6f}" for value in c["ledoux"]],
        "splitting/nHz": _to_five_digits(c["splitting"]),
        "rate/nHz": _to_five_digits(c["mean_rate"]),
    }
    least = {"l": 2, "n": 5}
    out = {
        name: [cell.rjust(least.get(name, 0)) for cell in aligned(cells, name)]
        for name, cells in numbers.items()
    }
    kinds = [str(value).ljust(6) for value in c["kind"]]
    return {"l": out.pop("l"), "n": out.pop("n"), "kind": kinds, **out}


def _to_five_digits(values: np.ndarray) -> list[str]:
    """Fixed notation, the largest value with five digits."""
    finest = 1e-4 * float(np.max(np.abs(values), initial=0.0))
    return [fixed(float(value), finest) for value in values]


def _headings(columns: dict[str, list[str]]) -> list[str]:
    return [
        name.ljust(len(cells[0])) if name == "kind" else name.rjust(len(cells[0]))
        for name, cells in columns.items()
    ]


def _mean_lines(measured: MeasuredSplittings, mean: MeanRotation) -> Iterator[str]:
    size = measured.degree.size
    yield f"# mean rotation from {size} splittings, core inside x = {mean.radius:.6g}"
    yield f"# core     {mean.core:.6g} +- {mean.core_error:.2g} nHz"
    yield f"# envelope {mean.envelope:.6g} +- {mean.envelope_error:.2g} nHz"
    yield f"# correlation {mean.correlation:.3f}, chi2 {mean.chi2:.4g} for {mean.freedom} free"
    texts = {
        "l": [str(value) for value in measured.degree],
        "n": [str(value) for value in measured.order],
        "measured/nHz": [f"{value:.6g}" for value in measured.splitting],
        "error": [f"{value:.3g}" for value in measured.splitting_error],
        "fitted/nHz": [f"{value:.6g}" for value in mean.fitted],
        "core share": [f"{value:.4f}" for value in mean.core_share],
    }
    columns = {name: aligned(cells, name) for name, cells in texts.items()}
    yield "#   " + "  ".join(_headings(columns))
    for cells in zip(*columns.values(), strict=True):
        yield "#   " + "  ".join(cells)
