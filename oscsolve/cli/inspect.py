"""``oscsolve inspect``: what a model file holds, and whether it is fit for pulsation work."""

from __future__ import annotations

from pathlib import Path

import click

import oscsolve
from oscsolve.cli.options import (
    Band,
    BandType,
    DegreesType,
    gravitational_constant_option,
    overwrite_option,
)
from oscsolve.cli.outputs import check_output


@click.command("inspect")
@click.argument("model", type=click.Path(path_type=Path))
@click.option(
    "--degrees",
    type=DegreesType(),
    default="0-3",
    show_default=True,
    metavar="LIST",
    help="Spherical degrees that the mesh is judged for, such as 0-3,10.",
)
@click.option(
    "--band",
    type=BandType(),
    metavar="LOW:HIGH[UNIT]",
    help="Band that mesh and atmosphere are judged for: 1000:4000 in uHz, or with a unit. "
    "Default: what suits the star.",
)
@gravitational_constant_option
@click.option(
    "--plot",
    "plot_path",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="Draw the propagation diagram as PNG, PDF or SVG.",
)
@overwrite_option
@click.option(
    "--json", "as_json", is_flag=True, help="Print one JSON document in place of the text."
)
def command(
    model: Path,
    degrees: tuple[int, ...],
    band: Band | None,
    gravitational_constant: float | None,
    plot_path: Path | None,
    overwrite: bool,
    as_json: bool,
) -> int:
    """Tell what the star in MODEL (FGONG, column table or HDF5) is, and what is wrong with it.

    First the figures of the star as a whole, then the findings: defects (results will be wrong),
    doubts (they may mislead) and notes. Exit status 1 if there is a defect.
    """
    if plot_path is not None:
        suffixes = (".png", ".pdf", ".svg")
        check_output(plot_path, overwrite=overwrite, suffixes=suffixes, inputs=(model,))
    # Loaded here so that --help does not wait for numpy and h5py.
    from oscsolve.cli.inspection import inspection_document, inspection_lines

    star = oscsolve.read_model(model, gravitational_constant=gravitational_constant)
    found = oscsolve.inspect_model(
        star,
        degrees=degrees,
        band=None if band is None else (band.first, band.second),
        unit="uHz" if band is None else band.unit,
    )
    if plot_path is not None:
        from oscsolve.plots.figure import save_figure
        from oscsolve.plots.propagation import propagation_diagram

        shown = [degree for degree in degrees if degree > 0][:3] or [1]
        save_figure(
            plot_path,
            lambda axes: propagation_diagram(axes, star, degrees=shown, band=found.band),
            star.name,
            overwrite=overwrite,
        )
    if as_json:
        click.echo(inspection_document(star, found))
    else:
        for line in inspection_lines(star, found):
            click.echo(line)
    return 0 if found.usable else 1
