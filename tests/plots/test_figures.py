"""What the figures show: the numbers behind lines and markers, labels, and what is refused."""

from __future__ import annotations

from dataclasses import replace

import matplotlib as mpl
import numpy as np
import pytest
from matplotlib.collections import PathCollection
from matplotlib.figure import Figure

import oscsolve
from oscsolve import InputError, plots
from oscsolve.plots.echelle import typical_separation
from oscsolve.plots.figure import make_figure, picture, save_figure
from oscsolve.plots.style import key_texts


def points(axes) -> np.ndarray:
    """(k, 2) places of all markers of scatter plots."""
    parts = [part for part in axes.collections if isinstance(part, PathCollection)]
    return np.concatenate([np.asarray(part.get_offsets()) for part in parts])


def lines_of(axes, label: str) -> list:
    return [line for line in axes.lines if line.get_label() == label]


def test_propagation_shows_both_frequencies_the_band_and_the_modes(n3_list, axes):
    star = n3_list.star
    plots.propagation_diagram(axes, star, n3_list)
    (buoyancy,), (first,), (second,) = (
        lines_of(axes, name) for name in ("$N$", "$S_{1}$", "$S_{2}$")
    )
    inside = (star.brunt_n2 > 1e-9) & np.isfinite(star.brunt_n2)
    expected = np.sqrt(star.brunt_n2[inside]) / (2e-6 * np.pi)
    assert buoyancy.get_ydata()[inside] == pytest.approx(expected, rel=1e-9)
    # S_2/S_1 = sqrt(6/2) everywhere; the innermost point stands for infinity.
    ratio = second.get_ydata()[1:-1] / first.get_ydata()[1:-1]
    drawn = second.get_ydata()[1:-1] < second.get_ydata()[0]
    assert ratio[drawn] == pytest.approx(np.sqrt(3.0))
    band = lines_of(axes, "_band")[0].get_ydata()
    assert list(band) == [n3_list.census.low.min(), n3_list.census.high.max()]
    texts = key_texts(axes)
    assert {"g cavity ($\\ell=1$)", "p cavity ($\\ell=1$)", "p node", "g node"} <= set(texts)
    assert any(text.startswith(r"$\ell=1$ modes") for text in texts)
    assert axes.get_yscale() == "log" and axes.get_ylabel() == r"frequency ($\mu$Hz)"


def test_propagation_marks_every_node_of_a_named_mode(n3_list, axes):
    row = int(np.flatnonzero((n3_list.degree == 2) & (n3_list.order == -3))[0])
    plots.propagation_diagram(axes, n3_list.star, n3_list, rows=[row])
    dots = [line for line in axes.lines if line.get_marker() == "o"]
    assert all(np.all(line.get_ydata() == n3_list.nu[row]) for line in dots)
    assert sum(line.get_xdata().size for line in dots) == n3_list.n_p[row] + n3_list.n_g[row]


def test_a_bare_model_and_a_list_without_eigenfunctions_have_one_too(star_n3, axes):
    plots.propagation_diagram(axes, star_n3)
    assert axes.get_xlabel() == "$r/R$" and "g node" not in key_texts(axes)
    listed = oscsolve.solve_modes(star_n3, [1], (2.0, 60.0), unit="sigma2")
    listed = replace(listed, eigenfunctions=None)
    other = plots.propagation_diagram(Figure().subplots(), star_n3, listed)
    assert r"$\ell=1$ modes" in key_texts(other) and "p node" not in key_texts(other)


def test_a_star_without_stable_layers_has_no_g_cavity(axes):
    plots.propagation_diagram(axes, oscsolve.uniform_sphere())
    texts = key_texts(axes)
    assert "$N$" not in texts and "g cavity ($\\ell=1$)" not in texts
    assert "p cavity ($\\ell=1$)" in texts and "convective" in texts


