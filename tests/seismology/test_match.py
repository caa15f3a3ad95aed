"""Mode lists against observed ones: the Sun, a subgiant, made-up lists, and what is refused."""

from __future__ import annotations

import pickle
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import oscsolve
from oscsolve import InputError, Likelihood, ObservedModes, match_observed, read_observed
from oscsolve.seismology.match import _chi2, _layer


@pytest.fixture(scope="module")
def sun_modes(shared_data: Path) -> oscsolve.ModeSet:
    star = oscsolve.read_model(shared_data / "solar" / "standard.fgong")
    options = oscsolve.SolveOptions(eigenfunctions=False)
    return oscsolve.solve_modes(
        star, (0, 1, 2, 3), (900.0, 4700.0), surface="isothermal", options=options
    )


@pytest.fixture(scope="module")
def sun_seen(shared_data: Path) -> ObservedModes:
    """79 modes of the Sun: Broomhall et al. 2009, MNRAS 396, L100."""
    return read_observed(shared_data / "solar" / "observed-low-degree.csv")


@pytest.fixture(scope="module")
def subgiant_modes(shared_data: Path) -> oscsolve.ModeSet:
    star = oscsolve.read_model(shared_data / "subgiant" / "structure-columns.txt")
    options = oscsolve.SolveOptions(eigenfunctions=False)
    band = (900.0, 2600.0)
    return oscsolve.solve_modes(star, (0, 1, 2, 3), band, surface="isothermal", options=options)


@pytest.fixture(scope="module")
def subgiant_seen(shared_data: Path) -> ObservedModes:
    """38 modes, Lund et al. 2017, ApJ 835, 172."""
    return read_observed(shared_data / "subgiant" / "observed.csv")


def without_orders(seen: ObservedModes) -> ObservedModes:
    return ObservedModes(seen.degree, seen.nu, seen.nu_error)


@pytest.mark.parametrize("orders", [True, False])
def test_all_modes_of_the_observed_sun_find_their_published_orders(sun_modes, sun_seen, orders):
    found = match_observed(sun_modes, sun_seen if orders else without_orders(sun_seen))
    assert found.pair.size == len(sun_seen) == 79 and found.unmatched_observed.size == 0
    assert np.array_equal(sun_modes.degree[found.row], sun_seen.degree[found.pair])
    assert np.array_equal(sun_modes.order[found.row], sun_seen.order[found.pair])
    assert not found.pairing.doubtful


def test_what_is_left_of_the_sun_after_each_surface_law(sun_modes, sun_seen):
    """Raw differences of this model reach 15 uHz, about 6 rms; after the two-term law some 0.12
    uHz are left below 3500 uHz (the notes beside the data)."""
    left, low = {}, sun_seen.nu < 3500.0
    for law in ("none", "power", "cubic", "two-term", "lorentzian"):
        found = match_observed(sun_modes, sun_seen, surface=law)
        left[law] = float(np.sqrt(np.mean(found.residual[low[found.pair]] ** 2)))
        if law == "none":
            assert found.rms == pytest.approx(6.0, abs=1.0)
    assert left["two-term"] < 0.2 and left["two-term"] == pytest.approx(0.12, abs=0.02)
    assert left["two-term"] < left["cubic"] < left["power"] < left["none"]
    assert left["lorentzian"] < 0.1 * left["none"]


def test_ratios_of_the_sun_need_no_surface_law(sun_modes, sun_seen):
    """Roxburgh & Vorontsov 2003: the surface drops out. Raw small separations are off by up to
    the surface term; ratios of this model by no more than some 2 percent, whatever the law."""
    plain, corrected = (match_observed(sun_modes, sun_seen, surface=s) for s in ("none", "cubic"))
    assert np.array_equal(plain.ratios.computed, corrected.ratios.computed)
    ratios = plain.ratios
    assert ratios.freedom == ratios.order.size == 57
    middle = {
        name: float(np.mean((ratios.observed / ratios.computed)[ratios.name == name]))
        for name in ("ratio_01", "ratio_10", "ratio_02")
    }
    assert all(value == pytest.approx(1.0, abs=0.05) for value in middle.values())


