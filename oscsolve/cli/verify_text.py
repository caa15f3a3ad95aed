"""What ``oscsolve modes --verify`` adds to its output."""

from __future__ import annotations

import numpy as np

from oscsolve.pulsation.modeset import ModeSet

_METHOD = (
    "# verify   second opinion by shooting in Dziembowski's variables, with adaptive explicit\n"
    "#          integration; it shares nothing with the first but the interpolated model"
)
#: Modes named in one line.
_IN_A_LINE = 6


def verify_results(modes: ModeSet) -> tuple[list[str], dict[str, object]]:
    """Lines for people, and the same as plain values for a JSON document."""
    confirmed, second = modes.confirmed, modes.nu_second
    if confirmed is None or second is None:
        raise ValueError("these modes carry no second opinion; solve with verify=True")
    difference = np.abs(second - modes.nu) / np.maximum(np.abs(modes.nu), 1e-300)
    astray = np.flatnonzero(~confirmed)
    lines = [*_METHOD.split("\n")]
    values: dict[str, object] = {"differ": [_label(modes, int(row)) for row in astray]}
    if np.any(np.isfinite(difference)):
        worst = int(np.nanargmax(difference))
        lines.append(
            f"# verify   largest relative difference {difference[worst]:.1e} "
            f"({_name(modes, worst)}); error bars {modes.nu_error[worst]:.0e} uHz here, "
            f"{modes.nu_second_error[worst]:.0e} uHz there"  # type: ignore[index]
        )
        values |= {"difference": float(difference[worst]), **_label(modes, worst)}
    agree = len(modes) - astray.size
    lines.append(f"# verify   {agree} of {len(modes)} modes agree within both error bars")
    if astray.size:
        lines[-1] += f", {astray.size} DO NOT:"
        names = [_name(modes, int(row)) for row in astray]
        for first in range(0, len(names), _IN_A_LINE):
            lines.append(f"#          {'; '.join(names[first : first + _IN_A_LINE])}")
    return lines, {"second_opinion": values}


def _name(modes: ModeSet, row: int) -> str:
    return f"l = {modes.degree[row]}, n = {modes.order[row]}"


def _label(modes: ModeSet, row: int) -> dict[str, object]:
    return {"degree": int(modes.degree[row]), "order": int(modes.order[row])}
