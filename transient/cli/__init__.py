"""The console program: commands, words and exit statuses; no numerics.

Rooms are imported inside the commands, so that each command pays only for what it uses.
"""

from __future__ import annotations

import os
import signal
import warnings

import typer

from transient.cli.check import check
from transient.cli.figure import figure
from transient.cli.loads import loads
from transient.cli.run import run
from transient.cli.schema import schema
from transient.cli.sheet import sheet
from transient.cli.size import size
from transient.cli.sweep import sweep
from transient.cli.table import table
from transient.cli.template import template
from transient.cli.verify import verify
from transient.cli.words import FAILED, INTERRUPTED, REFUSED, Stop, Version, note, one_line, own_error

COMMANDS = (run, sweep, size, check, sheet, table, loads, figure, template, schema, verify)

app = typer.Typer(
    add_completion=False,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["--help", "-h"], "max_content_width": 100},
)
for command in COMMANDS:
    app.command()(command)


@app.callback(invoke_without_command=True)
def _program(context: typer.Context, version: Version = False) -> None:
    """How a liquid between walls starts, stops and settles: settling time, peak wall stress, and their errors."""
    if context.invoked_subcommand is None:
        print(context.get_help())


def main(arguments: list[str] | None = None) -> int:
    """Run one command line (default: the process's own) and return its exit status; never a traceback."""
    if arguments is None and hasattr(signal, "SIGPIPE"):
        # A reader that has seen enough (`| head`) ends the program quietly, as with any console tool.
        signal.signal(signal.SIGPIPE, signal.SIG_DFL)
    if arguments is None and not os.environ.get("TRANSIENT_DEBUG"):
        warnings.simplefilter("ignore")  # they speak to developers; tests turn each into an error
    try:
        status = app(args=arguments, prog_name="transient", standalone_mode=False) or 0
        if status == INTERRUPTED:  # the newer versions of typer catch the interrupt themselves
            note("interrupted")
        return status
    except Stop as stop:
        note(one_line(str(stop)))
        return stop.status
    except (typer.Abort, KeyboardInterrupt):
        note("interrupted")
        return INTERRUPTED
    except Exception as error:
        if hasattr(error, "format_message"):
            note(_usage(error.format_message()))
            return REFUSED
        note(own_error(error))
        return FAILED


def _usage(message: str) -> str:
    """A usage error in one line, with the way to more."""
    if message.startswith("No such command"):
        names = ", ".join(command.__name__ for command in COMMANDS)
        name = message.split("'")[1] if "'" in message else ""
        return f'transient: this version has no command "{name}"; it has {names}'
    return one_line(f"transient: {message.rstrip('.')} (see transient --help)")


