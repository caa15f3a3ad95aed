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
        ("propagation", "--mode", "1,3", "--mode", "2,-1", "--axis", "mass"),
        ("echelle",),
        ("echelle", "--fold", "period", "--degrees", "1"),
        ("spacing",),
        ("inertia", "--degrees", "0,2"),
        ("eigenfunction", "--mode", "1,-3"),
        ("kernel", "--mode", "1,3", "--mode", "2,-1"),
        ("kernel", "--of", "gamma1", "--mode", "0,2"),
        ("kernel", "--of", "rho-gamma1", "--mode", "1,2", "--axis", "mass"),
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
        (("eigenfunction", "--mode", "1,1", "--mode", "1,2"), "one mode; got --mode 2 times"),
        (("inertia", "--degrees", "5"), "no modes of l = 5; it has l = 0, 1, 2"),
        (("propagation", "--degrees", "0"), "degrees above 0"),
        (("propagation", "--mode", "1,x"), "expected degree and order, such as 1,-3"),
        (("kernel", *("--mode", "1,1") * 9), "up to 8 modes; got 9"),
        (("spacing", "--degrees", "0"), "lantern.h5: the list holds no g modes"),
        (("echelle", "--fold", "period", "--degrees", "0"), "no three g modes"),
        (("echelle", "--fold", "period", "--observed", "seen.csv"), "--observed holds frequencies"),
        (("echelle", "--observed", "absent.csv"), "absent.csv"),
        (("inertia", "--observed", "seen.csv"), "No such option"),
        (("portrait",), "No such command 'portrait'"),
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


def test_figures_are_named_in_the_overview_and_load_nothing_big(run):
    from oscsolve.cli.plot import command
    from oscsolve.plots.coordinate import COORDINATES

    done = run("plot")
    names = ("propagation", "echelle", "spacing", "inertia", "eigenfunction", "kernel")
    assert done.status == 0 and tuple(command.commands) == names
    assert all(name in done.out for name in names)
    (axis,) = (part for part in command.commands["kernel"].params if part.name == "axis")
    assert tuple(axis.type.choices) == COORDINATES


def test_a_mode_that_no_one_named_is_said(run, tmp_path, listed):
    done = run("plot", "eigenfunction", listed, "-o", tmp_path / "a.svg")
    assert done.status == 0 and "no mode was named; l = 1, n = " in done.err
    both = run("plot", "kernel", listed, "-o", tmp_path / "b.svg")
    assert both.status == 0 and " and l = 1, n = " in both.err


def test_lists_without_eigenfunctions_or_modes_are_refused(tmp_path, listed, refused):
    from dataclasses import replace

    modes = oscsolve.load_modes(listed)
    bare = tmp_path / "bare.h5"
    oscsolve.save_modes(replace(modes, eigenfunctions=None), bare)
    for what in ("eigenfunction", "kernel"):
        line = refused("plot", what, bare, "-o", tmp_path / "a.png")
        assert "bare.h5: holds no eigenfunctions" in line
    empty = tmp_path / "empty.h5"
    oscsolve.save_modes(oscsolve.solve_modes(modes.star, [0], (8.3, 8.6), unit="sigma2"), empty)
    for what in ("echelle", "spacing", "inertia", "eigenfunction", "kernel"):
        line = refused("plot", what, empty, "-o", tmp_path / "a.png")
        assert "empty.h5: the list is empty" in line
    model = tmp_path / "model.h5"
    oscsolve.write_model(modes.star, model)
    line = refused("plot", "propagation", model, "--mode", "1,1", "-o", tmp_path / "a.png")
    assert "a model holds no modes" in line
    radial = tmp_path / "radial.h5"
    oscsolve.save_modes(modes.only([0]), radial)
    line = refused("plot", "kernel", radial, "-o", tmp_path / "a.png")
    assert "radial.h5: the list holds no nonradial mode" in line
    assert not (tmp_path / "a.png").exists()


def test_radial_modes_have_kernels_of_the_structure(run, tmp_path, listed):
    radial = tmp_path / "radial.h5"
    oscsolve.save_modes(oscsolve.load_modes(listed).only([0]), radial)
    done = run("plot", "kernel", radial, "--of", "c2", "-o", tmp_path / "a.svg")
    assert done.status == 0 and "l = 0, n = " in done.err


def test_nothing_is_overwritten_unasked(run, tmp_path, listed, refused):
    out = tmp_path / "a.pdf"
    out.write_text("precious")
    assert "the file exists" in refused("plot", "inertia", listed, "-o", out)
    assert out.read_text() == "precious"
    assert run("plot", "inertia", listed, "-o", out, "--overwrite").status == 0
    assert out.read_bytes().startswith(b"%PDF")


def test_observed_modes_are_drawn_into_an_echelle(run, tmp_path, listed):
    seen = tmp_path / "seen.csv"
    seen.write_text("degree,order,nu,nu_error\n0,8,1100.0,0.2\n1,8,1160.5,0.3\n")
    done = run("plot", "echelle", listed, "--observed", seen, "-o", tmp_path / "a.svg")
    assert done.status == 0 and (tmp_path / "a.svg").exists()
    broken = tmp_path / "broken.csv"
    broken.write_text("degree,nu\n0,1100.0\n")
    again = run("plot", "echelle", listed, "--observed", broken, "-o", tmp_path / "b.svg")
    assert again.status == 2 and "column 'nu_error' is missing" in again.err
