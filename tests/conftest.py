"""Fixtures that all tests share."""

from __future__ import annotations

from pathlib import Path

import pytest

_SHARED = Path(__file__).resolve().parents[1].parent / "shared"


def _folder(name: str) -> Path:
    folder = _SHARED / name
    if not folder.is_dir():
        pytest.skip(f"{folder} is absent: open data for tests, not part of the project")
    return folder


@pytest.fixture(scope="session")
def shared_data() -> Path:
    """Folder of public models and observations; skips where it is absent."""
    return _folder("data")


@pytest.fixture(scope="session")
def shared_reference() -> Path:
    """Folder of reference values; skips where it is absent."""
    return _folder("reference")
