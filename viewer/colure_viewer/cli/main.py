"""The `colure` command: finds the subcommand, runs it, and turns every error into one line and an exit code.

Exit codes: 0 done; 1 understood, but no answer exists; 2 not understood, contradictory, unreadable or unwritable.
Each subcommand is a module of this package, imported only when it is asked for.
"""

import gc
import os
import sys
from collections.abc import Sequence
from importlib import import_module

import click

from colure import __version__
from colure.errors import ColureError, near_names

COMMANDS = {
    "chart": "Draw a chart to a PNG, SVG or PDF file.",
    "where": "Where bodies are: places, distances, rates, phases, magnitudes.",
    "convert": "Carry a position, or a table of them, from one frame to another.",
    "ledger": "Every step of a reduction, with its size, model and uncertainty.",
    "audit": "Which frame is this coordinate in? Frame, place, origin, time, digits.",
    "time": "One moment in every time scale, with sidereal times.",
    "obliquity": "The obliquity of the ecliptic by every model.",
    "selfcheck": "Check the shipped data, the versions and the platform.",
    "bench": "Measure the performance figures; prints JSON.",
}

UNREADABLE = 2
INTERRUPTED = 130
MINUS = "\N{MINUS SIGN}"


class Command(click.Command):
    """A command whose positional values may begin with a minus sign: `obliquity -1200`, `convert "-10.5 4"`."""

    def parse_args(self, ctx: click.Context, args: list[str]) -> list[str]:
        """Hide the leading minus of positional numbers from the option parser, and put it back afterwards."""
        takes_value = {
            name
            for option in self.params
            if isinstance(option, click.Option) and not option.is_flag and not option.count
            for name in option.opts
        }
        hidden, previous = [], ""
        for token in args:
            is_value = previous in takes_value
            is_number = len(token) > 1 and token[0] == "-" and (token[1].isdigit() or token[1] == ".")
            hidden.append(MINUS + token[1:] if is_number and not is_value else token)
            previous = token
        rest = super().parse_args(ctx, hidden)
        for argument in self.params:
            if isinstance(argument, click.Argument) and argument.name is not None:
                value = ctx.params.get(argument.name)
                if isinstance(value, str):
                    ctx.params[argument.name] = _with_hyphen(value)
                elif isinstance(value, tuple):
                    ctx.params[argument.name] = tuple(_with_hyphen(one) for one in value)
        return rest


def _with_hyphen(text: str) -> str:
    return "-" + text[1:] if text.startswith(MINUS) else text


class Colure(click.Group):
    """The group of commands; a first word that is no command is a session file for the window."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Return the commands in the order of the documentation."""
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """Import the module of one command."""
        if cmd_name not in COMMANDS:
            return None
        module = import_module(f"colure_viewer.cli.{cmd_name}")
        command: click.Command = module.command
        return command

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        """List the commands from their one-line descriptions, importing none of them."""
        with formatter.section("Commands"):
            formatter.write_dl(list(COMMANDS.items()))

    def resolve_command(
        self, ctx: click.Context, args: list[str]
    ) -> tuple[str | None, click.Command | None, list[str]]:
        """Take a word that is no command for a session file, if there is such a file."""
        first = args[0]
        if first in COMMANDS:
            return super().resolve_command(ctx, args)
        if first.startswith("-"):
            ctx.fail(f"No such option: {first}")
        if not os.path.exists(first) and not first.endswith(".toml"):
            ctx.fail(f"'{first}' is neither a command nor a session file{near_names(first, COMMANDS)}")
        if len(args) > 1:
            ctx.fail(f"'{args[1]}': unexpected after the session file '{first}'")
        return None, _window, args


@click.command()
@click.argument("session", required=False)
def _window(session: str | None) -> None:
    """Open the window on a session."""
    # Until the first chart nearly all that is made is kept: to search it for garbage would take a tenth of the time.
    # `run` starts the collector again.
    gc.disable()
    from colure_viewer.app import run

    sys.exit(run(session))


@click.group(
    cls=Colure,
    invoke_without_command=True,
    context_settings={"help_option_names": ["-h", "--help"]},
    options_metavar="[--version] [--debug]",
    subcommand_metavar="[SESSION | COMMAND …]",
)
@click.version_option(__version__, prog_name="colure", message="%(prog)s %(version)s")
@click.pass_context
def group(ctx: click.Context) -> None:
    """A desktop tool for people who observe near the ecliptic.

    Without a command, opens the window on SESSION, or on the demo session.
    """
    if ctx.invoked_subcommand is None:
        ctx.invoke(_window, session=None)


def main(arguments: Sequence[str] | None = None) -> int:
    """Run `colure` with `arguments` (default: the process's own); return the exit code."""
    # A second BLAS thread stalls small products for milliseconds whenever the other core is busy; numpy reads this
    # when it is first imported, which no module above does.
    for name in ("OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS", "OMP_NUM_THREADS"):
        os.environ.setdefault(name, "1")
    words = list(sys.argv[1:] if arguments is None else arguments)
    debug = "--debug" in words
    words = [word for word in words if word != "--debug"]
    try:
        answer = group.main(words, prog_name="colure", standalone_mode=False)
        sys.stdout.flush()
        return answer if isinstance(answer, int) else 0
    except click.exceptions.Exit as leave:
        return leave.exit_code
    except (KeyboardInterrupt, click.Abort):
        return _say("interrupted", INTERRUPTED, debug)
    except click.ClickException as error:
        hint = ""
        if isinstance(error, click.UsageError) and error.ctx is not None:
            hint = f" ('{error.ctx.command_path} --help' lists what it takes)"
        return _say(error.format_message().rstrip(".") + hint, UNREADABLE, debug)
    except ColureError as error:
        return _say(str(error), error.exit_code, debug)
    except BrokenPipeError:
        # The reader of our output left: say nothing, and keep the interpreter from saying it at exit.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    except OSError as error:
        what = f"{error.filename}: " if error.filename else ""
        return _say(f"{what}{error.strerror or error}", UNREADABLE, debug)
    except Exception as error:
        fault = f"a fault of colure itself: {type(error).__name__}: {error} (--debug shows where)"
        return _say(fault, UNREADABLE, debug)


def _say(message: str, code: int, debug: bool) -> int:
    if debug:
        import traceback

        traceback.print_exc()
    line = " ".join(message.split())
    print(f"colure: {line}", file=sys.stderr)
    return code


if __name__ == "__main__":
    sys.exit(main())
