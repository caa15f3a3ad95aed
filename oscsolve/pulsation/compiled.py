"""The one decorator of compiled functions, and the width of their innermost loops."""

from __future__ import annotations

from numba import njit

#: Trial frequencies treated side by side in every compiled sweep.
LANES = 8

#: Contracting a*b + c to one instruction is allowed; assuming that no NaN occurs is not.
compiled = njit(cache=True, nogil=True, error_model="numpy", fastmath={"contract", "nsz"})
