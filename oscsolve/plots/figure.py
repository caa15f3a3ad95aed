"""Figures as files: made without touching the settings, windows or state of the user."""

from __future__ import annotations

import os
from collections.abc import Callable, Sequence
from io import BytesIO
from pathlib import Path
from typing import Any

from matplotlib.axes import Axes
from matplotlib.figure import Figure

from oscsolve.errors import InputError
from oscsolve.plots.style import SOFT, look
from oscsolve.star.formats.files import replacing

#: Endings that a picture may have, and the format each stands for.
FORMATS = {".png": "png", ".pdf": "pdf", ".svg": "svg"}
#: Width and height of one panel, inch: the width of a page of A4 between margins.
_PANEL = (6.5, 4.1)

Draw = Callable[[Axes], Any]


def make_figure(draw: Draw | Sequence[Draw], title: str = "", *, height: float = 1.0) -> Figure:
    """A figure with one panel below the other, on one horizontal axis.

    Parameters
    ----------
    draw : functions that take an Axes, one a panel
    title : small, above the first panel
    height : of each panel, in units of the usual one

    Examples
    --------
    >>> from oscsolve import plots
    >>> len(plots.make_figure([lambda axes: axes.plot([1, 2]), lambda axes: None]).axes)
    2
    """
    panels = [draw] if callable(draw) else list(draw)
    with look():
        size = _PANEL[0], _PANEL[1] * height * len(panels)
        figure = Figure(figsize=size, layout="constrained")
        axes = figure.subplots(len(panels), 1, sharex=True, squeeze=False)[:, 0]
        for one, place in zip(panels, axes, strict=True):
            one(place)
        for place in axes[:-1]:
            place.set_xlabel("")
            place.tick_params(labelbottom=False)
        if title:
            # A dollar sign in the name of a star is a dollar sign.
            words = {"parse_math": False, "fontsize": 9.0, "color": SOFT}
            figure.suptitle(title, x=0.995, ha="right", **words)
    return figure


def picture(figure: Figure, kind: str) -> bytes:
    """A figure as the bytes of a PNG, PDF or SVG file, the same for the same figure."""
    stream = BytesIO()
    dated = {"svg": {"Date": None}, "pdf": {"CreationDate": None}}.get(kind)
    with look():
        figure.savefig(stream, format=kind, metadata=dated)
    return stream.getvalue()


def write_figure(
    path: Path, figure: Figure, kind: str | None = None, *, overwrite: bool = False
) -> None:
    """Write a figure that appears complete or not at all; errors are those of `save_figure`."""
    content = picture(figure, kind or _format(path))
    with replacing(path, overwrite) as temporary:
        temporary.write_bytes(content)


def _format(path: Path) -> str:
    kind = FORMATS.get(path.suffix.lower())
    if kind is None:
        raise InputError(f"{path}: the name must end in {', '.join(FORMATS)}")
    return kind


def save_figure(
    path: str | os.PathLike[str],
    draw: Draw | Sequence[Draw],
    title: str = "",
    *,
    height: float = 1.0,
    overwrite: bool = False,
) -> None:
    """Draw into a file whose ending says the format.

    Raises
    ------
    InputError
        The ending is none of .png, .pdf, .svg; or the file exists or cannot be written.
    """
    file = Path(path)
    kind = _format(file)
    write_figure(file, make_figure(draw, title, height=height), kind, overwrite=overwrite)
