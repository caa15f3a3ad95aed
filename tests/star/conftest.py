"""A star in closed form that the format tests share."""

from __future__ import annotations

import numpy as np
import pytest

from oscsolve.star.model import StarModel
from oscsolve.units import NEWTON_G


def _polytrope_n1(points=400):
    """A closed form: rho = rho_c sin(z)/z, P = K rho^2, m = 4 pi a^3 rho_c (sin z - z cos z)."""
    z = np.linspace(0.0, 3.0, points)
    scale, central = 2e10, 5.0
    shape = np.sinc(z / np.pi)
    rho = central * shape
    pressure = 2.0 * np.pi * NEWTON_G * scale**2 * rho**2
    mass = 4.0 * np.pi * scale**3 * central * (np.sin(z) - z * np.cos(z))
    # z < 0.02: the series, since sin z - z cos z cancels.
    small = z < 0.02
    mass[small] = 4.0 * np.pi * scale**3 * central * (z**3 / 3 - z**5 / 30)[small]
    gamma1 = np.full(points, 5 / 3)
    slope = np.zeros(points)
    slope[1:] = -(z * np.cos(z) - np.sin(z))[1:] / np.sin(z)[1:]
    # dln rho/dln r = -slope, dlnP/dln r = -2 slope.
    return StarModel(
        scale * z, mass, pressure, rho, gamma1,
        mass[-1], scale * z[-1],
        a_star=slope - 2.0 * slope / gamma1, temperature=1e7 * shape, hydrogen=np.full(points, 0.7),
        helium=np.full(points, 0.28), luminosity=1e33,
        effective_temperature=5000.0, name="lantern-1",
    )  # fmt: skip


@pytest.fixture(scope="session")
def polytrope_n1():
    """Function of the number of points that makes a polytrope n = 1, out to z = 3."""
    return _polytrope_n1
