"""``oscsolve match``: a mode list, or all of a grid, against an observed list."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

import oscsolve
from oscsolve.cli.options import overwrite_option
from oscsolve.cli.outputs import check_output

if TYPE_CHECKING:
    from oscsolve.seismology.acoustic import ModeColumns
    from oscsolve.seismology.match import Match

_LAWS = ("none", "power", "cubic", "two-term", "lorentzian")


@click.command("match")
@click.argument("modes_path", metavar="MODES.h5", type=click.Path(path_type=Path))
@click.argument("observed_path", metavar="OBSERVED.csv", type=click.Path(path_type=Path))
@click.option(
    "--law",
    "--surface",
    "law",
    type=click.Choice(_LAWS),
    default="two-term",
    show_default=True,
    help="Correction for what models get wrong near the surface.",
)
@click.option(
    "--rank-by",
    "measure",
    type=click.Choice(("frequencies", "ratios")),
    default="frequencies",
    show_default=True,
    help="What ranks the models of a grid.",
)
@click.option(
    "--best",
    type=click.IntRange(1),
    default=10,
    show_default=True,
    help="Models of a grid to list.",
)
@click.option(
    "--plot",
    "plot_path",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="Draw observed and corrected frequencies, folded with the large separation (of a grid: "
    "those of the best model), as PNG, PDF or SVG.",
)
@click.option(
    "--json", "as_json", is_flag=True, help="Print one JSON document in place of the table."
)
@overwrite_option
def command(
    modes_path: Path,
    observed_path: Path,
    law: str,
    measure: str,
    best: int,
    plot_path: Path | None,
    as_json: bool,
    overwrite: bool,
) -> int:
    """Compare MODES.h5 with an observed list.

    MODES.h5 is a mode list (oscsolve modes --out) or a grid store (oscsolve grid), whose models are
    ranked. OBSERVED.csv has the columns degree, nu, nu_error (uHz) and, where known, order. Every
    line that does not begin with # is one pair of modes, or one model.
    """
    if plot_path is not None:
        check_output(
            plot_path,
            overwrite=overwrite,
            suffixes=(".png", ".pdf", ".svg"),
            inputs=(modes_path, observed_path),
        )
    # Loaded here so that --help does not wait for numpy and h5py.
    from oscsolve.store import is_grid_store

    observed = oscsolve.read_observed(observed_path)
    if is_grid_store(modes_path):
        return _rank(modes_path, observed, law, measure, best, plot_path, as_json, overwrite)
    from oscsolve.cli.match_text import match_document, match_table

    modes = oscsolve.load_modes(modes_path)
    found = oscsolve.match_observed(modes, observed, surface=law)
    if plot_path is not None:
        _draw(modes, found, plot_path, modes.star.name, overwrite)
    if as_json:
        click.echo(match_document(modes, found))
    else:
        for line in match_table(modes, found):
            click.echo(line)
    return 0


def _rank(
    path: Path,
    observed: oscsolve.ObservedModes,
    law: str,
    measure: str,
    best: int,
    plot_path: Path | None,
    as_json: bool,
    overwrite: bool,
) -> int:
    from oscsolve.cli.match_text import rank_document, rank_table
    from oscsolve.cli.progress import Progress
    from oscsolve.grid.rank import match_row, rank_grid

    with Progress(announce=lambda: None) as told:
        ranking = rank_grid(
            path,
            observed,
            surface=law,
            measure=measure,
            progress=lambda done, total: told(done, total, "models"),
        )
    if plot_path is not None:
        row = ranking.grid.row(int(ranking.order[0]))
        _draw(row, match_row(row, observed, law), plot_path, row.name, overwrite)
    if as_json:
        click.echo(rank_document(ranking, observed, law, measure, best))
    else:
        for line in rank_table(ranking, observed, law, measure, best):
            click.echo(line)
    return 0


def _draw(modes: ModeColumns, found: Match, path: Path, name: str, overwrite: bool) -> None:
    from oscsolve.plots.figure import save_figure
    from oscsolve.plots.match import match_plot

    def draw(axes: Any) -> Any:
        return match_plot(axes, modes, found)

    save_figure(path, draw, name, height=1.35, overwrite=overwrite)
