"""The second opinion: right on its own, in agreement with the first, and not to be talked over."""

from __future__ import annotations

import ast
import csv
import os
import subprocess
import sys
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from scipy.integrate import solve_ivp

import oscsolve.pulsation
from oscsolve import (
    ModeSet,
    SolveOptions,
    StarModel,
    layered_sphere,
    load_modes,
    polytrope,
    read_model,
    save_modes,
    solve_modes,
    uniform_sphere,
)
from oscsolve.pulsation import dziembowski
from oscsolve.pulsation.integrator import Accuracy, integrate
from oscsolve.pulsation.shooting import Matching, second_opinion, with_second_opinion
from oscsolve.star.profile import Profile

BARE = SolveOptions(eigenfunctions=False)
GAMMA1 = 5.0 / 3.0


def matching(star: StarModel, degree: int, cowling: bool = False) -> Matching:
    profile = Profile(star)
    return Matching(profile, dziembowski.pack_layers(profile), degree, cowling, False)


def found(match: Matching, exact: float, offset: float = 3e-5) -> tuple[float, float]:
    """Relative error of nu and its estimate, from a start that is off by `offset`."""
    start = exact * (1.0 + offset)
    lam, error = match.find(start, 1e-6 * exact, (0.99 * exact, 1.01 * exact))
    return 0.5 * (lam / exact - 1.0), 0.5 * error / exact


def sphere(degree: int, k: int) -> float:
    """sigma2 of the uniform sphere: Sterne (1937) for l = 0, p modes of Pekeris (1938) beyond."""
    if degree == 0:
        return GAMMA1 * (2 * k**2 + 5 * k + 3) - 4.0
    half = 0.5 * (GAMMA1 * (k * (2 * degree + 2 * k + 5) + 2 * degree + 3) - 4.0)
    return half + np.sqrt(half**2 + degree * (degree + 1))


def relative(modes: ModeSet) -> np.ndarray:
    assert modes.nu_second is not None
    return np.abs(modes.nu_second / modes.nu - 1.0)


@pytest.mark.parametrize("degree", [0, 1, 2, 5, 40])
def test_the_uniform_sphere_is_met_without_help_of_the_first_solver(degree):
    match = matching(uniform_sphere(GAMMA1), degree)
    for k in (0, 1, 4, 15):
        error, stated = found(match, sphere(degree, k))
        # A thousand steps of round-off, and the stated error above it but not by far.
        assert abs(error) < 1e-13
        assert abs(error) <= stated < 3e-12


def test_kelvin_modes_are_met():
    star = uniform_sphere(GAMMA1)
    for degree in (2, 3, 10):
        error, _ = found(matching(star, degree), 2.0 * degree * (degree - 1) / (2 * degree + 1))
        assert abs(error) < 1e-13, degree


@pytest.mark.parametrize("index", ["1", "1.5", "3", "4"])
def test_reference_polytropes_are_met(shared_reference: Path, index: str):
    """306 values of 20 digits, see the README beside them: every second row of four polytropes."""
    with (shared_reference / "polytropes.csv").open() as stream:
        rows = [row for row in csv.DictReader(stream) if row["n"] == index]
    assert len(rows) > 25
    stars: dict[float, StarModel] = {}
    matches: dict[tuple, Matching] = {}
    for row in rows[::2]:
        gamma1, degree, cowling = float(row["Gamma1"]), int(row["l"]), row["cowling"] == "1"
        star = stars.setdefault(gamma1, polytrope(float(index), gamma1))
        key = gamma1, degree, cowling
        match = matches.setdefault(key, matching(star, degree, cowling))
        exact = float(row["sigma2"])
        if exact == 0.0:
            continue
        error, stated = found(match, exact, 1e-6)
        # The points of the polytrope are exact to 1e-13, g modes of n = 4 feel them the most.
        assert abs(error) < 2e-13, row
        assert abs(error) < stated, row


