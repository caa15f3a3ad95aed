"""Errors and warnings of the package. Imports nothing from it.

Everything a user can cause is a child of `OscsolveError`; the command line turns it into
one line and exit code 2 (or 1 for `IncompleteError`).
"""


class OscsolveError(Exception):
    """Root of all errors raised on purpose by oscsolve."""


class InputError(OscsolveError, ValueError):
    """A file, argument or option cannot be used; the message says where and what to do."""


class ModelError(InputError):
    """A structure model cannot be used for pulsation work as it stands."""


class BandError(InputError):
    """The frequency band asked for cannot be searched."""


class IncompleteError(OscsolveError, RuntimeError):
    """A computation finished but could not prove or reach what was asked."""


class MissingPackageError(OscsolveError, ImportError):
    """An optional package is needed; the message holds the install line."""
