"""Separations and ratios: definitions, errors, and the observed Sun."""

from __future__ import annotations

import numpy as np
import pytest

import oscsolve
from oscsolve.seismology.acoustic import acoustic_modes
from oscsolve.seismology.separations import SEPARATIONS

DELTA, EPSILON, D0 = 135.0, 1.45, 1.5


@pytest.fixture
def comb() -> tuple[np.ndarray, ...]:
    """degree, order, nu of nu = DELTA (n + l/2 + EPSILON) - l(l+1) D0 (Tassoul 1980)."""
    degree = np.repeat([0, 1, 2, 3], 12)
    order = np.tile(np.arange(10, 22), 4)
    nu = DELTA * (order + degree / 2 + EPSILON) - degree * (degree + 1) * D0
    return degree, order, nu


@pytest.fixture(scope="module")
def observed_sun(shared_data):
    return _read(shared_data / "solar" / "observed-low-degree.csv")


def _read(path) -> tuple[np.ndarray, ...]:
    lines = [line for line in path.read_text().splitlines() if not line.startswith("#")]
    table = np.array([line.split(",") for line in lines[1:]], dtype=float)
    return table[:, 0].astype(int), table[:, 1].astype(int), table[:, 2], table[:, 3]


def test_an_exact_comb_has_the_separations_of_tassoul(comb):
    found = oscsolve.combine_frequencies(*comb, np.full(comb[2].size, 0.1))
    # Closed forms of the comb: d02 = 6 D0, d13 = 10 D0, d01 = d10 = 2 D0 (Gough 1986, from memory).
    small = {"small_02": 6, "small_13": 10, "small_01": 2, "small_10": 2, "five_01": 2}
    expected = {name: factor * D0 for name, factor in small.items()}
    expected |= {"five_10": 2 * D0, "ratio_02": 6 * D0 / DELTA, "ratio_13": 10 * D0 / DELTA}
    expected |= {"ratio_01": 2 * D0 / DELTA, "ratio_10": 2 * D0 / DELTA}
    expected |= {f"large_{degree}": DELTA for degree in range(4)}
    expected |= {f"second_{degree}": 0.0 for degree in range(4)}
    assert set(found) == set(expected) == set(SEPARATIONS)
    for name, value in expected.items():
        # Round-off of sums of frequencies of 3000.
        assert found[name].value == pytest.approx(value, abs=1e-11), name


def test_five_points_are_the_weights_of_roxburgh_and_vorontsov(comb):
    degree, order, nu = comb
    # Roxburgh & Vorontsov (2003, A&A 411, 215), from memory: 1/8 of 1, -4, 6, -4, 1.
    nu = nu + np.random.default_rng(1).normal(size=nu.size)
    at = {(d, n): v for d, n, v in zip(degree, order, nu, strict=True)}
    found = oscsolve.combine_frequencies(degree, order, nu, np.full(nu.size, 1.0))
    n = 15
    zero, one = (lambda k: at[0, n + k]), (lambda k: at[1, n + k])
    d01 = (zero(-1) - 4 * one(-1) + 6 * zero(0) - 4 * one(0) + zero(1)) / 8
    d10 = -(one(-1) - 4 * zero(0) + 6 * one(0) - 4 * zero(1) + one(1)) / 8
    expected = {
        "ratio_01": d01 / (one(0) - one(-1)),
        "ratio_10": d10 / (zero(1) - zero(0)),
        "ratio_02": (zero(0) - at[2, n - 1]) / (one(0) - one(-1)),
        "ratio_13": (one(0) - at[3, n - 1]) / (zero(1) - zero(0)),
    }
    for name, value in expected.items():
        part = found[name]
        assert part.value[part.order == n] == pytest.approx(value, rel=1e-12), name
        assert part.nu[part.order == n] == [at[int(name[-2]), n]]


def test_slopes_are_the_derivatives(comb):
    degree, order, nu = comb
    error = np.full(nu.size, 0.1)
    found = oscsolve.combine_frequencies(degree, order, nu, error)
    step = 1e-3
    for name, part in found.items():
        gradient = part.gradient(nu.size)
        for row in (3, 17, 30, 40):
            moved = np.array(nu)
            moved[row] += step
            other = oscsolve.combine_frequencies(degree, order, moved, error)[name]
            # Second order of the ratios: step over the large separation, squared.
            assert (other.value - part.value) / step == pytest.approx(gradient[:, row], abs=1e-6), (
                name
            )