def test_two_neighbours_that_live_apart_are_told_apart():
    """At l = 20 the interface mode and the f mode differ by 0.4 percent: one under the surface,
    one at the jump, and each must be matched where it lives."""
    star = layered_sphere([(0.6, 3.0), (1.0, 1.0)])
    modes = solve_modes(
        star, [20], (15, 25), unit="sigma2", tolerance=1e-12, verify=True, options=BARE
    )
    assert len(modes) == 2 and modes.nu[1] < 1.005 * modes.nu[0]
    assert np.all(relative(modes) < 1e-13)


@pytest.mark.parametrize("gravity", ["full", "cowling"])
def test_density_jumps_are_crossed_by_both(gravity):
    star = layered_sphere([(0.4, 5.0), (0.7, 1.0), (1.0, 2.0)], GAMMA1)
    modes = solve_modes(
        star,
        (0, 1, 2),
        (4, 150),
        unit="sigma2",
        gravity=gravity,
        tolerance=1e-12,
        verify=True,
        options=BARE,
    )
    assert len(modes) > 12
    assert np.all(modes.confirmed)
    assert np.all(relative(modes) < 1e-12)


def test_growing_and_neutral_modes_are_found():
    growing = solve_modes(polytrope(1, 1.2), [0], (-5, 30), unit="sigma2", verify=True)
    assert growing.nu[0] < 0.0 and np.all(growing.confirmed)
    assert np.all(relative(growing) < 1e-11)
    # Gamma1 = 4/3: the fundamental mode of any star is neutral; only round-off of sigma2 is left.
    opinion = matching(polytrope(3, 4.0 / 3.0), 0).find(1e-9, 1e-8, (-1e-2, 1e-2))
    assert abs(opinion[0]) < opinion[1] < 1e-12


@pytest.mark.parametrize("surface", ["free", "isothermal"])
def test_p_f_and_g_modes_of_the_sun_agree(sun: StarModel, surface: str):
    orders: set[tuple[int, int]] = set()
    for band in ((250.0, 420.0), (2950.0, 3100.0)):
        modes = solve_modes(
            sun, (0, 1, 2, 3), band, surface=surface, verify=True, options=BARE, tolerance=1e-9
        )
        orders |= set(zip(modes.degree.tolist(), modes.order.tolist(), strict=True))
        assert np.all(modes.confirmed)
        assert not [found for found in modes.findings if "second-opinion" in found.code]
        assert np.all(relative(modes) < 1e-10)
    # Radial, f, g and p modes are among them.
    assert {(0, 21), (2, 0), (3, 0), (2, -1), (3, 20)} <= orders


def test_the_sun_agrees_without_perturbed_gravity(sun: StarModel):
    modes = solve_modes(
        sun, (0, 1, 2), (2950.0, 3100.0), gravity="cowling", verify=True, options=BARE
    )
    assert np.all(modes.confirmed) and np.all(relative(modes) < 1e-10)


def test_a_demo_star_agrees():
    star = read_model(Path(__file__).resolve().parents[2] / "models_demo" / "lantern-1.fgong")
    modes = solve_modes(
        star, (0, 1, 2, 3), (2000.0, 2300.0), surface="isothermal", verify=True, options=BARE
    )
    assert len(modes) >= 6 and np.all(modes.confirmed) and np.all(relative(modes) < 1e-8)


def test_mixed_modes_of_a_subgiant_agree(subgiant: StarModel):
    modes = solve_modes(
        subgiant, (1, 2), (500.0, 620.0), verify=True, options=BARE, tolerance=1e-10
    )
    assert np.any(modes.kind == "mixed")
    assert np.all(modes.confirmed) and np.all(relative(modes) < 1e-10)


@pytest.fixture(scope="module")
def few(star_n3: StarModel) -> ModeSet:
    return solve_modes(star_n3, (0, 2), (2, 60), unit="sigma2", options=BARE)


