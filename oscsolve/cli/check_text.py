"""What ``oscsolve modes --check`` adds to its output."""

from __future__ import annotations

from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.checks import integral_check, orthogonality


def check_results(modes: ModeSet) -> tuple[list[str], dict[str, object]]:
    """Two lines for people, and the same as plain values for a JSON document."""
    integral, overlaps = integral_check(modes), orthogonality(modes)
    if integral.worst is None or overlaps.worst is None:
        return ["# check    the list is empty: nothing to check"], {}
    worst, one = integral.worst, overlaps.worst
    other = int(overlaps.partner[one])
    difference, overlap = float(integral.difference[worst]), float(overlaps.overlap[one])
    lines = [
        "# check    sigma2 from the energy integral: largest relative difference "
        f"{abs(difference):.1e} ({_name(modes, worst)})"
    ]
    if one == other:
        lines.append("# check    orthogonality: no two modes of one degree to compare")
    else:
        lines.append(
            f"# check    orthogonality: largest overlap {overlap:.1e} ({_name(modes, one)} and "
            f"{modes.order[other]})"
        )
    values: dict[str, object] = {
        "integral": {"difference": difference, **_label(modes, worst)},
        "orthogonality": {
            "overlap": overlap,
            **_label(modes, one),
            "other_order": int(modes.order[other]),
        },
    }
    return lines, values


def _name(modes: ModeSet, row: int) -> str:
    return f"l = {modes.degree[row]}, n = {modes.order[row]}"


def _label(modes: ModeSet, row: int) -> dict[str, object]:
    return {"degree": int(modes.degree[row]), "order": int(modes.order[row])}
