"""The command line: finds the command, loads only that one, turns errors into one line."""

from __future__ import annotations

import contextlib
import importlib
import io
import os
import sys
from collections.abc import Sequence

import click

from oscsolve.errors import IncompleteError, OscsolveError
from oscsolve.version import __version__

#: Command: module under `oscsolve.cli` that has a click command `command`, and what it does.
#: Kept here so that the overview need not load the commands.
COMMANDS = {
    "modes": ("modes", "List the modes of one star, with a proof that none is missing."),
    "inspect": ("inspect", "Tell what a model holds and what is wrong or doubtful about it."),
    "match": ("match", "Compare computed with observed modes, one star or a whole grid."),
    "split": ("split", "Split modes by slow rotation, and turn splittings into rotation."),
    "plot": ("plot", "Draw one figure of a model or a mode list."),
    "report": ("report", "Tell what the modes of one star say, as text or as one page."),
    "grid": ("grid", "List the modes of many models, on all cores or on a cluster."),
    "build": ("build", "Make an analytic star and write it as a model file."),
}

_EXIT_INCOMPLETE, _EXIT_USAGE = 1, 2
#: What a shell reports for a program ended by SIGINT or SIGPIPE.
_EXIT_INTERRUPTED, _EXIT_PIPE = 130, 141


class _LazyGroup(click.Group):
    """A group whose commands are imported when they are run."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        if cmd_name not in COMMANDS:
            return None
        module = importlib.import_module(f"oscsolve.cli.{COMMANDS[cmd_name][0]}")
        return module.command

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        with formatter.section("Commands"):
            formatter.write_dl([(name, what) for name, (_, what) in COMMANDS.items()])


@click.group(
    cls=_LazyGroup,
    invoke_without_command=True,
    no_args_is_help=False,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 90},
)
@click.version_option(__version__, message="oscsolve %(version)s")
@click.pass_context
def cli(ctx: click.Context) -> None:
    """Oscillation modes of stars: complete, labelled, with error bars.

    Results go to standard output, messages to standard error. Exit status: 0 all done, 1 done but
    not complete, 2 wrong usage or unreadable input.
    """
    if ctx.invoked_subcommand is None:
        click.echo(ctx.get_help())


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command line and return its exit status; never a traceback for a user's mistake."""
    # A model's name may hold letters that the terminal lacks.
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(errors="backslashreplace")
    try:
        status = _run(list(sys.argv[1:] if arguments is None else arguments))
        sys.stdout.flush()
    except BrokenPipeError:
        # The reader (head, less) has seen enough.
        _abandon_output()
        return _EXIT_PIPE
    except KeyboardInterrupt as error:
        return _complain(": ".join(["interrupted", *map(str, error.args)]), _EXIT_INTERRUPTED)
    except click.UsageError as error:
        return _complain(_usage(error), _EXIT_USAGE)
    except click.ClickException as error:
        return _complain(error.format_message(), _EXIT_USAGE)
    except IncompleteError as error:
        return _complain(str(error), _EXIT_INCOMPLETE)
    except OscsolveError as error:
        return _complain(str(error), _EXIT_USAGE)
    except OSError as error:
        # Readers and writers word their own errors; what is left is mostly standard output itself.
        _abandon_output()
        where = error.filename or "standard output"
        return _complain(f"{where}: {error.strerror or error}; check the disk", _EXIT_USAGE)
    return status


def _run(arguments: list[str]) -> int:
    # Not click's own main(): it answers an interrupt with two lines, wrong usage with three.
    try:
        with cli.make_context("oscsolve", arguments) as ctx:
            result = cli.invoke(ctx)
    except click.exceptions.Exit as end:
        return end.exit_code
    return result if isinstance(result, int) else 0


def _abandon_output() -> None:
    """Keep the interpreter from flushing standard output, and failing, once more at its end."""
    with contextlib.suppress(OSError, ValueError):
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())


def _usage(error: click.UsageError) -> str:
    where = error.ctx.command_path if error.ctx is not None else "oscsolve"
    command = where.removeprefix("oscsolve").strip()
    message = error.format_message().rstrip(".")
    return f"{command + ': ' if command else ''}{message}; see '{where} --help'"


def _complain(message: str, status: int) -> int:
    """One line on standard error, whatever the message holds."""
    click.echo(f"oscsolve: {' '.join(message.split())}", err=True)
    return status
