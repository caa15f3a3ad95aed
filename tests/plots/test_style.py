"""The look of figures: degrees are told apart in grey, too, and settings stay the user's."""

from __future__ import annotations

import subprocess
import sys

import matplotlib as mpl
import numpy as np
import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.colors import to_rgb
from matplotlib.figure import Figure
from matplotlib.legend import Legend
from matplotlib.lines import Line2D

from oscsolve import plots
from oscsolve.plots.figure import picture
from oscsolve.plots.style import degree_key, key_above, key_texts, marker_size, shade, thinned

#: Linear RGB as protanopes and deuteranopes see it (Vienot, Brettel & Mollon 1999; from memory).
_SEEN = {
    "protanopia": [
        [0.11238, 0.88762, 0.0],
        [0.11238, 0.88762, 0.0],
        [0.00401, -0.00401, 1.0],
    ],
    "deuteranopia": [
        [0.29275, 0.70725, 0.0],
        [0.29275, 0.70725, 0.0],
        [-0.02234, 0.02234, 1.0],
    ],
}


def linear(name: str) -> np.ndarray:
    """Linear RGB of a colour (IEC 61966-2-1)."""
    c = np.array(to_rgb(name))
    return np.where(c <= 0.04045, c / 12.92, ((c + 0.055) / 1.055) ** 2.4)


def lab(rgb: np.ndarray) -> np.ndarray:
    """CIE 1976 L*a*b* of linear RGB under D65."""
    to_xyz = [[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]]
    xyz = np.array(to_xyz) @ np.clip(rgb, 0.0, 1.0) / np.array([0.9505, 1.0, 1.089])
    f = np.where(xyz > 216 / 24389, np.cbrt(xyz), (24389 / 27 * xyz + 16) / 116)
    return np.array([116 * f[1] - 16, 500 * (f[0] - f[1]), 200 * (f[1] - f[2])])


def test_low_degrees_differ_in_lightness():
    lightness = [lab(linear(plots.colour(degree)))[0] for degree in range(4)]
    # Ten units of L* are told apart in print at a glance (common practice).
    assert np.all(np.diff(lightness) > 10.0)
    # And all stand out from white paper.
    assert max(lightness) < 75.0


@pytest.mark.parametrize("kind", _SEEN)
def test_low_degrees_differ_for_colour_blind_eyes(kind):
    seen = [lab(np.array(_SEEN[kind]) @ linear(plots.colour(degree))) for degree in range(4)]
    apart = [np.linalg.norm(a - b) for k, a in enumerate(seen) for b in seen[:k]]
    # A distance of 2.3 is just noticed (CIE 1976); ten times that is plain.
    assert min(apart) > 23.0


def test_colour_and_marker_together_tell_the_first_dozen_degrees_apart():
    looks = {(plots.colour(degree), str(plots.marker(degree))) for degree in range(13)}
    assert len(looks) == 13
    assert len({str(plots.marker(degree)) for degree in range(7)}) == 7


def test_shades_of_one_degree_differ():
    assert len({shade(1, number) for number in range(3)}) == 3
    assert shade(1, 0) == plots.colour(1)


def test_markers_shrink_in_long_lists_but_not_to_nothing():
    assert marker_size(1, 10) == marker_size(1)
    assert 0.5 * marker_size(1) < marker_size(1, 5000) < marker_size(1)


def test_settings_of_the_user_come_back():
    mpl.rcParams["lines.linewidth"] = 7.5
    try:
        before = dict(mpl.rcParams)
        with plots.look():
            assert mpl.rcParams["lines.linewidth"] < 2.0
        assert dict(mpl.rcParams) == before
    finally:
        mpl.rcParams["lines.linewidth"] = mpl.rcParamsDefault["lines.linewidth"]


def test_importing_and_drawing_need_no_pyplot_and_choose_no_backend():
    code = (
        "import io, sys, matplotlib\n"
        "chosen = dict.__getitem__(matplotlib.rcParams, 'backend')\n"
        "from oscsolve import plots\n"
        "from oscsolve.plots.figure import picture\n"
        "picture(plots.make_figure(lambda axes: axes.plot([1, 2]), 'lantern'), 'png')\n"
        "assert 'matplotlib.pyplot' not in sys.modules\n"
        "assert dict.__getitem__(matplotlib.rcParams, 'backend') is chosen\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True)
    assert done.returncode == 0, done.stderr


def test_a_key_wraps_above_the_frame_and_covers_none_of_it(axes):
    names = [f"entry number {k} of the key" for k in range(9)]
    with plots.look():
        key_above(axes, [Line2D([], [], label=name) for name in names])
        FigureCanvasAgg(axes.figure).draw()
    assert key_texts(axes) == names
    keys = [part for part in axes.get_children() if isinstance(part, Legend)]
    assert len(keys) > 1
    frame, page = axes.get_window_extent(), axes.figure.bbox
    boxes = [key.get_window_extent() for key in keys]
    assert all(box.y0 > frame.y1 and box.y1 < page.y1 and box.x1 < page.x1 for box in boxes)
    # Rows stand clear of each other.
    heights = sorted((box.y0, box.y1) for box in boxes)
    assert all(low[1] <= high[0] + 1.0 for low, high in zip(heights, heights[1:], strict=False))


def test_titles_are_taken_letter_by_letter():
    figure = plots.make_figure(lambda axes: axes.plot([1, 2]), "lantern-$1_ \u6c49")
    assert picture(figure, "svg")
    assert figure.get_suptitle() == "lantern-$1_ \u6c49"


def test_a_degree_has_one_key_everywhere():
    key = degree_key(3)
    assert key.get_color() == plots.colour(3) and key.get_label() == r"$\ell=3$"
    assert isinstance(Figure().subplots().add_artist(key), Line2D)


def test_thinning_leaves_no_point_further_than_can_be_seen():
    x = np.linspace(0.0, 1.0, 40_001)
    y = 0.5 + 0.5 * np.sin(9.0 * x)
    keep = thinned(x, y)
    assert keep[0] == 0 and keep[-1] == x.size - 1 and keep.size < x.size / 5
    # Of a frame of a thousand dots.
    assert np.abs(np.interp(x, x[keep], y[keep]) - y).max() < 1e-3
