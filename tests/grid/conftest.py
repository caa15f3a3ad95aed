"""A field of small invented stars, solved once without any disturbance."""

from __future__ import annotations

import dataclasses
import os
import subprocess
import sys
import time
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import h5py
import numpy as np
import pytest

import oscsolve
from oscsolve.star.model import StarModel

ROOT = Path(oscsolve.__file__).resolve().parents[1]
#: What every grid here asks for: a few modes of each star, some hundredths of a second.
ASKED = {"degrees": (0, 1), "band": (3.0, 30.0), "unit": "sigma2"}
STARS = 12


class Inline(ThreadPoolExecutor):
    """An executor that costs nothing: one thread of this process."""

    def __init__(self) -> None:
        super().__init__(1)


class Odd(StarModel):
    """A star that runs an expression where it arrives, in the worker."""

    def __reduce__(self):
        return eval, (self.name,)


def odd_star(expression: str) -> StarModel:
    """A star whose worker evaluates `expression` before it gets the star."""
    star = oscsolve.polytrope(1.5)
    values = {item.name: getattr(star, item.name) for item in dataclasses.fields(StarModel)}
    return Odd(**{**values, "brunt_n2": None, "name": expression})


def deadly_star() -> StarModel:
    """A star that ends its worker."""
    return odd_star("__import__('os')._exit(9)")


def slow_star(seconds: float, index: float = 1.5) -> StarModel:
    """A star that takes its time."""
    return odd_star(
        f"[__import__('time').sleep({seconds}), __import__('oscsolve').polytrope({index})][1]"
    )


@pytest.fixture(scope="session")
def kit():
    """The helpers of this file."""
    return sys.modules[__name__]


@pytest.fixture(scope="session")
def field(tmp_path_factory) -> list[Path]:
    """Files of polytropes, lantern-1 to lantern-12; numbers 11 and 12 sort behind 2 by name."""
    folder = tmp_path_factory.mktemp("field")
    files = []
    for number in range(1, STARS + 1):
        file = folder / f"lantern-{number}.fgong"
        oscsolve.write_model(oscsolve.polytrope(1.0 + 0.2 * number), file)
        files.append(file)
    return files


@pytest.fixture(scope="session")
def undisturbed(field, tmp_path_factory) -> Path:
    """The store of all stars of the field, solved in one go by one thread."""
    store = tmp_path_factory.mktemp("undisturbed") / "grid.h5"
    with Inline() as pool:
        oscsolve.solve_grid(field, store, executor=pool, **ASKED)
    return store


def contents(store: Path) -> dict[str, object]:
    """Everything a store holds, name to values, except when it was made."""
    values: dict[str, object] = {}

    def look(name: str, item: object) -> None:
        if isinstance(item, h5py.Dataset):
            values[name] = item.asstr()[()] if item.dtype.kind == "O" else item[()]

    with h5py.File(store) as file:
        file.visititems(look)
        values |= {
            f"@{name}": str(value) for name, value in file.attrs.items() if name != "created"
        }
    return values


def assert_same_store(one: Path, other: Path) -> None:
    """Equal bit by bit, in the same order."""
    left, right = contents(one), contents(other)
    assert left.keys() == right.keys()
    for name, value in left.items():
        np.testing.assert_array_equal(value, right[name], err_msg=name)


def leftovers(store: Path) -> list[str]:
    """Files beside a store that a run should not leave."""
    return sorted(
        entry.name
        for entry in store.parent.iterdir()
        if store.name in entry.name and entry != store
    )


def start_grid(*arguments: object) -> subprocess.Popen[str]:
    """``oscsolve grid`` in a process, and a process group, of its own."""
    paths = os.pathsep.join([str(ROOT), os.environ.get("PYTHONPATH", "")])
    return subprocess.Popen(
        [sys.executable, "-m", "oscsolve", "grid", *map(str, arguments)],
        env={**os.environ, "PYTHONPATH": paths},
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        start_new_session=True,
    )


def wait_until(true, seconds: float = 60.0) -> None:
    """Wait for something to become true; fail where it does not."""
    end = time.monotonic() + seconds
    while not true():
        assert time.monotonic() < end, "waited in vain"
        time.sleep(0.01)
