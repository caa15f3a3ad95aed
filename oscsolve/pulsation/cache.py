"""Where compiled code is kept, told without loading the compiler."""

from __future__ import annotations

import os
from pathlib import Path


def compile_is_due() -> bool:
    """True where no compiled solver is found on disk, so that the first run must compile it."""
    if os.environ.get("NUMBA_DISABLE_JIT", "0") not in ("", "0"):
        return False
    chosen = os.environ.get("NUMBA_CACHE_DIR")
    if chosen:
        return next(Path(chosen).rglob("*.nbi"), None) is None
    return next((Path(__file__).resolve().parent / "__pycache__").glob("*.nbi"), None) is None