def test_echelle_folds_p_modes_and_keeps_their_frequencies(n3_list, axes):
    plots.frequency_echelle(axes, n3_list)
    width = typical_separation(n3_list)
    assert list(axes.get_xlim()) == pytest.approx([0.0, width])
    acoustic = (n3_list.n_g == 0) | (n3_list.n_p > 0)
    x, nu = points(axes).T
    assert np.sort(nu) == pytest.approx(np.sort(n3_list.nu[acoustic]))
    # What was folded lies on the fold: all differences are whole widths.
    turns = (nu - x - (nu - x)[0]) / width
    assert turns == pytest.approx(np.rint(turns), abs=1e-9)
    assert key_texts(axes)[:3] == [r"$\ell=0$", r"$\ell=1$", r"$\ell=2$"]
    colours = [tuple(part.get_facecolor()[0]) for part in axes.collections]
    assert colours == [mpl.colors.to_rgba(plots.colour(degree)) for degree in range(3)]


def test_observed_modes_lie_open_over_computed_ones(n3_list, axes):
    seen = oscsolve.ObservedModes(n3_list.degree, n3_list.nu, np.full(len(n3_list), 0.1))
    plots.frequency_echelle(axes, n3_list, observed=seen)
    assert "observed" in key_texts(axes)
    open_ones = [line for line in axes.lines if line.get_markerfacecolor() == "none"]
    assert np.sort(np.concatenate([line.get_ydata() for line in open_ones])) == pytest.approx(
        np.sort(n3_list.nu)
    )


def test_markers_of_mixed_modes_go_with_their_amplitude(shared_data, axes):
    star = oscsolve.read_model(shared_data / "giants" / "red-giant-columns.txt")
    modes = oscsolve.solve_modes(star, [0, 1], (240, 300), surface="isothermal")
    plots.frequency_echelle(axes, modes, separation=21.5)
    dipoles = axes.collections[1]
    area = dipoles.get_sizes()
    own = modes.degree == 1
    # By rising inertia, relative to radial modes, areas fall.
    order = np.argsort(
        modes.inertia[own] / np.interp(modes.nu[own], modes.nu[~own], modes.inertia[~own])
    )
    assert area.min() < 0.3 * area.max() and np.all(np.diff(area[order]) <= 0.0)
    assert "smaller: more inertia" in key_texts(axes)


def test_period_echelle_stands_upright_for_asymptotic_modes(star_n3, axes):
    """High-order g modes of one degree (Tassoul 1980): one nearly vertical ridge."""
    modes = oscsolve.solve_modes(star_n3, [1], (0.01, 0.03), unit="sigma2")
    plots.period_echelle(axes, modes)
    x, period = points(axes).T
    width = axes.get_xlim()[1]
    assert x.size > 5 and np.ptp(x) < 0.1 * width
    assert np.sort(period) == pytest.approx(np.sort(modes.period))
    # Between the second and the third of its width: nothing is cut.
    assert np.all((x > 0.25 * width) & (x < 0.75 * width))


def test_several_degrees_share_a_period_echelle_by_reduced_periods(star_n3, axes):
    modes = oscsolve.solve_modes(star_n3, [1, 2], (0.05, 0.3), unit="sigma2")
    plots.period_echelle(axes, modes, [1, 2])
    reduced = np.sqrt(modes.degree * (modes.degree + 1.0)) * modes.period
    assert np.sort(points(axes)[:, 1]) == pytest.approx(np.sort(reduced[modes.n_g > 0]))
    assert r"\sqrt{\ell(\ell+1)}\,P" in axes.get_xlabel()


def test_spacing_and_inertia_draw_what_the_list_holds(n3_list, axes):
    plots.spacing_plot(axes, n3_list)
    for part in oscsolve.period_spacings(n3_list):
        (drawn,) = lines_of(axes, rf"$\ell={part.degree}$")
        assert drawn.get_ydata() == pytest.approx(part.spacing)
        assert drawn.get_color() == plots.colour(part.degree)
    assert axes.get_ylabel() == "period spacing (s)" and "asymptotic" in key_texts(axes)
    other = plots.inertia_plot(Figure().subplots(), n3_list)
    assert np.concatenate([line.get_ydata() for line in other.lines]) == pytest.approx(
        n3_list.inertia
    )
    assert [line.get_color() for line in other.lines] == [plots.colour(k) for k in range(3)]


