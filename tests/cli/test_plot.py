"""``oscsolve plot`` and the pictures of other commands."""

from __future__ import annotations

from pathlib import Path

import pytest

import oscsolve


@pytest.fixture(scope="module")
def listed(tmp_path_factory) -> Path:
    star = oscsolve.polytrope(3)
    modes = oscsolve.solve_modes(star, [0, 1, 2], (0.5, 300.0), unit="sigma2")
    path = tmp_path_factory.mktemp("plots") / "lantern.h5"
    oscsolve.save_modes(modes, path)
    return path


@pytest.mark.parametrize(
    "asked",
    [
        ("propagation",),
        ("propagation", "--degrees", "1", "--axis", "log-radius"),
        ("echelle",),
        ("echelle", "--fold", "period", "--degrees", "1"),
        ("spacing",),
        ("inertia", "--degrees", "0,2"),
        ("eigenfunction", "--mode", "1,-3"),
        ("kernel", "--mode", "1,3", "--mode", "2,-1"),
        ("kernel", "--of", "gamma1", "--mode", "0,2"),
    ],
)
def test_every_figure_is_drawn(run, tmp_path, listed, asked):
    what, *options = asked
    done = run("plot", what, listed, "-o", tmp_path / "a.png", *options)
    assert done.status == 0 and done.out == done.err == ""
    assert (tmp_path / "a.png").read_bytes().startswith(b"\x89PNG")


def test_a_model_is_inspected_with_a_picture(run, tmp_path):
    model = tmp_path / "star.h5"
    run("build", "polytrope", "--index", "3", "--out", model)
    assert run("inspect", model, "--plot", tmp_path / "a.svg").status == 0
    assert (tmp_path / "a.svg").read_text().startswith("<?xml")
    again = run("inspect", model, "--plot", tmp_path / "a.svg")
    assert again.status == 2 and "the file exists" in again.err
    assert run("plot", "propagation", model, "-o", tmp_path / "b.pdf").status == 0


@pytest.mark.parametrize(
    ("asked", "message"),
    [
        (("kernel", "--mode", "0,2"), "radial"),
        (("eigenfunction", "--mode", "1"), "expected degree and order, such as 1,-3"),
        (("eigenfunction", "--mode", "1,99"), "the list has no mode of l = 1, n = 99"),
        (("eigenfunction", "--mode", "1,1", "--mode", "1,2"), "at most 1 mode(s); got 2"),
        (("inertia", "--degrees", "5"), "the list has no l = 5"),
        (("propagation", "--degrees", "0"), "degrees above 0"),
    ],
)
def test_what_cannot_be_drawn_is_one_line(run, tmp_path, listed, asked, message):
    what, *options = asked
    done = run("plot", what, listed, "-o", tmp_path / "a.png", *options)
    assert done.status == 2 and message in done.err and done.err.count("\n") == 1
    assert not (tmp_path / "a.png").exists()


def test_other_endings_are_refused(run, tmp_path, listed):
    done = run("plot", "inertia", listed, "-o", tmp_path / "a.jpg")
    assert done.status == 2 and "must end in .png or .pdf or .svg" in done.err
