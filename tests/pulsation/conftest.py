"""Stars and discrete actions that the tests of the solver share."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from oscsolve import StarModel, polytrope, read_model
from oscsolve.pulsation.mesh import Mesh, element, model_mesh
from oscsolve.pulsation.sweep import Action, build_action
from oscsolve.star.profile import Profile


def _thinned(star: StarModel, step: int) -> StarModel:
    size = star.radius.size
    keep = np.unique(np.append(np.arange(0, size, step), [size - 2, size - 1]))
    names = ("radius", "mass", "pressure", "density", "gamma1", "a_star")
    return star.with_changes(**{name: getattr(star, name)[keep] for name in names})


@pytest.fixture(scope="session")
def thinned() -> Callable[[StarModel, int], StarModel]:
    """Function that keeps every so-many-th point of a star, and its last two."""
    return _thinned


@pytest.fixture(scope="session")
def coarse_n3() -> StarModel:
    """Polytrope of index 3 with 20 points: a mesh small enough for dense matrices."""
    return _thinned(polytrope(3), 48)


@pytest.fixture(scope="session")
def stump(coarse_n3) -> StarModel:
    """The inner 0.97 R of it under a fictitious surface: no edge, so atmospheres are possible."""
    names = ("radius", "mass", "pressure", "density", "gamma1", "a_star")
    inside = coarse_n3.fractional_radius < 0.97
    return coarse_n3.with_changes(
        **{name: getattr(coarse_n3, name)[inside] for name in names},
        total_mass=float(coarse_n3.mass[inside][-1]),
        photospheric_radius=float(coarse_n3.radius[inside][-1]),
    )


@pytest.fixture(scope="session")
def make_action() -> Callable[..., tuple[Mesh, Action]]:
    """Function that makes the mesh of a star's own points, cut `parts` times, and its action."""

    def make(
        star: StarModel,
        degree: int,
        gravity: str = "full",
        surface: str = "free",
        stages: int = 3,
        parts: int = 1,
    ) -> tuple[Mesh, Action]:
        profile = Profile(star)
        mesh = model_mesh(profile)
        mesh = mesh.split(np.full(mesh.size, parts))
        return mesh, build_action(profile, mesh, element(stages), degree, gravity, surface)

    return make


@pytest.fixture(scope="session")
def sun(shared_data: Path) -> StarModel:
    """The standard solar model of the open data."""
    return read_model(shared_data / "solar" / "standard.fgong")


@pytest.fixture(scope="session")
def giant(shared_data: Path) -> StarModel:
    """The red giant of the open data."""
    return read_model(shared_data / "giants" / "red-giant-columns.txt")


@pytest.fixture(scope="session")
def subgiant(shared_data: Path) -> StarModel:
    """The subgiant of the open data."""
    return read_model(shared_data / "subgiant" / "structure-columns.txt")
