"""The energy integral and orthogonality hold on every kind of star, and see what is wrong."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

import oscsolve
from oscsolve.seismology.checks import coarse_points
from oscsolve.star.build import layered_sphere

#: Solver tolerance 1e-8; interpolation between the points adds less than that on these stars.
NEAR = 3e-8


def _largest(modes):
    integral, overlaps = oscsolve.integral_check(modes), oscsolve.orthogonality(modes)
    assert integral.sigma2.shape == overlaps.overlap.shape == modes.nu.shape
    return abs(integral.difference).max(), overlaps.overlap.max()


def _with_eigenfunctions(modes, **changes):
    return dataclasses.replace(
        modes, eigenfunctions=dataclasses.replace(modes.eigenfunctions, **changes)
    )


def test_polytrope(n3_modes):
    assert max(_largest(n3_modes)) < 1e-9


@pytest.mark.parametrize("gravity", ["full", "cowling"])
@pytest.mark.parametrize("index", [0.0, 1.5, 4.0])
def test_polytropes_with_and_without_their_gravity_field(index, gravity):
    star = oscsolve.polytrope(index)
    modes = oscsolve.solve_modes(star, (0, 1, 2), (2, 150), unit="sigma2", gravity=gravity)
    assert len(modes) > 15
    assert max(_largest(modes)) < 1e-7


def test_demo_star_under_an_atmosphere(lantern_modes):
    assert max(_largest(lantern_modes)) < NEAR


def test_the_atmosphere_belongs_to_the_inner_product(lantern_modes):
    free = dataclasses.replace(lantern_modes, options={**lantern_modes.options, "surface": "free"})
    assert oscsolve.orthogonality(free).overlap.max() > 100 * NEAR


def test_density_jumps_belong_to_the_integral():
    star = layered_sphere([(0.6, 3.0), (1.0, 1.0)])
    modes = oscsolve.solve_modes(star, (0, 1, 2), (0.5, 60), unit="sigma2")
    assert -1 in modes.order[modes.degree == 2]
    # Rows of the two sides of the jump differ in p' and so in xi_h.
    assert max(_largest(modes)) < 1e-6


def test_solar_model(shared_data):
    star = oscsolve.read_model(shared_data / "solar" / "standard.fgong")
    modes = oscsolve.solve_modes(star, (0, 1, 2), (200, 2500), surface="isothermal")
    # The file is rounded to 10 digits, so that its N^2 and density disagree near the centre.
    assert max(_largest(modes)) < 1e-6


def test_subgiant(shared_data):
    star = oscsolve.read_model(shared_data / "subgiant" / "structure-columns.txt")
    modes = oscsolve.solve_modes(star, (0, 1, 2), (600, 1500))
    assert "mixed" in modes.kind
    assert max(_largest(modes)) < 1e-6


def test_a_wrong_frequency_is_seen(n3_modes):
    sigma2 = n3_modes.sigma2.copy()
    sigma2[7] *= 1.0 + 1e-4
    check = oscsolve.integral_check(dataclasses.replace(n3_modes, sigma2=sigma2))
    assert check.worst == 7
    # The integral itself stays; only what it is compared with has moved.
    assert check.difference[7] == pytest.approx(-1e-4, rel=0.05)


def test_a_damaged_eigenfunction_is_seen_by_both(n3_modes):
    row = int(np.flatnonzero(n3_modes.degree == 2)[3])
    xi_r = n3_modes.eigenfunctions.xi_r.copy()
    xi_r[row, 300:400] *= 1.01
    damaged = _with_eigenfunctions(n3_modes, xi_r=xi_r)
    assert oscsolve.integral_check(damaged).worst == row
    overlaps = oscsolve.orthogonality(damaged)
    assert row in (overlaps.worst, overlaps.partner[overlaps.worst])
    assert overlaps.overlap.max() > 1e-4


def test_blocks_do_not_change_overlaps(n3_modes, monkeypatch):
    whole = oscsolve.orthogonality(n3_modes)
    monkeypatch.setattr("oscsolve.seismology.checks._BLOCK", 40_000)
    # Overlaps are round-off of sums of order one.
    np.testing.assert_allclose(oscsolve.orthogonality(n3_modes).overlap, whole.overlap, atol=1e-13)


def test_a_list_read_back_gives_the_same(n3_modes, tmp_path):
    oscsolve.save_modes(n3_modes, tmp_path / "n3.h5")
    back = oscsolve.load_modes(tmp_path / "n3.h5")
    np.testing.assert_array_equal(
        oscsolve.integral_check(back).sigma2, oscsolve.integral_check(n3_modes).sigma2
    )


def test_lists_without_eigenfunctions_are_refused(star_n3):
    modes = oscsolve.solve_modes(
        star_n3,
        (1,),
        (10, 40),
        unit="sigma2",
        options=oscsolve.SolveOptions(eigenfunctions=False),
    )
    for function in (oscsolve.integral_check, oscsolve.orthogonality, oscsolve.energy_share):
        with pytest.raises(oscsolve.InputError, match="holds no eigenfunctions"):
            function(modes)


def test_an_empty_list_has_no_worst_mode(star_n3):
    modes = oscsolve.solve_modes(star_n3, (0,), (2, 3), unit="sigma2")
    assert oscsolve.integral_check(modes).worst is None
    assert oscsolve.orthogonality(modes).worst is None


def test_points_too_few_for_a_mode_are_a_doubt(n3_modes, giant_modes):
    assert coarse_points(n3_modes) == ()
    (found,) = coarse_points(giant_modes)
    assert (found.severity, found.code) == ("doubt", "coarse-points")
    assert found.size > 1e-3
