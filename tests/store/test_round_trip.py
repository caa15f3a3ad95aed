"""A mode list comes back from its file as it went in, and other programs can read the file."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
from dataclasses import fields

import h5py
import numpy as np
import pytest
import xarray as xr

import oscsolve
from oscsolve.errors import InputError
from oscsolve.store import schema

GROUPS = ("modes", "census", "structure", "eigenfunctions", "findings")


def assert_same(one, other):
    """Equal bit by bit, attribute by attribute."""
    for item in fields(one):
        left, right = getattr(one, item.name), getattr(other, item.name)
        if isinstance(left, np.ndarray):
            assert left.dtype == right.dtype, item.name
            np.testing.assert_array_equal(left, right, err_msg=item.name)
        elif hasattr(left, "__dataclass_fields__"):
            assert_same(left, right)
        else:
            assert left == right, item.name


@pytest.fixture
def saved(handmade_modes, tmp_path):
    modes = handmade_modes()
    path = tmp_path / "modes.h5"
    oscsolve.save_modes(modes, path)
    return modes, path


def test_everything_comes_back_bit_by_bit(saved):
    modes, path = saved
    assert_same(modes, oscsolve.load_modes(path))


def test_a_solved_list_comes_back_bit_by_bit(star_n3, tmp_path):
    modes = oscsolve.solve_modes(star_n3, (0, 1), (9, 17), unit="sigma2")
    oscsolve.save_modes(modes, tmp_path / "modes.h5")
    assert_same(modes, oscsolve.load_modes(tmp_path / "modes.h5"))


def test_findings_of_the_star_come_back(handmade_modes, star_n3, tmp_path):
    finding = oscsolve.Finding("doubt", "gravity-estimated", "G was estimated", size=1e-4)
    modes = handmade_modes(star=star_n3.with_findings(finding))
    oscsolve.save_modes(modes, tmp_path / "modes.h5")
    assert oscsolve.load_modes(tmp_path / "modes.h5").star.findings == (finding,)


def test_a_list_without_eigenfunctions_comes_back(handmade_modes, tmp_path):
    modes = handmade_modes(eigenfunctions=None)
    oscsolve.save_modes(modes, tmp_path / "modes.h5")
    assert_same(modes, oscsolve.load_modes(tmp_path / "modes.h5"))


def test_an_empty_list_comes_back(handmade_modes, star_n3, tmp_path):
    names = ("degree", "order", "n_p", "n_g", "kind", "nu", "nu_error", "sigma2", "inertia")
    none = np.zeros((0, star_n3.radius.size))
    modes = handmade_modes(
        **{name: [] for name in names},
        census=oscsolve.Census([2], [1.0], [2.0], [0], [0], [0]),
        eigenfunctions=oscsolve.Eigenfunctions(star_n3.fractional_radius, *[none] * 5),
        findings=(),
    )
    oscsolve.save_modes(modes, tmp_path / "modes.h5")
    assert_same(modes, oscsolve.load_modes(tmp_path / "modes.h5"))
    with xr.open_dataset(tmp_path / "modes.h5", group="modes", engine="h5netcdf") as opened:
        assert opened.sizes == {"mode": 0}


def test_xarray_sees_named_dimensions_and_units(saved):
    modes, path = saved
    expected = {
        "modes": {"mode": 5},
        "census": {"degree": 2},
        "structure": {"point": modes.star.radius.size},
        "eigenfunctions": {"mode": 5, "point": modes.star.radius.size},
        "findings": {"finding": 2},
    }
    for group in GROUPS:
        with xr.open_dataset(path, group=group, engine="h5netcdf") as opened:
            assert dict(opened.sizes) == expected[group]
            for name, variable in opened.variables.items():
                assert variable.attrs["units"], (group, name)
                assert variable.attrs["long_name"], (group, name)
    with xr.open_dataset(path, group="modes", engine="h5netcdf") as opened:
        assert list(opened.kind.values) == ["radial", "radial", "g", "p", "p"]
        np.testing.assert_array_equal(opened.nu, modes.nu)
        np.testing.assert_array_equal(opened.period, modes.period)
    with xr.open_dataset(path, group="eigenfunctions", engine="h5netcdf") as opened:
        assert opened.xi_h.dims == ("mode", "point")
        np.testing.assert_array_equal(opened.xi_h, modes.eigenfunctions.xi_h)
    with xr.open_dataset(path, engine="h5netcdf") as opened:
        assert opened.attrs["option_tolerance"] == 1e-8


def test_the_root_says_what_the_file_is(saved):
    modes, path = saved
    with h5py.File(path) as file:
        assert file.attrs["content"] == "oscsolve modes"
        assert file.attrs["schema"] == schema.SCHEMA
        assert file.attrs["created"].endswith("Z")
        assert file.attrs["model_name"] == modes.star.name
        assert file.attrs["option_gravity"] == "full"
        assert isinstance(file.attrs["option_phase_per_cell"], h5py.Empty)


def test_no_compound_types_and_compressed_eigenfunctions(saved):
    _, path = saved
    kinds = set()
    with h5py.File(path) as file:
        for name in GROUPS:
            for dataset in file[name].values():
                kinds.add(dataset.dtype.kind)
        xi_r = file["eigenfunctions/xi_r"]
        assert xi_r.compression == "gzip"
        assert xi_r.shuffle
        assert xi_r.chunks == xi_r.shape  # these few modes fit in one chunk
    assert kinds == {"i", "f", "O"}


def test_an_existing_file_is_replaced_only_when_asked(saved, handmade_modes):
    _, path = saved
    before = path.read_bytes()
    with pytest.raises(InputError, match=r"modes\.h5: the file exists"):
        oscsolve.save_modes(handmade_modes(), path)
    assert path.read_bytes() == before
    oscsolve.save_modes(handmade_modes(program_version="later"), path, overwrite=True)
    assert oscsolve.load_modes(path).program_version == "later"


def test_an_option_that_is_no_plain_value_is_refused_and_leaves_no_file(handmade_modes, tmp_path):
    with pytest.raises(InputError, match="option knob cannot be saved"):
        oscsolve.save_modes(handmade_modes(options={"knob": object()}), tmp_path / "modes.h5")
    assert list(tmp_path.iterdir()) == []


@pytest.mark.skipif(not hasattr(signal, "SIGKILL"), reason="the system has no SIGKILL")
def test_a_killed_writer_leaves_the_old_file_alone(saved):
    modes, path = saved
    script = (
        "import os, signal, sys, oscsolve, oscsolve.store.write as write\n"
        "modes = oscsolve.load_modes(sys.argv[1])\n"
        "write.write_eigenfunctions = lambda *_: os.kill(os.getpid(), signal.SIGKILL)\n"
        "oscsolve.save_modes(modes, sys.argv[1], overwrite=True)\n"
    )
    ended = subprocess.run([sys.executable, "-c", script, os.fspath(path)], check=False)
    assert ended.returncode == -signal.SIGKILL
    assert_same(modes, oscsolve.load_modes(path))
