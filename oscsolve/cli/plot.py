"""``oscsolve plot``: one figure of a model or a mode list."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

import oscsolve
from oscsolve.cli.options import DegreesType, NumberType, overwrite_option
from oscsolve.cli.outputs import check_output
from oscsolve.errors import InputError

if TYPE_CHECKING:
    from oscsolve.pulsation.modeset import ModeSet

WHAT = ("propagation", "echelle", "spacing", "inertia", "eigenfunction", "kernel")
_KERNELS = {
    "rotation": None,
    "c2": ("c2", "rho"),
    "gamma1": ("gamma1", "rho"),
    "rho": ("rho", "c2"),
}


@click.command("plot")
@click.argument("what", type=click.Choice(WHAT))
@click.argument("path", metavar="FILE", type=click.Path(path_type=Path))
@click.option(
    "-o",
    "--out",
    type=click.Path(path_type=Path),
    required=True,
    metavar="PICTURE",
    help="File to write; its ending says the format: .png, .pdf or .svg.",
)
@click.option(
    "--degrees",
    type=DegreesType(),
    metavar="LIST",
    help="Degrees to draw, such as 1-2. Default: 1-2 for propagation, all elsewhere.",
)
@click.option(
    "--mode",
    "wanted",
    multiple=True,
    metavar="L,N",
    help="Mode of degree L and order N, for eigenfunction (one) and kernel (up to eight). Default: "
    "the middle of the list.",
)
@click.option(
    "--axis",
    type=click.Choice(("auto", "radius", "log-radius", "pressure")),
    default="auto",
    show_default=True,
    help="Horizontal axis of propagation and eigenfunction.",
)
@click.option(
    "--fold",
    type=click.Choice(("auto", "frequency", "period")),
    default="auto",
    show_default=True,
    help="What an echelle folds.",
)
@click.option(
    "--width", type=NumberType(0.0), metavar="X", help="Width of an echelle, uHz or s, set by hand."
)
@click.option(
    "--observed",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="Observed list (CSV) to draw into an echelle.",
)
@click.option(
    "--of",
    "quantity",
    type=click.Choice(tuple(_KERNELS)),
    default="rotation",
    show_default=True,
    help="Kernel of rotation, or of c^2 at fixed rho, Gamma1 at fixed rho, rho at fixed c^2.",
)
@overwrite_option
def command(
    what: str,
    path: Path,
    out: Path,
    degrees: tuple[int, ...] | None,
    wanted: tuple[str, ...],
    axis: str,
    fold: str,
    width: float | None,
    observed: Path | None,
    quantity: str,
    overwrite: bool,
) -> int:
    """Draw WHAT from FILE, a mode list (oscsolve modes --out); propagation also from a model."""
    inputs = [source for source in (path, observed) if source is not None]
    check_output(out, overwrite=overwrite, suffixes=(".png", ".pdf", ".svg"), inputs=inputs)
    # Loaded here so that --help does not wait for matplotlib.
    from oscsolve.plots.figure import save_figure

    if what == "propagation":
        draw, name = _propagation(path, degrees or (1, 2), axis)
    else:
        modes = oscsolve.load_modes(path)
        name = modes.star.name
        shown = modes if degrees is None else _of_degrees(modes, degrees)
        if what == "echelle":
            draw = [_echelle(shown, fold, width, observed, degrees)]
        elif what == "eigenfunction":
            draw = _eigenfunction(modes, wanted, axis)
            name = f"{name}, {_title(modes, _rows(modes, wanted, 1)[0])}"
        elif what == "kernel":
            draw = [_kernel(modes, wanted, quantity)]
        else:
            draw = [_list_figure(what, shown)]
    height = 1.35 if what == "echelle" else 0.8 if len(draw) > 1 else 1.0
    save_figure(out, draw, name, height=height, overwrite=overwrite)
    return 0


Panels = list[Callable[[Any], Any]]


def _propagation(path: Path, degrees: tuple[int, ...], axis: str) -> tuple[Panels, str]:
    from oscsolve.plots.propagation import propagation_diagram
    from oscsolve.store import is_mode_file

    degrees = tuple(degree for degree in degrees if degree > 0)
    if not degrees:
        raise InputError("a propagation diagram shows degrees above 0; give --degrees 1-2")
    modes = oscsolve.load_modes(path) if is_mode_file(path) else None
    star = oscsolve.read_model(path) if modes is None else modes.star

    def draw(axes: Any) -> Any:
        return propagation_diagram(axes, star, modes, degrees=degrees, coordinate=axis)

    return [draw], star.name


def _echelle(
    modes: ModeSet,
    fold: str,
    width: float | None,
    observed: Path | None,
    degrees: tuple[int, ...] | None,
) -> Callable[[Any], Any]:
    from oscsolve.plots.echelle import frequency_echelle, period_echelle

    nonradial = [int(degree) for degree in modes.census.degree if degree > 0]
    g_rich = bool(((modes.n_g > 0) & (modes.n_p == 0)).sum() > 0.5 * len(modes))
    if fold == "period" or (fold == "auto" and g_rich and observed is None):
        if not nonradial:
            raise InputError("periods are folded for l > 0, and the list holds radial modes only")
        degree = nonradial[0]
        return lambda axes: period_echelle(axes, modes, degree, width)
    seen = None if observed is None else oscsolve.read_observed(observed)
    return lambda axes: frequency_echelle(axes, modes, width, seen)


def _eigenfunction(modes: ModeSet, wanted: tuple[str, ...], axis: str) -> Panels:
    from oscsolve.plots.eigenfunction import displacement_plot, energy_plot

    row = _rows(modes, wanted, 1)[0]
    return [
        lambda axes: displacement_plot(axes, modes, row, coordinate=axis),
        lambda axes: energy_plot(axes, modes, row, coordinate=axis),
    ]


def _kernel(modes: ModeSet, wanted: tuple[str, ...], quantity: str) -> Callable[[Any], Any]:
    from oscsolve.plots.kernel import rotation_kernel_plot, structure_kernel_plot

    pair = _KERNELS[quantity]
    rows = _rows(modes, wanted, 8, nonradial=pair is None)
    if pair is None:
        return lambda axes: rotation_kernel_plot(axes, modes, rows)
    return lambda axes: structure_kernel_plot(axes, modes, rows, quantity=pair[0], held=pair[1])


def _list_figure(what: str, modes: ModeSet) -> Callable[[Any], Any]:
    from oscsolve.plots.inertia import inertia_plot
    from oscsolve.plots.spacing import spacing_plot

    if what == "inertia":
        return lambda axes: inertia_plot(axes, modes)
    return lambda axes: spacing_plot(axes, modes)


def _rows(
    modes: ModeSet, wanted: tuple[str, ...], most: int, *, nonradial: bool = False
) -> list[int]:
    """Rows of the modes that were named, or one from the middle of the list."""
    if modes.eigenfunctions is None:
        raise InputError("the mode list holds no eigenfunctions; repeat oscsolve modes with --out")
    if len(wanted) > most:
        raise InputError(f"this figure shows at most {most} mode(s); got {len(wanted)}")
    allowed = [k for k in range(len(modes)) if modes.degree[k] > 0 or not nonradial]
    if not allowed:
        raise InputError("the mode list holds no mode that can be drawn like this")
    if not wanted:
        return [allowed[len(allowed) // 2]]
    return [_row(modes, text) for text in wanted]


def _row(modes: ModeSet, text: str) -> int:
    try:
        degree, order = (int(part) for part in text.split(","))
    except ValueError as error:
        raise InputError(f"--mode {text}: expected degree and order, such as 1,-3") from error
    for row in range(len(modes)):
        if modes.degree[row] == degree and modes.order[row] == order:
            return row
    raise InputError(f"--mode {text}: the list has no mode of l = {degree}, n = {order}")


def _title(modes: ModeSet, row: int) -> str:
    kind = f"{modes.kind[row]}, " if modes.kind[row] != "radial" else ""
    return f"l = {modes.degree[row]}, n = {modes.order[row]}, {kind}{modes.nu[row]:.6g} uHz"


def _of_degrees(modes: ModeSet, degrees: tuple[int, ...]) -> ModeSet:
    missing = [degree for degree in degrees if degree not in modes.census.degree]
    if missing:
        raise InputError(f"--degrees: the list has no l = {missing[0]}")
    return modes.only(degrees)
