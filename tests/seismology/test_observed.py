"""Observed lists: what is read, and each refusal once."""

from __future__ import annotations

import numpy as np
import pytest

from oscsolve import InputError, ObservedModes, read_observed

GOOD = "# invented\ndegree,order,nu,nu_error\n0,20,2900.5,0.1\n1,20,2960.1,0.2\n"


def test_a_list_is_read_with_its_orders(tmp_path):
    file = tmp_path / "seen.csv"
    file.write_text(GOOD)
    seen = read_observed(file)
    assert len(seen) == 2 and seen.order.tolist() == [20, 20] and seen.name == str(file)
    assert seen.nu.tolist() == [2900.5, 2960.1] and seen.nu_error.tolist() == [0.1, 0.2]
    file.write_text("nu_error,degree,nu,comment\n0.1,0,2900.5,clear\n")
    assert read_observed(file).order is None


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("nu_error", "sigma", "column 'nu_error' is missing; expected degree, nu, nu_error"),
        ("0.2", "-0.2", "row 2: nu_error must be above zero; got -0.2"),
        ("0.2", "0", "row 2: nu_error must be above zero; got 0"),
        ("2960.1", "-5", "row 2: nu must be above zero; got -5"),
        ("2960.1", "nan", "line 4: nu is 'nan', expected a number; repair the line"),
        ("2960.1", "***", "line 4: nu is '\\*\\*\\*', expected a number"),
        ("1,20,", "0,20,", "l = 0, n = 20 is in rows 1 and 2; each mode comes once"),
        ("1,20,2960.1", "0,21,2900.5", "l = 0, nu = 2900.5 is in rows 1 and 2"),
        ("1,20,", "1.5,20,", "line 4: degree must be a whole number; got 1.5"),
        ("1,20,", "-1,20,", "row 2: degree must be 0 or above; got -1"),
        ("1,20,", "1,", "line 4: 3 fields where the heading has 4; repair the line"),
    ],
)
def test_wrong_lists_are_refused_with_the_place(tmp_path, old, new, message):
    file = tmp_path / "seen.csv"
    file.write_text(GOOD.replace(old, new))
    with pytest.raises(InputError, match=message):
        read_observed(file)


def test_files_that_hold_no_table_are_refused(tmp_path):
    for content, message in (
        (b"", "the file is empty"),
        (b"# only a comment\n", "holds no table"),
        (b"degree,nu,nu_error\n", "holds no table"),
        (b"\xff\xfe\x00", "not a text file"),
    ):
        file = tmp_path / "seen.csv"
        file.write_bytes(content)
        with pytest.raises(InputError, match=message):
            read_observed(file)
    with pytest.raises(InputError, match="missing.csv"):
        read_observed(tmp_path / "missing.csv")


def test_columns_of_different_length_and_empty_lists_are_refused():
    with pytest.raises(InputError, match="one number a mode"):
        ObservedModes(np.zeros(2), np.ones(3), np.ones(3))
    with pytest.raises(InputError, match="at least one mode"):
        ObservedModes(np.zeros(0), np.zeros(0), np.zeros(0))
