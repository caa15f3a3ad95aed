"""``oscsolve modes``: what it prints, what it writes, and how it ends."""

from __future__ import annotations

import csv
import io
import json

import numpy as np
import pytest

import oscsolve

BAND = ("--degrees", "0-2", "--band", "2:40sigma2")


@pytest.fixture
def solved(monkeypatch, handmade_modes):
    """Function that makes the solver return a list made by hand."""

    def replace(**changes):
        modes = handmade_modes(**changes)
        monkeypatch.setattr(oscsolve, "solve_modes", lambda *_, **__: modes)
        return modes

    return replace


def test_every_line_without_hash_is_a_mode_of_the_solver(run, polytrope_file):
    ended = run("modes", polytrope_file, *BAND)
    assert ended.status == 0
    star = oscsolve.read_model(polytrope_file)
    modes = oscsolve.solve_modes(star, (0, 1, 2), (2, 40), unit="sigma2")
    assert [row[:2] for row in ended.rows] == [
        [str(degree), str(order)] for degree, order in zip(modes.degree, modes.order, strict=True)
    ]
    assert [row[2] for row in ended.rows] == list(modes.kind)
    for row, nu, error, inertia in zip(
        ended.rows, modes.nu, modes.nu_error, modes.inertia, strict=True
    ):
        assert len(row) == 9
        assert abs(float(row[5]) - nu) <= error
        # The error is printed with one digit, the inertia with five.
        assert float(row[6]) == pytest.approx(error, rel=0.5)
        assert float(row[8]) == pytest.approx(inertia, rel=1e-4)
        # The median period, 46 min, is above the 2000 s up to which seconds are shown.
        assert float(row[7]) * 60.0 == pytest.approx(1e6 / nu, rel=1e-5)
    assert "period/min" in ended.out
    total = len(modes)
    assert f"# Complete: {total} counted, {total} listed, none missing and none twice." in ended.out


def test_the_header_names_star_scales_and_physics(run, polytrope_file):
    out = run("modes", polytrope_file, *BAND, "--cowling").out
    assert f"# source   {polytrope_file}" in out
    assert "# M        1.9884099e+33 g = 1 solar" in out
    assert "# G        6.6743e-08 cm^3 g^-1 s^-2" in out
    assert "# gravity  Cowling approximation" in out
    assert "# surface  free: no pressure perturbation" in out


def test_the_table_fits_a_terminal(run, polytrope_file):
    out = run("modes", polytrope_file, "--degrees", "1", "--band", "0.5:40sigma2").out
    rows = [line for line in out.splitlines() if not line.startswith("# source")]
    assert max(map(len, rows)) <= 100


def test_headings_stand_over_their_columns(run, polytrope_file):
    lines = run("modes", polytrope_file, "--degrees", "2", "--band", "2:40sigma2").out.splitlines()
    place = next(k for k, line in enumerate(lines) if line.startswith("#  l "))
    heading, row = lines[place], lines[place + 1]
    for name in ("error", "inertia"):
        end = heading.index(name) + len(name)
        assert row[end - 1] != " "
        assert row[end : end + 1] in ("", " ")


def test_findings_go_to_standard_error(run, polytrope_file, solved):
    solved()
    ended = run("modes", polytrope_file)
    assert "oscsolve: defect: it grows; check Gamma1" in ended.err.splitlines()
    assert "it grows" not in ended.out


def test_remarks_stand_behind_their_modes(run, polytrope_file, solved):
    solved()
    lines = run("modes", polytrope_file).out.splitlines()
    (grows,) = [line for line in lines if line.endswith("# grows")]
    assert grows.split()[:2] == ["0", "1"]
    assert grows.split()[7] == "inf"
    (other,) = [line for line in lines if line.endswith("# nodes give n = 13")]
    assert other.split()[:2] == ["1", "12"]
    assert any("1 mode whose node counts disagree" in line for line in lines)