def test_covariance_is_that_of_noise(comb):
    degree, order, nu = comb
    rng = np.random.default_rng(7)
    error = rng.uniform(0.02, 0.2, nu.size)
    names = ("ratio_01", "ratio_10", "ratio_02")
    found = oscsolve.combine_frequencies(degree, order, nu, error)
    covariance = oscsolve.joint_covariance([found[name] for name in names], error)
    samples = []
    for _ in range(1000):
        noisy = oscsolve.combine_frequencies(degree, order, rng.normal(nu, error), error)
        samples.append(np.concatenate([noisy[name].value for name in names]))
    scale = np.sqrt(np.diag(covariance))
    correlation = covariance / np.outer(scale, scale)
    seen = np.cov(np.array(samples).T) / np.outer(scale, scale)
    # 1000 draws: a correlation is known to 1/sqrt(1000) = 0.032 or, on the diagonal, 0.045.
    assert seen == pytest.approx(correlation, abs=5 * 0.045)
    # Neighbours share modes: whoever drops the covariance is far off.
    assert correlation[0, 1] > 0.3
    assert np.sqrt(np.diag(covariance))[: len(found["ratio_01"])] == pytest.approx(
        found["ratio_01"].error
    )


def test_a_covariance_of_frequencies_may_be_given_in_full(comb):
    degree, order, nu = comb
    error = np.full(nu.size, 0.1)
    # A common shift of all frequencies moves no separation.
    shared = np.diag(error**2) + 25.0
    alone = oscsolve.combine_frequencies(degree, order, nu, error)
    with_shift = oscsolve.combine_frequencies(degree, order, nu, shared)
    for name in alone:
        # 25 cancels in sums of squares of 0.01.
        assert with_shift[name].error == pytest.approx(alone[name].error, rel=1e-9)


def test_what_lacks_a_mode_is_absent(comb):
    degree, order, nu = comb
    keep = ~((degree == 1) & (order == 15))
    found = oscsolve.combine_frequencies(degree[keep], order[keep], nu[keep], nu[keep] * 0 + 0.1)
    assert not {14, 15, 16} & set(found["ratio_10"].order)
    assert {13, 17} <= set(found["ratio_10"].order)
    only = degree == 0
    assert set(oscsolve.combine_frequencies(degree[only], order[only], nu[only], nu[only])) == {
        "large_0",
        "second_0",
    }


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (lambda d, n, f, e: (d, n, f[:-1], e[:-1]), "expected one number a mode"),
        (lambda d, n, f, e: (d, n, f, e[:-1]), "nu_error has shape"),
        (lambda d, n, f, e: (d, n, f, -e), "below zero"),
        (lambda d, n, f, e: (d, n, np.where(n == 12, np.nan, f), e), "row 3 of"),
        (
            lambda d, n, f, e: (d, np.where(n == 12, 11, n), f, e),
            "l = 0, n = 11 is in rows 2 and 3",
        ),
        (lambda d, n, f, e: (d, -n, f, e), "nu does not rise from n = -21 to n = -20"),
    ],
)
def test_bad_lists_are_refused(comb, change, words):
    with pytest.raises(oscsolve.InputError, match=words):
        oscsolve.combine_frequencies(*change(*comb, np.full(comb[2].size, 0.1)))


def test_a_covariance_must_fit_the_list(comb):
    found = oscsolve.combine_frequencies(*comb, np.full(comb[2].size, 0.1))
    with pytest.raises(oscsolve.InputError, match="holds 5 modes"):
        oscsolve.joint_covariance([found["ratio_02"]], np.full(5, 0.1))


def test_stated_errors_bound_those_of_a_rougher_solution(star_n3):
    band, unit = (20, 300), "sigma2"
    fine = oscsolve.solve_modes(star_n3, (0, 1, 2, 3), band, unit=unit, tolerance=1e-12)
    rough = oscsolve.solve_modes(star_n3, (0, 1, 2, 3), band, unit=unit, tolerance=1e-5)
    exact = oscsolve.separations(fine)
    for name, part in oscsolve.separations(rough).items():
        off = np.abs(part.value - exact[name].value)
        assert np.all(off <= part.error + exact[name].error), name


