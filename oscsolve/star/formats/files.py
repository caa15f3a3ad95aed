"""Opening, checking and replacing files: what every reader and writer shares."""

from __future__ import annotations

import contextlib
import hashlib
import os
import tempfile
from collections.abc import Iterator
from pathlib import Path

from oscsolve.errors import InputError

#: Bytes looked at when the format of a file is recognised.
HEAD_BYTES = 65536


def checked_path(path: str | os.PathLike[str]) -> Path:
    """`path` as a Path that is an ordinary, non-empty file.

    Raises
    ------
    InputError
        The file is missing, a folder, a device or pipe, or empty.
    """
    file = Path(path)
    try:
        if file.is_dir():
            raise InputError(f"{file}: this is a folder; name one model file in it")
        if not file.exists():
            raise InputError(f"{file}: no such file; check the name and the folder")
        if not file.is_file():
            raise InputError(f"{file}: not an ordinary file; copy the model to a file first")
        if file.stat().st_size == 0:
            raise InputError(f"{file}: the file is empty; copy or write it again")
    except (OSError, ValueError) as error:
        if isinstance(error, InputError):
            raise
        raise unreadable(file, error) from error
    return file


def unreadable(path: Path, error: Exception) -> InputError:
    """The one-line error for a file that the system will not let us read."""
    reason = getattr(error, "strerror", None) or str(error)
    return InputError(f"{path}: cannot be read ({reason}); check its permissions")


def read_head(path: Path) -> bytes:
    """The first `HEAD_BYTES` bytes of a file."""
    try:
        with path.open("rb") as stream:
            return stream.read(HEAD_BYTES)
    except OSError as error:
        raise unreadable(path, error) from error


def read_bytes(path: Path) -> bytes:
    """All bytes of a file."""
    try:
        return path.read_bytes()
    except OSError as error:
        raise unreadable(path, error) from error


def file_hash(path: Path) -> str:
    """sha256 of a file of any size, as hexadecimal text."""
    try:
        with path.open("rb") as stream:
            return hashlib.file_digest(stream, "sha256").hexdigest()
    except OSError as error:
        raise unreadable(path, error) from error


def bytes_hash(data: bytes) -> str:
    """sha256 of bytes already in memory, as hexadecimal text."""
    return hashlib.sha256(data).hexdigest()


@contextlib.contextmanager
def replacing(path: Path, overwrite: bool) -> Iterator[Path]:
    """A temporary name beside `path`, renamed to `path` when the block ends well.

    A killed or failing writer leaves the old file as it was, and an error inside the block
    removes the temporary file.

    Raises
    ------
    InputError
        `path` exists and `overwrite` is false, is a folder, or its folder cannot be written.
    """
    if path.is_dir():
        raise InputError(f"{path}: this is a folder; give the name of a file to write")
    if path.exists() and not overwrite:
        raise InputError(f"{path}: the file exists; choose another name or ask to overwrite it")
    try:
        handle, name = tempfile.mkstemp(prefix=f".{path.name}.", suffix=".tmp", dir=path.parent)
    except OSError as error:
        reason = error.strerror or str(error)
        raise InputError(
            f"{path}: cannot be written ({reason}); check that the folder exists and is yours"
        ) from error
    os.close(handle)
    temporary = Path(name)
    try:
        yield temporary
        # mkstemp makes files private to the owner; a model is an ordinary file.
        mask = os.umask(0)
        os.umask(mask)
        temporary.chmod(0o666 & ~mask)
        if overwrite:
            os.replace(temporary, path)
        else:
            _rename_new(temporary, path)
    except OSError as error:
        reason = error.strerror or str(error)
        raise InputError(f"{path}: cannot be written ({reason}); check the disk") from error
    finally:
        temporary.unlink(missing_ok=True)


def _rename_new(temporary: Path, path: Path) -> None:
    """Give the temporary file its name unless another process took the name meanwhile."""
    try:
        os.link(temporary, path)
    except FileExistsError as error:
        raise InputError(
            f"{path}: the file exists; choose another name or ask to overwrite it"
        ) from error
    except OSError:
        # No hard links on this file system: a plain rename is the best there is.
        os.replace(temporary, path)
