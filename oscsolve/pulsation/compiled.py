"""The one decorator of compiled functions, and the width of their innermost loops."""

from __future__ import annotations

from numba import njit

#: Most trial frequencies treated side by side in a compiled sweep. Innermost loops run over them;
#: their number is a run-time value, because the compiler turns a loop of known short length into
#: single operations first and then finds no vectors in it.
LANES = 64
#: Lanes come in multiples of this: the vector units take so many at once, and a loop over what is
#: left runs one by one.
_VECTOR = 8

#: Contracting a*b + c to one instruction is allowed; assuming that no NaN occurs is not.
compiled = njit(cache=True, nogil=True, error_model="numpy", fastmath={"contract", "nsz"})


def padded(lanes: int) -> int:
    """The next number of lanes that fills the vector units."""
    return -(-lanes // _VECTOR) * _VECTOR
