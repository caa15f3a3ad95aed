"""Options that several commands share, and the words they are given in."""

from __future__ import annotations

import math
import re
from collections.abc import Callable
from fractions import Fraction
from typing import Any, NamedTuple, TypeVar

import click

from oscsolve.errors import InputError
from oscsolve.units import UNITS, band_to_uhz

#: Ranges beyond this are typing errors; the solver has its own limit.
_LARGEST_DEGREE = 10_000

_Function = TypeVar("_Function", bound=Callable[..., Any])


class Band(NamedTuple):
    """Two limits in `unit`, as given."""

    first: float
    second: float
    unit: str


class DegreesType(click.ParamType):
    """``0-3,10``: degrees and ranges of degrees, into a sorted tuple."""

    name = "degrees"

    def convert(self, value: Any, param: Any, ctx: Any) -> tuple[int, ...]:
        if isinstance(value, tuple):
            return value
        degrees: set[int] = set()
        for part in str(value).split(","):
            match = re.fullmatch(r"\s*(\d{1,9})(?:-(\d{1,9}))?\s*", part)
            if match is None:
                self.fail(
                    f"{value!r}: {part!r} is no degree; expected whole numbers and ranges such as "
                    "0-3,10",
                    param,
                    ctx,
                )
            first = int(match[1])
            last = int(match[2] or first)
            if last < first:
                self.fail(f"{value!r}: the range {part.strip()} runs backwards", param, ctx)
            if last > _LARGEST_DEGREE:
                self.fail(f"{value!r}: degrees end at {_LARGEST_DEGREE}", param, ctx)
            degrees.update(range(first, last + 1))
        return tuple(sorted(degrees))


class BandType(click.ParamType):
    """``1000:4000`` in uHz, or with a unit behind the upper limit: ``0.5:3d``."""

    name = "band"

    def convert(self, value: Any, param: Any, ctx: Any) -> Band:
        if isinstance(value, Band):
            return value
        units = "|".join(re.escape(unit) for unit in sorted(UNITS, key=len, reverse=True))
        match = re.fullmatch(rf"\s*([^:]+?)\s*:\s*([^:]+?)\s*({units})?\s*", str(value))
        numbers = [_number(text) for text in match.groups()[:2]] if match else [None]
        if match is None or None in numbers:
            self.fail(
                f"{value!r} is no band; expected LOW:HIGH with a unit of {', '.join(UNITS)} behind "
                "it or none for uHz, such as 1000:4000 or 0.5:3d",
                param,
                ctx,
            )
        band = Band(float(numbers[0] or 0.0), float(numbers[1] or 0.0), match[3] or "uHz")
        try:
            # Whether the limits make sense does not depend on the star.
            band_to_uhz((band.first, band.second), band.unit, nu_dynamical=1.0)
        except InputError as error:
            self.fail(str(error), param, ctx)
        return band


class NumberType(click.ParamType):
    """A finite number within limits; fractions such as ``5/3`` are welcome."""

    name = "number"

    def __init__(self, above: float = -math.inf, *, least: float = -math.inf) -> None:
        self.above, self.least = above, least

    def convert(self, value: Any, param: Any, ctx: Any) -> float:
        number = value if isinstance(value, float) else _number(str(value))
        if number is None:
            self.fail(f"{value!r} is no number; expected one such as 1.5 or 5/3", param, ctx)
        if not number > self.above:
            self.fail(f"{value!r} is out of range; it must be above {self.above:g}", param, ctx)
        if number < self.least:
            self.fail(f"{value!r} is out of range; it must be at least {self.least:g}", param, ctx)
        return number


def _number(text: str) -> float | None:
    """A finite number or fraction, or None."""
    try:
        number = float(Fraction(text.replace("_", "?").strip()))
    except (ValueError, ZeroDivisionError, OverflowError):
        return None
    return number if math.isfinite(number) else None


def solve_options(function: _Function) -> _Function:
    """What a run of the solver needs: degrees, band, physics and accuracy."""
    options = [
        click.option(
            "--degrees",
            type=DegreesType(),
            default="0-3",
            show_default=True,
            metavar="LIST",
            help="Spherical degrees, such as 0-3,10.",
        ),
        click.option(
            "--band",
            type=BandType(),
            metavar="LOW:HIGH[UNIT]",
            help="Frequencies in uHz or with a unit: 1000:4000, 1:4mHz, 5:20c/d; or periods: "
            "100:1500s, 0.5:3d; or 2:400sigma2 for omega^2 R^3/GM. Default: what suits the star.",
        ),
        click.option(
            "--cowling", is_flag=True, help="Neglect the perturbation of the gravitational field."
        ),
        click.option(
            "--surface",
            type=click.Choice(["free", "isothermal"]),
            default="free",
            show_default=True,
            help="What lies above the outermost point: nothing, or an isothermal atmosphere.",
        ),
        click.option(
            "--tolerance",
            type=NumberType(0.0),
            default="1e-8",
            show_default=True,
            metavar="ERROR",
            help="Largest relative error of a frequency.",
        ),
    ]
    for option in reversed(options):
        function = option(function)
    return function


def gravitational_constant_option(function: _Function) -> _Function:
    """The G to use in place of the one that the model states or implies."""
    return click.option(
        "--gravitational-constant",
        type=NumberType(0.0),
        metavar="G",
        help="G in cm^3 g^-1 s^-2, in place of the one in the model or estimated from it.",
    )(function)


def overwrite_option(function: _Function) -> _Function:
    """Leave to replace files that exist."""
    return click.option("--overwrite", is_flag=True, help="Replace files that exist.")(function)
