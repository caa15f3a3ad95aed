"""Many models at once: what to run, who runs it, and a store that survives being broken off."""

from oscsolve.grid.plan import GridModel
from oscsolve.grid.run import GridProgress, GridSummary, solve_grid

__all__ = ["GridModel", "GridProgress", "GridSummary", "solve_grid"]
