"""The demo stars are what they stand for: facts of the trade, all "common practice".

Ranges of periods are those in which pulsators of each kind are seen.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

import oscsolve
from oscsolve import ModeSet, StarModel

FOLDER = Path(__file__).resolve().parents[2] / "models_demo"
BARE = oscsolve.SolveOptions(eigenfunctions=False)
HOUR, DAY = 3600.0, 86400.0


def star(number: int) -> StarModel:
    (file,) = (path for path in FOLDER.glob(f"lantern-{number}.*"))
    return oscsolve.read_model(file)


def solved(number: int, degrees: list[int], band: tuple[float, float], unit: str) -> ModeSet:
    modes = oscsolve.solve_modes(star(number), degrees, band, unit=unit, options=BARE)
    assert modes.complete
    return modes


def test_every_file_is_marked_as_invented_and_fit_for_use():
    files = sorted(FOLDER.glob("lantern-*.fgong")) + sorted(FOLDER.glob("lantern-*.h5"))
    assert len(files) >= 10
    table = (FOLDER / "README.md").read_text()
    for file in files:
        assert f"`{file.name}`" in table, "the README tells the story of every star"
        found = oscsolve.inspect_model(oscsolve.read_model(file))
        assert found.usable, file.name
        assert all(item.code == "atmosphere-short" for item in found if item.severity == "doubt")
        if file.suffix == ".h5":
            assert "invented" in oscsolve.read_model(file).name


@pytest.mark.parametrize(
    ("number", "shortest", "longest"),
    [
        (4, 0.25 * HOUR, 8.0 * HOUR),  # low-order p modes of A-F dwarfs
        (7, 2.0 * HOUR, 12.0 * HOUR),  # hotter B stars: several hours
        (10, 60.0, 600.0),  # hot subdwarfs: 1 to 10 min
    ],
)
def test_low_order_radial_modes_have_the_periods_of_their_kind(number, shortest, longest):
    modes = solved(number, [0], (3.0, 25.0), "sigma2")
    low = modes.period[modes.order <= 2]
    assert 1 in modes.order and np.all((low >= shortest) & (low <= longest))


def test_the_supergiant_pulsates_in_days_to_months():
    modes = solved(8, [0], (3.0, 20.0), "sigma2")
    fundamental = modes.period[modes.order == 1][0]
    assert 2.0 * DAY < fundamental < 60.0 * DAY


def test_the_horizontal_branch_star_pulsates_in_fundamental_or_first_overtone():
    """0.6 to 0.8 solar masses; about 0.4 to 0.9 d and 0.2 to 0.5 d."""
    modes = solved(9, [0], (3.0, 30.0), "sigma2")
    fundamental, overtone = (modes.period[modes.order == n][0] / DAY for n in (1, 2))
    assert 0.4 < fundamental < 0.9 and 0.2 < overtone < 0.5
    assert 0.7 < overtone / fundamental < 0.78


def test_the_subgiant_has_mixed_modes_among_its_p_modes():
    """A mode of every few that is mixed, with the inertia of its core."""
    modes = oscsolve.solve_modes(
        star(2), [0, 1], (500.0, 950.0), surface="isothermal", options=BARE
    )
    mixed = (modes.degree == 1) & (modes.kind == "mixed")
    radial = modes.degree == 0
    assert modes.complete and np.count_nonzero(mixed) > np.count_nonzero(radial)
    alike = np.interp(modes.nu[mixed], modes.nu[radial], np.log(modes.inertia[radial]))
    assert np.max(np.log(modes.inertia[mixed]) - alike) > 0.5


def test_high_order_g_modes_of_the_f_dwarf_take_half_a_day_to_three():
    modes = solved(5, [1], (0.5, 3.0), "d")
    assert modes.order.min() <= -20 and np.all(modes.kind == "g")


def test_g_modes_of_the_slowly_pulsating_b_star_take_days_and_feel_its_graded_zone():
    modes = solved(6, [1], (0.8, 4.0), "d")
    assert len(modes) > 20 and np.all(modes.order < 0)
    spacing = np.abs(np.diff(modes.period))
    assert np.ptp(spacing) > 0.02 * np.median(spacing)


def test_the_hotter_b_star_has_p_and_g_modes_of_several_hours():
    modes = solved(7, [1, 2], (2.0, 10.0), "h")
    assert np.any(modes.order > 0) and np.any(modes.order < 0)


def test_the_rapid_oscillator_holds_modes_near_1500_uhz():
    cutoff = oscsolve.inspect_model(star(12)).figures.acoustic_cutoff
    modes = solved(12, [0, 1], (1300.0, 1700.0), "uHz")
    assert cutoff > 1700.0 and np.all(modes.order > 10) and len(modes) > 8


def test_p_modes_run_where_the_frequency_exceeds_n_and_s_and_g_modes_below_both():
    """Energy of pure modes of the sun-like star lies where their kind can propagate."""
    modes = oscsolve.solve_modes(star(1), [1], (100.0, 3000.0), surface="isothermal")
    share = oscsolve.energy_share(modes)
    assert np.all(share[modes.order > 10] < 0.05)
    assert np.all(share[modes.order < -3] > 0.9)


def test_the_observed_list_is_found_again_with_its_surface_term():
    """Made with a power law and noise of 0.15 uHz: a reduced chi2 of one."""
    modes = oscsolve.solve_modes(
        star(1), [0, 1, 2], (1800.0, 4200.0), surface="isothermal", options=BARE
    )
    found = oscsolve.match_observed(modes, FOLDER / "lantern-1-observed.csv", surface="power")
    assert found.unmatched_observed.size == 0
    assert found.reduced_chi2 == pytest.approx(1.0, abs=0.5)
