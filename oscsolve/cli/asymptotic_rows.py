"""Asymptotic quantities as rows that a page and a terminal both show.

A row is a symbol, a value rounded to its error, the error, a unit and a remark. Symbols are words
with indices (``Delta nu_0``) that a page turns into letters.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import NamedTuple

import numpy as np

from oscsolve.cli.numbers import fixed
from oscsolve.seismology.asymptotics import Asymptotics
from oscsolve.seismology.separations import Separation

#: Digits of quantities whose error is not known, and the most of others.
_DIGITS = 6
#: Name of a combination: its symbol and its definition, nu(n, l).
COMBINATIONS = {
    **{
        f"large_{k}": (f"Delta nu_{k}", f"nu(n, {k}) - nu(n-1, {k}), large separation")
        for k in range(4)
    },
    "small_02": ("delta nu_02", "nu(n, 0) - nu(n-1, 2), small separation"),
    "small_13": ("delta nu_13", "nu(n, 1) - nu(n-1, 3), small separation"),
    "small_01": ("delta nu_01", "nu(n, 0) - [nu(n-1, 1) + nu(n, 1)]/2"),
    "small_10": ("delta nu_10", "[nu(n, 0) + nu(n+1, 0)]/2 - nu(n, 1)"),
    "five_01": ("d_01", "five points about nu(n, 0): weights 1, -4, 6, -4, 1 over 8"),
    "five_10": ("d_10", "five points about nu(n, 1): weights -1, 4, -6, 4, -1 over 8"),
    "ratio_01": ("r_01", "d_01(n) / Delta nu_1(n)"),
    "ratio_10": ("r_10", "d_10(n) / Delta nu_0(n+1)"),
    "ratio_02": ("r_02", "delta nu_02(n) / Delta nu_1(n)"),
    "ratio_13": ("r_13", "delta nu_13(n) / Delta nu_0(n+1)"),
    **{
        f"second_{k}": (f"Delta_2 nu_{k}", f"nu(n-1, {k}) - 2 nu(n, {k}) + nu(n+1, {k})")
        for k in range(4)
    },
}


class Row(NamedTuple):
    """One quantity.

    Attributes
    ----------
    symbol : words with indices
    value, error : text; "" where there is no error estimate
    unit : "" for pure numbers
    remark : how it was found
    """

    symbol: str
    value: str
    error: str
    unit: str
    remark: str


def asymptotic_groups(found: Asymptotics) -> Iterator[tuple[str, list[Row]]]:
    """Heading and rows of each group that this star has."""
    groups = {
        "Sound": list(_sound(found)),
        "Buoyancy": list(_buoyancy(found)),
        "Mixed modes": list(_mixed(found)),
        "Scaled from the Sun": list(_scaled(found)),
    }
    for heading, rows in groups.items():
        if rows:
            yield heading, rows


def separation_rows(found: Asymptotics) -> list[tuple[Row, int, int]]:
    """Each combination where it matters most, with its order n and how many orders it has.

    That is at nu_max where it is known and within the list, else in the middle of the list; orders
    in which a mixed mode stands for a p mode are passed over where there are others.
    """
    rows = []
    for name, part in found.separations.items():
        place = _typical(part, found.nu_max)
        label, definition = COMBINATIONS[name]
        mixed = int(np.count_nonzero(part.mixed))
        note = f"; {mixed} with a mixed mode" if mixed else ""
        row = Row(
            label,
            short(float(part.value[place]), float(part.error[place]), part.unit),
            f"{part.error[place]:.0e}",
            "" if part.unit == "1" else part.unit,
            definition + note,
        )
        rows.append((row, int(part.order[place]), len(part)))
    return rows


def short(value: float, error: float, unit: str) -> str:
    """A separation or ratio to what can be compared with observations, or to its error if worse."""
    least = 10.0 ** (-4 if unit != "1" else -6)
    return fixed(value, max(error, least))


def _typical(part: Separation, nu_max: float | None) -> int:
    pool = np.flatnonzero(~part.mixed) if not np.all(part.mixed) else np.arange(len(part))
    nu = part.nu[pool]
    if nu_max is None or not nu[0] <= nu_max <= nu[-1]:
        return int(pool[nu.size // 2])
    return int(pool[np.argmin(np.abs(nu - nu_max))])


def _plain(value: float) -> str:
    return f"{value:.{_DIGITS}g}"


def with_error(value: float, error: float, numerical: float) -> tuple[str, str]:
    """A fitted value and its error, two digits of the error shown."""
    total = max(error, numerical)
    if not (math.isfinite(total) and total > 0.0):
        return _plain(value), ""
    decimals = max(0, 1 - math.floor(math.log10(total)))
    return f"{value:.{decimals}f}", f"{total:.{decimals}f}"


def _sound(found: Asymptotics) -> Iterator[Row]:
    for fit in found.large_separations:
        about = "equal weights" if fit.nu_max is None else "weighted about nu_max"
        remark = (
            f"line through {fit.order.size} modes of l = {fit.degree}, {about}; error: scatter "
            f"(numerical {fit.separation_propagated:.0e})"
        )
        value, error = with_error(fit.separation, fit.separation_error, fit.separation_propagated)
        yield Row(f"Delta nu_{fit.degree}", value, error, "uHz", remark)
    for fit in found.large_separations:
        value, error = with_error(fit.epsilon, fit.epsilon_error, fit.epsilon_propagated)
        yield Row(
            f"epsilon_{fit.degree}",
            value,
            error,
            "",
            f"nu/Delta nu = n + l/2 + epsilon, same line (numerical {fit.epsilon_propagated:.0e})",
        )
    if math.isfinite(found.large_separation_integral):
        yield Row(
            "Delta nu",
            _plain(found.large_separation_integral),
            "",
            "uHz",
            "[2 int dr/c]^-1 of the model, to its outermost point (Tassoul 1980)",
        )
        yield Row(
            "tau_c",
            _plain(found.acoustic_radius),
            "",
            "s",
            "acoustic radius of the model, int dr/c",
        )
    if found.envelope_depth is not None:
        yield Row(
            "tau_env",
            _plain(found.envelope_depth),
            "",
            "s",
            "acoustic depth of the bottom of the convective envelope",
        )


def _buoyancy(found: Asymptotics) -> Iterator[Row]:
    dips = {part.degree: part for part in found.period_spacings}
    for fit in found.period_spacing_fits:
        value, error = with_error(fit.spacing, fit.spacing_error, fit.spacing_propagated)
        yield Row(
            f"Delta Pi_{fit.degree}",
            value,
            error,
            "s",
            f"line through {fit.order.size} g modes of l = {fit.degree}; error: scatter (numerical "
            f"{fit.spacing_propagated:.0e})",
        )
    for degree, part in dips.items():
        count = int(np.count_nonzero(part.dip))
        if len(part) < 3:
            continue
        middle = float(np.median(part.spacing))
        yield Row(
            f"Delta Pi_{degree}",
            short(middle, float(part.error.max()), "s"),
            f"{part.error.max():.0e}",
            "s",
            f"median of {len(part)} steps between {part.spacing.min():.5g} and "
            f"{part.spacing.max():.5g} s; {count} dip{'s' * (count != 1)}; error: numerical",
        )
    for degree, integral in found.period_spacing_integral:
        if math.isfinite(integral):
            yield Row(
                f"Delta Pi_{degree}",
                _plain(integral),
                "",
                "s",
                "2 pi^2/[sqrt(l(l+1)) int N dr/r] of the model, all stable layers (Tassoul 1980)",
            )


def _mixed(found: Asymptotics) -> Iterator[Row]:
    for fit in found.mixed:
        about = (
            f"{fit.row.size} modes of l = {fit.degree}; rms {fit.rms:.2g} uHz, "
            f"{100.0 * fit.misfit:.2g} percent of the distance between modes"
        )
        rows = (
            ("q", "coupling", "", f"coupling; tan p = q tan g (Shibahashi 1979) through {about}"),
            ("Delta Pi", "spacing", "s", "period spacing of pure g modes, same fit"),
            ("epsilon_g", "epsilon_g", "", "phase of the g modes (Mosser et al. 2012), same fit"),
            (
                "d_p",
                "offset",
                "",
                "p modes beyond n + l/2 of the radial ones, in Delta nu, same fit",
            ),
        )
        for label, name, unit, remark in rows:
            value, error = with_error(
                getattr(fit, name),
                getattr(fit, f"{name}_error"),
                getattr(fit, f"{name}_propagated"),
            )
            mark = "," if "_" in label else "_"
            yield Row(f"{label}{mark}{fit.degree}", value, error, unit, remark)


def _scaled(found: Asymptotics) -> Iterator[Row]:
    if found.nu_max is not None and found.effective_temperature is not None:
        yield Row("T_eff", f"{found.effective_temperature:.5g}", "", "K", "of the model")
    if found.nu_max is not None:
        value, error = with_error(found.nu_max, 0.05 * found.nu_max, 0.0)
        remark = "M R^-2 T_eff^-1/2 (Kjeldsen & Bedding 1995); error: 5 percent, common practice"
        yield Row("nu_max", value, error, "uHz", remark)
    if found.large_separation_scaled is not None:
        separation = found.large_separation_scaled
        value, error = with_error(separation, 0.02 * separation, 0.0)
        remark = "M^1/2 R^-3/2 (Kjeldsen & Bedding 1995); error: 2 percent, common practice"
        yield Row("Delta nu", value, error, "uHz", remark)
