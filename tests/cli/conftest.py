"""The command line, run in this process."""

from __future__ import annotations

from dataclasses import dataclass

import pytest

from oscsolve.cli.main import main


@dataclass(frozen=True)
class Ended:
    """How a command ended: exit status, standard output, standard error."""

    status: int
    out: str
    err: str

    @property
    def rows(self) -> list[list[str]]:
        """Fields of the lines of a table that are no comment."""
        return [line.split() for line in self.out.splitlines() if not line.startswith("#")]


@pytest.fixture
def run(capsys):
    """Function that runs ``oscsolve ARGUMENT...``."""

    def run_command(*arguments: object) -> Ended:
        capsys.readouterr()
        status = main([str(argument) for argument in arguments])
        return Ended(status, *capsys.readouterr())

    return run_command


@pytest.fixture
def polytrope_file(tmp_path, star_n3):
    """An FGONG file of the polytrope of index 3."""
    import oscsolve

    path = tmp_path / "n3.fgong"
    oscsolve.write_model(star_n3, path)
    return path


@pytest.fixture
def refused(run):
    """Function that runs a command which must end with 2 and one line, and gives the line."""

    def run_refused(*arguments: object) -> str:
        ended = run(*arguments)
        assert ended.status == 2, ended
        assert ended.out == ""
        lines = ended.err.splitlines()
        assert len(lines) == 1, lines
        assert lines[0].startswith("oscsolve: ")
        return lines[0]

    return run_refused
