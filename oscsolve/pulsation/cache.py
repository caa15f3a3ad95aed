"""Where compiled code is kept, told without loading the compiler."""

from __future__ import annotations

import os
from pathlib import Path

_SOURCES = Path(__file__).resolve().parent


def compile_is_due() -> bool:
    """True where no compiled solver is found on disk, so that the first run must compile it."""
    return _compiling_is_on() and not _compiled()


def compile_may_be_due() -> bool:
    """True also where a file of the solver is newer than what was compiled of it.

    Whether that still holds is for the compiler to say, which compares contents.
    """
    compiled = _compiled()
    return _compiling_is_on() and (
        not compiled
        or any(
            source.is_file() and source.stat().st_mtime > compiled[module]
            for module in compiled
            for source in [_SOURCES / f"{module}.py"]
        )
    )


def _compiling_is_on() -> bool:
    return os.environ.get("NUMBA_DISABLE_JIT", "0") in ("", "0")


def _compiled() -> dict[str, float]:
    """Modules of which compiled functions lie on disk, and when the last of them was made."""
    chosen = os.environ.get("NUMBA_CACHE_DIR")
    found = Path(chosen).rglob("*.nbi") if chosen else (_SOURCES / "__pycache__").glob("*.nbi")
    compiled: dict[str, float] = {}
    for index in found:
        # numba calls an index MODULE.FUNCTION-LINE.pyVERSION.nbi.
        module = index.name.partition(".")[0]
        compiled[module] = max(compiled.get(module, 0.0), index.stat().st_mtime)
    return compiled
