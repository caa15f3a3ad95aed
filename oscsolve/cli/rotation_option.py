"""Rotation profiles as words of the command line."""

from __future__ import annotations

import re
from pathlib import Path

from oscsolve.errors import InputError
from oscsolve.seismology.rotation import (
    Rotation,
    model_rotation,
    step_rotation,
    uniform_rotation,
)
from oscsolve.seismology.tables import read_rotation
from oscsolve.star.model import StarModel
from oscsolve.units import PERIOD_UNITS

#: Unit of Omega/2 pi: factor to nHz.
_RATE_UNITS = {"nHz": 1.0, "uHz": 1e3, "mHz": 1e6, "c/d": 1e9 / 86400.0}
_NUMBER = r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?"
_RATE = rf"({_NUMBER})\s*({'|'.join([*_RATE_UNITS, *PERIOD_UNITS])})"

FORMS = (
    "a rate or period such as 430nHz, 0.5uHz or 25d; a step CORE:ENVELOPE@X such as "
    "750nHz:30nHz@0.2; the word model; or a CSV file"
)


def rotation_of(text: str, star: StarModel) -> Rotation:
    """The profile that `text` stands for.

    Raises
    ------
    InputError
        It is none of `FORMS`, or the file cannot be used.
    """
    text = text.strip()
    solid = re.fullmatch(_RATE, text)
    if solid:
        return uniform_rotation(_rate(solid[1], solid[2], text))
    step = re.fullmatch(rf"{_RATE}:{_RATE}@({_NUMBER})", text)
    if step:
        core, envelope = _rate(step[1], step[2], text), _rate(step[3], step[4], text)
        return step_rotation(core, envelope, float(step[5]))
    if text == "model":
        return model_rotation(star)
    if not Path(text).exists():
        raise InputError(f"--rotation {text!r} is no profile and no file; expected {FORMS}")
    return read_rotation(text, star)


def _rate(number: str, unit: str, text: str) -> float:
    """nHz."""
    value = float(number)
    if unit in _RATE_UNITS:
        return value * _RATE_UNITS[unit]
    if value == 0.0:
        raise InputError(f"--rotation {text!r}: a period cannot be zero; a star at rest is 0nHz")
    return 1e9 / (value * PERIOD_UNITS[unit])
