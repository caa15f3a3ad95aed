"""Mode lists and frames that the tests of figures share."""

from __future__ import annotations

import pytest
from matplotlib.figure import Figure

import oscsolve
from oscsolve import plots


@pytest.fixture(scope="session")
def n3_list(star_n3) -> oscsolve.ModeSet:
    """g, f and p modes of l = 0 to 2 of the polytrope of index 3."""
    return oscsolve.solve_modes(star_n3, [0, 1, 2], (0.5, 300.0), unit="sigma2")


@pytest.fixture
def axes():
    with plots.look():
        return Figure(layout="constrained").subplots()
