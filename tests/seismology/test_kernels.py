"""Structure kernels: differences of frequencies of near stars, from kernels and from solutions."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.interpolate import CubicSpline

import oscsolve
from oscsolve.star.build import stratified_star

#: What the issue asks for; third-order terms of the steps below leave 1e-4.
WANTED = 1e-3


def with_gamma1(star, step):
    """The same pressure and density with another Gamma1, and N^2 to match."""
    x = star.fractional_radius
    gamma1 = star.gamma1 * (1.0 + step * np.exp(-(((x - 0.3) / 0.15) ** 2)) + 0.5 * step * x**2)
    gravity = star.gravitational_constant * star.mass
    v = np.zeros_like(x)
    np.divide(gravity * star.density, star.pressure * star.radius, out=v, where=(x > 0) & (x < 1))
    return star.with_changes(
        gamma1=gamma1, a_star=star.a_star + v * (1.0 / star.gamma1 - 1.0 / gamma1)
    )


def condensed(step):
    """A star with a dense radiative core and mixed modes; `step` bends its stratification."""
    return stratified_star(
        [(0.0, 1.0), (4.0, 0.75 + step), (9.0, 0.6 - step)],
        photosphere=24.0,
        outermost=24.0,
        mass=2e33,
        radius=7e10,
        points=1500,
    )


CASES = {
    "Gamma1 of a polytrope": [with_gamma1(oscsolve.polytrope(3), e) for e in (-1e-3, 0.0, 1e-3)],
    "polytropic index": [oscsolve.polytrope(3 + e) for e in (-1e-3, 0.0, 1e-3)],
    "stratification": [condensed(e) for e in (-3e-4, 0.0, 3e-4)],
    "Gamma1 with mixed modes": [with_gamma1(condensed(0.0), e) for e in (-1e-3, 0.0, 1e-3)],
}


@pytest.mark.parametrize("case", CASES)
def test_kernels_give_the_difference_of_two_solutions(case):
    below, star, above = CASES[case]
    low, modes, high = (
        oscsolve.solve_modes(s, (0, 1, 2), (1.5, 200), unit="sigma2", tolerance=1e-11)
        for s in (below, star, above)
    )
    labels = [
        list(zip(m.degree.tolist(), m.order.tolist(), strict=True)) for m in (low, modes, high)
    ]
    common = [label for label in labels[1] if label in labels[0] and label in labels[2]]
    assert len(common) > 25
    rows, first, last = (
        [found.index(k) for k in common] for found in (labels[1], labels[0], labels[2])
    )
    solved = 0.5 * np.log(high.sigma2[last] / low.sigma2[first])
    kinds = set(modes.kind[rows])
    assert {"p", "g"} <= kinds
    if case in ("stratification", "Gamma1 with mixed modes"):
        assert "mixed" in kinds
    for pair in (("c2", "rho"), ("gamma1", "rho")):
        change = oscsolve.frequency_change(modes, above, *pair)
        change -= oscsolve.frequency_change(modes, below, *pair)
        np.testing.assert_allclose(change[rows], solved, rtol=WANTED)


def test_kernels_on_the_points_integrate_to_the_same(n3_modes):
    star = n3_modes.star
    x, other = star.fractional_radius, with_gamma1(star, 1e-4)
    change = np.log(other.gamma1 / star.gamma1)
    expected = oscsolve.frequency_change(n3_modes, other, "gamma1", "rho")
    for row in (2, 15, 40, 70):
        kernel = oscsolve.structure_kernel(n3_modes, row, "gamma1", "rho")
        np.testing.assert_array_equal(kernel, oscsolve.structure_kernel(n3_modes, row, "c2", "rho"))
        integral = CubicSpline(x, kernel * change).integrate(0.0, 1.0)
        # The two rules differ by the fourth order of the spacing.
        assert integral == pytest.approx(expected[row], rel=1e-4)


def test_density_kernels_on_the_points_do_so_too(n3_modes):
    star = n3_modes.star
    x, bump = star.fractional_radius, np.exp(-(((star.fractional_radius - 0.35) / 0.1) ** 2))
    # Not a star in balance, but the kernels are linear in whatever is put in.
    other = star.with_changes(density=star.density * (1.0 + 1e-5 * bump))
    same_c2 = other.with_changes(pressure=star.pressure * (1.0 + 1e-5 * bump))
    expected = oscsolve.frequency_change(n3_modes, same_c2, "rho", "c2")
    for row in (2, 15, 40, 70):
        kernel = oscsolve.structure_kernel(n3_modes, row, "rho", "c2")
        integral = CubicSpline(x, kernel * np.log1p(1e-5 * bump)).integrate(0.0, 1.0)
        # Between the points rho follows its slope, which here does not belong to its values.
        assert integral == pytest.approx(expected[row], rel=5e-3, abs=1e-9)


def test_homologous_changes_change_nothing(n3_modes):
    star = oscsolve.polytrope(3, mass=3e33, radius=2e11)
    for pair in (("c2", "rho"), ("gamma1", "rho")):
        change = oscsolve.frequency_change(n3_modes, star, *pair)
        # Round-off of numbers of order one.
        np.testing.assert_allclose(change, 0.0, atol=1e-10)


def test_unknown_pairs_and_other_ends_are_refused(n3_modes, lantern_modes):
    with pytest.raises(oscsolve.InputError, match="no kernel of 'u' at fixed 'rho'"):
        oscsolve.structure_kernel(n3_modes, 3, "u", "rho")
    with pytest.raises(oscsolve.InputError, match="no kernels of 'u'"):
        oscsolve.frequency_change(n3_modes, n3_modes.star, "u", "rho")
    with pytest.raises(oscsolve.InputError, match="end at different radii"):
        oscsolve.frequency_change(n3_modes, lantern_modes.star)
