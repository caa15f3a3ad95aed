"""Rarely needed knobs of a run, in one frozen object."""

from __future__ import annotations

import os
from dataclasses import dataclass

from oscsolve.errors import InputError

#: Phase per cell, radian, at which collocation with so many points errs by about 1e-10, wanted at
#: a tolerance of 1e-8.
_PHASE = {2: 0.08, 3: 0.15, 4: 0.45, 5: 0.9, 6: 1.2}


@dataclass(frozen=True)
class SolveOptions:
    """Knobs that everyday use leaves alone.

    Attributes
    ----------
    stages : Gauss points per cell, 2 to 6; None takes the 3 or 4 that cost less. Errors fall as
        width^(2 stages). The same modes seen with one point more give the error estimate.
    phase_per_cell : phase, in radian, that a mode of the band may turn in one cell before the
        cell is split; None derives it from the tolerance
    cells_factor : every cell of the first mesh is cut into this many more
    most_cells : refinement stops at this many cells and the result says so
    eigenfunctions : keep the eigenfunctions in the result
    threads : degrees, and modes of a second opinion, worked on side by side; None: one for each
        core. The result does not depend on it.

    Raises
    ------
    InputError
        A value is out of range.
    """

    stages: int | None = None
    phase_per_cell: float | None = None
    cells_factor: int = 1
    most_cells: int = 400_000
    eigenfunctions: bool = True
    threads: int | None = None

    def __post_init__(self) -> None:
        if self.stages is not None and not 2 <= self.stages <= 6:
            raise InputError(f"stages must be 2 to 6; got {self.stages}")
        if self.phase_per_cell is not None and not 0.0 < self.phase_per_cell <= 3.0:
            raise InputError(f"phase_per_cell must be in (0, 3]; got {self.phase_per_cell:g}")
        if self.cells_factor < 1 or self.most_cells < 10:
            raise InputError("cells_factor must be at least 1 and most_cells at least 10")
        if self.threads is not None and self.threads < 1:
            raise InputError(f"threads must be at least 1, or None; got {self.threads}")

    @property
    def most_threads(self) -> int:
        """Threads that may work at once."""
        return self.threads or os.cpu_count() or 1

    def phase_limit(self, tolerance: float, stages: int) -> float:
        """Phase per cell at which collocation errs by less than `tolerance` almost everywhere."""
        if self.phase_per_cell is not None:
            return self.phase_per_cell
        return float(min(1.2, _PHASE[stages] * (tolerance / 1e-8) ** (0.5 / stages)))
