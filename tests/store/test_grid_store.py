"""A grid store gives back the rows that went in, as h5py and xarray see them too."""

from __future__ import annotations

import pickle
from dataclasses import replace

import h5py
import numpy as np
import pytest
import xarray as xr

import oscsolve
from oscsolve.errors import InputError
from oscsolve.store import grid_read, grid_write, schema
from oscsolve.store.grid_write import GridHeader, GridShape, write_grid
from oscsolve.store.rows import GridRow, row_of_modes

HEADER = GridHeader({"gravity": "full", "tolerance": 1e-8}, (0, 1), "0.1.0")


def assert_same_row(one: GridRow, other: GridRow) -> None:
    """Equal bit by bit in everything but the number of the row."""
    for name in GridRow.__dataclass_fields__:
        left, right = getattr(one, name), getattr(other, name)
        if name == "census":
            for column in schema.CENSUS:
                np.testing.assert_array_equal(
                    getattr(left, column.name), getattr(right, column.name), err_msg=column.name
                )
        elif name == "eigenfunctions" and left is not None:
            for column in (schema.EIGENFUNCTION_RADIUS, *schema.EIGENFUNCTIONS):
                np.testing.assert_array_equal(
                    getattr(left, column.name), getattr(right, column.name), err_msg=column.name
                )
        elif name != "row":
            np.testing.assert_equal(left, right, err_msg=name)


def shape_of(rows, **parameters) -> GridShape:
    findings = sum(len(row.findings) + len(row.star_findings) for row in rows)
    return GridShape(len(rows), sum(len(row) for row in rows), findings, parameters)


@pytest.fixture
def rows(handmade_modes):
    """Four invented models: one with eigenfunctions, one that failed, one whose census is open."""
    modes = handmade_modes()
    plain = replace(modes, eigenfunctions=None)
    short = replace(
        plain, census=oscsolve.Census([0, 1], [1.0, 1.0], [2.0, 2.0], [2, 4], [2, 3], [0, 1])
    )
    return [
        row_of_modes(plain, name="lantern-1", source="", source_hash="1", parameters={"mass": 1.0}),
        GridRow("lantern-2", "/field/lantern-2", "", "failed", "no such file"),
        row_of_modes(modes, name="lantern-3", source="", source_hash="3", parameters={"age": "x"}),
        row_of_modes(short, name="lantern-4", source="/field/4", source_hash="4"),
    ]


@pytest.fixture
def path(rows, tmp_path):
    file = tmp_path / "grid.h5"
    write_grid(file, HEADER, shape_of(rows, mass="f", age="s"), rows, 4)
    return file


def test_rows_come_back_bit_by_bit_and_in_order(rows, path):
    grid = oscsolve.load_grid(path)
    assert len(grid) == 4
    assert [row.row for row in grid] == [0, 1, 2, 3]
    for before, after in zip(rows, grid, strict=True):
        assert_same_row(before, after)


@pytest.mark.parametrize(("rows_at_once", "modes_at_once"), [(1, 1), (2, 100), (100, 6)])
def test_the_size_of_pieces_changes_nothing(
    rows, tmp_path, monkeypatch, rows_at_once, modes_at_once
):
    monkeypatch.setattr(grid_write, "_ROWS_AT_ONCE", rows_at_once)
    monkeypatch.setattr(grid_write, "_MODES_AT_ONCE", modes_at_once)
    monkeypatch.setattr(grid_write, "_CHUNK", 4)
    monkeypatch.setattr(grid_read, "_MODES_AT_ONCE", modes_at_once)
    write_grid(tmp_path / "grid.h5", HEADER, shape_of(rows, mass="f", age="s"), rows, 4)
    for before, after in zip(rows, oscsolve.load_grid(tmp_path / "grid.h5"), strict=True):
        assert_same_row(before, after)


def test_a_row_survives_the_way_from_a_worker(rows):
    for row in rows:
        assert_same_row(row, pickle.loads(pickle.dumps(row)))


def test_verdicts_are_status_and_message(rows):
    assert [row.status for row in rows] == ["complete", "failed", "complete", "incomplete"]
    assert rows[3].message == ("the census does not close for l = 1: 6 modes counted, 5 listed")


def test_an_unfinished_store_says_so(rows, tmp_path):
    path = tmp_path / "grid.h5"
    for planned, expected in ((7, 7), (None, None)):
        write_grid(path, HEADER, shape_of(rows, mass="f", age="s"), rows, planned)
        grid = oscsolve.load_grid(path)
        assert not grid.finished
        assert grid.planned == expected
        with h5py.File(path) as file:
            assert file.attrs["state"] == "unfinished"
    write_grid(path, HEADER, shape_of(rows, mass="f", age="s"), rows, 4)
    assert oscsolve.load_grid(path).finished


def test_a_store_without_rows_can_be_read(tmp_path):
    write_grid(tmp_path / "grid.h5", HEADER, GridShape(0, 0, 0), [], 3)
    grid = oscsolve.load_grid(tmp_path / "grid.h5")
    assert (len(grid), list(grid), grid.finished) == (0, [], False)
    with xr.open_dataset(tmp_path / "grid.h5", group="modes", engine="h5netcdf") as opened:
        assert opened.sizes == {"mode": 0}


