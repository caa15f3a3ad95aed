"""Where compiled code is kept, told without loading the compiler."""

from __future__ import annotations

import os
from pathlib import Path

_SOURCES = Path(__file__).resolve().parent


def compile_is_due() -> bool:
    """True where the solver on disk is not compiled, or is newer than what was compiled of it."""
    if os.environ.get("NUMBA_DISABLE_JIT", "0") not in ("", "0"):
        return False
    chosen = os.environ.get("NUMBA_CACHE_DIR")
    found = Path(chosen).rglob("*.nbi") if chosen else (_SOURCES / "__pycache__").glob("*.nbi")
    compiled: dict[str, float] = {}
    for index in found:
        # numba calls an index MODULE.FUNCTION-LINE.pyVERSION.nbi.
        module = index.name.partition(".")[0]
        compiled[module] = max(compiled.get(module, 0.0), index.stat().st_mtime)
    return not compiled or any(
        source.is_file() and source.stat().st_mtime > compiled[module]
        for module in compiled
        for source in [_SOURCES / f"{module}.py"]
    )
