"""Speed, memory and accuracy of the main job."""

from __future__ import annotations

from pathlib import Path

import numpy as np

import oscsolve
from oscsolve.pulsation.compiled import LANES
from oscsolve.pulsation.inverse import Workspace
from oscsolve.pulsation.mesh import element, model_mesh
from oscsolve.pulsation.sweep import Action, build_action, count_negative
from oscsolve.star.profile import Profile

_LANTERN = Path(__file__).resolve().parents[1] / "models_demo" / "lantern-1.fgong"
#: Fundamental radial mode of the polytrope n = 3, Gamma1 = 5/3: sigma2 to 12 digits
#: (from the project's own arbitrary-precision table).
_FUNDAMENTAL = 9.25470607385


class Sweep:
    """One elimination and one step of inverse iteration, per cell and frequency."""

    params = (2, 3, 4)
    param_names = ("stages",)

    def setup(self, stages: int) -> None:
        profile = Profile(oscsolve.read_model(_LANTERN))
        mesh = model_mesh(profile)
        self.action: Action = build_action(profile, mesh, element(stages), 2, "full", "isothermal")
        self.lam = np.linspace(200.0, 1500.0, LANES)
        self.negative = np.zeros(LANES, np.int64)
        self.work = Workspace(self.action, LANES)
        self.work.vector[:] = 1.0
        self.time_count(stages)
        self.time_step(stages)

    def time_count(self, stages: int) -> None:
        count_negative(self.action, self.lam, self.negative)

    def time_step(self, stages: int) -> None:
        self.work.iterate(self.action, self.lam)

    def track_cells_times_lanes(self, stages: int) -> int:
        return self.action.width.size * LANES


class DemoStar:
    """lantern-1, l = 0-3, 1000-4000 uHz: the whole list with census, error bars, eigenfunctions."""

    def setup(self) -> None:
        self.star = oscsolve.read_model(_LANTERN)
        self.modes = oscsolve.solve_modes(self.star, band=(1000, 4000), surface="isothermal")

    def time_solve(self) -> None:
        oscsolve.solve_modes(self.star, band=(1000, 4000), surface="isothermal")

    def peakmem_solve(self) -> None:
        oscsolve.solve_modes(self.star, band=(1000, 4000), surface="isothermal")

    def track_modes(self) -> int:
        return len(self.modes)

    def track_largest_relative_error_bar(self) -> float:
        return float(np.max(self.modes.nu_error / self.modes.nu))


class Polytrope:
    """n = 3, radial, where the answer is known."""

    params = (1e-8, 1e-12)
    param_names = ("tolerance",)

    def setup(self, tolerance: float) -> None:
        self.star = oscsolve.polytrope(3)
        self.time_solve(tolerance)

    def time_solve(self, tolerance: float) -> None:
        self.modes = oscsolve.solve_modes(
            self.star, [0], (9.0, 200.0), unit="sigma2", tolerance=tolerance
        )

    def track_true_relative_error(self, tolerance: float) -> float:
        return float(abs(self.modes.sigma2[0] / _FUNDAMENTAL - 1.0))
