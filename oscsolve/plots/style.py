"""How every figure looks: one colour and one marker for each degree, type and lines for print.

A marker has as many corners as its degree: a disc for l = 0, a drop for l = 1, a lens for l = 2, a
triangle, a square, and so on. The colours of l = 0 to 3 differ in lightness too, so that a figure
printed in grey, or seen by a colour-blind reader, loses nothing.

Nothing here changes matplotlib's settings for anyone else: figures are drawn inside `look` and
built from `matplotlib.figure.Figure`, which needs neither a display nor a chosen backend.
"""

from __future__ import annotations

import functools
import warnings
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import contextmanager
from typing import Any, ParamSpec, TypeVar, cast

import matplotlib as mpl
import numpy as np
from matplotlib.axes import Axes
from matplotlib.colors import to_hex, to_rgb
from matplotlib.font_manager import FontProperties
from matplotlib.legend import Legend
from matplotlib.lines import Line2D
from matplotlib.path import Path
from matplotlib.textpath import TextPath
from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter
from matplotlib.transforms import ScaledTranslation

#: Lines and text; what stands back; help lines.
INK, SOFT, FAINT = "#1a1c29", "#6a6f7a", "#b9bcc4"
#: Fill of the cavities of gravity and sound waves, and of convective layers.
FILLS = {"g": "#ecdcc6", "p": "#e9f0f7"}
CONVECTIVE = "#b9b4ab"
#: Colours of l = 0, 1, ...; from l = 6 on they come again, with other markers.
_COLOURS = (INK, "#2a5db0", "#d9662b", "#7cb27a", "#8a2f5d", "#4fa3b5")
#: Line styles by degree, and of several lines of one degree.
_LINES: tuple[Any, ...] = ("-", (0, (6, 2)), (0, (3, 1.5)), (0, (1.2, 1.2)), (0, (6, 1.5, 1, 1.5)))
#: Share of the frame within which points of a curve are one.
_FINEST = 1e-3
#: Lists up to this length have markers of full size.
_FEW = 150

_SETTINGS: dict[str, Any] = {
    "font.family": ["STIXGeneral", "DejaVu Sans"],
    "font.size": 11.0,
    "mathtext.fontset": "stix",
    "text.color": INK,
    "axes.edgecolor": INK,
    "axes.labelcolor": INK,
    "axes.linewidth": 0.7,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.axisbelow": True,
    "axes.formatter.useoffset": False,
    "axes.formatter.limits": (-4, 6),
    "axes.formatter.use_mathtext": True,
    "xtick.color": INK,
    "ytick.color": INK,
    "xtick.labelsize": 10.0,
    "ytick.labelsize": 10.0,
    "xtick.minor.visible": True,
    "ytick.minor.visible": True,
    "xtick.major.width": 0.7,
    "ytick.major.width": 0.7,
    "legend.frameon": False,
    "legend.fontsize": 10.0,
    "legend.handletextpad": 0.4,
    "legend.columnspacing": 1.3,
    "legend.borderpad": 0.0,
    "lines.linewidth": 1.1,
    "lines.solid_capstyle": "round",
    "figure.dpi": 100.0,
    "savefig.dpi": 200.0,
    "savefig.facecolor": "white",
    "pdf.fonttype": 42,
    "svg.fonttype": "path",
    "svg.hashsalt": "oscsolve",
}
#: Settings that belong to the session and are none of a figure's business.
_SESSION = ("backend", "backend_fallback", "interactive", "toolbar", "timezone")

_Arguments = ParamSpec("_Arguments")
_Result = TypeVar("_Result")


@contextmanager
def look() -> Iterator[None]:
    """Settings of matplotlib for the length of a block; those of the user come back after it.

    Examples
    --------
    >>> from matplotlib.figure import Figure
    >>> from oscsolve import plots
    >>> with plots.look():
    ...     axes = Figure(layout="constrained").add_subplot()
    >>> axes.spines["top"].get_visible()
    False
    """
    plain = {name: value for name, value in mpl.rcParamsDefault.items() if name not in _SESSION}
    with mpl.rc_context(cast(Any, {**plain, **_SETTINGS})), warnings.catch_warnings():
        # A star's name may hold letters that no font has; the box in their place says so.
        warnings.filterwarnings("ignore", message=r"Glyph .* missing from")
        yield


def looking(function: Callable[_Arguments, _Result]) -> Callable[_Arguments, _Result]:
    """`function`, run within `look`."""

    @functools.wraps(function)
    def drawn(*args: _Arguments.args, **kwargs: _Arguments.kwargs) -> _Result:
        with look():
            return function(*args, **kwargs)

    return drawn


def _drop() -> Path:
    """A disc with one corner, above."""
    t = np.linspace(0.0, 2.0 * np.pi, 49)
    outline = np.column_stack((0.72 * np.sin(t) * np.sin(0.5 * t), np.cos(t) + 0.12))
    return Path(outline, closed=True)


def _lens() -> Path:
    """What two discs have in common: two corners, left and right."""
    x = np.linspace(-1.0, 1.0, 21)
    arc = 0.62 * (1.0 - x**2) * (1.0 + 0.15 * x**2)
    outline = np.vstack((np.column_stack((x, arc)), np.column_stack((x, -arc))[::-1]))
    return Path(outline, closed=True)


#: Marker and size of l = 0 to 6; of these sizes all have about one area.
_MARKERS: tuple[tuple[Any, float], ...] = (
    ("o", 4.6),
    (_drop(), 6.4),
    (_lens(), 6.6),
    ("^", 5.0),
    ("s", 4.2),
    ("p", 5.2),
    ("h", 5.4),
)


