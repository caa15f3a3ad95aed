"""Workers on other machines, behind a Dask scheduler that somebody has started."""

from __future__ import annotations

import contextlib
from collections.abc import Iterator
from typing import Any

from oscsolve.errors import InputError, MissingPackageError

#: Seconds to wait for the scheduler.
_PATIENCE = 15


@contextlib.contextmanager
def cluster(address: str) -> Iterator[Any]:
    """A client of the scheduler at an address such as ``tcp://node1:8786``, closed at the end.

    Raises
    ------
    MissingPackageError
        dask.distributed is not installed.
    InputError
        No scheduler answers at the address.
    """
    try:
        from distributed import Client
    except ImportError as error:
        raise MissingPackageError(
            "a cluster needs dask.distributed, which is not installed here: "
            "pip install 'oscsolve[cluster]'"
        ) from error
    try:
        client = Client(address, timeout=_PATIENCE, set_as_default=False)
    except (OSError, ValueError, RuntimeError) as error:
        reason = " ".join(str(error).split()) or type(error).__name__
        raise InputError(
            f"no scheduler answers at {address} ({reason}); start one with 'dask scheduler' and "
            "give the address that it prints"
        ) from error
    with client:
        yield client
