"""``oscsolve build``: analytic stars as files."""

from __future__ import annotations

import numpy as np
import pytest

import oscsolve


@pytest.mark.parametrize("name", ["star.fgong", "star.h5"])
def test_a_polytrope_is_read_back_with_its_scales(run, tmp_path, name):
    path = tmp_path / name
    ended = run(
        "build", "polytrope", "--index", "3/2", "--gamma1", "4/3", "--mass", "4e33",
        "--radius", "9e10", "--gravitational-constant", "6.67e-8", "--out", path,
    )  # fmt: skip
    assert ended.status == 0
    assert ended.out == ""
    assert str(path) in ended.err
    star = oscsolve.read_model(path)
    expected = oscsolve.polytrope(
        1.5, 4 / 3, mass=4e33, radius=9e10, gravitational_constant=6.67e-8
    )
    assert star.total_mass == 4e33
    assert star.photospheric_radius == 9e10
    assert star.gravitational_constant == pytest.approx(6.67e-8, rel=1e-9)
    # FGONG holds nine digits or more.
    np.testing.assert_allclose(star.density, expected.density, rtol=1e-8)
    np.testing.assert_allclose(star.gamma1, 4 / 3, rtol=1e-8)


def test_the_uniform_sphere_has_the_modes_of_the_closed_form(run, tmp_path):
    path = tmp_path / "uniform.h5"
    run("build", "uniform", "--gamma1", "5/3", "--out", path)
    ended = run("modes", path, "--degrees", "0", "--band", "0.5:13sigma2", "--csv", "-")
    sigma2 = [float(line.split(",")[7]) for line in ended.out.splitlines() if line[0] == "0"]
    # Sterne (1937): sigma2 = Gamma1 (2 k^2 + 5 k + 3) - 4.
    exact = [5 / 3 * (2 * k**2 + 5 * k + 3) - 4 for k in (0, 1)]
    np.testing.assert_allclose(sigma2, exact, rtol=1e-8)


def test_wrong_usage_is_one_line(refused, tmp_path):
    out = tmp_path / "star.fgong"
    assert "Missing option '--out'" in refused("build", "polytrope", "--index", "3")
    assert "Missing option '--index'" in refused("build", "polytrope", "--out", out)
    assert "at least 0" in refused("build", "polytrope", "--index", "-1", "--out", out)
    assert "got 7" in refused("build", "polytrope", "--index", "7", "--out", out)
    assert "is no number" in refused("build", "uniform", "--gamma1", "1/0", "--out", out)
    assert "must be above 0" in refused("build", "uniform", "--mass", "0", "--out", out)
    assert "must end in .fgong" in refused("build", "uniform", "--out", tmp_path / "star.txt")
    assert "No such command 'cube'" in refused("build", "cube")
    assert not out.exists()
    out.write_text("mine")
    assert "the file exists" in refused("build", "uniform", "--out", out)
    assert out.read_text() == "mine"


def test_build_alone_lists_the_kinds(run):
    ended = run("build")
    assert ended.status == 0
    assert "polytrope" in ended.out
    assert "uniform" in ended.out