def test_a_wrong_frequency_is_named(few: ModeSet):
    place = 3
    nu = few.nu.copy()
    nu[place] *= 1.0 + 1e-7
    modes = with_second_opinion(replace(few, nu=nu))
    assert np.flatnonzero(~modes.confirmed).tolist() == [place]
    (finding,) = [found for found in modes.findings if found.code == "second-opinion-differs"]
    assert finding.severity == "defect"
    assert finding.message.endswith(f": l = 0, n = {few.order[place]}")
    assert finding.size == pytest.approx(1e-7, rel=1e-6)
    assert modes.nu_second[place] == pytest.approx(few.nu[place], rel=1e-12)


def test_modes_of_another_star_are_refused(few: ModeSet):
    """One part in a million in the sound speed must not pass."""
    star = few.star.with_changes(gamma1=few.star.gamma1 * (1.0 + 1e-6))
    assert not np.any(second_opinion(star, few).agrees)
    lost = second_opinion(polytrope(2), few)
    assert not np.any(lost.agrees) and np.any(np.isnan(lost.nu))
    modes = with_second_opinion(replace(few, star=polytrope(2)))
    assert "not found" in modes.findings[-1].message
    assert "and 1 more" in modes.findings[-1].message


def test_an_unsolved_mode_list_has_no_second_opinion(few: ModeSet):
    assert few.confirmed is None and few.options["verify"] is False
    with pytest.raises(ValueError, match="come together"):
        replace(few, nu_second=few.nu)


def test_an_empty_list_is_confirmed(star_n3: StarModel):
    modes = solve_modes(star_n3, [0], (2, 3), unit="sigma2", verify=True)
    assert len(modes) == 0 and modes.confirmed.shape == (0,)


def test_progress_is_told(few: ModeSet):
    calls: list[tuple[int, int, str]] = []
    second_opinion(few.star, few, lambda *call: calls.append(call))
    assert calls[-1] == (len(few), len(few), "second opinion")


def test_a_second_opinion_comes_back_from_disk(few: ModeSet, tmp_path: Path):
    modes = with_second_opinion(few)
    save_modes(modes, tmp_path / "modes.h5")
    back = load_modes(tmp_path / "modes.h5")
    np.testing.assert_array_equal(back.nu_second, modes.nu_second)
    np.testing.assert_array_equal(back.nu_second_error, modes.nu_second_error)
    assert np.all(back.confirmed)


def test_nothing_but_the_profile_is_shared():
    """Neither file imports what the relaxation path is made of."""
    folder = Path(oscsolve.pulsation.__file__).parent
    allowed = {"compiled", "dziembowski", "integrator", "modeset"}
    for name in ("dziembowski", "integrator", "shooting"):
        for node in ast.walk(ast.parse((folder / f"{name}.py").read_text())):
            assert not isinstance(node, ast.Import) or "oscsolve" not in node.names[0].name
            if isinstance(node, ast.ImportFrom) and str(node.module).startswith("oscsolve.puls"):
                assert str(node.module).rsplit(".", 1)[1] in allowed, (name, node.module)


def test_polynomials_say_what_the_profile_says(star_n3: StarModel):
    profile = Profile(star_n3)
    pieces = profile.polynomials()
    for share in (0.0, 0.3, 1.0):
        x = pieces.left + share * pieces.width
        at = profile.at(x, profile.interval)
        w = np.polynomial.polynomial.polyval(share, pieces.w.T, tensor=False)
        q = np.polynomial.polynomial.polyval(share, pieces.q.T, tensor=False)
        residue = np.polynomial.polynomial.polyval(share, pieces.residue.T, tensor=False)
        # Radii next to the edge are rounded to 1e-16, their depth to 1e-7.
        inside = x < 1.0 - 1e-5
        assert w[inside] == pytest.approx(at.w[inside], rel=1e-10)
        assert q * x == pytest.approx(at.g, rel=1e-13)
        rho = np.exp(residue) * w**pieces.exponent
        assert rho[inside] == pytest.approx(at.rho[inside], rel=1e-10)


