"""Rotation kernels and splittings, and the rotation that measured splittings give."""

from __future__ import annotations

import dataclasses
import math

import numpy as np
import pytest
from scipy.interpolate import CubicSpline

import oscsolve

NHZ = 2e-9 * math.pi  # rad/s


def _row(modes, degree, order):
    (row,) = np.flatnonzero((modes.degree == degree) & (modes.order == order))
    return int(row)


def test_kernels_have_unit_integral(n3_modes):
    x = n3_modes.star.fractional_radius
    for label in ((1, 8), (1, -3), (2, 0), (3, -2), (3, 5)):
        kernel = oscsolve.rotation_kernel(n3_modes, _row(n3_modes, *label))
        # An independent rule, good to the fourth order of the spacing.
        assert CubicSpline(x, kernel).integrate(0.0, 1.0) == pytest.approx(1.0, abs=2e-5)


def test_high_orders_reach_their_limits(star_n3):
    g = oscsolve.solve_modes(star_n3, (1, 2, 3), (0.02, 0.05), unit="sigma2")
    p = oscsolve.solve_modes(star_n3, (1, 2, 3), (2500, 3000), unit="sigma2")
    for degree in (1, 2, 3):
        slow, fast = (oscsolve.ledoux_constant(m)[m.degree == degree] for m in (g, p))
        # C -> 1/(l(l+1)) and 0 (Ledoux 1951), with corrections of some 1/n; n is 16 to 67 here.
        assert slow * degree * (degree + 1) == pytest.approx(1.0, abs=0.02)
        assert np.all(np.diff(slow) < 0.0)
        assert fast == pytest.approx(0.0, abs=0.01)


def test_radial_modes_do_not_split(n3_modes):
    assert np.isnan(oscsolve.ledoux_constant(n3_modes)[n3_modes.degree == 0]).all()
    assert (n3_modes.degree[oscsolve.rotational_splitting(n3_modes, 1.0).row] > 0).all()
    with pytest.raises(oscsolve.InputError, match="is radial"):
        oscsolve.rotation_kernel(n3_modes, 0)


def test_the_f_mode_of_the_uniform_sphere_has_a_closed_form():
    star = oscsolve.uniform_sphere()
    modes = oscsolve.solve_modes(star, (2, 3), (0.5, 2.5), unit="sigma2")
    # Kelvin's mode is xi = grad(r^l Y_lm): xi_r = l xi_h, so C = (2 l + 1)/(l^2 + l(l+1)) = 1/l.
    for degree in (2, 3):
        row = _row(modes, degree, 0)
        assert oscsolve.ledoux_constant(modes)[row] == pytest.approx(1.0 / degree, rel=1e-7)


def test_solid_body_step_and_table_agree(n3_modes):
    solid = oscsolve.rotational_splitting(n3_modes, 430.0)
    np.testing.assert_allclose(solid.splitting, 430.0 * (1.0 - solid.ledoux), rtol=1e-13)
    np.testing.assert_allclose(solid.mean_rate, 430.0)
    step = oscsolve.rotational_splitting(n3_modes, oscsolve.step_rotation(430.0, 430.0, 0.3))
    np.testing.assert_allclose(step.splitting, solid.splitting, rtol=1e-12)
    table = oscsolve.Rotation(np.array([0.1, 0.5, 0.9]), np.full(3, 430.0))
    table_splitting = oscsolve.rotational_splitting(n3_modes, table).splitting
    np.testing.assert_allclose(table_splitting, solid.splitting, rtol=1e-12)


def test_a_step_is_cut_where_it_is(n3_modes):
    """Between two points the splitting follows the step smoothly, not in jumps."""
    x = n3_modes.star.fractional_radius
    at = int(np.searchsorted(x, 0.4))
    row = _row(n3_modes, 1, -3)
    place = int(np.flatnonzero(n3_modes.degree > 0).searchsorted(row))
    kernel, beta = oscsolve.rotation_kernel(n3_modes, row), 1.0 - oscsolve.ledoux_constant(n3_modes)
    inside = []
    for t in (0.0, 0.3, 1.0):
        edge = (1.0 - t) * x[at] + t * x[at + 1]
        rotation = oscsolve.step_rotation(1.0, 0.0, edge)
        inside.append(oscsolve.rotational_splitting(n3_modes, rotation).splitting[place])
    width = x[at + 1] - x[at]
    expected = beta[row] * width * 0.5 * (kernel[at] + kernel[at + 1])
    # Trapezium in one narrow interval.
    assert inside[2] - inside[0] == pytest.approx(expected, rel=1e-3)
    assert (inside[1] - inside[0]) / (inside[2] - inside[0]) == pytest.approx(0.3, abs=0.02)


def test_the_rotation_of_the_model_is_taken_from_it(n3_modes):
    star = n3_modes.star
    rate = 100.0 + 50.0 * star.fractional_radius**2
    turning = dataclasses.replace(n3_modes, star=star.with_changes(rotation=rate * NHZ))
    found = oscsolve.rotational_splitting(turning, oscsolve.model_rotation(turning.star))
    for k in (0, 20, 50):
        kernel = oscsolve.rotation_kernel(n3_modes, int(found.row[k]))
        expected = CubicSpline(star.fractional_radius, kernel * rate).integrate(0.0, 1.0)
        # The two rules differ by the fourth order of the spacing.
        assert found.mean_rate[k] == pytest.approx(expected, rel=2e-5)
    with pytest.raises(oscsolve.InputError, match="holds no rotation"):
        oscsolve.model_rotation(star)


