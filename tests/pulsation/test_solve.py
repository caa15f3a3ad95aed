"""`solve_modes` as users meet it: arguments, messages, findings, what the result records."""

from __future__ import annotations

import numpy as np
import pytest

from oscsolve import BandError, InputError, SolveOptions, __version__, polytrope, solve_modes
from oscsolve.pulsation import degree as degree_module
from oscsolve.pulsation.boundary import atmosphere_cutoff
from oscsolve.star.profile import Profile

BAND = (5.0, 30.0)


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"gravity": "newton"}, "gravity must be one of full, cowling; got 'newton'"),
        ({"surface": "open"}, "surface must be one of free, isothermal; got 'open'"),
        ({"surface": "isothermal"}, "this star has an edge .* use surface='free'"),
        ({"tolerance": 0.0}, "tolerance must be from 1e-13 to 1e-2; got 0"),
        ({"tolerance": 0.1}, "tolerance must be from 1e-13 to 1e-2; got 0.1"),
        ({"tolerance": float("nan")}, "tolerance must be from 1e-13 to 1e-2; got nan"),
        ({"unit": "Hz"}, "unit 'Hz' is not known; use one of uHz, mHz"),
        ({"degrees": []}, r"whole numbers, at least one; got \[\]"),
        ({"degrees": [1.5]}, r"whole numbers, at least one; got \[1.5\]"),
        ({"degrees": ["p"]}, r"degrees must be whole numbers; got \['p'\]"),
        ({"degrees": 2}, "degrees must be whole numbers; got 2"),
        ({"degrees": [-1, 0]}, r"degrees must be from 0 to 10000; got \[-1, 0\]"),
        ({"degrees": [10_001]}, "degrees must be from 0 to 10000; got"),
        ({"degrees": [2, 1, 2]}, r"each degree is given once; got \[2, 1, 2\]"),
    ],
)
def test_wrong_arguments_are_refused_in_one_line(changes, message):
    arguments = {"degrees": [2], "band": BAND, "unit": "sigma2", **changes}
    with pytest.raises(InputError, match=message) as caught:
        solve_modes(polytrope(3), **arguments)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize(
    ("band", "unit", "message"),
    [
        ((30.0, 5.0), "sigma2", "band 30:5 sigma2 holds nothing; the lower limit comes first"),
        ((5.0, 5.0), "uHz", "band 5:5 uHz holds nothing"),
        ((5.0,), "uHz", r"a band is two numbers, low and high; got \(5.0,\)"),
        ("ab", "uHz", "a band is two numbers, low and high; got 'ab'"),
        ((0.0, np.inf), "uHz", "band 0:inf uHz is not finite; give two numbers"),
        ((np.nan, 1.0), "d", "band nan:1 d is not finite"),
        ((0.0, 1.0), "h", "band 0:1 h: a period must be above zero"),
        ((0.0, 30.0), "sigma2", "the band begins at 0 uHz; for l > 0 it must begin above zero"),
        ((-1.0, 30.0), "sigma2", "for l > 0 it must begin above zero, where g modes pile up"),
        ((1e-7, 30.0), "sigma2", r"l = 2 in this band .* more than 2000; choose a higher"),
    ],
)
def test_wrong_bands_are_refused_in_one_line(band, unit, message):
    with pytest.raises(BandError, match=message) as caught:
        solve_modes(polytrope(3), [2], band, unit=unit, options=SolveOptions(most_cells=2000))
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"stages": 1}, "stages must be 2 to 6; got 1"),
        ({"stages": 7}, "stages must be 2 to 6; got 7"),
        ({"phase_per_cell": 0.0}, r"phase_per_cell must be in \(0, 3\]; got 0"),
        ({"phase_per_cell": 3.5}, r"phase_per_cell must be in \(0, 3\]; got 3.5"),
        ({"cells_factor": 0}, "cells_factor must be at least 1 and most_cells at least 10"),
        ({"most_cells": 9}, "cells_factor must be at least 1 and most_cells at least 10"),
        ({"threads": 0}, "threads must be at least 1, or None; got 0"),
    ],
)
def test_options_out_of_range_are_refused(changes, message):
    with pytest.raises(InputError, match=message):
        SolveOptions(**changes)