def test_a_subgiant_pairs_with_its_mixed_modes(subgiant_modes, subgiant_seen):
    for seen in (subgiant_seen, without_orders(subgiant_seen)):
        found = match_observed(subgiant_modes, seen)
        assert found.pair.size == len(seen) == 38
        mixed = subgiant_modes.kind[found.row] == "mixed"
        assert np.count_nonzero(mixed) >= 2
        # Observers count acoustic orders, which of a mixed mode may be n or n_p.
        published, order = subgiant_seen.order[found.pair], subgiant_modes.order[found.row]
        n_p = subgiant_modes.n_p[found.row]
        assert np.array_equal(order[~mixed], published[~mixed])
        assert np.all((order == published) | (n_p == published))
    # Without orders the twin of a mixed mode is in doubt, and named.
    (doubtful,) = found.pairing.doubtful.items()
    assert seen.degree[doubtful[0]] == 2 and len(doubtful[1]) == 1


@pytest.fixture(scope="module")
def made_up() -> oscsolve.ModeSet:
    return oscsolve.solve_modes(oscsolve.polytrope(3), [0, 1, 2], (20.0, 500.0), unit="sigma2")


@pytest.mark.parametrize(
    ("law", "amplitudes"), [("power", (-2.0,)), ("cubic", (-3.0,)), ("two-term", (1.5, -4.0))]
)
def test_a_law_put_in_comes_out_with_its_errors(made_up, law, amplitudes):
    """200 draws of noise: corrections scatter about what was put in as their errors say."""
    error = np.full(len(made_up), 0.05)
    plain = ObservedModes(made_up.degree, made_up.nu, error, made_up.order)
    found = match_observed(made_up, plain, surface=law)
    layer, fit = _layer(made_up, found.row, plain, None), found.surface
    wanted = replace(fit, values=np.array(amplitudes)).correction(layer)
    generator, draws = np.random.default_rng(12), []
    for _ in range(200):
        nu = made_up.nu[found.row] + wanted + generator.normal(0.0, error)
        seen = ObservedModes(made_up.degree[found.row], nu, error, made_up.order[found.row])
        again = match_observed(made_up, seen, surface=law)
        draws.append(again.corrected - again.computed)
    mean, spread = np.mean(draws, axis=0), np.std(draws, axis=0)
    stated = again.corrected_error
    # Five standard errors of the mean of 200 draws; a spread from 200 draws is good to 5 percent.
    assert np.all(np.abs(mean - wanted) < 5.0 * stated / np.sqrt(200) + 1e-9)
    assert spread == pytest.approx(stated, rel=0.25)


def test_the_lorentzian_finds_its_exponent(made_up):
    seen = ObservedModes(made_up.degree, made_up.nu, np.full(len(made_up), 0.01))
    found = match_observed(made_up, seen, surface="lorentzian")
    layer = _layer(made_up, found.row, seen, None)
    fit = found.surface
    wanted = replace(fit, values=np.array([-6.0, 4.0]))
    shifted = made_up.nu[found.row] + wanted.correction(layer)
    again = match_observed(
        made_up,
        ObservedModes(made_up.degree[found.row], shifted, np.full(found.row.size, 0.01)),
        surface="lorentzian",
    )
    # nu_max is the mean observed frequency here, which the law itself moves a little.
    assert again.surface.values == pytest.approx([-6.0, 4.0], rel=0.02)


def test_pairs_are_the_best_together_not_one_by_one(made_up):
    """Two observed modes nearest to the same computed one: one of them takes its neighbour."""
    own = np.flatnonzero(made_up.degree == 1)
    spacing = float(np.median(np.diff(made_up.nu[own])))
    nu = made_up.nu[own].copy()
    nu[3] += 0.35 * spacing
    nu[2] += 0.15 * spacing
    seen = ObservedModes(made_up.degree[own], nu, np.full(own.size, 0.1))
    found = match_observed(made_up, seen, surface="none")
    assert np.array_equal(found.row, own)


def test_an_outlier_and_a_stranger_are_named(made_up):
    nu, order = np.array(made_up.nu), np.array(made_up.order)
    spacing = float(np.median(np.diff(nu[made_up.degree == 0])))
    nu[5] += 0.05 * spacing
    seen = ObservedModes(
        np.append(made_up.degree, 0),
        np.append(nu, nu[2] + 0.47 * spacing),
        np.full(nu.size + 1, 0.01),
    )
    found = match_observed(made_up, seen, surface="none")
    assert found.pair[found.outlier].tolist() == [5]
    assert found.unmatched_observed.tolist() == [nu.size]
    fewer = np.arange(nu.size) != 4
    missing = match_observed(
        made_up, ObservedModes(made_up.degree[fewer], made_up.nu[fewer], np.full(nu.size - 1, 0.1))
    )
    assert missing.unmatched_computed.tolist() == [4] and order[4] == made_up.order[4]


