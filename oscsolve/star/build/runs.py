"""Prescribed runs of a quantity through a star: plateaus joined by smooth steps."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from oscsolve.errors import InputError

#: Coordinates along which a quantity may be prescribed.
COORDINATES = ("mass", "radius", "pressure")


@dataclass(frozen=True)
class Run:
    """A quantity that goes from one value to the next over given ranges of a coordinate.

    Attributes
    ----------
    values : the plateaus, from the centre outward
    steps : (from, to) pairs, one fewer than values: where one value begins to turn into the next
        and where that is done, from the centre outward. Linear between, with rounded corners.
    along : coordinate of the steps: "mass", m/M; "radius", r/R; or "pressure",
        log10(4 pi R^4 P/(G M^2)), which in an outer layer is the logarithm of the mass above it
        in units of M and falls outward
    rounding : width of the rounded corners in units of the step; 0.01 makes them sharp, 1 and
        more makes a step without straight part

    Raises
    ------
    InputError
        Numbers of values and steps do not fit, steps do not follow one another outward, or the
        coordinate is unknown.

    Notes
    -----
    With t the fraction of a step that is behind, each step contributes its height times

        f(t) = L(t) - L(t - 1),    L(t) = (d/2) ln(1 + exp(2 t/d)),    d = rounding,

    which is analytic and has a slope in closed form.

    Examples
    --------
    >>> hydrogen = Run((0.3, 0.7), [(0.1, 0.2)], rounding=0.1)
    >>> [round(float(v), 6) for v in hydrogen.at(np.array([0.0, 0.15, 1.0]))]
    [0.3, 0.5, 0.7]
    """

    values: tuple[float, ...]
    steps: tuple[tuple[float, float], ...] = ()
    along: str = "mass"
    rounding: float = 0.2

    def __post_init__(self) -> None:
        try:
            values = tuple(float(value) for value in self.values)
            steps = tuple((float(first), float(last)) for first, last in self.steps)
        except (TypeError, ValueError) as error:
            raise InputError(
                f"a run needs numbers and (from, to) pairs; got {self.values!r}, {self.steps!r}"
            ) from error
        object.__setattr__(self, "values", values)
        object.__setattr__(self, "steps", steps)
        if self.along not in COORDINATES:
            raise InputError(f"a run goes along {', '.join(COORDINATES)}; got {self.along!r}")
        if len(values) != len(steps) + 1:
            raise InputError(
                f"a run of {len(values)} values needs {len(values) - 1} steps; got {len(steps)}"
            )
        outward = -1.0 if self.along == "pressure" else 1.0
        places = [outward * place for step in steps for place in step]
        if not all(map(math.isfinite, (*values, *places, self.rounding))):
            raise InputError(f"a run needs finite numbers; got {values}, {steps}")
        if any(last <= first for first, last in zip(places, places[1:], strict=False)):
            raise InputError(
                f"steps of a run along {self.along} must follow one another outward; got {steps}"
            )
        if not self.rounding > 0.0:
            raise InputError(f"rounding of a run must be above zero; got {self.rounding:g}")

    def at(self, place: np.ndarray) -> np.ndarray:
        """(n,) values at (n,) places of the coordinate."""
        out = np.full_like(place, self.values[0])
        for (first, last), height in self._steps():
            t = (place - first) / (last - first)
            d = self.rounding
            corner = np.logaddexp(0.0, 2.0 * t / d) - np.logaddexp(0.0, 2.0 * (t - 1.0) / d)
            out += height * 0.5 * d * corner
        return out

    def slope(self, place: np.ndarray) -> np.ndarray:
        """(n,) slopes by the coordinate."""
        out = np.zeros_like(place)
        for (first, last), height in self._steps():
            t = (place - first) / (last - first)
            d = self.rounding
            part = 0.5 * (np.tanh(t / d) - np.tanh((t - 1.0) / d))
            out += height / (last - first) * part
        return out

    def _steps(self) -> list[tuple[tuple[float, float], float]]:
        heights = np.diff(self.values).tolist()
        return list(zip(self.steps, heights, strict=True))
