"""Arrays of results that nobody can change by accident."""

from __future__ import annotations

from dataclasses import fields

import numpy as np


def freeze_arrays(self: object) -> None:
    """Replace every array of a dataclass by a read-only copy; for ``__post_init__``."""
    for item in fields(self):  # type: ignore[arg-type]
        value = getattr(self, item.name)
        if isinstance(value, np.ndarray):
            value = np.array(value)
            value.setflags(write=False)
            object.__setattr__(self, item.name, value)
