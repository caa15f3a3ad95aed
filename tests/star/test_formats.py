"""Recognition, the HDF5 model file, safe writing, and the errors of both."""

from __future__ import annotations

import os
from pathlib import Path

import h5py
import numpy as np
import pytest

from oscsolve.errors import InputError
from oscsolve.star.findings import Finding
from oscsolve.star.formats import read_model, write_model
from oscsolve.star.formats.hdf5 import read_structure, write_structure

ARRAYS = ("radius", "mass", "pressure", "density", "gamma1", "a_star", "brunt_n2", "temperature",
          "hydrogen", "helium", "rotation")  # fmt: skip
SCALARS = ("total_mass", "photospheric_radius", "gravitational_constant", "effective_temperature",
           "luminosity", "name")  # fmt: skip


@pytest.fixture
def star(polytrope_n1):
    base = polytrope_n1(50)
    finding = Finding("doubt", "some-code", "a Δ here", "advice", 0.5, 2.0)
    return base.with_changes(rotation=np.full(50, 3e-6), findings=(finding,), source="origin.fgong")


def same(first, second):
    for name in ARRAYS:
        a, b = getattr(first, name), getattr(second, name)
        assert (a is None and b is None) or np.array_equal(a, b), name
    for name in SCALARS:
        assert getattr(first, name) == getattr(second, name), name


def test_hdf5_round_trip_is_exact(tmp_path, star):
    write_model(star, tmp_path / "a.h5")
    read = read_model(tmp_path / "a.h5")
    same(star, read)
    assert read.findings[0] == star.findings[0]
    assert (
        read.findings[1].code == "structure-origin" and "origin.fgong" in read.findings[1].message
    )
    assert read.source == str(tmp_path / "a.h5") and len(read.source_hash) == 64


def test_hdf5_round_trip_is_exact_whichever_buoyancy_was_given(tmp_path, star):
    n2 = star.brunt_n2 * (1 + 1e-7)
    other = star.with_changes(brunt_n2=n2)
    write_model(other, tmp_path / "a.h5")
    read = read_model(tmp_path / "a.h5")
    same(other, read)
    assert np.array_equal(read.brunt_n2, n2)


def test_hdf5_without_optional_arrays(tmp_path, star):
    bare = star.with_changes(temperature=None, hydrogen=None, helium=None, rotation=None,
                             luminosity=None, effective_temperature=None)  # fmt: skip
    write_model(bare, tmp_path / "a.h5")
    same(bare, read_model(tmp_path / "a.h5"))


def test_hdf5_layout_is_self_describing(tmp_path, star):
    write_model(star, tmp_path / "a.h5")
    with h5py.File(tmp_path / "a.h5") as file:
        assert file.attrs["content"] == "oscsolve stellar structure" and file.attrs["schema"] == 1
        assert file.attrs["created"].endswith("+00:00")
        group = file["structure"]
        assert group["radius"].attrs["units"] == "cm"
        assert group["radius"].dims[0][0].name == "/structure/point"
        for name, dataset in group.items():
            assert "units" in dataset.attrs and "long_name" in dataset.attrs, name


def test_hdf5_opens_in_xarray(tmp_path, star):
    xarray = pytest.importorskip("xarray")
    pytest.importorskip("h5netcdf")
    write_model(star, tmp_path / "a.h5")
    with xarray.open_dataset(tmp_path / "a.h5", group="structure", engine="h5netcdf") as data:
        assert data["density"].dims == ("point",)
        assert np.array_equal(data["density"].values, star.density)


def test_structure_inside_another_file(tmp_path, star):
    with h5py.File(tmp_path / "modes.h5", "w") as file:
        file.create_group("modes")
        write_structure(file.create_group("structure"), star)
    with h5py.File(tmp_path / "modes.h5") as file:
        stored = read_structure(file["structure"])
    same(star, stored)
    assert stored.source == "origin.fgong" and stored.findings == star.findings
    same(star, read_model(tmp_path / "modes.h5"))


def test_gravity_of_the_caller_wins_in_hdf5(tmp_path, star):
    write_model(star, tmp_path / "a.h5")
    read = read_model(tmp_path / "a.h5", gravitational_constant=6.67e-8)
    assert read.gravitational_constant == 6.67e-8
    assert np.array_equal(read.a_star, star.a_star)
    assert read.findings[-1].code == "gravity-given"


def spoil(path, action):
    with h5py.File(path, "a") as file:
        action(file)


def text_radius(file):
    del file["structure/radius"]
    file["structure/radius"] = "abc"


def attribute(name, value):
    return lambda file: file["structure"].attrs.__setitem__(name, value)


