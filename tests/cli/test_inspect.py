"""``oscsolve inspect``: figures and findings as text and as JSON."""

from __future__ import annotations

import json

import pytest

import oscsolve


def test_text_holds_the_figures_and_the_findings(run, polytrope_file):
    ended = run("inspect", polytrope_file)
    assert ended.status == 0
    assert ended.err == ""
    # rho_c over the mean density of n = 3: 54.1825 (Chandrasekhar 1939, ch. IV, table 4).
    assert "54.182 = rho_c" in ended.out
    assert "2467" in ended.out and "Tassoul" in ended.out
    assert "[gravity-read]" in ended.out or "[gravity-estimated]" in ended.out
    assert ended.out.splitlines()[-1].startswith("Fit for pulsation work: 0 defects, 0 doubts")
    assert max(map(len, ended.out.splitlines())) <= 160


def test_json_is_one_document_with_the_same_findings(run, polytrope_file):
    ended = run("inspect", polytrope_file, "--json", "--band", "100:200", "--degrees", "1")
    document = json.loads(ended.out)
    star = oscsolve.read_model(polytrope_file)
    inspection = oscsolve.inspect_model(star, degrees=(1,), band=(100, 200))
    assert document["usable"] is True
    assert [f["code"] for f in document["findings"]] == [f.code for f in inspection]
    assert document["figures"]["large_separation"] == inspection.figures.large_separation
    assert set(document["figures"]) == set(document["units"]["figures"])
    assert document["figures"]["acoustic_cutoff"] is None
    assert document["band"] == pytest.approx([100.0, 200.0])


def test_a_defect_ends_with_one(run, tmp_path, star_n3):
    path = tmp_path / "heavy.h5"
    oscsolve.write_model(star_n3.with_changes(mass=1.2 * star_n3.mass), path)
    ended = run("inspect", path)
    assert ended.status == 1
    assert "mass-mismatch" in ended.out
    assert ended.out.splitlines()[-1].startswith("Not fit for pulsation work")
    assert json.loads(run("inspect", path, "--json").out)["usable"] is False


def test_another_gravity_is_used_and_doubted(run, polytrope_file):
    ended = run("inspect", polytrope_file, "--gravitational-constant", "6.68e-8")
    assert ended.status == 0
    assert "[gravity-given]" in ended.out and "[gravity-mismatch]" in ended.out
    assert "Usable with the doubts above in mind" in ended.out


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (("--band", "5:3"), "lower limit"),
        (("--band", "tall"), "is no band"),
        (("--degrees", "x"), "is no degree"),
    ],
)
def test_wrong_usage_is_one_line(refused, polytrope_file, arguments, words):
    assert words in refused("inspect", polytrope_file, *arguments)


def test_unreadable_files_are_one_line(refused, tmp_path):
    assert "no such file" in refused("inspect", tmp_path / "none.fgong")
    (tmp_path / "empty").write_text("")
    assert "empty" in refused("inspect", tmp_path / "empty")
