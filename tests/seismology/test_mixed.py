"""The asymptotic relation of mixed modes."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

import oscsolve
from oscsolve.seismology.mixed import _normal, _Relation, core_period_spacing

RADIAL = np.array([150.0, 171.5, 193.2, 215.0, 236.9, 258.9])
ORDER = np.arange(6.0, 12.0)
TRUE = np.array([97.3, 0.27, math.log(0.16), -0.02, 0.004])


@pytest.fixture
def made_of_the_relation(red_giant_modes):
    """The giant's list with dipole frequencies that follow the relation to the last digit."""
    modes = red_giant_modes
    radial = modes.degree == 0
    relation = _Relation(modes.nu[radial], modes.order[radial].astype(float), 1)
    nu = np.array(modes.nu)
    dipole = np.flatnonzero(modes.degree == 1)
    nu[dipole] = relation.roots(modes.order[dipole], TRUE)
    sigma2 = (nu / modes.star.nu_dynamical) ** 2
    return replace(modes, nu=nu, sigma2=sigma2, eigenfunctions=None)


def test_roots_satisfy_tan_p_is_q_tan_g():
    relation = _Relation(RADIAL, ORDER, 1)
    order = np.arange(-40, -10)
    order = order[
        (order > relation.at(RADIAL[:1], TRUE)) & (order < relation.at(RADIAL[-1:], TRUE))
    ]
    nu = relation.roots(order, TRUE)
    assert order.size > 8 and np.all(np.diff(nu) > 0.0)
    spacing, phase, log_q, offset, slope = TRUE
    x = np.interp(nu, RADIAL, ORDER)
    p = np.pi * (x - 0.5 - offset - slope * (x - 8.5))
    g = np.pi * (1e6 / (nu * spacing) - phase)
    # sin p cos g = q cos p sin g has no poles; round-off of bisection times pi d(theta)/dnu.
    assert np.sin(p) * np.cos(g) == pytest.approx(math.exp(log_q) * np.cos(p) * np.sin(g), abs=1e-9)


def test_weak_coupling_leaves_pure_modes_alone():
    relation = _Relation(RADIAL, ORDER, 1)
    weak = np.array([97.3, 0.27, math.log(1e-9), 0.0, 0.0])
    order = np.arange(-60, -15)
    nu = relation.roots(order, weak)
    inside = (nu > RADIAL[0]) & (nu < RADIAL[-1])
    x, g = np.interp(nu, RADIAL, ORDER), 1e6 / (nu * 97.3) - 0.27
    off_p, off_g = (x - 0.5) % 1.0, np.abs(g % 1.0 - 0.5)
    off_p = np.minimum(off_p, 1.0 - off_p)
    # Each mode is a p mode (tan p = 0) or a g mode (tan g infinite), but for the coupling.
    assert np.count_nonzero(inside) > 5
    assert np.all(np.minimum(off_p, off_g)[inside] < 1e-6)


def test_two_forms_of_one_relation_are_brought_to_one():
    strong = np.array([97.3, 2.77, math.log(2.9), -0.51, 0.004])
    normal = _normal(strong)
    assert math.exp(normal[2]) == pytest.approx(1.0 / 2.9)
    assert abs(normal[3]) <= 0.5
    relation = _Relation(RADIAL, ORDER, 1)
    nu = np.linspace(RADIAL[0], RADIAL[-1], 200)
    # The same curve, round-off aside.
    assert relation.at(nu, normal) == pytest.approx(relation.at(nu, strong), abs=1e-9)


def test_a_fit_finds_the_parameters_that_made_the_modes(made_of_the_relation):
    fit = oscsolve.fit_mixed_modes(made_of_the_relation)
    # Exact modes: what is left is the end of the bisection and of the minimiser.
    assert fit.spacing == pytest.approx(TRUE[0], rel=1e-6)
    assert fit.coupling == pytest.approx(0.16, rel=1e-4)
    assert fit.epsilon_g == pytest.approx(0.27, abs=1e-4)
    assert fit.offset == pytest.approx(-0.02, abs=1e-4)
    assert fit.rms < 1e-4


