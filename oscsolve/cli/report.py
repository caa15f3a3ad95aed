"""``oscsolve report``: what the modes of one star say, as a page or as text."""

from __future__ import annotations

from pathlib import Path

import click

import oscsolve
from oscsolve.cli.options import overwrite_option
from oscsolve.cli.outputs import check_output


@click.command("report")
@click.argument("modes_path", metavar="MODES.h5", type=click.Path(path_type=Path))
@click.option(
    "-o",
    "--out",
    type=click.Path(path_type=Path),
    metavar="FILE.html",
    help="Write a page that needs no other file and no network: pictures, asymptotic "
    "quantities, the list, the star and its findings, the census, and how to make it again.",
)
@click.option(
    "--json",
    "as_json",
    is_flag=True,
    help="Print the asymptotic quantities of all orders as one JSON document in place of the text.",
)
@overwrite_option
def command(modes_path: Path, out: Path | None, as_json: bool, overwrite: bool) -> int:
    """Tell what the modes in MODES.h5 (oscsolve modes MODEL --out MODES.h5) say of their star.

    Without -o the asymptotic quantities are printed: large and small separations, ratios, epsilon,
    period spacings, the coupling of mixed modes, with their errors and definitions. Exit status 1
    where the list is not complete.
    """
    if out is not None and as_json:
        raise click.UsageError("-o writes a page and --json prints a document; give one of them")
    if out is not None:
        check_output(out, overwrite=overwrite, suffixes=(".html", ".htm"), inputs=[modes_path])
    # Loaded here so that --help does not wait for numpy and h5py.
    from oscsolve.cli.documents import write_text
    from oscsolve.cli.report_text import report_document, report_lines

    modes = oscsolve.load_modes(modes_path)
    found = oscsolve.asymptotics(modes)
    if as_json:
        click.echo(report_document(modes, found))
    elif out is None:
        for line in report_lines(modes, found):
            click.echo(line)
    else:
        page = _page(modes, found, modes_path)
        write_text(out, page.splitlines(), overwrite=overwrite)
    return 0 if modes.complete else 1


def _page(modes: oscsolve.ModeSet, found: oscsolve.Asymptotics, path: Path) -> str:
    from oscsolve.cli.report_page import Picture, report_page
    from oscsolve.plots.gallery import gallery

    low, high = modes.census.low, modes.census.high
    band = (float(low.min()), float(high.max())) if low.size and low.min() > 0.0 else None
    inspection = oscsolve.inspect_model(
        modes.star, degrees=[int(degree) for degree in modes.census.degree], band=band
    )
    pictures = [Picture(plate.title, plate.caption, plate.svg()) for plate in gallery(modes)]
    return report_page(modes, found, inspection, file_name=path.name, pictures=pictures)
