"""Numbers as Fortran and others write them."""

from __future__ import annotations

import re

import numpy as np

# A mantissa, then an exponent whose letter Fortran leaves out when it needs three digits.
_NO_LETTER = re.compile(r"^([+-]?[0-9]*\.?[0-9]+|[+-]?[0-9]+\.)([+-][0-9]+)$")
_MANTISSA = re.compile(r"[+-]?(\d*\.?\d*)")


def parse_number(text: str) -> float:
    """One number: D exponents and exponents without a letter included.

    Raises
    ------
    ValueError
        The text is no number.
    """
    text = text.strip()
    try:
        return float(text)
    except ValueError:
        plain = text.replace("D", "E").replace("d", "E")
        return float(_NO_LETTER.sub(r"\1E\2", plain))


def is_number(text: str) -> bool:
    """True if `parse_number` takes the text."""
    try:
        parse_number(text)
    except ValueError:
        return False
    return True


def rounding(texts: list[str]) -> float:
    """Relative rounding of numbers written like these, from the longest mantissa."""
    found = (_MANTISSA.match(text.strip()) for text in texts)
    digits = max((len(match[1].replace(".", "")) for match in found if match), default=1)
    return float(max(10.0 ** (1 - digits), np.finfo(float).eps))