def textbook(
    profile: Profile, lam: float, degree: int
) -> Callable[[float, np.ndarray], np.ndarray]:
    """dy/dx of y1 to y4 as printed in Unno et al. (1989), ch. III, from the profile alone."""

    def derivative(x: float, y: np.ndarray) -> np.ndarray:
        interval = np.searchsorted(profile.x, x, side="right") - 1
        at = profile.at(np.array(x), np.array(interval))
        ll, c1_lam, vg = degree * (degree + 1), lam * x / at.g, at.g * x / at.c2
        a, u = x * at.n2 / at.g, 4.0 * np.pi * at.rho * x / at.g
        matrix = np.array(
            [
                [vg - 3.0, ll / c1_lam - vg, vg, 0.0],
                [c1_lam - a, a - u + 1.0, -a, 0.0],
                [0.0, 0.0, 1.0 - u, 1.0],
                [u * a, u * vg, ll - u * vg, -u],
            ]
        )
        return matrix @ y / x

    return derivative


@pytest.mark.parametrize("degree", [1, 3])
def test_integration_follows_the_textbook_equations(star_n3: StarModel, degree: int):
    """A slow twin: other variables (y4 in place of z4, no power of x), other code, other steps."""
    profile = Profile(star_n3)
    layers = dziembowski.pack_layers(profile)
    trial = dziembowski.make_trial(degree, False, 30.0)
    first, last = 250, 420
    pieces = layers.polynomials
    start = np.array([[1.0, 0.3], [-0.2, 0.4], [0.1, 0.5], [0.7, -0.6]])
    planes = np.empty((last + 1, 4, 2))
    assert integrate(layers, trial, first, last, 1, 0.0, Accuracy(1e-13, 2), start.copy(), planes)

    def turned(u: np.ndarray, x: float, k: int, share: float) -> np.ndarray:
        y = u * x ** (degree - 2)
        big_u = dziembowski.structure(pieces, k, share)[4]
        return np.vstack((y[:3], y[3] - big_u * y[0]))

    begin, end = pieces.left[first], pieces.right[last]
    expected = np.empty((4, 2))
    for c, y in enumerate(turned(start, begin, first, 0.0).T):
        done = solve_ivp(
            textbook(profile, 30.0, degree), (begin, end), y, method="Radau", rtol=1e-9, atol=1e-12
        )
        expected[:, c] = done.y[:, -1]
    # Columns may have been made orthogonal on the way: compare the planes.
    ours = turned(planes[last], end, last, 1.0)
    left = ours - expected @ np.linalg.lstsq(expected, ours, rcond=None)[0]
    assert np.max(np.abs(left)) < 1e-7 * np.max(np.abs(ours))


@pytest.mark.slow
def test_compiled_code_stays_inside_its_arrays(tmp_path: Path):
    code = """
import oscsolve
for gravity in ("full", "cowling"):
    star = oscsolve.layered_sphere([(0.6, 3.0), (1.0, 1.0)], points=12)
    modes = oscsolve.solve_modes(star, [0, 2], (4, 30), unit="sigma2", gravity=gravity)
    from oscsolve.pulsation.shooting import second_opinion
    assert second_opinion(star, modes).nu.size > 1
print("inside")
"""
    environment = {
        **os.environ,
        "NUMBA_BOUNDSCHECK": "1",
        "NUMBA_CACHE_DIR": str(tmp_path),
        "PYTHONPATH": str(Path(__file__).parents[2]),
    }
    done = subprocess.run(
        [sys.executable, "-c", code], env=environment, capture_output=True, text=True, check=False
    )
    assert done.returncode == 0 and done.stdout.strip() == "inside", done.stderr
