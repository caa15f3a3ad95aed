"""New HDF5 files on disks that may be full.

The HDF5 library does not survive a write that fails: it keeps what it could not write, fails again
while it closes and may take the whole process with it. So it writes through a layer that never
tells it; the first error is kept, and raised once the file is closed.
"""

from __future__ import annotations

import contextlib
import os
from collections.abc import Iterator
from pathlib import Path

import h5py


class Disk:
    """A file as h5py wants it, whose writes always seem to succeed.

    Attributes
    ----------
    error : the first that the disk has answered, or None
    """

    def __init__(self, path: Path) -> None:
        self._file = path.open("w+b", buffering=0)
        self.error: OSError | None = None

    def seek(self, offset: int, whence: int = os.SEEK_SET) -> int:
        return self._file.seek(offset, whence)

    def tell(self) -> int:
        return self._file.tell()

    def read(self, size: int = -1) -> bytes:
        return self._file.read(size)

    def readinto(self, buffer: memoryview) -> int:
        return self._file.readinto(buffer)

    def write(self, data: memoryview) -> int:
        if self.error is None:
            left = memoryview(data)
            try:
                while left:
                    left = left[self._file.write(left) :]
            except OSError as error:
                self.error = error
        return len(data)

    def truncate(self, size: int) -> int:
        if self.error is None:
            try:
                return self._file.truncate(size)
            except OSError as error:
                self.error = error
        return size

    def flush(self) -> None:
        """Nothing is held back."""

    def close(self) -> None:
        """Wait for the disk itself: renamed before its bytes are there, a file can come out of a
        power cut empty."""
        try:
            if self.error is None:
                os.fsync(self._file.fileno())
        except OSError as error:
            self.error = error
        finally:
            self._file.close()

    def check(self) -> None:
        """Raise what the disk has answered so far, to stop a long write early."""
        if self.error is not None:
            raise self.error


@contextlib.contextmanager
def new_hdf5(path: Path) -> Iterator[tuple[h5py.File, Disk]]:
    """An empty HDF5 file, and the disk below it, closed and safe on the disk at the end.

    Raises
    ------
    OSError
        The disk is full or failing; at the end of the block at the latest.
    """
    disk = Disk(path)
    try:
        with h5py.File(disk, "w") as file:
            yield file, disk
    except Exception as error:
        # What HDF5 makes of bytes that never reached the disk says less than the disk itself.
        if disk.error is not None and error is not disk.error:
            raise disk.error from error
        raise
    finally:
        disk.close()
    disk.check()
