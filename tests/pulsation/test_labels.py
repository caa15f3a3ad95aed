"""Labels by nodes and by counts: equal where node counting holds, consecutive everywhere."""

from __future__ import annotations

import numpy as np
import pytest

from oscsolve import ModeSet, SolveOptions, layered_sphere, polytrope, solve_modes
from oscsolve.pulsation.labels import _crossings, count_labels, kinds

BARE = SolveOptions(eigenfunctions=False)


def assert_labels_agree(modes: ModeSet, gravity: str = "full") -> None:
    """Node count equals count label for every mode, and orders are consecutive."""
    assert modes.complete and len(modes) > 0
    bad = np.flatnonzero(modes.relabelled)
    listed = [(int(modes.degree[i]), int(modes.order[i])) for i in bad[:5]]
    assert bad.size == 0, f"nodes and counts differ at (l, n) = {listed}"
    assert not np.any(modes.census.relabelled)
    for degree in np.unique(modes.degree):
        order = modes.order[modes.degree == degree]
        skipped = (order[:-1] == -1) & (degree == 1) & (gravity == "full")
        assert np.array_equal(np.diff(order), np.where(skipped, 2, 1)), degree


@pytest.mark.parametrize("gravity", ["full", "cowling"])
@pytest.mark.parametrize("index", [1, 1.5, 2, 3])
def test_labels_agree_in_polytropes_of_low_condensation(index, gravity):
    low = 0.5 if index > 1.5 else 1.0
    modes = solve_modes(
        polytrope(index), (0, 1, 2, 3), (low, 300.0), unit="sigma2", gravity=gravity, options=BARE
    )
    assert_labels_agree(modes, gravity)


@pytest.mark.parametrize("index", [3.5, 4, 4.5])
def test_dipole_variables_label_condensed_polytropes(index):
    """Plain counting of xi_r fails from n = 3.5 on (shared/reference/README.md); Takata (2006)."""
    modes = solve_modes(polytrope(index), (0, 1), (2.0, 500.0), unit="sigma2", options=BARE)
    assert_labels_agree(modes)
    dipole = modes.degree == 1
    # The plain count would name p1 wrongly there; in these variables it is p1.
    assert 1 in modes.order[dipole] and -1 in modes.order[dipole]


def test_plain_counting_fails_where_the_reference_says_so():
    """n = 4, l = 1: p1 has one p-type and one g-type zero of xi_r, p2 two and one."""
    modes = solve_modes(polytrope(4), [1], (5.0, 60.0), unit="sigma2")
    p1 = int(np.flatnonzero(modes.order == 1)[0])
    for index, expected in ((p1, (1, 1)), (p1 + 1, (2, 1))):
        f = modes.eigenfunction(index)
        inside = slice(1, -2)
        assert _crossings(f.xi_r[inside], f.xi_h[inside]) == expected


def test_labels_agree_in_the_sun(sun):
    modes = solve_modes(sun, (0, 1, 2, 3), (150, 2500), options=BARE)
    assert_labels_agree(modes)
    assert set(modes.kind) == {"radial", "p", "g", "mixed"}
    f_modes = modes.order == 0
    assert np.array_equal(modes.n_p[f_modes], modes.n_g[f_modes]) and np.sum(f_modes) == 2


def test_labels_agree_in_a_subgiant(subgiant):
    """Its mixed modes, -4 to 11 for l = 1: the mass column of the innermost points is coarse."""
    modes = solve_modes(subgiant, (0, 1, 2), (300, 1200), options=BARE)
    assert_labels_agree(modes)
    assert np.any(modes.kind == "mixed")


def test_labels_agree_in_a_red_giant(giant):
    modes = solve_modes(giant, (0, 1), (100, 130), options=BARE)
    assert_labels_agree(modes)
    mixed = modes.kind[modes.degree == 1]
    assert np.all(mixed == "mixed") and np.all(modes.n_g[modes.degree == 1] > 70)


def test_interface_mode_counts_as_the_first_g_mode():
    """The wave on a density jump is the gravity wave of a layer of no thickness."""
    star = layered_sphere([(0.6, 3.0), (1.0, 1.0)], 1e4)
    modes = solve_modes(star, [2, 3], (0.5, 5.0), unit="sigma2", options=BARE)
    assert modes.order.tolist() == [-1, 0, -1, 0]


def test_radial_orders_start_at_one():
    modes = solve_modes(polytrope(3), [0], (1.0, 60.0), unit="sigma2", options=BARE)
    assert modes.order.tolist() == [1, 2, 3, 4]
    assert np.all(modes.n_g == 0) and np.all(modes.kind == "radial")


def test_count_label_takes_off_what_any_medium_has():
    negative = np.array([2 * 10 * 3 + 1, 2 * 10 * 3 + 2, 2 * 10 * 3])
    assert count_labels(negative, 10, 3, 2, dipole=False).tolist() == [0, -1, 1]
    # l = 1 in full gravity: the f mode is the translation at sigma2 = 0, g1 comes next below p1.
    assert count_labels(negative, 10, 3, 2, dipole=True).tolist() == [-1, -2, 1]


def test_crossings_turn_by_the_sense_of_the_phase_diagram():
    """Counter-clockwise is p-type: xi_r falls through zero where xi_h > 0, or rises where < 0."""
    angle = np.linspace(0.1, 4.0 * np.pi + 0.2, 200)
    assert _crossings(np.cos(angle), np.sin(angle)) == (4, 0)
    assert _crossings(np.cos(angle), -np.sin(angle)) == (0, 4)
    assert _crossings(np.array([1.0, 0.0, -1.0]), np.ones(3)) == (1, 0), "a zero on a point"


def test_kinds_follow_the_node_counts():
    n_p, n_g = np.array([0, 2, 0, 3]), np.array([0, 0, 4, 1])
    assert kinds(2, n_p, n_g, n_p - n_g).tolist() == ["f", "p", "g", "mixed"]
    assert kinds(0, n_p, n_g, n_p + 1).tolist() == ["radial"] * 4
