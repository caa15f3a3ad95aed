"""``oscsolve grid``: the mode lists of many models in one store."""

from __future__ import annotations

import contextlib
import logging
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

import oscsolve
from oscsolve.cli.options import (
    Band,
    gravitational_constant_option,
    overwrite_option,
    solve_options,
)

if TYPE_CHECKING:
    from oscsolve.grid import GridSummary

_SUFFIXES = (".h5", ".hdf5")


@click.command("grid")
@click.argument("models", nargs=-1, required=True, metavar="MODEL...")
@click.option(
    "--store",
    type=click.Path(path_type=Path),
    required=True,
    metavar="FILE.h5",
    help="Store to make or to go on with.",
)
@solve_options
@gravitational_constant_option
@click.option(
    "--table",
    type=click.Path(path_type=Path),
    metavar="FILE.csv",
    help="Parameters of the models, kept with their rows: a column 'model' with file names, and "
    "one column for each parameter.",
)
@click.option(
    "--workers",
    type=click.IntRange(min=1),
    metavar="N",
    help="Processes on this machine. Default: one for each core.",
)
@click.option(
    "--cluster",
    "address",
    metavar="ADDRESS",
    help="Work behind the Dask scheduler at this address, such as tcp://node1:8786.",
)
@click.option("--eigenfunctions", is_flag=True, help="Keep the eigenfunctions; they are large.")
@click.option("--verify", is_flag=True, help="Recompute every mode by shooting.")
@click.option(
    "--warm-start",
    is_flag=True,
    help="Search each model from the modes of the one before it in its folder.",
)
@click.option(
    "--dry-run", is_flag=True, help="Tell what would run, and how long; solves a few, writes none."
)
@overwrite_option
def command(
    models: tuple[str, ...],
    store: Path,
    table: Path | None,
    workers: int | None,
    address: str | None,
    dry_run: bool,
    overwrite: bool,
    **asked: Any,
) -> int:
    """List the modes of every MODEL: files, folders, patterns, or @LIST (a file of such lines).

    The same command goes on where it was broken off, and solves what is new, has changed or has
    failed. --overwrite begins anew. Exit status 1 where a model failed or is not complete.
    """
    if workers is not None and address is not None:
        raise click.UsageError("--workers is for this machine, --cluster for others; give one")
    _check_store(store)
    from oscsolve.grid.plan import GridModel, find_models, read_parameters

    files = find_models(models, skip=_no_models(store, table))
    given = read_parameters(table, files) if table is not None else None
    if given is not None:
        _note_table(table, len(given.strangers), sum(file not in given.of for file in files))
    listed = [GridModel(file, "", given.of.get(file, {}) if given else {}) for file in files]
    keywords = _keywords(**asked)
    if dry_run:
        return _forecast(listed, store, keywords, workers, overwrite)
    summary = _solve(listed, store, address, workers=workers, overwrite=overwrite, **keywords)
    return _tell(summary)


def _check_store(store: Path) -> None:
    if store.suffix.lower() not in _SUFFIXES:
        raise click.UsageError(f"--store {store}: the name must end in {' or '.join(_SUFFIXES)}")
    if not store.parent.is_dir():
        raise click.UsageError(f"--store {store}: there is no folder {store.parent}; make it first")


def _no_models(store: Path, table: Path | None) -> list[Path]:
    """Files that may lie among the models."""
    journal = store.with_name(f"{store.name}.journal")
    return [store, journal] if table is None else [store, journal, table]


def _note_table(table: Path | None, strangers: int, bare: int) -> None:
    if strangers:
        click.echo(f"oscsolve: note: {table}: {strangers} line(s) fit no model", err=True)
    if bare:
        click.echo(f"oscsolve: note: {table}: {bare} model(s) have no line", err=True)


def _keywords(
    *, degrees: tuple[int, ...], band: Band | None, cowling: bool, **others: Any
) -> dict[str, Any]:
    """Options of the command as `solve_grid` takes them."""
    return {
        "degrees": degrees,
        "band": None if band is None else (band.first, band.second),
        "unit": "uHz" if band is None else band.unit,
        "gravity": "cowling" if cowling else "full",
        **others,
    }


def _forecast(
    models: list[Any], store: Path, keywords: dict[str, Any], workers: int | None, overwrite: bool
) -> int:
    from oscsolve.cli.grid_text import forecast_lines
    from oscsolve.grid.forecast import forecast_grid
    from oscsolve.grid.run import checked_settings

    keywords = dict(keywords)
    options = oscsolve.SolveOptions(eigenfunctions=keywords.pop("eigenfunctions"))
    settings = checked_settings(**keywords, options=options)
    found = forecast_grid(models, store, settings, workers=workers, overwrite=overwrite)
    for line in forecast_lines(found):
        click.echo(line)
    return 0


def _solve(models: list[Any], store: Path, address: str | None, **keywords: Any) -> GridSummary:
    from oscsolve.cli.grid_text import GridTold, NoteHandler

    with GridTold() as told, _notes_to(NoteHandler(told)), _executor(address) as executor:
        try:
            return oscsolve.solve_grid(
                models, store, executor=executor, progress=told.tell, **keywords
            )
        except KeyboardInterrupt:
            ready = 0 if told.seen is None else told.seen.done + told.seen.kept
            raise KeyboardInterrupt(
                f"{ready} of {len(models)} models are in {store}; the same command goes on"
            ) from None


@contextlib.contextmanager
def _notes_to(handler: logging.Handler) -> Iterator[None]:
    log = logging.getLogger("oscsolve")
    log.addHandler(handler)
    try:
        yield
    finally:
        log.removeHandler(handler)


@contextlib.contextmanager
def _executor(address: str | None) -> Iterator[Any]:
    if address is None:
        yield None
        return
    from oscsolve.grid.cluster import cluster

    with cluster(address) as client:
        _quiet("distributed", "tornado")
        yield client


def _quiet(*packages: str) -> None:
    """Keep the logs of packages from the terminal: what goes wrong is told in one line, by us."""
    for name in list(logging.root.manager.loggerDict):
        if name.partition(".")[0] in packages:
            logging.getLogger(name).setLevel(logging.CRITICAL + 1)


def _tell(summary: GridSummary) -> int:
    from oscsolve.cli.grid_text import failure_lines, summary_lines

    for text in summary.notes:
        click.echo(f"oscsolve: note: {text}", err=True)
    for text in failure_lines(summary):
        click.echo(f"oscsolve: {text}", err=True)
    for line in summary_lines(summary):
        click.echo(line)
    return 0 if summary.all_complete else 1
