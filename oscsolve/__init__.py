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
    from oscsolve.grid import GridModel, GridProgress, GridSummary, solve_grid
    from oscsolve.pulsation.modeset import Census, Eigenfunction, Eigenfunctions, ModeSet
    from oscsolve.pulsation.options import SolveOptions
    from oscsolve.pulsation.solve import solve_modes
    from oscsolve.seismology.asymptotics import Asymptotics, asymptotics
    from oscsolve.seismology.checks import (
        IntegralCheck,
        Orthogonality,
        integral_check,
        orthogonality,
    )
    from oscsolve.seismology.depth import acoustic_depth
    from oscsolve.seismology.energy import energy_density, energy_share, mode_inertia, mode_mass
    from oscsolve.seismology.interpolate import InterpolatedModes, interpolate_modes
    from oscsolve.seismology.kernels import frequency_change, structure_kernel
    from oscsolve.seismology.large_separation import (
        LargeSeparationFit,
        fit_large_separation,
        fit_ridge,
    )
    from oscsolve.seismology.likelihood import Likelihood
    from oscsolve.seismology.match import Match, match_observed
    from oscsolve.seismology.mixed import MixedModeFit, fit_mixed_modes
    from oscsolve.seismology.observed import ObservedModes, read_observed
    from oscsolve.seismology.period_spacing import (
        PeriodSpacingFit,
        PeriodSpacings,
        fit_period_spacing,
        period_spacings,
    )
    from oscsolve.seismology.rotation import (
        Rotation,
        Splittings,
        ledoux_constant,
        model_rotation,
        rotation_kernel,
        rotational_splitting,
        step_rotation,
        uniform_rotation,
    )
    from oscsolve.seismology.scaling import (
        effective_temperature,
        large_separation_scaling,
        nu_max_scaling,
    )
    from oscsolve.seismology.separations import (
        Separation,
        combine_frequencies,
        joint_covariance,
        separations,
    )
    from oscsolve.seismology.tables import read_rotation, read_splittings
    from oscsolve.seismology.two_zones import MeanRotation, MeasuredSplittings, mean_rotation
    from oscsolve.star.build import Run, build_star, layered_sphere, polytrope, uniform_sphere
    from oscsolve.star.findings import Finding
    from oscsolve.star.formats import read_model, write_model
    from oscsolve.star.inspection import Figures, Inspection, inspect_model
    from oscsolve.star.model import StarModel
    from oscsolve.store import Grid, GridRow, load_grid, load_modes, save_modes

