"""The ``lbwork`` command: verbs in the order of the work, errors as one line."""

from __future__ import annotations

import os
import sys
from collections.abc import Sequence

import typer

from lbwork.cli import verbs
from lbwork.cli.console import say
from lbwork.errors import LbworkError

__all__ = ["application", "main"]

# The usage errors of the command parser; their common base is not exported by name.
_WrongUsage: type[Exception] = typer.BadParameter.__mro__[1]

application = typer.Typer(
    name="lbwork",
    help="Numerics of Lindblad generators on chains; every number with its certificate.",
    add_completion=False,
    pretty_exceptions_enable=False,
    rich_markup_mode=None,
)
for verb in verbs.ALL:
    application.command(name=verb.NAME)(verb.run)


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command line; returns the exit status instead of leaving the interpreter.

    0 done and certified, 1 refused or not certified, 2 wrong usage. Bugs keep their traceback.
    """
    command = typer.main.get_command(application)
    words = list(sys.argv[1:] if arguments is None else arguments)
    try:
        status = command.main(args=words or ["--help"], prog_name="lbwork", standalone_mode=False)
        return status if isinstance(status, int) else 0
    except LbworkError as error:
        say(f"lbwork: {_one_line(str(error))}")
        return error.exit_code
    except _WrongUsage as error:
        say(f"lbwork: {_one_line(_words(error))}{_help_hint(error)}")
        return 2
    except (typer.Abort, KeyboardInterrupt):
        say("lbwork: interrupted; finished sectors are kept")
        return 130
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0


def _words(error: Exception) -> str:
    formatted = getattr(error, "format_message", None)
    return str(formatted()) if callable(formatted) else str(error)


def _help_hint(error: Exception) -> str:
    context = getattr(error, "ctx", None)
    path = "lbwork" if context is None else context.command_path
    return f"; see {path} --help"


def _one_line(text: str) -> str:
    return " ".join(text.split()).rstrip(".")
