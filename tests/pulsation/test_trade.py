"""Numbers of the trade that whole runs must give back."""

from __future__ import annotations

import numpy as np
import pytest

from oscsolve import polytrope, read_model, solve_modes
from oscsolve.star.integrals import period_spacing
from oscsolve.units import SOLAR_MASS, SOLAR_RADIUS


def test_pulsation_constant_of_the_standard_polytrope():
    """Q = period sqrt(mean density / solar) of n = 3, Gamma1 = 5/3 is 0.038 d.

    Source: handbooks on pulsating stars (from memory: Cox 1980, Theory of Stellar Pulsation).
    """
    for mass, radius in ((1.0, 1.0), (5.0, 60.0)):
        star = polytrope(3, mass=mass * SOLAR_MASS, radius=radius * SOLAR_RADIUS)
        fundamental = solve_modes(star, [0], (5.0, 15.0), unit="sigma2")
        assert fundamental.order.tolist() == [1]
        constant = fundamental.period[0] / 86400.0 * np.sqrt(mass / radius**3)
        assert constant == pytest.approx(0.038, abs=0.0005)


@pytest.mark.parametrize("degree", [1, 2])
def test_g_modes_of_a_white_dwarf_have_the_asymptotic_spacing(degree, shared_data):
    """Tassoul 1980, ApJS 43, 469: periods grow by 2 pi^2/(sqrt(l(l+1)) int N dr/r) an order.

    Layers trap modes, and single spacings differ by half of that either way; a line through
    forty orders averages the trapping to well below a percent.
    """
    star = read_model(shared_data / "dwarfs" / "white-dwarf-columns.txt")
    spacing = period_spacing(star, degree)
    modes = solve_modes(star, [degree], (20.0 * spacing, 61.0 * spacing), unit="s")
    order = -modes.order
    assert modes.complete and order.size >= 38 and np.all(np.diff(np.sort(order)) == 1)
    assert np.polyfit(order, modes.period, 1)[0] == pytest.approx(spacing, rel=0.005)
