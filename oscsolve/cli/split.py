"""``oscsolve split``: rotational splittings of a mode list, and what measured ones say."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

import oscsolve
from oscsolve.cli.options import NumberType, overwrite_option
from oscsolve.cli.outputs import check_output
from oscsolve.errors import InputError

if TYPE_CHECKING:
    from oscsolve.seismology.rotation import Splittings
    from oscsolve.seismology.two_zones import MeanRotation, MeasuredSplittings


@click.command("split")
@click.argument("modes_path", metavar="MODES.h5", type=click.Path(path_type=Path))
@click.option(
    "--rotation",
    metavar="PROFILE",
    help="430nHz, 0.5uHz or 25d (solid body); 750nHz:30nHz@0.2 (core:envelope@r/R); model (what "
    "came with the star); or a CSV file with x or radius (cm) and omega (rad/s), rate_nHz or "
    "rate_uHz.",
)
@click.option(
    "--measured",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="CSV of measured splittings (degree,order,splitting,splitting_error in nHz): gives the "
    "mean rotation of core and envelope.",
)
@click.option(
    "--core-radius",
    type=NumberType(0.0),
    metavar="X",
    help="r/R that parts core and envelope. Default: the top of the g-mode cavity.",
)
@click.option(
    "--kernels",
    "kernels_path",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="Write the rotation kernels as CSV, one column a mode.",
)
@click.option(
    "--csv",
    "csv_path",
    type=click.Path(path_type=Path, allow_dash=True),
    metavar="FILE",
    help="Write the splittings as CSV; - writes them to standard output in place of the table.",
)
@click.option(
    "--json", "as_json", is_flag=True, help="Print one JSON document in place of the table."
)
@overwrite_option
def command(
    modes_path: Path,
    rotation: str | None,
    measured: Path | None,
    core_radius: float | None,
    kernels_path: Path | None,
    csv_path: Path | None,
    as_json: bool,
    overwrite: bool,
) -> int:
    """Split the modes in MODES.h5 (oscsolve modes --out) by slow rotation.

    Frequencies in the inertial frame: nu(m) = nu + m splitting, m > 0 with the rotation. Every
    line that does not begin with # is one mode: l, n, kind, nu in uHz, beta, C = 1 - beta, and the
    splitting and the mean rate of rotation that the mode senses, both in nHz.
    """
    if rotation is None and measured is None:
        raise click.UsageError("give --rotation PROFILE, --measured FILE or both")
    if core_radius is not None and measured is None:
        raise click.UsageError("--core-radius goes with --measured")
    to_stdout = csv_path == Path("-")
    if to_stdout and as_json:
        raise click.UsageError("--json and --csv - both want standard output; give --csv a file")
    if rotation is None and csv_path is not None:
        raise click.UsageError("--csv lists splittings; give --rotation PROFILE as well")
    files = [path for path in (kernels_path, None if to_stdout else csv_path) if path is not None]
    for path in files:
        inputs = [source for source in (modes_path, measured) if source is not None]
        check_output(path, overwrite=overwrite, inputs=inputs)
    if len({path.absolute() for path in files}) < len(files):
        raise click.UsageError(f"--csv and --kernels both name {files[0]}; give them two names")
    # Loaded here so that --help does not wait for numpy and h5py.
    from oscsolve.cli.documents import write_text
    from oscsolve.cli.split_text import kernel_lines, split_csv, split_document, split_table

    modes = oscsolve.load_modes(modes_path)
    found, mean = _work(modes, modes_path, rotation, measured, core_radius)
    _warn(modes)
    if kernels_path is not None:
        write_text(kernels_path, kernel_lines(modes), overwrite=overwrite)
    if csv_path is not None and not to_stdout and found is not None:
        write_text(csv_path, split_csv(modes, found, mean), overwrite=overwrite)
    if as_json:
        click.echo(split_document(modes, found, mean))
    else:
        lines = split_csv if to_stdout and found is not None else split_table
        for line in lines(modes, found, mean):  # type: ignore[arg-type]
            click.echo(line)
    return 0


def _work(
    modes: oscsolve.ModeSet,
    path: Path,
    rotation: str | None,
    measured: Path | None,
    core_radius: float | None,
) -> tuple[Splittings | None, tuple[MeasuredSplittings, MeanRotation] | None]:
    from oscsolve.cli.rotation_option import rotation_of
    from oscsolve.seismology.rotation import rotational_splitting
    from oscsolve.seismology.tables import read_splittings
    from oscsolve.seismology.two_zones import mean_rotation

    if modes.eigenfunctions is None:
        raise InputError(f"{path}: holds no eigenfunctions; repeat oscsolve modes with --out")
    if not (modes.degree > 0).any():
        raise InputError(f"{path}: holds radial modes only, which do not split; solve for l > 0")
    found = None
    if rotation is not None:
        found = rotational_splitting(modes, rotation_of(rotation, modes.star))
    mean = None
    if measured is not None:
        table = read_splittings(measured)
        mean = table, mean_rotation(modes, table, core_radius)
    return found, mean


def _warn(modes: oscsolve.ModeSet) -> None:
    """Say so where the points of the model are too few for the eigenfunctions."""
    from oscsolve.cli.progress import show_findings
    from oscsolve.seismology.checks import coarse_points

    show_findings(coarse_points(modes))
