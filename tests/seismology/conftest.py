"""Mode lists that several tests of this folder share."""

from __future__ import annotations

from pathlib import Path

import pytest

import oscsolve


@pytest.fixture(scope="session")
def n3_modes(star_n3) -> oscsolve.ModeSet:
    """Polytrope of index 3, g modes and p modes of l = 0 to 3."""
    return oscsolve.solve_modes(star_n3, (0, 1, 2, 3), (0.3, 300), unit="sigma2")


@pytest.fixture(scope="session")
def lantern_modes() -> oscsolve.ModeSet:
    """The Sun-like demo star under an isothermal atmosphere."""
    path = Path(__file__).resolve().parents[2] / "models_demo" / "lantern-1.fgong"
    star = oscsolve.read_model(path)
    return oscsolve.solve_modes(star, (0, 1, 2), (150, 4000), surface="isothermal")


@pytest.fixture(scope="session")
def giant_modes(shared_data) -> oscsolve.ModeSet:
    """Mixed dipole modes of a red giant."""
    star = oscsolve.read_model(shared_data / "giants" / "red-giant-columns.txt")
    return oscsolve.solve_modes(star, (1,), (100, 130))


@pytest.fixture(scope="session")
def solar_modes(shared_data) -> oscsolve.ModeSet:
    """p modes of the standard solar model under an isothermal atmosphere."""
    star = oscsolve.read_model(shared_data / "solar" / "standard.fgong")
    return oscsolve.solve_modes(star, (0, 1, 2, 3), (300, 4500), surface="isothermal")


@pytest.fixture(scope="session")
def red_giant_modes(shared_data) -> oscsolve.ModeSet:
    """Radial, dipole and quadrupole modes of a red giant about its frequency of greatest power."""
    star = oscsolve.read_model(shared_data / "giants" / "red-giant-columns.txt")
    return oscsolve.solve_modes(star, (0, 1, 2), (150, 400), surface="isothermal")


@pytest.fixture(scope="session")
def subgiant_modes(shared_data) -> oscsolve.ModeSet:
    """Modes of a subgiant, some of them mixed."""
    star = oscsolve.read_model(shared_data / "subgiant" / "structure-columns.txt")
    return oscsolve.solve_modes(star, (0, 1, 2, 3), (700, 2400), surface="isothermal")