def test_a_band_above_the_cutoff_of_an_atmosphere_is_refused(sun):
    with pytest.raises(BandError, match=r"above the acoustic cut-off of the atmosphere \(5"):
        solve_modes(sun, [0], (9000.0, 9500.0), surface="isothermal")


def test_a_band_of_gravity_waves_that_escape_is_refused(sun):
    with pytest.raises(BandError, match=r"gravity waves of l = 3 escape .* use a free surface"):
        solve_modes(sun, [3], (1.0, 2.0), surface="isothermal")


def test_a_band_that_reaches_the_cutoff_is_cut_and_says_so(sun):
    modes = solve_modes(sun, [0, 1], (5000.0, 9000.0), surface="isothermal")
    assert modes.complete
    assert [f.code for f in modes.findings] == ["band-cut-l0", "band-cut-l1"]
    cutoff = np.sqrt(atmosphere_cutoff(Profile(sun), 0).high) * sun.nu_dynamical
    assert modes.census.high[0] == pytest.approx(cutoff, rel=1e-8)
    assert np.all(modes.nu < cutoff)


def test_a_free_surface_above_the_cutoff_leaves_a_doubt(sun):
    options = SolveOptions(eigenfunctions=False)
    modes = solve_modes(sun, [0, 1], (5200.0, 5900.0), options=options)
    assert [f.code for f in modes.findings] == ["above-cutoff"], "once, not for each degree"
    assert "exist only because a free surface reflects everything" in modes.findings[0].message


def test_a_band_chosen_by_the_program_is_told(sun):
    modes = solve_modes(polytrope(3), [1])
    found = next(f for f in modes.findings if f.code == "band-chosen")
    assert "no band was given;" in found.message and modes.options["band_chosen_by_program"]
    assert f"{modes.options['band_low_uHz']:g} to" in found.message
    assert np.any(modes.order < -5) and np.any(modes.order > 5)
    sunlike = solve_modes(sun, [0], options=SolveOptions(eigenfunctions=False))
    # Where convection excites: a quarter to nine tenths of the cut-off of about 5200 uHz.
    assert 1000 < sunlike.census.low[0] < 1800 and 4000 < sunlike.census.high[0] < 5200


def test_the_number_of_threads_changes_no_digit():
    star = polytrope(3)
    serial, parallel = (
        solve_modes(
            star,
            [0, 1, 2],
            (2.0, 60.0),
            unit="sigma2",
            verify=True,
            options=SolveOptions(threads=threads),
        )
        for threads in (1, 3)
    )
    np.testing.assert_array_equal(serial.nu, parallel.nu)
    np.testing.assert_array_equal(serial.nu_second, parallel.nu_second)
    np.testing.assert_array_equal(serial.eigenfunctions.xi_h, parallel.eigenfunctions.xi_h)


def test_a_tolerance_out_of_reach_is_reported():
    options = SolveOptions(most_cells=1300, phase_per_cell=3.0)
    modes = solve_modes(
        polytrope(4), [2], (0.15, 30.0), unit="sigma2", tolerance=1e-13, options=options
    )
    assert modes.complete
    found = next(f for f in modes.findings if f.code == "tolerance-missed-l2")
    late = modes.nu_error > 1e-13 * modes.nu
    assert found.severity == "doubt" and found.message.startswith(
        f"{np.sum(late)} mode(s) of l = 2"
    )
    assert found.size == pytest.approx(np.max(modes.nu_error / modes.nu), rel=1e-12)


def test_error_bars_meet_the_tolerance_that_is_asked_for():
    for tolerance in (1e-6, 1e-9, 1e-11):
        modes = solve_modes(polytrope(4), [2], (0.5, 300.0), unit="sigma2", tolerance=tolerance)
        assert np.all(modes.nu_error <= tolerance * modes.nu) and not modes.findings