@pytest.mark.parametrize(
    ("action", "message"),
    [
        (lambda f: f.pop("structure"), "has no group /structure"),
        (lambda f: f["structure"].pop("mass"), "dataset 'mass' is missing"),
        (text_radius, "'radius' is no dataset of numbers"),
        (lambda f: f["structure"].attrs.pop("total_mass"), "attribute 'total_mass' is missing"),
        (attribute("total_mass", "x"), "'total_mass' is not one number"),
        (attribute("structure_schema", 99), "schema .*99.* is not known"),
        (attribute("findings", "{"), "'findings' is not the list"),
        (lambda f: f["structure/radius"].__setitem__(10, 0.0), "radius must increase outward"),
    ],
)
def test_spoiled_hdf5_is_refused_in_one_line(tmp_path, star, action, message):
    write_model(star, tmp_path / "a.h5")
    spoil(tmp_path / "a.h5", action)
    with pytest.raises(InputError, match=message) as caught:
        read_model(tmp_path / "a.h5")
    assert "\n" not in str(caught.value) and "a.h5" in str(caught.value)


def test_cut_hdf5_is_refused(tmp_path, star):
    write_model(star, tmp_path / "a.h5")
    data = (tmp_path / "a.h5").read_bytes()
    (tmp_path / "b.h5").write_bytes(data[: len(data) // 2])
    with pytest.raises(InputError, match="damaged or cut short"):
        read_model(tmp_path / "b.h5")


@pytest.mark.parametrize("at", range(0, 12000, 500))
def test_hdf5_with_a_wrong_byte_is_read_or_refused(tmp_path, star, at):
    write_model(star, tmp_path / "a.h5")
    data = bytearray((tmp_path / "a.h5").read_bytes())
    data[at:at] = b"-"
    (tmp_path / "b.h5").write_bytes(data)
    try:
        read_model(tmp_path / "b.h5")
    except InputError as error:
        assert "\n" not in str(error) and "b.h5" in str(error)


def test_content_decides_not_the_name(tmp_path, star):
    write_model(star, tmp_path / "a.fgong", format="hdf5")
    write_model(star, tmp_path / "b.h5", format="fgong")
    assert np.array_equal(read_model(str(tmp_path / "a.fgong")).radius, star.radius)
    assert np.array_equal(read_model(tmp_path / "b.h5").radius, star.radius)


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (None, "no such file"),
        ("folder", "this is a folder"),
        (b"", "the file is empty"),
        (b"\x00\x01\x02" * 100, "binary file is in no known format"),
        (b"Dear reader,\nthis is a letter.\n", "text file is in no known format"),
        (b"1 2 3 4.5\n" * 20, "text file is in no known format"),
    ],
)
def test_files_that_are_no_models(tmp_path, content, message):
    path = tmp_path / "thing"
    if content == "folder":
        path.mkdir()
    elif content is not None:
        path.write_bytes(content)
    with pytest.raises(InputError, match=message) as caught:
        read_model(path)
    assert "\n" not in str(caught.value) and str(path) in str(caught.value)


def test_pipes_and_odd_names_are_refused(tmp_path):
    os.mkfifo(tmp_path / "pipe")
    with pytest.raises(InputError, match="not an ordinary file"):
        read_model(tmp_path / "pipe")
    with pytest.raises(InputError):
        read_model("a\0b")


def test_file_that_may_not_be_read(tmp_path, monkeypatch):
    path = tmp_path / "a"
    path.write_text("x")

    def denied(*_args, **_kwargs):
        raise PermissionError(13, "Permission denied")

    # The tests may run as root, who may read everything.
    monkeypatch.setattr(Path, "open", denied)
    with pytest.raises(InputError, match=r"cannot be read \(Permission denied\)"):
        read_model(path)


@pytest.mark.parametrize("suffix", [".h5", ".fgong"])
def test_nothing_is_overwritten_unasked(tmp_path, star, suffix):
    path = tmp_path / f"a{suffix}"
    path.write_text("precious")
    with pytest.raises(InputError, match="the file exists"):
        write_model(star, path)
    assert path.read_text() == "precious"
    write_model(star, path, overwrite=True)
    assert np.array_equal(read_model(path).radius, star.radius)
    assert os.listdir(tmp_path) == [path.name]


def test_failed_writer_leaves_the_old_file_and_no_litter(tmp_path, star, monkeypatch):
    path = tmp_path / "a.h5"
    write_model(star, path)
    before = path.read_bytes()

    def full(*_args):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("oscsolve.star.formats.hdf5.write_structure", full)
    with pytest.raises(InputError, match="No space left"):
        write_model(star, path, overwrite=True)
    assert path.read_bytes() == before and os.listdir(tmp_path) == ["a.h5"]


@pytest.mark.parametrize(
    ("name", "format", "message"),
    [
        ("a.dat", None, "ending '.dat' names no format"),
        ("a.h5", "columns", "format 'columns' cannot be written"),
        ("missing/a.h5", None, "check that the folder exists"),
        ("", None, "names no format"),
        ("", "hdf5", "this is a folder"),
    ],
)
def test_targets_that_cannot_be_written(tmp_path, star, name, format, message):
    with pytest.raises(InputError, match=message):
        write_model(star, tmp_path / name, format=format)