def test_a_model_is_found_by_row_name_or_source(path, rows):
    grid = oscsolve.load_grid(path)
    for key in (3, "lantern-4", "/field/4"):
        assert grid.row(key).name == "lantern-4"


def test_one_model_comes_back_as_a_mode_list(path, handmade_modes, star_n3):
    modes = oscsolve.load_modes(path, model="lantern-3", star=star_n3)
    expected = handmade_modes()
    np.testing.assert_array_equal(modes.nu, expected.nu)
    np.testing.assert_array_equal(modes.eigenfunction(2).xi_h, expected.eigenfunction(2).xi_h)
    assert modes.findings == expected.findings
    assert modes.options["gravity"] == "full"


def test_the_star_of_a_row_is_read_again_from_its_file(handmade_modes, star_n3, tmp_path):
    model = tmp_path / "lantern-5.h5"
    oscsolve.write_model(star_n3, model)
    star = oscsolve.read_model(model)
    row = row_of_modes(
        handmade_modes(star=star), name="lantern-5", source=str(model),
        source_hash=star.source_hash,
    )  # fmt: skip
    store = tmp_path / "grid.h5"
    write_grid(store, HEADER, shape_of([row]), [row], 1)
    np.testing.assert_array_equal(oscsolve.load_modes(store, model=0).star.density, star.density)
    oscsolve.write_model(star_n3.with_changes(name="other"), model, overwrite=True)
    with pytest.raises(InputError, match=r"lantern-5\.h5 has changed since it was solved"):
        oscsolve.load_modes(store, model=0)
    model.unlink()
    with pytest.raises(InputError, match=r"lantern-5\.h5 is gone"):
        oscsolve.load_modes(store, model=0)


@pytest.mark.parametrize(
    ("model", "wanted"),
    [
        (9, "there is no row 9; the store holds 4 models"),
        ("nobody", "no model is called 'nobody'"),
        ("lantern-2", "this model failed and has no modes: no such file"),
        ("lantern-1", "this model was made in memory; give the star itself"),
    ],
)
def test_a_model_that_cannot_be_had_is_refused(path, model, wanted):
    with pytest.raises(InputError, match=wanted):
        oscsolve.load_modes(path, model=model)


def test_a_name_that_stands_for_several_rows_is_refused(rows, tmp_path):
    twice = [rows[0], rows[0]]
    write_grid(tmp_path / "grid.h5", HEADER, shape_of(twice, mass="f"), twice, 2)
    with pytest.raises(
        InputError, match="2 models are called 'lantern-1'; give one of the rows 0, 1"
    ):
        oscsolve.load_modes(tmp_path / "grid.h5", model="lantern-1")


def test_a_foreign_star_is_refused(path):
    with pytest.raises(InputError, match="the star given is not the one that was solved"):
        oscsolve.load_modes(path, model=0, star=oscsolve.polytrope(1))


def test_a_grid_store_is_no_mode_file_and_the_other_way_round(path, handmade_modes, tmp_path):
    with pytest.raises(InputError, match="holds a grid of 4 models; say which one"):
        oscsolve.load_modes(path)
    oscsolve.save_modes(handmade_modes(), tmp_path / "modes.h5")
    with pytest.raises(InputError, match="holds 'oscsolve modes'; expected 'oscsolve grid'"):
        oscsolve.load_grid(tmp_path / "modes.h5")


def test_damage_is_one_line(path):
    data = path.read_bytes()
    path.write_bytes(data[: len(data) // 2])
    with pytest.raises(InputError, match="damaged or cut short"):
        oscsolve.load_grid(path)
    path.write_text("no store")
    with pytest.raises(InputError, match="not an HDF5 file; expected a grid store"):
        oscsolve.load_grid(path)


def test_xarray_sees_named_dimensions_units_and_parameters(path):
    expected = {
        "models": {"model": 4, "degree": 2},
        "modes": {"mode": 15},
        "findings": {"finding": 6},
        "eigenfunctions/2": {"mode": 5, "point": 925},
    }
    for group, sizes in expected.items():
        with xr.open_dataset(path, group=group, engine="h5netcdf") as opened:
            assert dict(opened.sizes) == sizes
            for name, variable in opened.variables.items():
                assert variable.attrs["units"], (group, name)
                assert variable.attrs["long_name"], (group, name)
    with xr.open_dataset(path, group="models", engine="h5netcdf") as models:
        assert models.counted.dims == ("model", "degree")
        np.testing.assert_array_equal(models.mass, [1.0, np.nan, np.nan, np.nan])
        assert list(models.age.values) == ["", "", "x", ""]
    with xr.open_dataset(path, group="modes", engine="h5netcdf") as modes:
        assert list(modes.model.values) == [0] * 5 + [2] * 5 + [3] * 5


def test_no_compound_types(path):
    kinds = set()
    with h5py.File(path) as file:
        file.visititems(
            lambda _, item: kinds.add(item.dtype.kind) if isinstance(item, h5py.Dataset) else None
        )
    assert kinds == {"i", "f", "O"}