@pytest.mark.parametrize("coordinate", ["radius", "log-radius", "mass", "pressure"])
def test_energy_along_any_axis_has_an_area_of_one(n3_list, coordinate):
    row = int(np.flatnonzero((n3_list.degree == 1) & (n3_list.order == 2))[0])
    figure = make_figure(lambda axes: plots.energy_plot(axes, n3_list, row, coordinate=coordinate))
    density, share = figure.axes[0].lines[0], figure.axes[1].lines[0]
    x = density.get_xdata()
    along = np.log(x) if coordinate in ("log-radius", "pressure") else x
    # A trapezoid over five places between points of the model.
    area = abs(np.trapezoid(density.get_ydata(), along))
    assert area == pytest.approx(1.0, rel=1e-3)
    assert share.get_ydata()[-1] == pytest.approx(1.0, abs=1e-6)
    assert np.all(np.diff(share.get_ydata()) >= 0.0)


def test_eigenfunction_shows_both_displacements_and_fills_cavities(n3_list, axes):
    row = int(np.flatnonzero((n3_list.degree == 1) & (n3_list.order == -2))[0])
    plots.displacement_plot(axes, n3_list, row, coordinate="radius")
    radial, horizontal = (
        lines_of(axes, r"$\xi_r$")[0],
        lines_of(axes, r"$\sqrt{\ell(\ell+1)}\,\xi_h$")[0],
    )
    largest = max(np.abs(line.get_ydata()).max() for line in (radial, horizontal))
    assert largest == pytest.approx(1.0)
    mode, star = n3_list.eigenfunction(row), n3_list.star
    x = radial.get_xdata()
    expected = np.interp(x, mode.radius, mode.xi_r * mode.radius * np.sqrt(star.density))
    across = np.interp(x, mode.radius, mode.xi_h * mode.radius * np.sqrt(2.0 * star.density))
    scale = max(np.abs(expected).max(), np.abs(across).max())
    # Straight lines between points against polynomials.
    assert radial.get_ydata() == pytest.approx(expected / scale, abs=1e-3)
    assert horizontal.get_ydata() == pytest.approx(across / scale, abs=1e-3)
    assert {"g cavity", "g node"} <= set(key_texts(axes))
    row = int(np.flatnonzero((n3_list.degree == 1) & (n3_list.order == 3))[0])
    other = plots.displacement_plot(Figure().subplots(), n3_list, row)
    assert {"p cavity", "p node"} <= set(key_texts(other))


def test_radial_modes_have_no_horizontal_displacement_and_no_g_cavity(n3_list, axes):
    row = int(np.flatnonzero((n3_list.degree == 0) & (n3_list.order == 3))[0])
    plots.displacement_plot(axes, n3_list, row)
    texts = key_texts(axes)
    assert r"$\xi_r$" in texts and "g cavity" not in texts and len(texts) == 3


@pytest.mark.parametrize("coordinate", ["radius", "log-radius", "mass"])
def test_rotation_kernels_have_area_one_on_every_axis(n3_list, axes, coordinate):
    rows = np.flatnonzero(n3_list.degree > 0)[:2].tolist()
    plots.rotation_kernel_plot(axes, n3_list, rows, coordinate=coordinate)
    drawn = [line for line in axes.lines if "ell" in str(line.get_label())]
    assert len(drawn) == 2
    for line in drawn:
        x, y = line.get_xdata(), line.get_ydata()
        along = np.log(x[1:]) if coordinate == "log-radius" else x[1:]
        assert np.trapezoid(y[1:], along) == pytest.approx(1.0, rel=5e-3)
    other = plots.running_kernel_plot(Figure().subplots(), n3_list, rows, coordinate=coordinate)
    assert all(line.get_ydata()[-1] == 1.0 for line in other.lines)