#: Public name: module that has it. Keep in step with the imports above and with `__all__`.
_HOMES = {
    "Asymptotics": "oscsolve.seismology.asymptotics",
    "BandError": "oscsolve.errors",
    "Census": "oscsolve.pulsation.modeset",
    "Eigenfunction": "oscsolve.pulsation.modeset",
    "Eigenfunctions": "oscsolve.pulsation.modeset",
    "Figures": "oscsolve.star.inspection",
    "Finding": "oscsolve.star.findings",
    "Grid": "oscsolve.store",
    "GridModel": "oscsolve.grid",
    "GridProgress": "oscsolve.grid",
    "GridRow": "oscsolve.store",
    "GridSummary": "oscsolve.grid",
    "IncompleteError": "oscsolve.errors",
    "InputError": "oscsolve.errors",
    "Inspection": "oscsolve.star.inspection",
    "IntegralCheck": "oscsolve.seismology.checks",
    "InterpolatedModes": "oscsolve.seismology.interpolate",
    "LargeSeparationFit": "oscsolve.seismology.large_separation",
    "Likelihood": "oscsolve.seismology.likelihood",
    "Match": "oscsolve.seismology.match",
    "MeanRotation": "oscsolve.seismology.two_zones",
    "MeasuredSplittings": "oscsolve.seismology.two_zones",
    "MissingPackageError": "oscsolve.errors",
    "MixedModeFit": "oscsolve.seismology.mixed",
    "ModeSet": "oscsolve.pulsation.modeset",
    "ModelError": "oscsolve.errors",
    "ObservedModes": "oscsolve.seismology.observed",
    "Orthogonality": "oscsolve.seismology.checks",
    "OscsolveError": "oscsolve.errors",
    "PeriodSpacingFit": "oscsolve.seismology.period_spacing",
    "PeriodSpacings": "oscsolve.seismology.period_spacing",
    "Rotation": "oscsolve.seismology.rotation",
    "Run": "oscsolve.star.build",
    "Separation": "oscsolve.seismology.separations",
    "SolveOptions": "oscsolve.pulsation.options",
    "Splittings": "oscsolve.seismology.rotation",
    "StarModel": "oscsolve.star.model",
    "acoustic_depth": "oscsolve.seismology.depth",
    "asymptotics": "oscsolve.seismology.asymptotics",
    "build_star": "oscsolve.star.build",
    "combine_frequencies": "oscsolve.seismology.separations",
    "effective_temperature": "oscsolve.seismology.scaling",
    "energy_density": "oscsolve.seismology.energy",
    "energy_share": "oscsolve.seismology.energy",
    "fit_large_separation": "oscsolve.seismology.large_separation",
    "fit_mixed_modes": "oscsolve.seismology.mixed",
    "fit_period_spacing": "oscsolve.seismology.period_spacing",
    "fit_ridge": "oscsolve.seismology.large_separation",
    "frequency_change": "oscsolve.seismology.kernels",
    "inspect_model": "oscsolve.star.inspection",
    "integral_check": "oscsolve.seismology.checks",
    "interpolate_modes": "oscsolve.seismology.interpolate",
    "joint_covariance": "oscsolve.seismology.separations",
    "large_separation_scaling": "oscsolve.seismology.scaling",
    "layered_sphere": "oscsolve.star.build",
    "ledoux_constant": "oscsolve.seismology.rotation",
    "load_grid": "oscsolve.store",
    "load_modes": "oscsolve.store",
    "match_observed": "oscsolve.seismology.match",
    "mean_rotation": "oscsolve.seismology.two_zones",
    "mode_inertia": "oscsolve.seismology.energy",
    "mode_mass": "oscsolve.seismology.energy",
    "model_rotation": "oscsolve.seismology.rotation",
    "nu_max_scaling": "oscsolve.seismology.scaling",
    "orthogonality": "oscsolve.seismology.checks",
    "period_spacings": "oscsolve.seismology.period_spacing",
    "polytrope": "oscsolve.star.build",
    "read_model": "oscsolve.star.formats",
    "read_observed": "oscsolve.seismology.observed",
    "read_rotation": "oscsolve.seismology.tables",
    "read_splittings": "oscsolve.seismology.tables",
    "rotation_kernel": "oscsolve.seismology.rotation",
    "rotational_splitting": "oscsolve.seismology.rotation",
    "save_modes": "oscsolve.store",
    "separations": "oscsolve.seismology.separations",
    "solve_grid": "oscsolve.grid",
    "solve_modes": "oscsolve.pulsation.solve",
    "step_rotation": "oscsolve.seismology.rotation",
    "structure_kernel": "oscsolve.seismology.kernels",
    "uniform_rotation": "oscsolve.seismology.rotation",
    "uniform_sphere": "oscsolve.star.build",
    "write_model": "oscsolve.star.formats",
}

__all__ = [
    "Asymptotics",
    "BandError",
    "Census",
    "Eigenfunction",
    "Eigenfunctions",
    "Figures",
    "Finding",
    "Grid",
    "GridModel",
    "GridProgress",
    "GridRow",
    "GridSummary",
    "IncompleteError",
    "InputError",
    "Inspection",
    "IntegralCheck",
    "InterpolatedModes",
    "LargeSeparationFit",
    "Likelihood",
    "Match",
    "MeanRotation",
    "MeasuredSplittings",
    "MissingPackageError",
    "MixedModeFit",
    "ModeSet",
    "ModelError",
    "ObservedModes",
    "Orthogonality",
    "OscsolveError",
    "PeriodSpacingFit",
    "PeriodSpacings",
    "Rotation",
    "Run",
    "Separation",
    "SolveOptions",
    "Splittings",
    "StarModel",
    "__version__",
    "acoustic_depth",
    "asymptotics",
    "build_star",
    "combine_frequencies",
    "effective_temperature",
    "energy_density",
    "energy_share",
    "fit_large_separation",
    "fit_mixed_modes",
    "fit_period_spacing",
    "fit_ridge",
    "frequency_change",
    "inspect_model",
    "integral_check",
    "interpolate_modes",
    "joint_covariance",
    "large_separation_scaling",
    "layered_sphere",
    "ledoux_constant",
    "load_grid",
    "load_modes",
    "match_observed",
    "mean_rotation",
    "mode_inertia",
    "mode_mass",
    "model_rotation",
    "nu_max_scaling",
    "orthogonality",
    "period_spacings",
    "polytrope",
    "read_model",
    "read_observed",
    "read_rotation",
    "read_splittings",
    "rotation_kernel",
    "rotational_splitting",
    "save_modes",
    "separations",
    "solve_grid",
    "solve_modes",
    "step_rotation",
    "structure_kernel",
    "uniform_rotation",
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