def test_ratios_of_the_solar_model_are_those_of_the_observed_sun(solar_modes, observed_sun):
    observed = oscsolve.combine_frequencies(*observed_sun)
    computed = oscsolve.separations(solar_modes)
    worst = {}
    for name in ("ratio_02", "ratio_13", "large_0", "small_02"):
        row = [computed[name].order.tolist().index(n) for n in observed[name].order]
        off = observed[name].value - computed[name].value[row]
        worst[name] = float(np.median(np.abs(off / observed[name].value)))
        if name == "ratio_02":
            # Broomhall et al. (2009) against the model of Christensen-Dalsgaard et al. (1996):
            # half of the ratios lie within about one standard error.
            assert np.median(np.abs(off) / observed[name].error) < 1.5
    # Ratios do not feel the surface (Roxburgh & Vorontsov 2003): r02 agrees to half a percent. The
    # large separation, which feels it, differs by as much though it is fourteen times larger.
    assert worst["ratio_02"] < 0.01
    assert worst["ratio_13"] < 0.01
    assert 0.003 < worst["large_0"] < 0.006


def test_published_frequencies_of_the_model_give_the_same_ratios(solar_modes, shared_data):
    lines = (shared_data / "solar" / "standard-frequencies.txt").read_text().splitlines()
    rows = np.array([line.split()[:3] for line in lines if not line.startswith("#")], dtype=float)
    rows = rows[(rows[:, 1] > 5) & (rows[:, 2] < 4500)]
    degree, order, nu = rows[:, 0].astype(int), rows[:, 1].astype(int), rows[:, 2]
    table = oscsolve.combine_frequencies(degree, order, nu, np.full(nu.size, 0.01))
    computed = oscsolve.separations(solar_modes)
    # Frequencies agree to 4e-5 with the table. Radial ones are higher by up to 0.1 uHz beside
    # nonradial ones, which is 8e-4 of a large separation; nonradial ones agree among themselves.
    for name, tolerance in (("ratio_01", 1e-3), ("ratio_02", 1e-3), ("ratio_13", 2e-4)):
        common, ours, theirs = np.intersect1d(
            computed[name].order, table[name].order, return_indices=True
        )
        assert common.size > 15
        expected = pytest.approx(table[name].value[theirs], abs=tolerance)
        assert computed[name].value[ours] == expected


def test_small_separations_of_the_subgiant_are_those_observed(subgiant_modes, shared_data):
    observed = oscsolve.combine_frequencies(*_read(shared_data / "subgiant" / "observed.csv"))
    computed = oscsolve.separations(subgiant_modes)
    row = [computed["ratio_02"].order.tolist().index(n) for n in observed["ratio_02"].order]
    off = (observed["ratio_02"].value - computed["ratio_02"].value[row]) / observed[
        "ratio_02"
    ].error
    mixed = computed["ratio_02"].mixed[row]
    # Lund et al. (2017); the one order in which a mixed mode takes part tells of its coupling.
    assert np.count_nonzero(mixed) == 1
    assert np.all(np.abs(off[mixed]) > 5.0)
    assert np.all(np.abs(off[~mixed]) < 3.0)


def test_mixed_modes_stand_for_p_modes_of_their_place(subgiant_modes, red_giant_modes):
    for modes in (subgiant_modes, red_giant_modes):
        acoustic = acoustic_modes(modes)
        nu0 = modes.nu[acoustic.row[acoustic.degree == 0]]
        n0 = acoustic.order[acoustic.degree == 0]
        for degree in (1, 2):
            here = acoustic.degree == degree
            place = np.interp(modes.nu[acoustic.row[here]], nu0, n0) - acoustic.order[here]
            inside = (modes.nu[acoustic.row[here]] > nu0[0]) & (
                modes.nu[acoustic.row[here]] < nu0[-1]
            )
            # Half a large separation above the radial mode for each degree, less a small one.
            assert np.all(np.abs(place[inside] - degree / 2 + 0.1) < 0.25)
    assert np.all(acoustic.mixed[acoustic.degree == 1])
    assert not np.any(acoustic.mixed[acoustic.degree == 0])


def test_a_list_without_radial_modes_has_the_modes_without_g_nodes(lantern_modes):
    from dataclasses import replace

    keep = lantern_modes.degree > 0
    names = ("degree", "order", "n_p", "n_g", "kind", "nu", "nu_error", "sigma2", "inertia")
    columns = {name: getattr(lantern_modes, name)[keep] for name in names}
    part = replace(lantern_modes, **columns, eigenfunctions=None)
    acoustic = acoustic_modes(part)
    assert np.all(part.n_g[acoustic.row] == 0)
    assert acoustic.order.tolist() == part.order[acoustic.row].tolist()


def test_it_works_on_a_list_read_back(lantern_modes, tmp_path):
    oscsolve.save_modes(lantern_modes, tmp_path / "star.h5")
    again = oscsolve.separations(oscsolve.load_modes(tmp_path / "star.h5"))
    for name, part in oscsolve.separations(lantern_modes).items():
        assert again[name].value.tolist() == part.value.tolist()
