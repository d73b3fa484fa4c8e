"""The command ``normalize``: finds the command asked for, and turns errors into messages.

Commands are loaded when they are asked for, and load the science when they run, so that
``normalize --help`` answers at once.
"""

from __future__ import annotations

import gc
import importlib
import os
import sys
from collections.abc import Sequence
from typing import Final

import click

from normalize.cli.console import forgiving_streams, private, say, show
from normalize.errors import NormalizeError

# Name → what it does, in one line.  Each is normalize/cli/NAME.py with a command `command`.
COMMANDS: Final = {
    "savings": "How much less was used after an upgrade, in a normal year. The main job.",
    "plan": "Will a saving show? After how many bills, from the bills before the work.",
    "fit": "The fits alone: every form that was tried, before and after.",
    "bills": "How a file of bills was understood and repaired.",
    "degree-days": "Degree-days of a weather file, by month, year or bill, at any base.",
    "weather": "Find a weather station, get its files, check a file.",
    "new": "Start a folder for a new site.",
}

DONE: Final = 0
NEEDS_A_PERSON: Final = 1
WRONG_USAGE: Final = 2
COLLECT_SELDOM = (200_000, 50, 100)
INTERRUPTED: Final = 130  # 128 + SIGINT, what shells expect


class LazyGroup(click.Group):
    """A group that imports a command's module only when that command is run."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Names in the order of use, not of the alphabet."""
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """The command of that name, or None."""
        if cmd_name not in COMMANDS:
            return None
        module = importlib.import_module(f"normalize.cli.{cmd_name.replace('-', '_')}")
        command: click.Command = module.command
        return command

    def resolve_command(
        self, ctx: click.Context, args: list[str]
    ) -> tuple[str | None, click.Command | None, list[str]]:
        """As click does, but an unknown command names the nearest known one."""
        if args and args[0] not in COMMANDS and not args[0].startswith("-"):
            from difflib import get_close_matches

            guess = get_close_matches(args[0], COMMANDS, n=1)
            hint = f" Did you mean {guess[0]!r}?" if guess else ""
            ctx.fail(f"There is no command {args[0]!r}.{hint} There are: {', '.join(COMMANDS)}.")
        return super().resolve_command(ctx, args)

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        """The list of commands, without importing any of them."""
        with formatter.section("Commands"):
            formatter.write_dl(list(COMMANDS.items()))


def _show_version(ctx: click.Context, _param: click.Parameter, value: bool) -> None:
    if value and not ctx.resilient_parsing:
        from normalize import __version__

        show(f"normalize {__version__}")
        ctx.exit()


@click.group(
    cls=LazyGroup,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
    epilog="Start with: normalize new my-house. Then: normalize savings my-house.",
)
@click.option(
    "--version",
    is_flag=True,
    is_eager=True,
    expose_value=False,
    callback=_show_version,
    help="Show the version and exit.",
)
def cli() -> None:
    """How much energy an upgrade saved in a normal year, from utility bills and weather.

    Exit codes: 0 done; 1 the input needs a person, and the message says what to do; 2 wrong usage.
    """


def main(args: Sequence[str] | None = None) -> int:
    """Run the command line and return its exit code.  Never lets a traceback through."""
    if args is None:
        # A process of its own, soon over: the collector need not walk every import's objects.
        gc.set_threshold(*COLLECT_SELDOM)
    forgiving_streams()
    try:
        # Commands return nothing for "done", or an exit code.
        code = cli.main(args=args, prog_name="normalize", standalone_mode=False)
        sys.stdout.flush()
    except (click.Abort, KeyboardInterrupt):  # Ctrl-C; click turns most into Abort
        return INTERRUPTED
    except click.ClickException as error:
        error.show()
        return WRONG_USAGE
    except NormalizeError as error:
        say(private(str(error), known=sys.argv[1:] if args is None else args))
        return NEEDS_A_PERSON
    except BrokenPipeError:
        # The reader, such as `head`, has left.  Python would complain once more at exit.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return NEEDS_A_PERSON
    except OSError as error:
        return _of_the_system(error)
    except Exception as error:  # noqa: BLE001 - the last door: a person must not see a traceback
        return _fault(error)
    return code if isinstance(code, int) else DONE


def _of_the_system(error: OSError) -> int:
    if os.environ.get("NORMALIZE_DEBUG"):
        raise error
    place = f"{error.filename}: " if error.filename else ""
    say(f"{place}{error.strerror or error}. Check the name, the disk and your rights to it.")
    return NEEDS_A_PERSON


def _fault(error: Exception) -> int:
    if os.environ.get("NORMALIZE_DEBUG"):
        raise error
    say(
        f"this is a fault of the program, not of your input ({type(error).__name__}). "
        "Set NORMALIZE_DEBUG=1 and run it again to see where; please report that."
    )
    return NEEDS_A_PERSON


if __name__ == "__main__":
    sys.exit(main())
