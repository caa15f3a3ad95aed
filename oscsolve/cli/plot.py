"""``oscsolve plot``: one figure of a model or a mode list."""

from __future__ import annotations

import contextlib
from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, TypeVar

import click

import oscsolve
from oscsolve.cli.options import DegreesType, NumberType, overwrite_option
from oscsolve.cli.outputs import check_output
from oscsolve.errors import InputError

if TYPE_CHECKING:
    from oscsolve.pulsation.modeset import ModeSet

#: Endings that a picture may have.
PICTURES = (".png", ".pdf", ".svg")
#: Choice of --of: what changes and what is held; None for rotation.
_KERNELS = {
    "rotation": None,
    "c2": ("c2", "rho"),
    "rho": ("rho", "c2"),
    "gamma1": ("gamma1", "rho"),
    "rho-gamma1": ("rho", "gamma1"),
}
#: Height of a panel in units of the usual one: square figures, and one of two panels.
_SQUARE, _HALF = 1.35, 0.8
#: Modes whose kernels one figure shows.
_MOST = 8

_Function = TypeVar("_Function", bound=Callable[..., Any])
_Panel = Callable[[Any], Any]


@click.group("plot", invoke_without_command=True, no_args_is_help=False)
@click.pass_context
def command(ctx: click.Context) -> None:
    """Draw a figure of a mode list (oscsolve modes MODEL --out FILE.h5) as PNG, PDF or SVG."""
    if ctx.invoked_subcommand is None:
        click.echo(ctx.get_help())


def _figure(function: _Function) -> _Function:
    """What every figure needs."""
    out = click.option(
        "-o",
        "--out",
        type=click.Path(path_type=Path),
        required=True,
        metavar="PICTURE",
        help="File to write; its ending says the format: .png, .pdf or .svg.",
    )
    path = click.argument("path", metavar="FILE", type=click.Path(path_type=Path))
    return path(out(overwrite_option(function)))


_degrees = click.option(
    "--degrees", type=DegreesType(), metavar="LIST", help="Degrees to draw, such as 1-2."
)
_axis = click.option(
    "--axis",
    # As `oscsolve.plots.COORDINATES`, which would load matplotlib.
    type=click.Choice(("auto", "radius", "log-radius", "mass", "pressure")),
    default="auto",
    show_default=True,
    help="What runs along the horizontal axis; auto takes what shows most of the star.",
)


def _mode(text: str) -> Callable[[_Function], _Function]:
    return click.option("--mode", "named", multiple=True, metavar="L,N", help=text)


@command.command("propagation")
@_figure
@_degrees
@_mode("Draw the mode of degree L and order N; may be given several times.")
@_axis
def propagation(
    path: Path,
    out: Path,
    overwrite: bool,
    degrees: tuple[int, ...] | None,
    named: tuple[str, ...],
    axis: str,
) -> int:
    """N and S_l through the star, the band, and the modes with their nodes.

    FILE is a mode list or a model. Without --degrees S_l is drawn for l up to 3; the cavities, and
    the modes unless they are named, are those of the lowest degree above 0.
    """
    _check(out, overwrite, path)
    from oscsolve.plots.propagation import propagation_diagram
    from oscsolve.store import is_mode_file

    if degrees is not None and not any(degrees):
        raise InputError("a propagation diagram shows degrees above 0; give --degrees 1-2")
    modes = oscsolve.load_modes(path) if is_mode_file(path) else None
    star = oscsolve.read_model(path) if modes is None else modes.star
    if modes is None and named:
        raise InputError(f"{path}: a model holds no modes; --mode goes with a mode list")
    rows = None if modes is None or not named else [_row(modes, text) for text in named]

    def draw(axes: Any) -> Any:
        return propagation_diagram(axes, star, modes, degrees=degrees, rows=rows, coordinate=axis)

    return _save([draw], path, out, overwrite, star.name)


