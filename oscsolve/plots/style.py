"""The look of all figures: one colour and marker a degree, nothing that carries no meaning.

Colours differ in lightness as well as in hue, and every degree has a marker and a line of its own,
so that figures survive a grey printer and colour-blind eyes.
"""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any, cast

import matplotlib as mpl

#: Colour, marker and line style of the degrees 0, 1, 2, 3 and of all above.
_DEGREES = (
    ("#14213d", "o", "-"),
    ("#b23a48", "^", "--"),
    ("#2a9d8f", "s", "-."),
    ("#e0a030", "D", ":"),
    ("#8d8d99", "v", (0, (1, 1))),
)
#: Buoyancy and what it carries, sound and what it carries, faint help lines, observed data.
BUOYANCY, SOUND, FAINT, OBSERVED = "#5a6b2f", "#3d5a80", "#b9b9c3", "#111111"
#: Shades of the two cavities.
G_SHADE, P_SHADE = "#dfe3cf", "#d6dfea"

_SETTINGS: dict[str, Any] = {
    "font.size": 9.0,
    "axes.labelsize": 9.0,
    "axes.titlesize": 9.5,
    "axes.titlelocation": "left",
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.linewidth": 0.7,
    "axes.axisbelow": True,
    "xtick.direction": "out",
    "ytick.direction": "out",
    "legend.fontsize": 8.0,
    "legend.frameon": False,
    "lines.linewidth": 1.1,
    "lines.markersize": 4.5,
    "figure.dpi": 100.0,
    "savefig.dpi": 160.0,
    "svg.hashsalt": "oscsolve",
    "pdf.fonttype": 42,
}


@contextmanager
def look() -> Iterator[None]:
    """Settings of matplotlib for the length of a block; those of the user come back after it."""
    with mpl.rc_context(cast(Any, _SETTINGS)):
        yield


def colour(degree: int) -> str:
    """The colour of a degree."""
    return _DEGREES[min(int(degree), len(_DEGREES) - 1)][0]


def marker(degree: int) -> str:
    """The marker of a degree."""
    return _DEGREES[min(int(degree), len(_DEGREES) - 1)][1]


def line(degree: int) -> Any:
    """The line style of a degree."""
    return _DEGREES[min(int(degree), len(_DEGREES) - 1)][2]
