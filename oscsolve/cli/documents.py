"""The mode list for other programs: one JSON document, or a CSV table."""

from __future__ import annotations

import csv
import io
import json
import math
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import asdict
from pathlib import Path

import numpy as np

from oscsolve.cli.table import star_lines, verdict_sentence
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.star.formats.files import replacing

#: Column: unit.
COLUMNS = {
    "degree": "1",
    "order": "1",
    "n_p": "1",
    "n_g": "1",
    "kind": "1",
    "nu": "uHz",
    "nu_error": "uHz",
    "sigma2": "1",
    "period": "s",
    "inertia": "1",
}
#: Further columns of a list that carries a second opinion.
_SECOND_OPINION = {"nu_second": "uHz", "nu_second_error": "uHz"}
_CENSUS = ("degree", "low", "high", "counted", "listed", "relabelled")
#: What documents tell of the star: attribute to unit.
STAR = {
    "name": "",
    "source": "",
    "source_hash": "",
    "total_mass": "g",
    "photospheric_radius": "cm",
    "gravitational_constant": "cm3 g-1 s-2",
    "nu_dynamical": "uHz",
}


def json_document(modes: ModeSet, checks: Mapping[str, object] | None = None) -> str:
    """The list as one JSON document; what is not finite or not known is null.

    Parameters
    ----------
    modes : the list
    checks : outcome of checks that were asked for, under the name ``checks``
    """
    census, columns = modes.census, _columns(modes)
    document: dict[str, object] = {
        "program": f"oscsolve {modes.program_version}",
        "complete": modes.complete,
        "star": {name: getattr(modes.star, name) for name in STAR},
        "options": dict(modes.options),
        "units": {"modes": columns, "census": {"low": "uHz", "high": "uHz"}, "star": STAR},
        "census": rows_of({name: getattr(census, name) for name in _CENSUS}),
        "modes": rows_of(
            {name: getattr(modes, name) for name in (*columns, "relabelled")},
        ),
        "findings": [asdict(found) for found in (*modes.star.findings, *modes.findings)],
    }
    if checks is not None:
        document["checks"] = checks
    return json.dumps(plain(document), allow_nan=False, ensure_ascii=False, indent=1)


def csv_lines(modes: ModeSet, remarks: Iterable[str] = ()) -> Iterator[str]:
    """The list as CSV: comments behind ``#``, a line of names, one line a mode, all digits."""
    yield f"# oscsolve {modes.program_version}: oscillation modes"
    yield from star_lines(modes.star)
    for name, value in modes.options.items():
        yield f"# option {name} = {value}"
    yield f"# {verdict_sentence(modes)}"
    yield from remarks
    yield "# nu and nu_error in uHz, period in s"
    columns = _columns(modes)
    yield ",".join(columns)
    for row in rows_of({name: getattr(modes, name) for name in columns}):
        line = io.StringIO()
        csv.writer(line, lineterminator="").writerow(row.values())
        yield line.getvalue()


def _columns(modes: ModeSet) -> dict[str, str]:
    return COLUMNS if modes.nu_second is None else {**COLUMNS, **_SECOND_OPINION}


def write_text(path: Path, lines: Iterable[str], *, overwrite: bool) -> None:
    """Write lines to a file that appears complete or not at all."""
    with (
        replacing(path, overwrite) as temporary,
        temporary.open("w", encoding="utf-8", newline="\n", errors="backslashreplace") as stream,
    ):
        stream.writelines(f"{line}\n" for line in lines)


def rows_of(columns: dict[str, np.ndarray]) -> list[dict[str, object]]:
    """Columns of one length as one dictionary a row, of plain Python values."""
    lists = [column.tolist() for column in columns.values()]
    return [dict(zip(columns, row, strict=True)) for row in zip(*lists, strict=True)]


def plain(value: object) -> object:
    """`value` without numpy types and without numbers that JSON cannot hold."""
    if isinstance(value, dict):
        return {str(name): plain(item) for name, item in value.items()}
    if isinstance(value, list | tuple):
        return [plain(item) for item in value]
    if isinstance(value, np.generic | np.ndarray):
        return plain(value.tolist())
    if isinstance(value, float) and not math.isfinite(value):
        return None
    return value
