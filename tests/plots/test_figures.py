"""What the figures show: the numbers behind lines and markers, labels, and what is refused."""

from __future__ import annotations

import matplotlib as mpl
import numpy as np
import pytest
from matplotlib.figure import Figure

import oscsolve
from oscsolve import InputError
from oscsolve.plots import echelle, eigenfunction, inertia, kernel, propagation, spacing
from oscsolve.plots.coordinate import Coordinate
from oscsolve.plots.figure import make_figure, picture, save_figure
from oscsolve.plots.gallery import gallery
from oscsolve.plots.match import match_plot
from oscsolve.plots.style import colour, marker


@pytest.fixture(scope="module")
def modes() -> oscsolve.ModeSet:
    star = oscsolve.polytrope(3)
    return oscsolve.solve_modes(star, [0, 1, 2], (0.5, 300.0), unit="sigma2")


@pytest.fixture
def axes():
    return Figure().subplots()


def texts(axes) -> list[str]:
    return [text.get_text() for text in axes.get_legend().get_texts()]


def test_propagation_shows_the_two_frequencies_and_every_node(modes, axes):
    propagation.propagation_diagram(axes, modes.star, modes, degrees=(1, 2))
    buoyancy, *lambs = (
        line for line in axes.lines if line.get_label() in ("N", "$S_{1}$", "$S_{2}$")
    )
    star = modes.star
    inside = star.brunt_n2 > 0.0
    expected = np.sqrt(star.brunt_n2[inside]) / (2e-6 * np.pi)
    assert buoyancy.get_ydata()[inside] == pytest.approx(expected, rel=1e-9)
    # S_2/S_1 = sqrt(6/2) everywhere.
    ratio = lambs[1].get_ydata()[1:-1] / lambs[0].get_ydata()[1:-1]
    assert ratio == pytest.approx(np.sqrt(3.0))
    assert {"l = 1", "l = 2"} <= set(texts(axes))
    row = int(np.flatnonzero((modes.degree == 0) & (modes.order == 4))[0])
    assert propagation.mode_nodes(modes, row).size == 3


def test_a_bare_model_has_a_propagation_diagram_too(axes):
    propagation.propagation_diagram(axes, oscsolve.polytrope(3))
    assert axes.get_ylabel() == "frequency / uHz" and axes.get_xlabel() == "r/R"


def test_echelle_folds_frequencies_and_keeps_them(modes, axes):
    echelle.frequency_echelle(axes, modes)
    width = echelle.typical_separation(modes)
    assert list(axes.get_xlim()) == pytest.approx([0.0, width])
    offsets = np.concatenate([np.asarray(part.get_offsets()) for part in axes.collections])
    drawn = np.sort(offsets[:, 1])
    assert drawn == pytest.approx(np.sort(modes.nu))
    assert texts(axes) == ["l = 0", "l = 1", "l = 2"]
    seen = oscsolve.ObservedModes(modes.degree, modes.nu, np.full(len(modes), 0.1))
    other = Figure().subplots()
    assert "observed" in texts(echelle.frequency_echelle(other, modes, observed=seen))


def test_period_echelle_stands_upright_for_asymptotic_modes():
    """High-order g modes of one degree (Tassoul 1980): one nearly vertical ridge."""
    star = oscsolve.polytrope(3)
    mode_list = oscsolve.solve_modes(star, [1], (0.01, 0.03), unit="sigma2")
    axes = echelle.period_echelle(Figure().subplots(), mode_list)
    across = axes.collections[0].get_offsets()[:, 0]
    width = axes.get_xlim()[1]
    ridge = np.angle(np.exp(2j * np.pi * (across - across[0]) / width))
    assert across.size > 5 and np.ptp(ridge) < 0.4


def test_spacing_and_inertia_draw_what_the_list_holds(modes, axes):
    spacing.spacing_plot(axes, modes)
    drawn = axes.lines[0]
    assert np.all(drawn.get_ydata() > 0.0) and axes.get_ylabel() == "period spacing / s"
    other = inertia.inertia_plot(Figure().subplots(), modes)
    assert np.concatenate([line.get_ydata() for line in other.lines]) == pytest.approx(
        modes.inertia
    )
    assert [line.get_color() for line in other.lines] == [colour(0), colour(1), colour(2)]


def test_eigenfunction_shades_cavities_and_energy_has_area_one(modes):
    row = int(np.flatnonzero((modes.degree == 1) & (modes.order == -2))[0])
    made = make_figure(
        [
            lambda axes: eigenfunction.displacement_plot(axes, modes, row, coordinate="radius"),
            lambda axes: eigenfunction.energy_plot(axes, modes, row, coordinate="radius"),
        ]
    )
    upper, lower = made.axes
    assert max(np.abs(line.get_ydata()).max() for line in upper.lines) == pytest.approx(1.0)
    assert {"g cavity", "p cavity"} <= set(texts(upper))
    x, density = lower.lines[0].get_xdata(), lower.lines[0].get_ydata()
    keep = np.isfinite(x)
    # A trapezoid over the points of the model: good to a part in a thousand here.
    assert np.trapezoid(density[keep], x[keep]) == pytest.approx(1.0, rel=1e-3)


