"""Fixtures that all tests share."""

from __future__ import annotations

import os
from collections.abc import Callable
from pathlib import Path

import hypothesis
import numpy as np
import pytest

from oscsolve.pulsation.modeset import Census, Eigenfunctions, ModeSet
from oscsolve.star.build import polytrope
from oscsolve.star.findings import Finding
from oscsolve.star.model import StarModel

# Figures are drawn without a display, and every run of the suite tries the same examples.
os.environ.setdefault("MPLBACKEND", "Agg")
hypothesis.settings.register_profile("house", derandomize=True, deadline=None)
hypothesis.settings.load_profile("house")

_SHARED = Path(__file__).resolve().parents[1].parent / "shared"


def _folder(name: str) -> Path:
    folder = _SHARED / name
    if not folder.is_dir():
        pytest.skip(f"{folder} is absent: open data for tests, not part of the project")
    return folder


@pytest.fixture(scope="session")
def shared_data() -> Path:
    """Folder of public models and observations; skips where it is absent."""
    return _folder("data")


@pytest.fixture(scope="session")
def shared_reference() -> Path:
    """Folder of reference values; skips where it is absent."""
    return _folder("reference")


@pytest.fixture(scope="session")
def star_n3() -> StarModel:
    """The polytrope of index 3 with the mass and radius of the Sun."""
    return polytrope(3)


@pytest.fixture(scope="session")
def handmade_modes(star_n3: StarModel) -> Callable[..., ModeSet]:
    """Function that makes a mode list by hand: a growing mode, a relabelled one, odd options.

    The numbers are invented; keywords replace attributes.
    """

    def make(**changes: object) -> ModeSet:
        sigma2 = np.array([-0.5, 9.25, 2.5, 11.4, 130.0])
        nu = np.sign(sigma2) * np.sqrt(np.abs(sigma2)) * star_n3.nu_dynamical
        shape = (sigma2.size, star_n3.radius.size)
        rows = np.random.default_rng(3).normal(size=(5, *shape))
        fields: dict[str, object] = {
            "degree": [0, 0, 1, 1, 1],
            "order": [1, 2, -1, 1, 12],
            "n_p": [1, 2, 0, 1, 13],
            "n_g": [0, 0, 1, 0, 0],
            "kind": ["radial", "radial", "g", "p", "p"],
            "nu": nu,
            "nu_error": [1e-3, 2e-7, 3e-11, 0.0, 5e-5],
            "sigma2": sigma2,
            "inertia": [2e-2, 1.845e-3, 1.1, 5.7e-4, 3e-9],
            "census": Census([0, 1], [-80.0, 100.0], [1200.0, 1200.0], [2, 3], [2, 3], [0, 1]),
            "star": star_n3,
            "eigenfunctions": Eigenfunctions(star_n3.fractional_radius, *rows),
            "options": {
                "degrees": "0,1",
                "gravity": "full",
                "surface": "free",
                "tolerance": 1e-8,
                "stages": 4,
                "band_chosen_by_program": False,
                "phase_per_cell": None,
                "trial": (1.5, 2.5),
                "names": ("a", "\u03b2"),
            },
            "findings": (
                Finding("defect", "dynamically-unstable", "it grows", "check Gamma1", 0.5, -0.5),
                Finding("note", "band-chosen", "100 to 1200 \u03bcHz"),
            ),
            "program_version": "0.1.0",
        }
        return ModeSet(**{**fields, **changes})  # type: ignore[arg-type]

    return make
