"""One writer a store: a lock that the system drops by itself when its holder dies."""

from __future__ import annotations

import contextlib
import os
import socket
from collections.abc import Iterator
from pathlib import Path

from oscsolve.errors import InputError

try:
    import fcntl
except ImportError:  # Windows
    fcntl = None  # type: ignore[assignment]
    import msvcrt

#: Longest entry read from a lock file.
_ENTRY_BYTES = 300


def lock_path(store: Path) -> Path:
    """The lock file of a store, hidden beside it."""
    return store.with_name(f".{store.name}.lock")


@contextlib.contextmanager
def only_writer(store: Path) -> Iterator[None]:
    """Keep every other writer away from a store while the block runs.

    The lock belongs to the open file and not to the name: a killed holder leaves the file behind,
    and it stops nobody.

    Raises
    ------
    InputError
        Another run holds the lock, or the folder cannot be written.
    """
    path = lock_path(store)
    try:
        handle = _take(path)
    except OSError as error:
        reason = error.strerror or str(error)
        raise InputError(
            f"{store}: cannot be written ({reason}); check that the folder exists and is yours"
        ) from error
    if handle is None:
        raise InputError(
            f"{store}: another run is writing this store{_holder(path)}; wait until it ends, or "
            "choose another name"
        )
    try:
        os.ftruncate(handle, 0)
        os.write(handle, f"process {os.getpid()} on {socket.gethostname()}\n".encode())
        yield
    finally:
        # Removed while it is still held, so that nobody locks a file that has no name any more
        # without noticing, see `_take`.
        with contextlib.suppress(OSError):
            path.unlink()
        os.close(handle)


def _take(path: Path) -> int | None:
    """The open, locked file, or None where another process holds it."""
    while True:
        handle = os.open(path, os.O_RDWR | os.O_CREAT, 0o666)
        try:
            if fcntl is not None:
                fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
            else:
                msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)
        except (BlockingIOError, PermissionError):
            os.close(handle)
            return None
        except OSError:
            os.close(handle)
            raise
        with contextlib.suppress(FileNotFoundError):
            if os.path.samestat(os.fstat(handle), path.stat()):
                return handle
        # The former holder removed the name between our opening and locking.
        os.close(handle)


def _holder(path: Path) -> str:
    try:
        with path.open("rb") as stream:
            entry = stream.read(_ENTRY_BYTES).decode("utf-8", "replace").strip()
    except OSError:
        return ""
    return f" ({entry})" if entry else ""