def test_a_census_that_does_not_close_ends_with_1(run, polytrope_file, solved):
    solved(census=oscsolve.Census([0, 1], [10.0] * 2, [900.0] * 2, [2, 4], [2, 3], [0, 1]))
    ended = run("modes", polytrope_file)
    assert ended.status == 1
    assert ended.out.rstrip().endswith("# NOT COMPLETE: 6 counted, 5 listed; l = 1 does not close.")
    assert "DOES NOT CLOSE" in ended.out
    assert "# l = 1: 3 modes, 4 COUNTED" in ended.out


def test_an_empty_band_is_complete(run, polytrope_file):
    ended = run("modes", polytrope_file, "--degrees", "0", "--band", "2:3sigma2")
    assert ended.status == 0
    assert ended.rows == []
    assert "the band holds no mode" in ended.out


def test_incomplete_error_ends_with_1(run, polytrope_file, monkeypatch):
    def fail(*_, **__):
        raise oscsolve.IncompleteError("two modes\nagree to round-off")

    monkeypatch.setattr(oscsolve, "solve_modes", fail)
    ended = run("modes", polytrope_file)
    assert ended.status == 1
    assert ended.err == "oscsolve: two modes agree to round-off\n"


def test_json_is_one_document_with_null_for_what_is_not_finite(run, polytrope_file, solved):
    modes = solved()

    def refuse(name):
        raise AssertionError(name)

    ended = run("modes", polytrope_file, "--json")
    document = json.loads(ended.out, parse_constant=refuse)
    assert [row["nu"] for row in document["modes"]] == modes.nu.tolist()
    assert document["modes"][0]["period"] is None
    assert [row["relabelled"] for row in document["modes"]] == modes.relabelled.tolist()
    assert document["complete"] is True
    assert document["census"][1]["counted"] == 3
    assert document["star"]["total_mass"] == modes.star.total_mass
    assert document["options"]["phase_per_cell"] is None
    assert document["units"]["modes"]["nu"] == "uHz"
    assert document["findings"][0]["code"] == "dynamically-unstable"


def test_csv_holds_every_digit(run, polytrope_file, solved, tmp_path):
    modes = solved()
    ended = run("modes", polytrope_file, "--csv", tmp_path / "list.csv")
    assert ended.rows, "the table is printed all the same"
    text = (tmp_path / "list.csv").read_text()
    rows = list(csv.DictReader(line for line in io.StringIO(text) if line[0] != "#"))
    for name in ("nu", "nu_error", "sigma2", "period", "inertia"):
        np.testing.assert_array_equal([float(row[name]) for row in rows], getattr(modes, name))
    assert [row["kind"] for row in rows] == list(modes.kind)


def test_csv_to_standard_output_replaces_the_table(run, polytrope_file, solved):
    solved()
    lines = [line for line in run("modes", polytrope_file, "--csv", "-").out.splitlines()]
    data = [line for line in lines if not line.startswith("#")]
    assert data[0] == "degree,order,n_p,n_g,kind,nu,nu_error,sigma2,period,inertia"
    assert len(data) == 6


def test_out_saves_modes_eigenfunctions_and_star(run, polytrope_file, tmp_path):
    ended = run("modes", polytrope_file, *BAND, "--out", tmp_path / "n3.h5")
    modes = oscsolve.load_modes(tmp_path / "n3.h5")
    assert len(modes) == len(ended.rows)
    assert modes.eigenfunctions is not None
    assert modes.star.source == str(polytrope_file)


def test_a_mode_list_serves_as_a_model(run, polytrope_file, tmp_path):
    first = run("modes", polytrope_file, *BAND, "--out", tmp_path / "n3.h5")
    assert run("modes", tmp_path / "n3.h5", *BAND).rows == first.rows