@pytest.mark.parametrize(
    ("quantity", "held"), [("c2", "rho"), ("gamma1", "rho"), ("rho", "c2"), ("rho", "gamma1")]
)
def test_structure_kernels_are_drawn_for_every_pair(n3_list, axes, quantity, held):
    plots.structure_kernel_plot(
        axes, n3_list, [0, 5], quantity=quantity, held=held, coordinate="radius"
    )
    drawn = [line for line in axes.lines if "ell" in str(line.get_label())]
    for row, line in zip((0, 5), drawn, strict=True):
        kernel = oscsolve.structure_kernel(n3_list, row, quantity, held)
        assert line.get_ydata() == pytest.approx(kernel)
    assert axes.get_ylabel().startswith("kernel of $")


def test_match_plot_holds_all_pairs(n3_list, axes):
    seen = oscsolve.ObservedModes(n3_list.degree, n3_list.nu + 1.0, np.full(len(n3_list), 0.5))
    found = oscsolve.match_observed(n3_list, seen, surface="none")
    plots.match_plot(axes, n3_list, found)
    assert {"observed", "computed", r"$\ell=1$, corrected"} <= set(key_texts(axes))
    corrected = np.concatenate([line.get_ydata() for line in lines_of(axes, "_corrected")])
    assert np.sort(corrected) == pytest.approx(np.sort(found.corrected))


def test_a_list_that_spans_decades_gets_a_logarithmic_axis(star_n3, axes):
    modes = oscsolve.solve_modes(star_n3, [1], (0.01, 200.0), unit="sigma2")
    assert plots.inertia_plot(axes, modes).get_xscale() == "log"


def test_unsuitable_lists_are_refused(n3_list, axes):
    radial = n3_list.only([0])
    with pytest.raises(InputError, match="no g modes of consecutive order"):
        plots.spacing_plot(axes, radial)
    with pytest.raises(InputError, match="no three g modes of consecutive order"):
        plots.period_echelle(axes, radial)
    few = oscsolve.solve_modes(n3_list.star, [0], (9.0, 17.5), unit="sigma2")
    with pytest.raises(InputError, match="no three p modes of consecutive order"):
        plots.frequency_echelle(axes, few)
    low = oscsolve.solve_modes(n3_list.star, [1], (0.5, 2.0), unit="sigma2")
    with pytest.raises(InputError, match="no p modes to fold"):
        plots.frequency_echelle(axes, low)
    for rows in ([], range(9)):
        with pytest.raises(InputError, match=f"kernels of 1 to 8 modes; got {len(rows)}"):
            plots.rotation_kernel_plot(axes, n3_list, rows)
    with pytest.raises(InputError, match="kernels are those of c2, rho, gamma1"):
        plots.structure_kernel_plot(axes, n3_list, [0], quantity="pressure")
    empty = oscsolve.solve_modes(n3_list.star, [0], (8.3, 8.6), unit="sigma2")
    with pytest.raises(InputError, match="no oscillating modes"):
        plots.inertia_plot(axes, empty)


@pytest.mark.parametrize(
    ("ending", "start"), [(".png", b"\x89PNG"), (".pdf", b"%PDF"), (".svg", b"<?xml")]
)
def test_files_have_the_format_of_their_ending_and_never_change(tmp_path, n3_list, ending, start):
    def draw(axes):
        return plots.inertia_plot(axes, n3_list)

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


def test_the_gallery_holds_what_suits_the_list(n3_list):
    full = [plate.title for plate in plots.gallery(n3_list)]
    assert "Where waves propagate" in full and "Inertia" in full
    assert "What rotational splittings sense" in full
    radial = [plate.title for plate in plots.gallery(n3_list.only([0]))]
    assert "Frequencies folded" in radial and "Period spacing" not in radial
    assert all(plate.svg().startswith(b"<?xml") for plate in plots.gallery(n3_list.only([0])))
