"""The frame of the command line: help, unknown commands, interrupts, broken pipes, import cost."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import pytest

import oscsolve
from oscsolve.cli.main import COMMANDS

ROOT = Path(oscsolve.__file__).resolve().parents[1]


def python(*arguments, **keywords):
    """A fresh interpreter that imports this checkout."""
    paths = os.pathsep.join([str(ROOT), os.environ.get("PYTHONPATH", "")])
    return subprocess.run(
        [sys.executable, *map(str, arguments)],
        env={**os.environ, "PYTHONPATH": paths},
        text=True,
        check=False,
        **{"capture_output": "stdout" not in keywords, **keywords},
    )


@pytest.mark.parametrize("arguments", [[], ["--help"], ["-h"]])
def test_the_overview_lists_every_command(run, arguments):
    ended = run(*arguments)
    assert ended.status == 0
    for name in COMMANDS:
        assert f"  {name} " in ended.out


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_has_help(run, name):
    ended = run(name, "--help")
    assert ended.status == 0
    assert ended.out.startswith(f"Usage: oscsolve {name}")


def test_the_version_is_printed(run):
    assert run("--version").out == f"oscsolve {oscsolve.__version__}\n"


def test_unknown_commands_are_one_line(refused):
    assert "No such command 'mode'" in refused("mode")
    assert "No such option" in refused("--colour")


def test_an_interrupt_is_one_line_and_130(run, polytrope_file, monkeypatch):
    def interrupt(*_, **__):
        raise KeyboardInterrupt

    monkeypatch.setattr(oscsolve, "solve_modes", interrupt)
    ended = run("modes", polytrope_file)
    assert ended.status == 130
    assert ended.err == "oscsolve: interrupted\n"


def test_a_reader_that_has_seen_enough_is_no_error(polytrope_file):
    read, write = os.pipe()
    os.close(read)
    try:
        ended = python(
            "-m", "oscsolve", "modes", polytrope_file, "--degrees", "0", "--band", "2:20sigma2",
            stdout=write, stderr=subprocess.PIPE,
        )  # fmt: skip
    finally:
        os.close(write)
    assert ended.returncode == 141
    assert all(line.startswith("oscsolve: note: ") for line in ended.stderr.splitlines())


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="the system has no /dev/full")
def test_a_full_disk_behind_standard_output_is_one_line(polytrope_file):
    with open("/dev/full", "w") as full:
        ended = python("-m", "oscsolve", "--help", stdout=full, stderr=subprocess.PIPE)
    assert ended.returncode == 2
    (line,) = ended.stderr.splitlines()
    assert line.startswith("oscsolve: standard output: ")


def test_importing_the_package_loads_nothing_heavy():
    ended = python(
        "-c",
        "import sys, oscsolve; dir(oscsolve); "
        "print({'numpy', 'scipy', 'numba', 'h5py', 'matplotlib', 'click'} & set(sys.modules))",
    )
    assert ended.stdout == "set()\n"


@pytest.mark.parametrize("name", ["", *COMMANDS])
def test_help_loads_nothing_heavy(name):
    ended = python(
        "-c",
        "import sys; from oscsolve.cli.main import main; main(sys.argv[1:]); "
        "print({'numpy', 'scipy', 'numba', 'h5py', 'matplotlib'} & set(sys.modules))",
        *[part for part in (name, "--help") if part],
    )
    assert ended.stdout.splitlines()[-1] == "set()"


def test_every_public_name_is_there():
    assert sorted(oscsolve.__all__) == sorted({*oscsolve._HOMES, "__version__"})
    for name in oscsolve.__all__:
        assert getattr(oscsolve, name) is not None
        assert name in dir(oscsolve)
    with pytest.raises(AttributeError, match="no attribute 'solve_everything'"):
        _ = oscsolve.solve_everything
