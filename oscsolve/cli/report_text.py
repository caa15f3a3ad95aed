"""What a report says of a star, as text for a terminal and as a JSON document."""

from __future__ import annotations

import json
from collections.abc import Iterator
from dataclasses import asdict, fields

import numpy as np

from oscsolve.cli.asymptotic_rows import COMBINATIONS, Row, asymptotic_groups, separation_rows
from oscsolve.cli.documents import STAR, plain
from oscsolve.cli.table import star_lines, verdict_sentence
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.asymptotics import Asymptotics


def report_lines(modes: ModeSet, found: Asymptotics) -> Iterator[str]:
    """The star, the verdict, and the asymptotic quantities with their errors."""
    yield f"oscsolve {modes.program_version}: what the modes of a star say"
    for line in star_lines(modes.star):
        yield line.removeprefix("# ")
    yield f"{'modes':<9}{verdict_sentence(modes)}"
    for heading, rows in asymptotic_groups(found):
        yield ""
        yield heading
        yield from _aligned(rows)
    if found.separations:
        yield ""
        yield f"Separations and ratios {_where(found)}; error: numerical"
        typical = separation_rows(found)
        yield from _aligned(
            [row for row, _, _ in typical],
            [f"n = {n}, {count} in all" for _, n, count in typical],
        )
    yield ""
    yield "All orders: oscsolve report MODES.h5 --json; all of it as a page: -o FILE.html"


def _where(found: Asymptotics) -> str:
    return "in the middle of the list" if found.nu_max is None else "at nu_max"


def _aligned(rows: list[Row], places: list[str] | None = None) -> Iterator[str]:
    labels = [row.symbol for row in rows]
    width = max(map(len, labels))
    values = [f"{row.value:>12}" for row in rows]
    errors = [f"+- {row.error}" if row.error else "" for row in rows]
    widest = max(map(len, errors))
    where = places or [""] * len(rows)
    gap = max(map(len, where))
    for label, value, error, row, place in zip(labels, values, errors, rows, where, strict=True):
        parts = (f"{label:<{width}}", value, f"{error:<{widest}}", f"{row.unit:<3}")
        middle = f"  {place:<{gap}}" if places else ""
        yield f"  {' '.join(parts)}{middle}  {row.remark}".rstrip()


def report_document(modes: ModeSet, found: Asymptotics) -> str:
    """All asymptotic quantities as one JSON document; what is not known is null."""
    document = {
        "program": f"oscsolve {modes.program_version}",
        "complete": modes.complete,
        "star": {name: getattr(modes.star, name) for name in STAR},
        "units": {"star": STAR, "nu": "uHz", "period": "s"},
        "scaling": {
            "effective_temperature": found.effective_temperature,
            "nu_max": found.nu_max,
            "large_separation": found.large_separation_scaled,
        },
        "model": {
            "large_separation": found.large_separation_integral,
            "period_spacing": dict(found.period_spacing_integral),
            "acoustic_radius": found.acoustic_radius,
            "envelope_depth": found.envelope_depth,
        },
        "large_separations": [asdict(fit) for fit in found.large_separations],
        "period_spacings": [asdict(part) for part in found.period_spacings],
        "period_spacing_fits": [asdict(fit) for fit in found.period_spacing_fits],
        "mixed": [asdict(fit) for fit in found.mixed],
        "separations": {
            name: {
                "definition": COMBINATIONS[name][1],
                "unit": part.unit,
                **{
                    item.name: getattr(part, item.name)
                    for item in fields(part)
                    if isinstance(getattr(part, item.name), np.ndarray)
                    and item.name not in ("row", "slope")
                },
            }
            for name, part in found.separations.items()
        },
    }
    return json.dumps(plain(document), allow_nan=False, ensure_ascii=False, indent=1)
