"""Tables that users hand in."""

from __future__ import annotations

import math

import numpy as np
import pytest

import oscsolve


@pytest.fixture
def table(tmp_path):
    def write(text):
        path = tmp_path / "table.csv"
        path.write_text(text)
        return path

    return write


@pytest.mark.parametrize(
    "text",
    [
        "x,rate_nHz\n0,700\n0.5,30\n",
        "# made up\n\nrate_uHz, x, note\n0.7,0,core\n# between\n0.03,0.5,envelope\n",
        f"radius,omega\n0,{1400e-9 * math.pi}\n{0.5 * 6.957e10},{60e-9 * math.pi}\n",
    ],
)
def test_rotation_in_every_unit(table, star_n3, text):
    rotation = oscsolve.read_rotation(table(text), star_n3)
    np.testing.assert_allclose(rotation.radius, [0.0, 0.5])
    np.testing.assert_allclose(rotation.rate, [700.0, 30.0])


@pytest.mark.parametrize(
    ("text", "why"),
    [
        ("# nothing\n", "holds no table"),
        ("x,omega\n", "holds no table"),
        ("x,speed\n0,1\n", "one column of omega, rate_nHz, rate_uHz; got none"),
        ("x,radius,omega\n0,0,1\n", "one column of x, radius; got more than one"),
        ("x,omega\n0,1\n0.5\n", "line 3: 1 fields where the heading has 2"),
        ("# c\nx,omega\n0,fast\n", "line 3: omega is 'fast', expected a number"),
        ("x,omega\n0,nan\n", "line 2: omega is 'nan'"),
        ("x,omega\n0.5,1\n0.2,1\n", "table.csv: rotation: radius must rise"),
    ],
)
def test_wrong_rotation_tables_are_one_line(table, star_n3, text, why):
    with pytest.raises(oscsolve.InputError, match=why) as refused:
        oscsolve.read_rotation(table(text), star_n3)
    assert "table.csv" in str(refused.value)
    assert "\n" not in str(refused.value)


def test_measured_splittings(table):
    text = "# star\ndegree,order,nu,splitting,splitting_error\n1,-8,120,350.5,4\n2,3,,410,6e0\n"
    measured = oscsolve.read_splittings(table(text))
    assert measured.order.tolist() == [-8, 3]
    assert measured.splitting.tolist() == [350.5, 410.0]
    assert measured.splitting_error.tolist() == [4.0, 6.0]


@pytest.mark.parametrize(
    ("text", "why"),
    [
        ("degree,order,splitting\n1,1,1\n", "column 'splitting_error' is missing"),
        ("degree,order,splitting,splitting_error\n1,1.5,1,1\n", "line 2: order must be a whole"),
        ("degree,order,splitting,splitting_error\n1,1,1,0\n", "table.csv: measured splittings"),
    ],
)
def test_wrong_splitting_tables_are_one_line(table, text, why):
    with pytest.raises(oscsolve.InputError, match=why):
        oscsolve.read_splittings(table(text))


def test_files_that_are_no_text_are_one_line(tmp_path, star_n3):
    path = tmp_path / "binary.csv"
    path.write_bytes(b"\xff\xfe\x00x")
    with pytest.raises(oscsolve.InputError, match="not a text file"):
        oscsolve.read_rotation(path, star_n3)
    with pytest.raises(oscsolve.InputError, match="no such file"):
        oscsolve.read_splittings(tmp_path / "none.csv")