def test_sub_bands_that_bound_memory_change_nothing(monkeypatch):
    whole = solve_modes(polytrope(3), [0, 2], (0.5, 300.0), unit="sigma2", tolerance=1e-11)
    monkeypatch.setattr(degree_module, "_MODES_AT_ONCE", 6)
    pieces = solve_modes(polytrope(3), [0, 2], (0.5, 300.0), unit="sigma2", tolerance=1e-11)
    for name in ("degree", "order", "n_p", "n_g", "kind"):
        assert np.array_equal(getattr(pieces, name), getattr(whole, name)), name
    assert np.array_equal(pieces.census.counted, whole.census.counted) and pieces.complete
    assert pieces.sigma2 == pytest.approx(whole.sigma2, rel=4e-11)
    assert pieces.eigenfunctions.xi_r.shape == whole.eigenfunctions.xi_r.shape


def test_degrees_come_sorted_whatever_order_they_are_given_in():
    modes = solve_modes(polytrope(3), (3, 0, 2), BAND, unit="sigma2")
    assert np.unique(modes.degree).tolist() == [0, 2, 3] == modes.census.degree.tolist()
    assert np.all(np.diff(modes.degree) >= 0)


def test_a_band_without_modes_is_complete_and_empty():
    modes = solve_modes(polytrope(3), [0, 2], (8.3, 8.6), unit="sigma2")
    assert len(modes) == 0 and modes.complete
    assert modes.census.counted.tolist() == [0, 0]
    assert modes.eigenfunctions.xi_r.shape == (0, modes.star.radius.size)


def test_the_census_counts_what_is_listed():
    modes = solve_modes(polytrope(3), [0, 1, 2], BAND, unit="sigma2")
    assert np.array_equal(modes.census.counted, np.bincount(modes.degree))
    low = np.sqrt(BAND[0]) * modes.star.nu_dynamical
    assert modes.census.low == pytest.approx(np.full(3, low), rel=1e-14)


def test_the_result_records_what_was_asked():
    options = SolveOptions(stages=5, phase_per_cell=0.6, most_cells=5000)
    star = polytrope(3)
    modes = solve_modes(
        star, (2, 0), BAND, unit="sigma2", gravity="cowling", tolerance=1e-9, options=options
    )
    recorded = modes.options
    assert recorded["degrees"] == "0,2" and recorded["gravity"] == "cowling"
    assert recorded["tolerance"] == 1e-9 and recorded["stages"] == 5
    assert recorded["phase_per_cell"] == 0.6 and recorded["most_cells"] == 5000
    assert recorded["band_high_uHz"] == pytest.approx(np.sqrt(30.0) * star.nu_dynamical)
    assert not recorded["band_chosen_by_program"]
    assert modes.star is star and modes.program_version == __version__


def test_progress_goes_from_nothing_to_all_degrees():
    seen: list[tuple[int, int, str]] = []
    solve_modes(
        polytrope(3), (0, 2, 5), BAND, unit="sigma2", progress=lambda *step: seen.append(step)
    )
    assert [(done, total) for done, total, _ in seen] == [(0, 3), (1, 3), (2, 3), (3, 3)]
    assert seen[-1][2] == "degree 5"


def test_high_degrees_are_solved_like_any_other():
    """f modes of high degree are surface waves: sigma2 -> l (deep-water waves, g = 1)."""
    modes = solve_modes(polytrope(3), [300], (200.0, 320.0), unit="sigma2")
    f = modes.sigma2[modes.order == 0]
    # sigma2 = l (1 - 1/l ...) for spheres: one part in l is what the plane formula misses.
    assert modes.complete and f == pytest.approx([300.0], rel=0.02)


def test_modes_of_a_similar_star_change_nothing_but_the_way():
    band, wanted = (0.5, 300.0), polytrope(3)
    plain = solve_modes(wanted, [0, 1, 2], band, unit="sigma2")
    for index, gravity in ((3.05, "full"), (2.0, "cowling")):
        near = solve_modes(polytrope(index), [0, 1, 2, 3], band, unit="sigma2", gravity=gravity)
        led = solve_modes(wanted, [0, 1, 2], band, unit="sigma2", similar=near)
        assert led.complete and np.array_equal(led.order, plain.order)
        assert np.all(np.abs(led.nu - plain.nu) <= plain.nu_error)


def test_high_bands_of_radial_modes_raise_no_warning():
    """Regression: iterates outside their fences once overflowed in the bound of the error."""
    modes = solve_modes(polytrope(3), [0], (2e4, 3e4), unit="sigma2")
    assert modes.complete and len(modes) > 20
