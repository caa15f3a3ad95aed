"""``oscsolve modes``: the mode list of one star."""

from __future__ import annotations

from itertools import chain
from pathlib import Path
from typing import Any

import click

import oscsolve
from oscsolve.cli.options import (
    Band,
    gravitational_constant_option,
    overwrite_option,
    solve_options,
)
from oscsolve.cli.outputs import check_output
from oscsolve.cli.progress import Progress, show_findings


@click.command("modes")
@click.argument("model", type=click.Path(path_type=Path))
@solve_options
@gravitational_constant_option
@click.option(
    "--out",
    type=click.Path(path_type=Path),
    metavar="FILE.h5",
    help="Save modes, eigenfunctions and model as HDF5.",
)
@click.option(
    "--csv",
    "csv_path",
    type=click.Path(path_type=Path, allow_dash=True),
    metavar="FILE",
    help="Write the list as CSV; - writes it to standard output in place of the table.",
)
@click.option(
    "--json", "as_json", is_flag=True, help="Print one JSON document in place of the table."
)
@click.option(
    "--check",
    is_flag=True,
    help="Recompute every frequency from the eigenfunctions through the energy integral, and take "
    "the overlaps of all modes of one degree; two lines tell the worst.",
)
@click.option(
    "--verify",
    is_flag=True,
    help="Recompute every mode by shooting, an independent method; exit status 1, the modes named, "
    "where the two differ by more than their error bars allow.",
)
@overwrite_option
def command(
    model: Path,
    out: Path | None,
    csv_path: Path | None,
    as_json: bool,
    check: bool,
    verify: bool,
    overwrite: bool,
    **asked: Any,
) -> int:
    """List the modes of the star in MODEL (FGONG, column table or HDF5).

    The table ends with a census: for each degree the number of modes in the band, counted by
    Sylvester's law of inertia, beside the number listed. Exit status 1 where the two differ.

    In the table every line that does not begin with # is one mode: l, n, kind, n_p, n_g, nu and its
    error in uHz, period, inertia.
    """
    to_stdout = csv_path == Path("-")
    if to_stdout and as_json:
        raise click.UsageError("--json and --csv - both want standard output; give --csv a file")
    _check_outputs(model, out, None if to_stdout else csv_path, overwrite)
    # Loaded here so that --help does not wait for numpy and h5py.
    from oscsolve.cli.check_text import check_results
    from oscsolve.cli.documents import csv_lines, json_document, write_text
    from oscsolve.cli.table import mode_table
    from oscsolve.cli.verify_text import verify_results

    modes = _solve(model, keep_eigenfunctions=out is not None or check, verify=verify, **asked)
    results = [check_results(modes)] if check else []
    if verify:
        results.append(verify_results(modes))
    lines = [line for part, _ in results for line in part]
    values = {name: value for _, part in results for name, value in part.items()}
    # Files first: whoever reads standard output may stop reading.
    if out is not None:
        oscsolve.save_modes(modes, out, overwrite=overwrite)
    if csv_path is not None and not to_stdout:
        write_text(csv_path, csv_lines(modes, lines), overwrite=overwrite)
    if as_json:
        click.echo(json_document(modes, values if results else None))
    else:
        table = csv_lines(modes, lines) if to_stdout else chain(mode_table(modes), lines)
        for line in table:
            click.echo(line)
    agreed = modes.confirmed is None or bool(modes.confirmed.all())
    return 0 if modes.complete and agreed else 1


def _check_outputs(model: Path, out: Path | None, csv_path: Path | None, overwrite: bool) -> None:
    if out is not None:
        check_output(out, overwrite=overwrite, suffixes=(".h5", ".hdf5"), inputs=[model])
    if csv_path is not None:
        check_output(csv_path, overwrite=overwrite, inputs=[model])
    if out is not None and csv_path is not None and out.absolute() == csv_path.absolute():
        raise click.UsageError(f"--out and --csv both name {out}; give them two names")


def _solve(
    model: Path,
    *,
    degrees: tuple[int, ...],
    band: Band | None,
    cowling: bool,
    surface: str,
    tolerance: float,
    gravitational_constant: float | None,
    keep_eigenfunctions: bool,
    verify: bool,
) -> oscsolve.ModeSet:
    star = oscsolve.read_model(model, gravitational_constant=gravitational_constant)
    with Progress(announce=lambda: show_findings(star.findings)) as progress:
        modes = oscsolve.solve_modes(
            star,
            degrees,
            None if band is None else (band.first, band.second),
            unit="uHz" if band is None else band.unit,
            gravity="cowling" if cowling else "full",
            surface=surface,
            tolerance=tolerance,
            verify=verify,
            options=oscsolve.SolveOptions(eigenfunctions=keep_eigenfunctions),
            progress=progress,
        )
    show_findings(modes.findings)
    return modes