@command.command("echelle")
@_figure
@_degrees
@click.option(
    "--fold",
    type=click.Choice(("auto", "frequency", "period")),
    default="auto",
    show_default=True,
    help="What is folded; auto: periods where most modes are g modes and no convective envelope "
    "drives p modes.",
)
@click.option(
    "--width",
    type=NumberType(0.0),
    metavar="X",
    help="What it is folded with, uHz or s. Default: the large separation, the period spacing.",
)
@click.option(
    "--observed",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="Observed frequencies (CSV) to draw as well.",
)
def echelle(
    path: Path,
    out: Path,
    overwrite: bool,
    degrees: tuple[int, ...] | None,
    fold: str,
    width: float | None,
    observed: Path | None,
) -> int:
    """Frequencies folded with the large separation, or periods with their spacing."""
    _check(out, overwrite, path, observed)
    if fold == "period" and observed is not None:
        raise click.UsageError("--observed holds frequencies; it goes with --fold frequency")
    from oscsolve.plots.choose import folds_periods
    from oscsolve.plots.echelle import frequency_echelle, period_echelle

    modes = _load(path, degrees)
    seen = None if observed is None else oscsolve.read_observed(observed)
    if fold == "period" or (fold == "auto" and seen is None and folds_periods(modes)):
        return _save(
            [lambda axes: period_echelle(axes, modes, degrees, width)],
            path,
            out,
            overwrite,
            modes.star.name,
            _SQUARE,
        )
    return _save(
        [lambda axes: frequency_echelle(axes, modes, width, seen)],
        path,
        out,
        overwrite,
        modes.star.name,
        _SQUARE,
    )


@command.command("spacing")
@_figure
@_degrees
def spacing(path: Path, out: Path, overwrite: bool, degrees: tuple[int, ...] | None) -> int:
    """Steps in period between g modes of consecutive order, against period."""
    _check(out, overwrite, path)
    from oscsolve.plots.spacing import spacing_plot

    modes = _load(path, degrees)
    return _save([lambda axes: spacing_plot(axes, modes)], path, out, overwrite, modes.star.name)


@command.command("inertia")
@_figure
@_degrees
def inertia(path: Path, out: Path, overwrite: bool, degrees: tuple[int, ...] | None) -> int:
    """Normalised inertia against frequency."""
    _check(out, overwrite, path)
    from oscsolve.plots.inertia import inertia_plot

    modes = _load(path, degrees)
    return _save([lambda axes: inertia_plot(axes, modes)], path, out, overwrite, modes.star.name)


@command.command("eigenfunction")
@_figure
@_mode("Mode of degree L and order N. Default: one in the middle of the list.")
@_axis
def eigenfunction(path: Path, out: Path, overwrite: bool, named: tuple[str, ...], axis: str) -> int:
    """Displacements of one mode with its nodes and cavities, and where its energy is."""
    _check(out, overwrite, path)
    if len(named) > 1:
        raise click.UsageError(f"this figure shows one mode; got --mode {len(named)} times")
    from oscsolve.plots.choose import lightest_row
    from oscsolve.plots.eigenfunction import displacement_plot, energy_plot

    modes = _load(path, eigenfunctions=True)
    with _about(path):
        row = _row(modes, named[0]) if named else lightest_row(modes)
    panels: list[_Panel] = [
        lambda axes: displacement_plot(axes, modes, row, coordinate=axis),
        lambda axes: energy_plot(axes, modes, row, coordinate=axis),
    ]
    title = f"{modes.star.name}, {_title(modes, row)}"
    done = _save(panels, path, out, overwrite, title, _HALF)
    if not named:
        _say_chosen(modes, [row])
    return done


