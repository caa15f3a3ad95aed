"""Files a command will write, looked at before the work begins."""

from __future__ import annotations

import os
from collections.abc import Iterable
from pathlib import Path

from oscsolve.errors import InputError


def check_output(
    path: Path, *, overwrite: bool, suffixes: Iterable[str] = (), inputs: Iterable[Path] = ()
) -> None:
    """Refuse a file that could not be written at the end of a long run.

    Parameters
    ----------
    path : file to be written
    overwrite : it may exist already
    suffixes : endings it may have, in lower case; none given: any
    inputs : files that the command reads and so must not replace

    Raises
    ------
    InputError
        The file is refused; the message says why and what to do.
    """
    allowed = tuple(suffixes)
    if allowed and path.suffix.lower() not in allowed:
        raise InputError(f"{path}: the name must end in {' or '.join(allowed)}")
    folder = path.parent
    if not folder.exists():
        raise InputError(f"{path}: the folder {folder} does not exist; make it first")
    if not folder.is_dir():
        raise InputError(f"{path}: {folder} is no folder; choose another name")
    if path.is_dir():
        raise InputError(f"{path}: this is a folder; give the name of a file to write")
    if path.exists():
        if any(path.samefile(source) for source in inputs if source.exists()):
            raise InputError(f"{path}: this is the file to be read; choose another name")
        if not overwrite:
            raise InputError(f"{path}: the file exists; choose another name or give --overwrite")
    if not os.access(folder, os.W_OK):
        raise InputError(f"{path}: the folder {folder} cannot be written; choose another one")
