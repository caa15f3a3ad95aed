"""Whatever is no mode list of ours is refused in one line that says why."""

from __future__ import annotations

import random
import subprocess
import sys
from pathlib import Path

import h5py
import numpy as np
import pytest

import oscsolve
from oscsolve.errors import InputError


@pytest.fixture
def path(handmade_modes, tmp_path):
    file = tmp_path / "modes.h5"
    oscsolve.save_modes(handmade_modes(), file)
    return file


def refusal(path) -> str:
    with pytest.raises(InputError) as caught:
        oscsolve.load_modes(path)
    message = str(caught.value)
    assert "\n" not in message
    assert path.name in message
    return message


def test_missing_file(tmp_path):
    assert "no such file" in refusal(tmp_path / "none.h5")


def test_text_file(tmp_path):
    (tmp_path / "list.h5").write_text("l n nu\n")
    assert "not an HDF5 file; expected a mode list" in refusal(tmp_path / "list.h5")


def test_model_file(star_n3, tmp_path):
    oscsolve.write_model(star_n3, tmp_path / "star.h5")
    assert "holds 'oscsolve stellar structure'; expected 'oscsolve modes'" in refusal(
        tmp_path / "star.h5"
    )


def test_foreign_file(tmp_path):
    with h5py.File(tmp_path / "other.h5", "w") as file:
        file["x"] = np.arange(3)
    assert "was not written by oscsolve" in refusal(tmp_path / "other.h5")


def test_newer_schema_names_the_version_that_reads_it(path):
    with h5py.File(path, "r+") as file:
        file.attrs["schema"] = 2
        file.attrs["schema_since"] = "3.4.0"
    assert "schema 2 needs oscsolve 3.4.0 or later" in refusal(path)


def test_schema_that_is_no_number(path):
    with h5py.File(path, "r+") as file:
        file.attrs["schema"] = "one"
    assert "'schema' is no whole number" in refusal(path)


@pytest.mark.parametrize(
    "name", ["modes/nu", "modes/kind", "census/counted", "eigenfunctions/xi_h", "findings/code"]
)
def test_missing_dataset_is_named(path, name):
    with h5py.File(path, "r+") as file:
        del file[name]
    assert f"the dataset /{name} is missing" in refusal(path)


def test_missing_structure(path):
    with h5py.File(path, "r+") as file:
        del file["structure"]
    assert "the group /structure is missing" in refusal(path)


@pytest.mark.parametrize(
    ("name", "values", "wanted"),
    [
        ("modes/nu", ["a"] * 5, "expected numbers"),
        ("modes/order", [1.5] * 5, "expected whole numbers"),
        ("modes/kind", [1] * 5, "expected texts"),
    ],
)
def test_wrong_type_is_named(path, name, values, wanted):
    with h5py.File(path, "r+") as file:
        del file[name]
        file[name] = values
    message = refusal(path)
    assert f"/{name} holds" in message
    assert wanted in message


def test_columns_of_different_length(path):
    with h5py.File(path, "r+") as file:
        del file["modes/nu"]
        file["modes/nu"] = np.ones(4)
    assert "do not fit together" in refusal(path)


def test_findings_of_different_length(path):
    with h5py.File(path, "r+") as file:
        del file["findings/code"]
        file["findings/code"] = ["a"]
    assert "/findings does not fit together" in refusal(path)


def test_eigenfunctions_of_another_list(path, handmade_modes, tmp_path, star_n3):
    few = oscsolve.Eigenfunctions(
        star_n3.fractional_radius, *[np.zeros((2, star_n3.radius.size))] * 5
    )
    other = tmp_path / "few.h5"
    oscsolve.save_modes(handmade_modes(eigenfunctions=few), other)
    assert "2 eigenfunctions for 5 modes" in refusal(other)


@pytest.mark.parametrize("kept", [0.1, 0.5, 0.999])
def test_truncated_file(path, kept):
    data = path.read_bytes()
    path.write_bytes(data[: int(len(data) * kept)])
    assert "damaged or cut short" in refusal(path)


def test_a_flipped_byte_never_ends_in_a_traceback(path):
    """Damage is refused with an `InputError` or does no harm to the reader."""
    data = path.read_bytes()
    chance = random.Random(7)
    refused = 0
    for _ in range(60):
        damaged = bytearray(data)
        # Most of what HDF5 trusts blindly, heap and object headers, lies at the beginning.
        damaged[chance.randrange(6000)] = chance.randrange(256)
        path.write_bytes(damaged)
        try:
            oscsolve.load_modes(path)
        except InputError:
            refused += 1
    assert refused > 0


@pytest.mark.skipif(not Path("/proc").exists(), reason="needs a system with file size limits")
@pytest.mark.parametrize("limit", [1000, 20_000, 100_000])
def test_a_full_disk_is_one_line_and_keeps_the_old_file(path, limit):
    """A real limit of the system on the size of files, which fails in the depths of HDF5."""
    before = path.read_bytes()
    script = (
        "import resource, sys, oscsolve\n"
        "modes = oscsolve.load_modes(sys.argv[1])\n"
        "resource.setrlimit(resource.RLIMIT_FSIZE, (int(sys.argv[2]),) * 2)\n"
        "try:\n"
        "    oscsolve.save_modes(modes, sys.argv[1], overwrite=True)\n"
        "except oscsolve.InputError as error:\n"
        "    print(error)\n"
    )
    ended = subprocess.run(
        [sys.executable, "-c", script, str(path), str(limit)],
        capture_output=True,
        text=True,
        check=False,
    )
    assert (ended.returncode, ended.stderr) == (0, "")
    assert "modes.h5: cannot be written (File too large)" in ended.stdout
    assert path.read_bytes() == before
    assert list(path.parent.iterdir()) == [path]
