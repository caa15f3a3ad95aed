"""``oscsolve build``: analytic stars, written as model files."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

import oscsolve
from oscsolve.cli.options import NumberType, overwrite_option
from oscsolve.cli.outputs import check_output
from oscsolve.units import NEWTON_G, SOLAR_MASS, SOLAR_RADIUS

if TYPE_CHECKING:
    from oscsolve.star.model import StarModel

_SUFFIXES = (".fgong", ".h5", ".hdf5")


def _build_options(function: Callable[..., Any]) -> Callable[..., Any]:
    """What every kind of star needs."""
    options = [
        click.option(
            "--gamma1",
            type=NumberType(0.0),
            default="5/3",
            show_default=True,
            metavar="NUMBER",
            help="First adiabatic exponent; fractions are welcome.",
        ),
        click.option(
            "--mass",
            type=NumberType(0.0),
            default=SOLAR_MASS,
            metavar="G",
            help="Mass in g. Default: that of the Sun.",
        ),
        click.option(
            "--radius",
            type=NumberType(0.0),
            default=SOLAR_RADIUS,
            metavar="CM",
            help="Radius in cm. Default: that of the Sun.",
        ),
        click.option(
            "--gravitational-constant",
            type=NumberType(0.0),
            default=NEWTON_G,
            metavar="G",
            help=f"G in cm^3 g^-1 s^-2. Default: {NEWTON_G:g}.",
        ),
        click.option(
            "--out",
            type=click.Path(path_type=Path),
            required=True,
            metavar="FILE",
            help="File to write; the ending .fgong, .h5 or .hdf5 chooses the format.",
        ),
        overwrite_option,
    ]
    for option in reversed(options):
        function = option(function)
    return function


@click.group("build", invoke_without_command=True, no_args_is_help=False)
@click.pass_context
def command(ctx: click.Context) -> None:
    """Make an analytic star and write it as a model file."""
    if ctx.invoked_subcommand is None:
        click.echo(ctx.get_help())


@command.command("polytrope")
@click.option(
    "--index",
    type=NumberType(least=0.0),
    required=True,
    metavar="N",
    help="Polytropic index, from 0 to below 5; fractions are welcome.",
)
@_build_options
def build_polytrope(index: float, out: Path, overwrite: bool, **scales: float) -> None:
    """A polytrope, P = K rho^(1 + 1/N)."""
    check_output(out, overwrite=overwrite, suffixes=_SUFFIXES)
    _write(oscsolve.polytrope(index, **scales), out, overwrite)


@command.command("uniform")
@_build_options
def build_uniform(out: Path, overwrite: bool, **scales: float) -> None:
    """A sphere of one density, whose modes are known in closed form."""
    check_output(out, overwrite=overwrite, suffixes=_SUFFIXES)
    _write(oscsolve.uniform_sphere(**scales), out, overwrite)


def _write(star: StarModel, out: Path, overwrite: bool) -> None:
    oscsolve.write_model(star, out, overwrite=overwrite)
    click.echo(f"oscsolve: {star.name}, {star.radius.size} points, written to {out}", err=True)
