"""HTML, with everything escaped that does not say that it is markup already."""

from __future__ import annotations

import re
from collections.abc import Iterable
from html import escape


class Html(str):
    """Text that is markup already; everything else is escaped."""


def tag(name: str, /, *content: object, **attributes: object) -> Html:
    """One element; ``None`` among the content is left out, an attribute that is None too.

    Underscores at the end of attribute names are dropped (``class_``), others become hyphens.
    """
    return Html(f"{void(name, **attributes)}{join(content)}</{name}>")


def void(name: str, /, **attributes: object) -> Html:
    """One element that has no content, such as img."""
    words = [name]
    for key, value in attributes.items():
        if value is not None:
            words.append(f'{key.rstrip("_").replace("_", "-")}="{escape(str(value))}"')
    return Html(f"<{' '.join(words)}>")


def join(content: Iterable[object]) -> Html:
    """Pieces one after the other, escaped unless they are markup."""
    return Html("".join(as_html(piece) for piece in content if piece is not None))


def as_html(piece: object) -> Html:
    """A piece as markup."""
    return piece if isinstance(piece, Html) else Html(escape(str(piece)))


def symbol(text: str) -> Html:
    """A symbol of the trade, ``Delta nu_max`` into letters with an index.

    Words that name Greek letters become those; what follows an underscore becomes an index, what
    follows a hat an exponent.
    """
    words = []
    for word in text.split(" "):
        base, mark, index = word.partition("_")
        power = ""
        if not mark:
            base, mark, power = word.partition("^")
        letter = _GREEK.get(base, base)
        italic = len(base) == 1 or (base in _GREEK and base.islower())
        piece = tag("i", letter) if italic else as_html(letter)
        if index:
            piece = join((piece, tag("sub", _GREEK.get(index, index))))
        if power:
            piece = join((piece, tag("sup", power)))
        words.append(piece)
    out = words[0]
    for before, word in zip(text.split(" "), words[1:], strict=False):
        # An operator clings to what it works on.
        gap = "" if before.split("_")[0] in ("Delta", "delta", "d") else " "
        out = join((out, gap, word))
    return out


def formula(text: str) -> Html:
    """A remark of the terminal with the letters, indices and exponents that a page has."""
    out = escape(text)
    for pattern, letters in _FORMULA:
        out = re.sub(pattern, letters, out)
    return Html(out)


_GREEK = {
    "nu": "\u03bd",
    "Delta": "\u0394",
    "delta": "\u03b4",
    "Pi": "\u03a0",
    "epsilon": "\u03b5",
    "sigma": "\u03c3",
    "rho": "\u03c1",
    "tau": "\u03c4",
    "xi": "\u03be",
    "Gamma": "\u0393",
}

_MINUS = "\u2212"
#: What stands in text, as a regular expression, and what a page shows for it, in this order.
_FORMULA = (
    (
        r"(?<![\w.])(\d(?:\.\d+)?)e-0*(\d+)\b",
        lambda found: f"{found[1]}\u00a0\u00d7\u00a010<sup>{_MINUS}{found[2]}</sup>",
    ),
    (r"\bsqrt\(l\(l\+1\)\)", "\u221a(l(l+1))"),
    (r"\bint ", "\u222b"),
    (r"\b(nu|Pi|epsilon)(?![A-Za-z])", lambda found: _GREEK[found[1]]),
    (r"\b(Delta|delta) (?=[\u03bd\u03a0])", lambda found: _GREEK[found[1]]),
    (r"\bpi\b", "\u03c0"),
    (r"\^(-?)(\d+(?:/\d+)?)", lambda found: f"<sup>{_MINUS if found[1] else ''}{found[2]}</sup>"),
    (r"(?<=\w)_([A-Za-z0-9]+)", r"<sub>\1</sub>"),
    (r"(?<= )- |\bn-(?=1)|(?<= )-(?=\d)", lambda found: found[0].replace("-", _MINUS)),
    (r" uHz\b", " \u03bcHz"),
)