def test_files_are_checked_before_the_work_begins(refused, polytrope_file, tmp_path, monkeypatch):
    def fail(*_, **__):
        raise AssertionError("the work began")

    monkeypatch.setattr(oscsolve, "solve_modes", fail)
    monkeypatch.setattr(oscsolve, "read_model", fail)
    there = tmp_path / "there.h5"
    there.write_text("")
    (tmp_path / "dir.h5").mkdir()
    for option, name, why in [
        ("--out", there, "the file exists"),
        ("--out", tmp_path / "no" / "a.h5", "does not exist; make it first"),
        ("--out", there / "a.h5", "is no folder"),
        ("--out", tmp_path / "dir.h5", "this is a folder"),
        ("--out", tmp_path / "a.csv", "must end in .h5 or .hdf5"),
        ("--csv", there, "the file exists"),
        ("--csv", polytrope_file, "this is the file to be read"),
    ]:
        line = refused("modes", polytrope_file, option, name)
        assert str(name) in line
        assert why in line
    line = refused("modes", polytrope_file, "--overwrite", "--csv", polytrope_file)
    assert "this is the file to be read" in line
    both = tmp_path / "both.h5"
    assert "both name" in refused("modes", polytrope_file, "--out", both, "--csv", both)


def test_overwrite_replaces_both_files(run, polytrope_file, solved, tmp_path):
    solved()
    out, table = tmp_path / "a.h5", tmp_path / "a.csv"
    out.write_text("old")
    table.write_text("old")
    ended = run("modes", polytrope_file, "--out", out, "--csv", table, "--overwrite")
    assert ended.status == 0
    assert len(oscsolve.load_modes(out)) == 5
    assert table.read_text().startswith("# oscsolve")


def test_the_constant_of_gravity_can_be_given(run, polytrope_file):
    given = run("modes", polytrope_file, *BAND, "--gravitational-constant", "6.7e-8")
    star = oscsolve.read_model(polytrope_file, gravitational_constant=6.7e-8)
    modes = oscsolve.solve_modes(star, (0, 1, 2), (2, 40), unit="sigma2")
    assert "# G        6.7e-08" in given.out
    assert abs(float(given.rows[0][5]) - modes.nu[0]) <= modes.nu_error[0]


@pytest.mark.parametrize(
    ("arguments", "why"),
    [
        (["--band", "3:2"], "holds nothing"),
        (["--band", "0:2s"], "a period must be above zero"),
        (["--band", "1000"], "is no band"),
        (["--band", "1:2furlong"], "is no band"),
        (["--band", "nan:2"], "is no band"),
        (["--band", "1:inf"], "is no band"),
        (["--degrees", "3-1"], "runs backwards"),
        (["--degrees", "1,,2"], "is no degree"),
        (["--degrees", "-1"], "is no degree"),
        (["--degrees", "0-99999"], "degrees end at"),
        (["--tolerance", "0"], "must be above 0"),
        (["--tolerance", "small"], "is no number"),
        (["--tolerance", "1"], "tolerance must be"),
        (["--surface", "glass"], "is not one of"),
        (["--surface", "isothermal"], "edge where pressure vanishes"),
        (["--gravitational-constant", "-1"], "must be above 0"),
        (["--band", "-5:4sigma2"], "must begin above zero"),
        (["--json", "--csv", "-"], "both want standard output"),
        (["--bandwidth", "3"], "No such option"),
        (["another.fgong"], "unexpected extra argument"),
    ],
)
def test_wrong_usage_is_one_line(refused, polytrope_file, arguments, why):
    assert why in refused("modes", polytrope_file, *arguments)


def test_wrong_models_are_one_line(refused, tmp_path):
    assert "no such file" in refused("modes", tmp_path / "none")
    assert "this is a folder" in refused("modes", tmp_path)
    (tmp_path / "notes.txt").write_text("to do\n" * 9)
    assert "in no known format" in refused("modes", tmp_path / "notes.txt")
    assert "Missing argument 'MODEL'" in refused("modes")