@pytest.mark.parametrize("coordinate", ["radius", "log-radius"])
def test_rotation_kernels_have_area_one_on_either_axis(modes, coordinate):
    rows = np.flatnonzero(modes.degree > 0)[:2].tolist()
    axes = kernel.rotation_kernel_plot(Figure().subplots(), modes, rows, coordinate=coordinate)
    for line in axes.lines[:2]:
        x, y = line.get_xdata(), line.get_ydata()
        keep = np.isfinite(x)
        along = np.log(x[keep]) if coordinate == "log-radius" else x[keep]
        assert np.trapezoid(y[keep], along) == pytest.approx(1.0, rel=5e-3)


def test_structure_kernels_are_drawn_for_every_pair(modes):
    for quantity, held in (("c2", "rho"), ("gamma1", "rho"), ("rho", "c2")):
        axes = kernel.structure_kernel_plot(
            Figure().subplots(), modes, [0, 5], quantity=quantity, held=held
        )
        assert len(texts(axes)) == 2 and "kernel of" in axes.get_ylabel()


def test_match_plot_holds_all_pairs(modes, axes):
    seen = oscsolve.ObservedModes(modes.degree, modes.nu + 1.0, np.full(len(modes), 0.5))
    found = oscsolve.match_observed(modes, seen, surface="none")
    match_plot(axes, modes, found)
    assert "observed" in texts(axes) and "computed" in texts(axes)


def test_axes_suit_the_star():
    assert Coordinate(oscsolve.polytrope(3)).name == "radius"
    assert Coordinate(oscsolve.polytrope(4.9)).name == "log-radius"
    small = oscsolve.polytrope(3, mass=1.2e33, radius=9e8)
    assert Coordinate(small).name == "pressure"
    with pytest.raises(InputError, match="the axis must be one of"):
        Coordinate(small, "depth")


def test_degrees_look_alike_everywhere_and_differ_from_each_other():
    assert len({colour(degree) for degree in range(4)}) == 4
    assert len({marker(degree) for degree in range(4)}) == 4
    # Apart in grey print, too: lightness of neighbouring degrees differs (Rec. 709 weights).
    light = [
        np.dot(mpl.colors.to_rgb(colour(degree)), (0.2126, 0.7152, 0.0722)) for degree in range(4)
    ]
    assert np.all(np.diff(light) > 0.05)


def test_unsuitable_lists_are_refused(modes, axes):
    radial = modes.only([0])
    with pytest.raises(InputError, match="no g modes of consecutive order"):
        spacing.spacing_plot(axes, radial)
    with pytest.raises(InputError, match="no three g modes of consecutive order"):
        echelle.period_echelle(axes, radial)
    few = oscsolve.solve_modes(modes.star, [0], (9.0, 17.5), unit="sigma2")
    with pytest.raises(InputError, match="no three p modes of consecutive order"):
        echelle.frequency_echelle(axes, few)
    with pytest.raises(InputError, match="kernels of 1 to 8 modes; got 0"):
        kernel.rotation_kernel_plot(axes, modes, [])
    empty = oscsolve.solve_modes(modes.star, [0], (8.3, 8.6), unit="sigma2")
    with pytest.raises(InputError, match="no oscillating modes"):
        inertia.inertia_plot(axes, empty)


@pytest.mark.parametrize(
    ("ending", "start"), [(".png", b"\x89PNG"), (".pdf", b"%PDF"), (".svg", b"<?xml")]
)
def test_files_have_the_format_of_their_ending_and_never_change(tmp_path, modes, ending, start):
    def draw(axes):
        return inertia.inertia_plot(axes, modes)

    before = dict(mpl.rcParams)
    save_figure(tmp_path / f"a{ending}", draw, "lantern")
    content = (tmp_path / f"a{ending}").read_bytes()
    assert content.startswith(start)
    assert content == picture(make_figure(draw, "lantern"), ending[1:])
    assert dict(mpl.rcParams) == before, "the user's settings are left alone"
    with pytest.raises(InputError, match="the file exists"):
        save_figure(tmp_path / f"a{ending}", draw)
    with pytest.raises(InputError, match="must end in .png, .pdf, .svg"):
        save_figure(tmp_path / "a.jpg", draw)


def test_the_gallery_holds_what_suits_the_list(modes):
    full = [plate.title for plate in gallery(modes)]
    assert "Where waves propagate" in full and "Inertia" in full
    assert "What rotational splittings sense" in full
    radial = [plate.title for plate in gallery(modes.only([0]))]
    assert "Frequencies folded" in radial and "Period spacing" not in radial
    assert all(plate.svg().startswith(b"<?xml") for plate in gallery(modes.only([0])))
