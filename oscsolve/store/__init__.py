"""Mode lists on disk: one self-describing HDF5 file a run."""

from oscsolve.store.grid_read import Grid, load_grid
from oscsolve.store.load import is_grid_store, is_mode_file, load_modes
from oscsolve.store.rows import GridRow
from oscsolve.store.write import save_modes

__all__ = [
    "Grid",
    "GridRow",
    "is_grid_store",
    "is_mode_file",
    "load_grid",
    "load_modes",
    "save_modes",
]