def test_propagated_errors_bound_a_shift_of_the_modes(made_of_the_relation):
    modes = made_of_the_relation
    dipole = modes.degree == 1
    error = np.where(dipole, 1e-3, modes.nu_error)
    rough = replace(modes, nu_error=error)
    base = oscsolve.fit_mixed_modes(rough)
    rng = np.random.default_rng(8)
    for _ in range(3):
        moved = modes.nu + np.where(dipole, 1e-3 * rng.choice([-1.0, 1.0], dipole.size), 0.0)
        fit = oscsolve.fit_mixed_modes(replace(rough, nu=moved))
        for name in ("spacing", "coupling", "epsilon_g", "offset"):
            off = abs(getattr(fit, name) - getattr(base, name))
            # First order in shifts of a thousandth of the distance between modes.
            assert off <= 1.05 * getattr(base, f"{name}_propagated"), name


def test_a_red_giant_has_the_parameters_of_red_giants(red_giant_modes):
    found = oscsolve.asymptotics(red_giant_modes)
    dipole, quadrupole = found.mixed
    integral = dict(found.period_spacing_integral)
    # Published for giants of this large separation (22 uHz), all from memory: q between 0.1 and
    # 0.25 (Mosser et al. 2017, A&A 600, A1), epsilon_g = 0.28 +- 0.08 (Mosser et al. 2018, A&A
    # 618, A109), spacings of 90 to 100 s (Mosser et al. 2014, A&A 572, L5).
    assert 0.1 < dipole.coupling < 0.25
    assert dipole.epsilon_g == pytest.approx(0.28, abs=0.16)
    assert 90.0 < dipole.spacing < 100.0
    # Quadrupole modes have a wider evanescent zone to cross.
    assert quadrupole.coupling < 0.3 * dipole.coupling
    for fit in (dipole, quadrupole):
        # Tassoul (1980), on the same structure; the fit covers some n_g = 25 to 60.
        assert fit.spacing == pytest.approx(integral[fit.degree], rel=5e-3)
        assert fit.misfit < 0.06
        assert fit.coupling_error < 0.2 * fit.coupling
    # The ratio of spacings is sqrt(3), the offset of l = 2 is minus the small separation.
    assert dipole.spacing / quadrupole.spacing == pytest.approx(math.sqrt(3.0), rel=3e-3)
    small = found.separations["small_02"]
    share = np.median(small.value) / found.large_separations[0].separation
    assert quadrupole.offset == pytest.approx(-share, abs=0.03)


def test_the_relation_predicts_the_modes_it_was_not_fitted_to(red_giant_modes):
    fit = oscsolve.fit_mixed_modes(red_giant_modes, band=(200.0, 300.0))
    outside = oscsolve.fit_mixed_modes(red_giant_modes, band=(180.0, 330.0))
    assert fit.row.size < outside.row.size
    assert fit.spacing == pytest.approx(outside.spacing, abs=3.0 * fit.spacing_error)


def test_the_core_spacing_counts_the_core_alone(red_giant_modes, solar_modes, star_n3):
    star = red_giant_modes.star
    core = core_period_spacing(star, 1, 250.0)
    whole = dict(oscsolve.asymptotics(red_giant_modes).period_spacing_integral)[1]
    assert core == pytest.approx(whole, rel=0.02)
    assert core > whole
    assert core_period_spacing(star_n3, 1, 1e5) is None


@pytest.mark.parametrize("degree", [0, 1, 2, 3])
def test_there_is_no_fit_without_mixed_modes(solar_modes, degree):
    assert oscsolve.fit_mixed_modes(solar_modes, degree) is None


def test_there_is_no_fit_where_the_range_holds_too_little(
    red_giant_modes, subgiant_modes, giant_modes
):
    assert oscsolve.fit_mixed_modes(red_giant_modes, band=(250.0, 260.0)) is None
    # Two g modes in all: spacing and coupling cannot be told apart.
    assert oscsolve.fit_mixed_modes(subgiant_modes) is None
    # No radial modes to lay out the acoustic orders.
    assert oscsolve.fit_mixed_modes(giant_modes) is None
