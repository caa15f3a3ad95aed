"""Nodes, cavities and coordinates: what figures of the interior are made of."""

from __future__ import annotations

import numpy as np
import pytest

import oscsolve
from oscsolve import InputError
from oscsolve.plots.choose import contrasting_rows, folds_periods, lightest_row, spread
from oscsolve.plots.coordinate import COORDINATES, coordinate_of
from oscsolve.plots.interior import cavities, counted_nodes, nodes_of, trace
from oscsolve.seismology.integrals import Quadrature, point_structure


def test_nodes_drawn_are_those_that_labels_count(n3_list):
    """n_p and n_g of l = 1 count in the variables of Takata (2006), p modes one more than those."""
    quadrature = Quadrature(n3_list)
    along = coordinate_of(n3_list.star, "radius")
    for row in range(len(n3_list)):
        nodes = counted_nodes(quadrature, row, along)
        degree, n_p, n_g = (getattr(n3_list, name)[row] for name in ("degree", "n_p", "n_g"))
        extra = 1 if degree == 0 or (degree == 1 and n_p > n_g) else 0
        found = np.count_nonzero(nodes.acoustic), np.count_nonzero(~nodes.acoustic)
        assert found == (n_p - extra, n_g), (degree, n3_list.order[row])
        assert np.all(np.diff(nodes.place) > 0.0)


def test_nodes_of_mixed_modes_are_those_that_labels_count(shared_data):
    star = oscsolve.read_model(shared_data / "giants" / "red-giant-columns.txt")
    modes = oscsolve.solve_modes(star, [1], (250, 270))
    quadrature, along = Quadrature(modes), coordinate_of(star)
    assert along.name == "log-radius" and len(modes) > 2
    for row in range(len(modes)):
        nodes = counted_nodes(quadrature, row, along)
        assert np.count_nonzero(~nodes.acoustic) == modes.n_g[row]


def test_zeros_of_the_radial_displacement_are_where_it_vanishes(n3_list):
    row = int(np.flatnonzero((n3_list.degree == 0) & (n3_list.order == 4))[0])
    along = coordinate_of(n3_list.star, "radius")
    nodes = nodes_of(trace(Quadrature(n3_list), row), 0, along)
    mode = n3_list.eigenfunction(row)
    there = np.interp(nodes.place, mode.radius, mode.xi_r)
    # Straight lines between the points of the model are off by the curvature over a step.
    assert nodes.place.size == 3 and nodes.acoustic.all()
    assert np.all(np.abs(there) < 1e-3 * np.abs(mode.xi_r).max())


def test_cavities_end_where_the_frequency_meets_n_or_lamb(star_n3):
    at, sigma2 = point_structure(star_n3), 2.0
    found = list(cavities(at, at.x, 1, sigma2))
    assert [kind for kind, _, _ in found][0] == "g"
    _, first, last = found[0]
    # Ends are sought at eight places between two points.
    step = np.diff(at.x).max() / 8.0
    assert np.interp(first, at.x, at.n2) == pytest.approx(sigma2, abs=50 * step)
    lamb2 = 2.0 * np.interp(last, at.x[1:], (at.c2[1:] / at.x[1:] ** 2))
    assert min(abs(lamb2 - sigma2), abs(np.interp(last, at.x, at.n2) - sigma2)) < 50 * step
    radial = {kind for kind, _, _ in cavities(at, at.x, 0, 20.0)}
    assert radial == {"p"}


@pytest.mark.parametrize("name", COORDINATES[1:])
def test_a_density_along_any_axis_has_the_same_integral(star_n3, name):
    """int f dx is int f stretch d(coordinate): here the mass, f = 4 pi rho x^2."""
    at, along = point_structure(star_n3), coordinate_of(star_n3, name)
    place = along.place(at)
    along_axis = np.log(place[1:-1]) if along.logarithmic else place[1:-1]
    density = (4.0 * np.pi * at.rho * at.x**2 * along.stretch(at))[1:-1]
    # Trapezoids over the points of the model, its innermost and outermost cell left out.
    assert abs(np.trapezoid(density, along_axis)) == pytest.approx(1.0, rel=1e-3)


def test_axes_suit_the_star(shared_data):
    suited = {
        "solar/standard.fgong": "radius",
        "giants/red-giant-columns.txt": "log-radius",
        "dwarfs/white-dwarf-columns.txt": "pressure",
    }
    for file, name in suited.items():
        assert coordinate_of(oscsolve.read_model(shared_data / file)).name == name


def test_axes_of_analytic_stars():
    assert coordinate_of(oscsolve.polytrope(3)).name == "radius"
    # Nothing is stably stratified in it.
    assert coordinate_of(oscsolve.uniform_sphere()).name == "radius"
    with pytest.raises(InputError, match="the axis must be one of auto, radius"):
        coordinate_of(oscsolve.polytrope(3), "depth")


def test_modes_in_the_middle_are_taken(n3_list):
    light, (first, second) = lightest_row(n3_list), contrasting_rows(n3_list)
    assert light == first and n3_list.degree[first] == n3_list.degree[second] == 1
    assert n3_list.inertia[first] < n3_list.inertia[second]
    assert n3_list.degree[lightest_row(n3_list.only([0]))] == 0
    with pytest.raises(InputError, match="no nonradial mode"):
        contrasting_rows(n3_list.only([0]))


def test_lines_keep_apart():
    nu = np.array([1.0, 1.01, 1.2, 1.21, 1.5])
    assert spread(nu, np.arange(5), 1.1).tolist() == [0, 2, 4]


def test_periods_are_folded_where_g_modes_prevail(n3_list, star_n3):
    low = oscsolve.solve_modes(star_n3, [1], (0.1, 3.0), unit="sigma2")
    assert folds_periods(low) and not folds_periods(n3_list.only([0]))