def colour(degree: int) -> str:
    """The colour of a degree, "#rrggbb".

    Examples
    --------
    >>> from oscsolve import plots
    >>> plots.colour(2)
    '#d9662b'
    """
    return _COLOURS[int(degree) % len(_COLOURS)]


def marker(degree: int) -> Any:
    """The marker of a degree: it has as many corners as the degree, up to twelve."""
    if degree < len(_MARKERS):
        return _MARKERS[int(degree)][0]
    return 5 + (int(degree) - 5) % 8, 1, 0.0


def marker_size(degree: int, count: int = 1) -> float:
    """Points; less where a figure holds many modes."""
    size = _MARKERS[int(degree)][1] if degree < len(_MARKERS) else 6.5
    return size * max(0.6, min(1.0, (_FEW / max(count, 1)) ** 0.5))


def line(number: int) -> Any:
    """The line style of a degree, or of one of several lines."""
    return _LINES[int(number) % len(_LINES)]


def shade(degree: int, number: int) -> str:
    """The colour of a degree; lighter and darker for the second and the third of its lines."""
    light, share = ((0.0, 1.0), (0.55, 0.45), (0.0, 0.5))[number % 3]
    red, green, blue = (light + share * part for part in to_rgb(colour(degree)))
    return to_hex((red, green, blue))


def degree_key(degree: int, **changes: Any) -> Line2D:
    """What stands for a degree in a key."""
    own: dict[str, Any] = {
        "color": colour(degree),
        "marker": marker(degree),
        "ms": marker_size(degree),
        "mew": 0.0,
        "ls": "none",
        "label": rf"$\ell={degree}$",
    }
    return Line2D([], [], **{**own, **changes})


def key_above(axes: Axes, handles: Iterable[Any]) -> None:
    """A key above the frame, where it covers no data, in as many rows as it needs.

    Parameters
    ----------
    axes : to stand above
    handles : artists with labels, in reading order
    """
    # The axes will take up about this much of the figure, which is not laid out yet.
    room = 0.845 / 0.775 * axes.bbox.width / axes.figure.dpi * 72.0
    step = 1.55 * _SETTINGS["legend.fontsize"] / 72.0
    for up, row in enumerate(reversed(_key_rows(list(handles), room))):
        # A legend a row: in one of several rows all columns are as wide as the widest entry.
        key = Legend(
            axes,
            row,
            [str(handle.get_label()) for handle in row],
            loc="lower left",
            bbox_to_anchor=(0.0, 1.0),
            bbox_transform=axes.transAxes + ScaledTranslation(0.0, up * step, _inches(axes)),
            ncols=len(row),
        )
        axes.add_artist(key)
        # What is clipped to the frame gets no room above it.
        key.set_clip_on(False)


def _inches(axes: Axes) -> Any:
    """From inches to pixels, whatever the resolution."""
    return cast(Any, axes.figure).dpi_scale_trans


def _key_rows(handles: Sequence[Any], room: float) -> list[list[Any]]:
    rows: list[list[Any]] = []
    left = room
    for handle in handles:
        width = _key_width(str(handle.get_label()))
        if left < width or not rows:
            rows.append([])
            left = room
        rows[-1].append(handle)
        left -= width
    return rows


@functools.cache
def _key_width(label: str) -> float:
    """How wide one entry of a key is, points."""
    size = _SETTINGS["legend.fontsize"]
    text = FontProperties(family=_SETTINGS["font.family"], size=size)
    gaps = 2.0 + _SETTINGS["legend.handletextpad"] + _SETTINGS["legend.columnspacing"]
    return gaps * size + float(TextPath((0.0, 0.0), label, prop=text).get_extents().width)


def key_texts(axes: Axes) -> list[str]:
    """The texts of the keys above a frame, in reading order."""
    keys = [part for part in axes.get_children() if isinstance(part, Legend)]
    return [text.get_text() for key in reversed(keys) for text in key.get_texts()]


def plain_ticks(axis: Any) -> None:
    """Numbers such as 200 and 5000 at the ticks of a logarithmic axis that spans few decades."""
    low, high = sorted(axis.get_view_interval())
    axis.set_minor_formatter(NullFormatter())
    decades = float(np.log10(high / low))
    if decades < 2.2:
        steps = (1.0, 2.0, 5.0) if decades > 0.7 else (1.0, 1.5, 2.0, 3.0, 4.0, 5.0, 6.0, 8.0)
        axis.set_major_locator(LogLocator(subs=steps, numticks=30))
    if low >= 1e-3 and high <= 2e5:
        axis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))


def frequency_text(nu: float) -> str:
    """A frequency in uHz as people write it, five digits or all before the point."""
    return f"{nu:.5g}" if abs(nu) < 1e5 else f"{nu:.0f}"


def thinned(x: np.ndarray, y: np.ndarray) -> np.ndarray:
    """Indices of the points of a curve that are needed to draw it, the first and the last too.

    Filled areas are written point by point, however close these are.

    Parameters
    ----------
    x, y : (n,) places, as shares of the width and the height of the frame
    """
    length = np.concatenate(([0.0], np.cumsum(np.abs(np.diff(x)) + np.abs(np.diff(y)))))
    bins = np.floor(length / _FINEST)
    keep = np.append(True, bins[1:] != bins[:-1])
    keep[-1] = True
    return np.flatnonzero(keep)


def mark_zero(axes: Axes) -> None:
    """A faint line at zero."""
    axes.axhline(0.0, color=FAINT, lw=0.7, zorder=0.5)
