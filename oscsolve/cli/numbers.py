"""Numbers as text: as many digits as their error bar supports, lined up on the decimal point."""

from __future__ import annotations

import math

#: Significant digits that a 64-bit float can be trusted with after a computation.
_MOST_DIGITS = 14
#: Digits of a number whose error is not known.
_PLAIN_DIGITS = 7


def decimals_of(value: float, error: float) -> int:
    """Digits behind the decimal point: the last one shown is the first that the error touches."""
    magnitude = math.floor(math.log10(abs(value))) if value else 0
    most = _MOST_DIGITS - 1 - magnitude
    if math.isfinite(error) and error > 0.0:
        wanted = -math.floor(math.log10(error))
    else:
        wanted = most if error == 0.0 else _PLAIN_DIGITS - 1 - magnitude
    return max(0, min(wanted, most))


def fixed(value: float, error: float) -> str:
    """`value` in fixed notation, rounded to its error; ``inf`` and ``nan`` stay what they are."""
    return f"{value:.{decimals_of(value, error)}f}" if math.isfinite(value) else f"{value}"


def aligned(texts: list[str], heading: str = "") -> list[str]:
    """Numbers padded with blanks so that the decimal points stand below each other.

    Padding is at least as wide as `heading`.
    """
    heads = [text.partition(".")[0] for text in texts]
    tails = [text[len(head) :] for text, head in zip(texts, heads, strict=True)]
    left = max((len(head) for head in heads), default=0)
    right = max((len(tail) for tail in tails), default=0)
    width = max(left + right, len(heading))
    return [
        (head.rjust(left) + tail.ljust(right)).rjust(width)
        for head, tail in zip(heads, tails, strict=True)
    ]
