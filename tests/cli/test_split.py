"""``oscsolve split``: splittings, kernels, mean rotation, and what is refused."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import numpy as np
import pytest

import oscsolve


@pytest.fixture(scope="module")
def listed(tmp_path_factory) -> Path:
    modes = oscsolve.solve_modes(oscsolve.polytrope(3), [0, 1, 2], (0.5, 300.0), unit="sigma2")
    path = tmp_path_factory.mktemp("split") / "lantern.h5"
    oscsolve.save_modes(modes, path)
    return path


def test_solid_body_splittings_are_beta_times_the_rate(run, listed):
    done = run("split", listed, "--rotation", "430nHz")
    modes = oscsolve.load_modes(listed)
    assert done.status == 0 and len(done.rows) == np.count_nonzero(modes.degree > 0)
    for degree, order, _, _, beta, ledoux, splitting, rate in done.rows:
        assert float(beta) + float(ledoux) == pytest.approx(1.0, abs=2e-6)
        assert float(splitting) == pytest.approx(430.0 * float(beta), abs=0.02), (degree, order)
        assert float(rate) == pytest.approx(430.0, abs=0.02)


def test_units_of_a_rate_and_of_a_period_agree(run, listed):
    """0.43 uHz is 430 nHz; 26.916 d is 1/(430 nHz)."""
    tables = [
        [row[6] for row in run("split", listed, "--rotation", text).rows]
        for text in ("430nHz", "0.43uHz")
    ]
    assert tables[0] == tables[1]
    period = run("split", listed, "--rotation", f"{1e9 / 430.0 / 86400.0:.9f}d").rows
    assert [row[6] for row in period] == tables[0]


def test_a_table_that_says_the_same_as_a_step_splits_the_same(run, listed, tmp_path):
    table = tmp_path / "rotation.csv"
    table.write_text("x,rate_nHz\n0,750\n0.2,750\n0.2,30\n1,30\n")
    step = run("split", listed, "--rotation", "750nHz:30nHz@0.2").rows
    assert step and run("split", listed, "--rotation", table).rows == step


def test_kernels_csv_and_json_hold_all_digits(run, listed, tmp_path):
    kernels, out = tmp_path / "kernels.csv", tmp_path / "splittings.csv"
    asked = ("split", listed, "--rotation", "430nHz", "--kernels", kernels, "--csv", out)
    assert run(*asked).status == 0
    lines = [line for line in kernels.read_text().splitlines() if not line.startswith("#")]
    table = np.array(list(csv.reader(lines[1:])), float)
    names = lines[0].split(",")
    assert names[0] == "x" and "K_1_-1" in names
    modes = oscsolve.load_modes(listed)
    # A trapezoid over the points of the model: good to half a percent for these modes.
    areas = np.trapezoid(table[:, 1:], table[:, 0], axis=0)
    assert areas == pytest.approx(np.ones(areas.size), abs=5e-3)
    document = json.loads(run("split", listed, "--rotation", "430nHz", "--json").out)
    found = oscsolve.rotational_splitting(modes, 430.0)
    assert [row["splitting"] for row in document["splittings"]] == found.splitting.tolist()
    again = run(*asked)
    assert again.status == 2 and "the file exists" in again.err and again.err.count("\n") == 1


def test_measured_splittings_give_the_two_rates_they_were_made_with(run, listed, tmp_path):
    modes = oscsolve.load_modes(listed)
    truth = oscsolve.step_rotation(700.0, 50.0, 0.3)
    found = oscsolve.rotational_splitting(modes, truth)
    rows = [
        f"{modes.degree[k]},{modes.order[k]},{value!r},1.0"
        for k, value in zip(found.row, found.splitting.tolist(), strict=True)
    ]
    measured = tmp_path / "measured.csv"
    measured.write_text("\n".join(["degree,order,splitting,splitting_error", *rows]) + "\n")
    done = run("split", listed, "--measured", measured, "--core-radius", "0.3", "--json")
    mean = json.loads(done.out)["mean_rotation"]
    assert mean["core"] == pytest.approx(700.0, rel=1e-6)
    assert mean["envelope"] == pytest.approx(50.0, rel=1e-6)
    table = run("split", listed, "--measured", measured, "--core-radius", "0.3")
    assert "# core     700" in table.out and "# envelope 50" in table.out


@pytest.mark.parametrize(
    ("asked", "message"),
    [
        ((), "give --rotation PROFILE, --measured FILE or both"),
        (("--rotation", "430"), "expected a rate or period such as 430nHz"),
        (("--rotation", "nowhere.csv"), "nowhere.csv"),
        (("--rotation", "model"), "rotation"),
        (("--rotation", "430nHz", "--core-radius", "0.3"), "--core-radius goes with --measured"),
        (("--rotation", "430nHz", "--json", "--csv", "-"), "both want standard output"),
    ],
)
def test_wrong_usage_is_one_line(run, listed, asked, message):
    done = run("split", listed, *asked)
    assert done.status == 2 and message in done.err and done.err.count("\n") == 1


def test_lists_that_cannot_split_are_refused(run, tmp_path):
    star = oscsolve.polytrope(3)
    bare = oscsolve.SolveOptions(eigenfunctions=False)
    for name, degrees, options, message in (
        ("radial", [0], None, "holds radial modes only"),
        ("bare", [1], bare, "holds no eigenfunctions"),
    ):
        path = tmp_path / f"{name}.h5"
        modes = oscsolve.solve_modes(star, degrees, (9, 60), unit="sigma2", options=options)
        oscsolve.save_modes(modes, path)
        done = run("split", path, "--rotation", "430nHz")
        assert done.status == 2 and message in done.err
