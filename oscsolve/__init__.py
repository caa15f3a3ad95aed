"""Linear adiabatic oscillation modes of stars.

A file becomes a star (`read_model`), a star becomes modes (`solve_modes`), modes become answers.
The names below load what they need on first use: importing the package costs nothing.
"""

from __future__ import annotations

import importlib
from typing import TYPE_CHECKING

from oscsolve.version import __version__

if TYPE_CHECKING:
    from oscsolve.errors import (
        BandError,
        IncompleteError,
        InputError,
        MissingPackageError,
        ModelError,
        OscsolveError,
    )
    from oscsolve.pulsation.modeset import Census, Eigenfunction, Eigenfunctions, ModeSet
    from oscsolve.pulsation.options import SolveOptions
    from oscsolve.pulsation.solve import solve_modes
    from oscsolve.star.build import layered_sphere, polytrope, uniform_sphere
    from oscsolve.star.findings import Finding
    from oscsolve.star.formats import read_model, write_model
    from oscsolve.star.inspection import Figures, Inspection, inspect_model
    from oscsolve.star.model import StarModel
    from oscsolve.store import load_modes, save_modes

#: Public name: module that has it. Keep in step with the imports above and with `__all__`.
_HOMES = {
    "BandError": "oscsolve.errors",
    "Census": "oscsolve.pulsation.modeset",
    "Eigenfunction": "oscsolve.pulsation.modeset",
    "Eigenfunctions": "oscsolve.pulsation.modeset",
    "Figures": "oscsolve.star.inspection",
    "Finding": "oscsolve.star.findings",
    "IncompleteError": "oscsolve.errors",
    "InputError": "oscsolve.errors",
    "Inspection": "oscsolve.star.inspection",
    "MissingPackageError": "oscsolve.errors",
    "ModeSet": "oscsolve.pulsation.modeset",
    "ModelError": "oscsolve.errors",
    "OscsolveError": "oscsolve.errors",
    "SolveOptions": "oscsolve.pulsation.options",
    "StarModel": "oscsolve.star.model",
    "inspect_model": "oscsolve.star.inspection",
    "layered_sphere": "oscsolve.star.build",
    "load_modes": "oscsolve.store",
    "polytrope": "oscsolve.star.build",
    "read_model": "oscsolve.star.formats",
    "save_modes": "oscsolve.store",
    "solve_modes": "oscsolve.pulsation.solve",
    "uniform_sphere": "oscsolve.star.build",
    "write_model": "oscsolve.star.formats",
}

__all__ = [
    "BandError",
    "Census",
    "Eigenfunction",
    "Eigenfunctions",
    "Figures",
    "Finding",
    "IncompleteError",
    "InputError",
    "Inspection",
    "MissingPackageError",
    "ModeSet",
    "ModelError",
    "OscsolveError",
    "SolveOptions",
    "StarModel",
    "__version__",
    "inspect_model",
    "layered_sphere",
    "load_modes",
    "polytrope",
    "read_model",
    "save_modes",
    "solve_modes",
    "uniform_sphere",
    "write_model",
]


def __getattr__(name: str) -> object:
    if name not in _HOMES:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    value = getattr(importlib.import_module(_HOMES[name]), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted({*globals(), *__all__})