@command.command("kernel")
@_figure
@_mode("Mode of degree L and order N, up to eight times. Default: two in the middle of the list.")
@click.option(
    "--of",
    "quantity",
    type=click.Choice(tuple(_KERNELS)),
    default="rotation",
    show_default=True,
    help="Rotation, or a change of c^2 at fixed rho, of rho at fixed c^2, of Gamma1 at fixed rho, "
    "of rho at fixed Gamma1.",
)
@_axis
def kernel(
    path: Path, out: Path, overwrite: bool, named: tuple[str, ...], quantity: str, axis: str
) -> int:
    """Kernels of some modes: what splittings say of rotation, or frequencies of the structure."""
    _check(out, overwrite, path)
    from oscsolve.plots import kernel as drawn
    from oscsolve.plots.choose import contrasting_rows, lightest_row

    modes = _load(path, eigenfunctions=True)
    if len(named) > _MOST:
        raise click.UsageError(f"this figure shows up to {_MOST} modes; got {len(named)}")
    pair = _KERNELS[quantity]
    with _about(path):
        if named:
            rows = [_row(modes, text) for text in named]
        elif pair is None or modes.degree.any():
            rows = contrasting_rows(modes)
        else:
            rows = [lightest_row(modes)]
    panels: list[_Panel]
    if pair is None:
        panels = [
            lambda axes: drawn.rotation_kernel_plot(axes, modes, rows, coordinate=axis),
            lambda axes: drawn.running_kernel_plot(axes, modes, rows, coordinate=axis),
        ]
    else:
        what, held = pair
        panels = [
            lambda axes: drawn.structure_kernel_plot(
                axes, modes, rows, quantity=what, held=held, coordinate=axis
            )
        ]
    done = _save(panels, path, out, overwrite, modes.star.name, _HALF if pair is None else 1.0)
    if not named:
        _say_chosen(modes, rows)
    return done


def _check(out: Path, overwrite: bool, *inputs: Path | None) -> None:
    read = [path for path in inputs if path is not None]
    check_output(out, overwrite=overwrite, suffixes=PICTURES, inputs=read)


def _load(
    path: Path, degrees: tuple[int, ...] | None = None, *, eigenfunctions: bool = False
) -> ModeSet:
    modes = oscsolve.load_modes(path)
    if len(modes) == 0:
        raise InputError(f"{path}: the list is empty; solve a wider band")
    if eigenfunctions and modes.eigenfunctions is None:
        raise InputError(f"{path}: holds no eigenfunctions; repeat oscsolve modes with --out")
    if degrees is None:
        return modes
    missing = [degree for degree in degrees if degree not in modes.degree]
    if missing:
        listed = ", ".join(str(degree) for degree in sorted(set(modes.degree.tolist())))
        raise InputError(f"{path}: the list has no modes of l = {missing[0]}; it has l = {listed}")
    return modes.only(degrees)


@contextlib.contextmanager
def _about(path: Path) -> Iterator[None]:
    """Name the file in what is said of its list."""
    try:
        yield
    except InputError as error:
        raise InputError(f"{path}: {error}") from error


def _row(modes: ModeSet, text: str) -> int:
    """Row of a mode that was named."""
    try:
        degree, order = (int(part) for part in text.split(","))
    except ValueError as error:
        raise InputError(f"--mode {text}: expected degree and order, such as 1,-3") from error
    found = ((modes.degree == degree) & (modes.order == order)).nonzero()[0]
    if found.size:
        return int(found[0])
    orders = modes.order[modes.degree == degree]
    has = f"; of l = {degree} it has n = {orders.min()} to {orders.max()}" if orders.size else ""
    raise InputError(f"--mode {text}: the list has no mode of l = {degree}, n = {order}{has}")


def _say_chosen(modes: ModeSet, rows: Sequence[int]) -> None:
    which = " and ".join(f"l = {modes.degree[row]}, n = {modes.order[row]}" for row in rows)
    click.echo(f"oscsolve: note: no mode was named; {which} was drawn", err=True)


def _title(modes: ModeSet, row: int) -> str:
    kind = f"{modes.kind[row]}, " if modes.kind[row] != "radial" else ""
    counts = f"n_p = {modes.n_p[row]}, n_g = {modes.n_g[row]}"
    from oscsolve.plots.style import frequency_text

    nu = f"{frequency_text(modes.nu[row])} \u03bcHz"
    return f"l = {modes.degree[row]}, n = {modes.order[row]} ({kind}{counts}), {nu}".replace(
        "-", "\u2212"
    )


def _save(
    panels: list[_Panel], path: Path, out: Path, overwrite: bool, title: str, height: float = 1.0
) -> int:
    from oscsolve.plots.figure import make_figure, write_figure

    with _about(path):
        figure = make_figure(panels, title, height=height)
    write_figure(out, figure, overwrite=overwrite)
    return 0