@pytest.mark.parametrize(
    ("radius", "rate", "why"),
    [
        ([0.0, 0.5], [1.0], "as many rates as radii"),
        ([], [], "as many rates as radii"),
        ([0.0, math.nan], [1.0, 1.0], "radius is no finite number at point 2"),
        ([0.0, 1.0], [1.0, math.inf], "rate is no finite number at point 2"),
        ([0.5, 0.2], [1.0, 1.0], "does not at point 2"),
        ([-0.1, 0.2], [1.0, 1.0], "does not at point 1"),
        ([0.2, 0.2, 0.2], [1.0, 2.0, 3.0], "three points share"),
    ],
)
def test_wrong_profiles_are_refused(radius, rate, why):
    with pytest.raises(oscsolve.InputError, match=why):
        oscsolve.Rotation(np.array(radius), np.array(rate))


def test_profiles_are_straight_between_points_and_jump_at_pairs():
    rotation = oscsolve.Rotation(np.array([0.2, 0.4, 0.4, 0.8]), np.array([10.0, 20.0, 5.0, 1.0]))
    x = np.array([0.0, 0.3, 0.4 - 1e-12, 0.4 + 1e-12, 0.6, 1.2])
    np.testing.assert_allclose(rotation.at(x), [10.0, 15.0, 20.0, 5.0, 3.0, 1.0])


class TestMeanRotation:
    """Splittings made with two rates give these back."""

    LABELS = ((1, -3), (1, -1), (1, 4), (2, -4), (2, 2))

    def _measured(self, modes, rotation, error=1.0):
        found = oscsolve.rotational_splitting(modes, rotation)
        rows = [_row(modes, *label) for label in self.LABELS]
        splitting = found.splitting[np.searchsorted(found.row, rows)]
        degree, order = np.array(self.LABELS).T
        return oscsolve.MeasuredSplittings(degree, order, splitting, np.full(len(rows), error))

    def test_two_rates_come_back(self, n3_modes):
        measured = self._measured(n3_modes, oscsolve.step_rotation(750.0, 30.0, 0.25))
        mean = oscsolve.mean_rotation(n3_modes, measured, 0.25)
        assert (mean.core, mean.envelope) == pytest.approx((750.0, 30.0), rel=1e-9)
        assert mean.chi2 < 1e-12
        assert mean.freedom == 3
        np.testing.assert_allclose(mean.fitted, measured.splitting)

    def test_errors_follow_from_those_of_the_splittings(self, n3_modes):
        """The rates are linear in the splittings, so shifting each one gives their covariance."""
        measured = self._measured(n3_modes, oscsolve.step_rotation(750.0, 30.0, 0.25), error=2.0)
        base = oscsolve.mean_rotation(n3_modes, measured, 0.25)
        slopes = []
        for step in np.eye(measured.splitting.size):
            shifted = oscsolve.MeasuredSplittings(
                measured.degree,
                measured.order,
                measured.splitting + step,
                measured.splitting_error,
            )
            mean = oscsolve.mean_rotation(n3_modes, shifted, 0.25)
            slopes.append((mean.core - base.core, mean.envelope - base.envelope))
        covariance = 2.0**2 * np.transpose(slopes) @ slopes
        errors = np.sqrt(np.diag(covariance))
        assert errors == pytest.approx([base.core_error, base.envelope_error], rel=1e-8)
        assert covariance[0, 1] / errors.prod() == pytest.approx(base.correlation, rel=1e-8)

    def test_the_core_ends_where_the_g_cavity_does(self, giant_modes):
        measured_rows = np.argsort(oscsolve.energy_share(giant_modes))[[0, 1, -1]]
        found = oscsolve.rotational_splitting(
            giant_modes, oscsolve.step_rotation(700.0, 50.0, 0.118)
        )
        measured = oscsolve.MeasuredSplittings(
            giant_modes.degree[measured_rows],
            giant_modes.order[measured_rows],
            found.splitting[measured_rows],
            np.full(3, 1.0),
        )
        mean = oscsolve.mean_rotation(giant_modes, measured)
        # N falls below 2 pi times 115 uHz near x = 0.118 in this star.
        assert mean.radius == pytest.approx(0.118, abs=0.005)
        assert mean.core == pytest.approx(700.0, rel=1e-3)
        assert mean.envelope == pytest.approx(50.0, rel=0.02)
        assert mean.core_share[2] > 0.95

    def test_what_cannot_be_inverted_is_refused(self, n3_modes):
        def measured(*labels):
            degree, order = np.array(labels).T
            ones = np.ones(len(labels))
            return oscsolve.MeasuredSplittings(degree, order, 400.0 * ones, ones)

        for labels, radius, why in (
            (((1, -3),), 0.3, "at least two"),
            (((0, 1), (1, 1)), 0.3, "radial mode does not split"),
            (((1, -3), (1, 99)), 0.3, "does not hold l = 1, n = 99"),
            (((1, 5), (1, 6)), None, "no layer is a g-mode cavity"),
            (((1, 5), (1, 6)), 2.0, "the same mixture"),
        ):
            with pytest.raises(oscsolve.InputError, match=why):
                oscsolve.mean_rotation(n3_modes, measured(*labels), radius)
        with pytest.raises(oscsolve.InputError, match="is there twice"):
            measured((1, 2), (1, 2))
        with pytest.raises(oscsolve.InputError, match="row 1 is 400"):
            oscsolve.MeasuredSplittings([1], [1], [400.0], [0.0])
