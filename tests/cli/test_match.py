"""``oscsolve match``: one star, a grid, and what is refused."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

import oscsolve

BAND = (20.0, 500.0)


@pytest.fixture(scope="module")
def folder(tmp_path_factory) -> Path:
    """A mode list, a grid of five polytropes, and a list observed on the middle one."""
    where = tmp_path_factory.mktemp("match")
    stars = [oscsolve.polytrope(index) for index in (2.9, 2.95, 3.0, 3.05, 3.1)]
    options = oscsolve.SolveOptions(eigenfunctions=False)
    modes = oscsolve.solve_modes(stars[2], [0, 1, 2], BAND, unit="sigma2", options=options)
    oscsolve.save_modes(modes, where / "modes.h5")
    noise = np.random.default_rng(5).normal(0.0, 0.3, len(modes))
    lines = ["# invented: lantern-0, noise of 0.3 uHz, seed 5", "degree,order,nu,nu_error"]
    columns = zip(modes.degree, modes.order, modes.nu + noise, strict=True)
    lines += [f"{degree},{order},{nu:.4f},0.3" for degree, order, nu in columns]
    (where / "seen.csv").write_text("\n".join(lines) + "\n")
    oscsolve.solve_grid(
        stars,
        store=where / "grid.h5",
        degrees=(0, 1, 2),
        band=(0.9 * modes.nu.min(), 1.1 * modes.nu.max()),
    )
    return where


def test_the_document_holds_what_other_programs_rely_on(run, folder):
    done = run("match", folder / "modes.h5", folder / "seen.csv", "--json")
    found = json.loads(done.out)
    assert done.status == 0 and done.err == ""
    assert {"pairs", "unmatched", "law", "coefficients", "chi2"} <= found.keys()
    wanted = {"degree", "order", "observed", "observed_error", "computed", "corrected"}
    assert all(wanted <= pair.keys() for pair in found["pairs"])
    assert len(found["pairs"]) == found["freedom"] + 2 and found["law"] == "two-term"
    assert found["reduced_chi2"] == pytest.approx(1.0, abs=0.6)


def test_the_table_lists_pairs_and_sums_up(run, folder):
    done = run("match", folder / "modes.h5", folder / "seen.csv", "--law", "none")
    pairs = [line for line in done.out.splitlines() if not line.startswith("#")]
    seen = (folder / "seen.csv").read_text().splitlines()
    assert len(pairs) == len(seen) - 2 and all(len(line.split()) >= 8 for line in pairs)
    assert "nothing is left over on either side" in done.out and "reduced chi2" in done.out


def test_a_grid_is_ranked_and_its_parameters_weighed(run, folder, tmp_path):
    picture = tmp_path / "best.png"
    asked = ("match", folder / "grid.h5", folder / "seen.csv", "--law", "none")
    done = run(*asked, "--plot", picture)
    rows = [line.split() for line in done.out.splitlines() if not line.startswith("#")]
    assert done.status == 0 and len(rows) == 5 and rows[0][0] == "2"
    chi2 = [float(row[1]) for row in rows]
    assert chi2 == sorted(chi2) and "M/Msun" in done.out
    assert picture.read_bytes().startswith(b"\x89PNG")
    document = json.loads(run(*asked, "--json", "--best", "2").out)
    assert [model["row"] for model in document["models"]] == [int(row[0]) for row in rows[:2]]
    assert document["effective_models"] == pytest.approx(1.0, abs=0.2)
    by_ratios = run(*asked, "--rank-by", "ratios")
    assert by_ratios.status == 0 and "ranked by ratios" in by_ratios.out


def test_wrong_lists_are_one_line(run, folder, tmp_path):
    wrong = tmp_path / "seen.csv"
    for content, message in (
        ("degree,nu\n0,1\n", "column 'nu_error' is missing"),
        ("degree,nu,nu_error\n7,900,0.1\n", "holds l = 7, which the mode list lacks"),
        ("degree,nu,nu_error\n0,90000,0.1\n", "solve with --band"),
    ):
        wrong.write_text(content)
        done = run("match", folder / "modes.h5", wrong)
        assert done.status == 2 and message in done.err and done.err.count("\n") == 1
