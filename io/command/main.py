"""
The group of commands, and how a run ends.

Exit status: 0 all read and answered; 1 some inputs could not be read (the others were done);
2 the call is wrong; 3 nothing could be read. Errors are one line each on standard error.
"""

from __future__ import annotations

import contextlib
import os
import sys
from collections.abc import Sequence

import click

from backveer.io.atomic import WriteError
from backveer.io.command.desk import desk
from backveer.io.command.outlook import outlook
from backveer.io.command.read import read
from backveer.io.command.rotor import rotor
from backveer.io.command.shear import shear
from backveer.io.command.turn import turn


@click.group(context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 88})
@click.version_option(package_name="backveer", message="backveer %(version)s")
def backveer() -> None:
    """
    How the wind turns and strengthens with height, in numbers that can be defended.

    Reads radiosonde, pilot-balloon, tower and wind-lidar files in whatever columns and units the
    instrument wrote. Supports and does not replace official aviation warnings, licensed practice
    and local codes.
    """


for command in (read, turn, shear, desk, rotor, outlook):
    backveer.add_command(command)


def main(arguments: Sequence[str] | None = None) -> int:
    """
    Run the command line and return its exit status.

    Parameters
    ----------
    arguments
        The words after ``backveer``; those of the process when left out.
    """
    try:
        status = backveer.main(
            args=None if arguments is None else list(arguments),
            prog_name="backveer",
            standalone_mode=False,
        )
        sys.stdout.flush()
        return int(status or 0)
    except click.exceptions.NoArgsIsHelpError as error:
        click.echo(error.format_message())
        return 2
    except click.exceptions.Exit as error:
        return error.exit_code
    except click.Abort:
        say("stopped. Nothing half-written is left behind.")
        return 130
    except click.ClickException as error:
        context = getattr(error, "ctx", None)
        remedy = f" See {context.command_path} --help." if context is not None else ""
        say(_one_line(error.format_message()).rstrip(".") + "." + remedy)
        return 2
    except WriteError as error:
        say(str(error))
        return 2
    except BrokenPipeError:
        # The reader of our output has gone (`| head`): what is left to say has no one to hear it.
        with contextlib.suppress(OSError):
            os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    except MemoryError:
        say("not enough memory. Give fewer or smaller files in one call.")
        return 3
    except Exception as error:
        if os.environ.get("BACKVEER_TRACEBACK"):
            raise
        say(
            f"internal fault ({type(error).__name__}: {_one_line(str(error))[:200]}). "
            "Please report it; BACKVEER_TRACEBACK=1 shows where it arose."
        )
        return 3


def say(problem: str) -> None:
    """Print one line on standard error."""
    click.echo(f"backveer: {problem}", err=True)


def _one_line(text: str) -> str:
    return " ".join(text.split())
