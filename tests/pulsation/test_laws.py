"""Laws that hold for every star and method: counts, bands, meshes, units, scales, orthogonality."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oscsolve import ModeSet, SolveOptions, StarModel, polytrope, solve_modes
from oscsolve.pulsation.boundary import atmosphere_cutoff
from oscsolve.pulsation.mesh import Ground, band_mesh, element
from oscsolve.pulsation.search import count_at
from oscsolve.pulsation.sweep import build_action
from oscsolve.star.profile import Profile

BARE = SolveOptions(eigenfunctions=False)
TRIALS = 1000


def assert_counts_never_rise(
    star: StarModel, band: tuple[float, float], surfaces: tuple[str, ...] = ("free",)
) -> None:
    """1,000 trial frequencies for l = 0, 1, 2, full and Cowling, on the mesh of that band."""
    profile = Profile(star)
    for degree in (0, 1, 2):
        for surface in surfaces:
            low, high = band
            if surface == "isothermal":
                cutoff = atmosphere_cutoff(profile, degree)
                low, high = max(low, 1.001 * cutoff.low), min(high, 0.999 * cutoff.high)
            for gravity in ("full", "cowling"):
                mesh = band_mesh(Ground(profile), degree, (low, high), 0.7, 400_000)
                action = build_action(profile, mesh, element(4), degree, gravity, surface)
                counts = count_at(action, np.geomspace(low, high, TRIALS))
                assert np.all(np.diff(counts) <= 0), (degree, surface, gravity)
                assert counts[0] - counts[-1] > 4, "a band without modes shows nothing"


@pytest.mark.parametrize("index", [1.5, 3, 4])
def test_counts_never_rise_with_frequency_in_polytropes(index):
    assert_counts_never_rise(polytrope(index), (0.5, 1000.0))


def test_counts_never_rise_with_frequency_in_the_sun(sun):
    assert_counts_never_rise(sun, (0.5, 1500.0), ("free", "isothermal"))


def test_counts_never_rise_with_frequency_in_a_red_giant(giant):
    assert_counts_never_rise(giant, (20.0, 200.0))


@pytest.fixture(scope="module")
def whole() -> ModeSet:
    """l = 0 to 3 of n = 3, 0.5 < sigma2 < 120: g, f and p modes."""
    return solve_modes(polytrope(3), (0, 1, 2, 3), (0.5, 120.0), unit="sigma2", tolerance=1e-11)


def pick(modes: ModeSet, low: float, high: float) -> np.ndarray:
    return (modes.sigma2 >= low) & (modes.sigma2 <= high)


@given(cut=st.floats(1.0, 100.0))
@settings(max_examples=8)
def test_two_halves_of_a_band_make_the_whole(whole, cut):
    """Nothing is lost or listed twice at any cut, and labels do not depend on the band."""
    halves = [
        solve_modes(whole.star, (0, 1, 2, 3), band, unit="sigma2", tolerance=1e-11, options=BARE)
        for band in ((0.5, cut), (cut, 120.0))
    ]
    for name in ("degree", "order", "n_p", "n_g"):
        joined = np.concatenate([getattr(half, name) for half in halves])
        sigma2 = np.concatenate([half.sigma2 for half in halves])
        place = np.lexsort((sigma2, np.concatenate([half.degree for half in halves])))
        assert np.array_equal(joined[place], getattr(whole, name)), name
    # Both are within their error bars, 2e-11 in sigma2 each.
    assert np.sort(sigma2) == pytest.approx(np.sort(whole.sigma2), rel=4e-11)
    counted = halves[0].census.counted + halves[1].census.counted
    assert np.array_equal(counted, whole.census.counted)


def test_a_band_that_ends_at_a_mode_is_settled_by_count_and_list_alike(whole):
    """However near the limit comes, the census closes."""
    mode = whole.sigma2[(whole.degree == 2) & (whole.order == 1)][0]
    for nudge in (-1e-9, -1e-12, 1e-12, 1e-9):
        limit = float(mode * (1.0 + nudge))
        modes = solve_modes(
            whole.star, [2], (3.0, limit), unit="sigma2", tolerance=1e-11, options=BARE
        )
        assert modes.complete
        assert (modes.order[-1] == 1) == (nudge > 0.0)


def test_each_degree_is_the_same_alone_and_in_company(whole):
    for degree in (0, 1, 2, 3):
        alone = solve_modes(whole.star, [degree], (0.5, 120.0), unit="sigma2", tolerance=1e-11)
        among = whole.degree == degree
        assert np.array_equal(alone.sigma2, whole.sigma2[among])
        assert np.array_equal(alone.inertia, whole.inertia[among])
        assert np.array_equal(alone.eigenfunctions.xi_r, whole.eigenfunctions.xi_r[among])


@pytest.mark.parametrize("unit", ["uHz", "mHz", "c/d", "s", "min", "h", "d"])
def test_every_unit_finds_the_same_modes(whole, unit):
    nu = np.sqrt([0.5, 120.0]) * whole.star.nu_dynamical * 1e-6
    limits = {
        "uHz": 1e6 * nu, "mHz": 1e3 * nu, "c/d": 86400.0 * nu, "s": 1.0 / nu, "min": 1.0 / nu / 60,
        "h": 1.0 / nu / 3600.0, "d": 1.0 / nu / 86400.0,
    }[unit]  # fmt: skip
    modes = solve_modes(whole.star, [0, 2], tuple(limits), unit=unit, tolerance=1e-11)
    among = (whole.degree == 0) | (whole.degree == 2)
    assert np.array_equal(modes.order, whole.order[among])
    # Band limits differ in their last digit, and trial frequencies with them.
    assert modes.sigma2 == pytest.approx(whole.sigma2[among], rel=1e-11)


@pytest.mark.parametrize(
    "options",
    [SolveOptions(cells_factor=2), SolveOptions(stages=3), SolveOptions(stages=6),
     SolveOptions(phase_per_cell=0.2)],
)  # fmt: skip
def test_other_meshes_and_stages_agree_within_the_error_bars(whole, options):
    modes = solve_modes(
        whole.star, (0, 1, 2, 3), (0.5, 120.0), unit="sigma2", tolerance=1e-11, options=options
    )
    assert np.array_equal(modes.order, whole.order)
    assert np.array_equal(modes.kind, whole.kind)
    assert np.all(np.abs(modes.nu - whole.nu) <= modes.nu_error + whole.nu_error)


@given(mass=st.floats(1e32, 1e35), radius=st.floats(1e9, 1e13), gravity=st.floats(6.6e-8, 6.7e-8))
@settings(max_examples=5)
def test_homologous_stars_share_sigma2(whole, mass, radius, gravity):
    """M, R and G enter only through sqrt(GM/R^3): sigma2 is the same to round-off."""
    star = polytrope(3, mass=mass, radius=radius, gravitational_constant=gravity)
    modes = solve_modes(
        star, (0, 1, 2, 3), (0.5, 120.0), unit="sigma2", tolerance=1e-11, options=BARE
    )
    assert modes.sigma2 == pytest.approx(whole.sigma2, rel=1e-12)
    dynamical = np.sqrt(gravity * mass / radius**3) / (2.0 * np.pi) * 1e6
    assert modes.nu == pytest.approx(np.sqrt(modes.sigma2) * dynamical, rel=1e-14)
    assert modes.period * modes.nu == pytest.approx(np.full(len(modes), 1e6), rel=1e-14)


def test_orders_are_consecutive_within_a_degree(whole):
    for degree in (0, 1, 2, 3):
        among = whole.degree == degree
        assert np.all(np.diff(whole.sigma2[among]) > 0.0)
        step = np.diff(whole.order[among])
        # l = 1 has no f mode in full gravity: p1 follows g1.
        skipped = (degree == 1) & (whole.order[among][:-1] == -1)
        assert np.array_equal(step, np.where(skipped, 2, 1))


def volume_integral(x: np.ndarray, integrand: np.ndarray) -> np.ndarray:
    """Trapezoidal rule over the points of the model, last axis: independent of the solver."""
    return np.trapezoid(integrand, x, axis=-1)


@pytest.mark.parametrize("gravity", ["full", "cowling"])
def test_eigenfunctions_of_one_degree_are_orthogonal(gravity):
    """int rho (xi_r xi_r' + L^2 xi_h xi_h') r^2 dr = 0 for different modes (Chandrasekhar 1964).

    Cowling modes obey it too. The trapezoidal rule on 900 points errs by some 1e-4 of the norm
    for modes of 5 nodes; the worst pair shows 2e-4.
    """
    star = polytrope(3)
    for degree in (0, 1, 2):
        modes = solve_modes(star, [degree], (1.5, 100.0), unit="sigma2", gravity=gravity)
        f = modes.eigenfunctions
        rho = star.density * star.photospheric_radius**3 / star.total_mass
        weight = np.sqrt(rho) * f.radius
        radial, across = weight * f.xi_r, np.sqrt(degree * (degree + 1)) * weight * f.xi_h
        product = radial[:, None] * radial[None] + across[:, None] * across[None]
        overlap = volume_integral(f.radius, product)
        norm = np.sqrt(np.diag(overlap))
        cosine = overlap / norm[:, None] / norm - np.eye(len(modes))
        assert len(modes) > 5 and np.abs(cosine).max() < 5e-4


def test_inertia_is_the_energy_of_the_eigenfunction(whole):
    """4 pi int rho (xi_r^2 + L^2 xi_h^2) r^2 dr with the total displacement 1 at r = R."""
    star, f = whole.star, whole.eigenfunctions
    rho = star.density * star.photospheric_radius**3 / star.total_mass
    ll = (whole.degree * (whole.degree + 1))[:, None]
    energy = 4.0 * np.pi * rho * f.radius**2 * (f.xi_r**2 + ll * f.xi_h**2)
    # The trapezoidal rule on 900 points: 6e-4 for the most oscillating of these modes.
    assert volume_integral(f.radius, energy) == pytest.approx(whole.inertia, rel=1.5e-3)


def test_variational_quotient_gives_back_the_eigenvalue(whole):
    """Chandrasekhar (1964): sigma2 is stationary, so poor quadrature of good functions will do.

    sigma2 int rho |xi|^2 = int p'^2/(rho c^2) + rho N^2 xi_r^2 + rho xi . grad Phi' over the
    volume; the surface term rho g xi_r^2 vanishes with rho at the edge of a polytrope.
    """
    star, f = whole.star, whole.eigenfunctions
    profile_scale = star.photospheric_radius**3 / star.total_mass
    inside = slice(1, -1)
    x, rho = f.radius[inside], star.density[inside] * profile_scale
    g = star.mass[inside] / star.total_mass / x**2
    pressure = star.pressure[inside] / (
        star.gravitational_constant * star.total_mass**2 / star.photospheric_radius**4
    )
    c2 = star.gamma1[inside] * pressure / rho
    n2 = star.a_star[inside] * g / x
    ll = (whole.degree * (whole.degree + 1))[:, None]
    xi_r, xi_h, p, phi, dphi = (
        part[:, inside] for part in (f.xi_r, f.xi_h, f.p_prime, f.phi_prime, f.dphi_prime)
    )
    work = p**2 / (rho * c2) + rho * n2 * xi_r**2 + rho * (xi_r * dphi + ll * xi_h * phi / x)
    energy = rho * (xi_r**2 + ll * xi_h**2)
    quotient = volume_integral(x, work * x**2) / volume_integral(x, energy * x**2)
    # As above: errors of the trapezoidal rule, 6e-4 for six nodes, 7e-5 for few.
    assert quotient == pytest.approx(whole.sigma2, rel=1.5e-3)
    few = np.abs(whole.order) <= 2
    assert quotient[few] == pytest.approx(whole.sigma2[few], rel=2e-4)