def test_chi2_with_covariance_is_that_of_independent_directions():
    """Against the plain formula, and with one direction that has no variance."""
    generator = np.random.default_rng(1)
    root = generator.normal(size=(4, 4))
    covariance, off = root @ root.T, generator.normal(size=4)
    assert _chi2(off, covariance)[0] == pytest.approx(off @ np.linalg.solve(covariance, off))
    doubled = np.vstack((root, root[:1]))
    chi2, rank = _chi2(np.append(off, off[0]), doubled @ doubled.T)
    assert rank == 4 and chi2 == pytest.approx(off @ np.linalg.solve(covariance, off))


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"degree": [0, 0, 4]}, r"holds l = 4, which the mode list lacks; solve for --degrees 0,4"),
        ({"nu": [1.0, 500.0, 600.0]}, r"reaches from 1 to 600 uHz, .* solve with --band 1:"),
    ],
)
def test_a_list_that_cannot_hold_the_partners_is_refused(made_up, change, message):
    columns = {"degree": [0, 0, 0], "nu": [700.0, 800.0, 900.0], "nu_error": [0.1, 0.1, 0.1]}
    columns = {name: np.array(values) for name, values in {**columns, **change}.items()}
    with pytest.raises(InputError, match=message):
        match_observed(made_up, ObservedModes(**columns))


def test_unknown_laws_and_too_few_pairs_are_refused(made_up):
    seen = ObservedModes(made_up.degree[:1], made_up.nu[:1], np.array([0.1]))
    with pytest.raises(InputError, match="surface must be one of none, power"):
        match_observed(made_up, seen, surface="quadratic")
    with pytest.raises(InputError, match="2 coefficients, and 1 pairs of modes cannot fix them"):
        match_observed(made_up, seen)


def test_the_likelihood_peaks_at_the_star_and_survives_pickling():
    """A plain random walk (Metropolis et al. 1953) over the index finds the star that was used."""
    truth = oscsolve.solve_modes(oscsolve.polytrope(3), [0, 1], (20.0, 300.0), unit="sigma2")
    error = np.full(len(truth), 2.0)
    seen = ObservedModes(truth.degree, truth.nu, error, truth.order)
    likely = Likelihood(seen, surface="none", atmosphere="free", tolerance=1e-6)
    likely = pickle.loads(pickle.dumps(likely))
    generator = np.random.default_rng(7)
    at, value, visited = 3.05, likely(oscsolve.polytrope(3.05)), []
    for _ in range(40):
        trial = at + generator.normal(0.0, 0.01)
        there = likely(oscsolve.polytrope(trial))
        if np.log(generator.uniform()) < there - value:
            at, value = trial, there
        visited.append(at)
    assert np.mean(visited[15:]) == pytest.approx(3.0, abs=0.02)
    assert pickle.loads(pickle.dumps(likely))(oscsolve.polytrope(3)) == pytest.approx(
        likely(oscsolve.polytrope(3)), rel=1e-9
    )


def test_likelihood_of_ratios_does_not_feel_the_surface(made_up):
    seen = ObservedModes(made_up.degree, made_up.nu, np.full(len(made_up), 0.05), made_up.order)
    settings = {"measure": "ratios", "atmosphere": "free"}
    exact = Likelihood(seen, **settings)(oscsolve.polytrope(3))
    assert np.isfinite(exact)
    assert exact > Likelihood(seen, **settings)(oscsolve.polytrope(3.02))


def test_a_star_that_cannot_be_compared_is_impossible(made_up):
    seen = ObservedModes(made_up.degree, made_up.nu, np.full(len(made_up), 0.05))
    # An isothermal atmosphere on a star with an edge is refused; here that means -inf.
    assert Likelihood(seen)(oscsolve.polytrope(3)) == -np.inf
    for wrong in ({"measure": "gravity"}, {"surface": "flat"}, {"margin": 0.0}):
        with pytest.raises(InputError):
            Likelihood(seen, **wrong)
