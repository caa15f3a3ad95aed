"""Mode lists on disk: one self-describing HDF5 file a run."""

from oscsolve.store.read import load_modes
from oscsolve.store.write import save_modes

__all__ = ["load_modes", "save_modes"]
