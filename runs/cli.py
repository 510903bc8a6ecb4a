"""The command line: commands loaded when called, and the one place where errors become messages and exit codes."""

from __future__ import annotations

import json
import signal
import sys
from collections.abc import Sequence
from importlib import import_module
from typing import Any, NoReturn, final

import click

from .. import __version__
from ..models.errors import InputError, PolewrightError

OK, INTERNAL, BAD_INPUT, INTERRUPTED = 0, 1, 2, 130

# Name, as typed: its line in the help. The command is the attribute ``command`` of ``commands/NAME.py``; the help
# stands here so that showing it imports none of them.
COMMANDS = {
    "design": "Find pole patterns that meet a spec.",
    "verify": "Check a run by a second physics path and scatter.",
    "show": "Show a run in the terminal.",
    "report": "Write a run's report, one HTML file.",
    "export": "Write the files of one design.",
    "spec": "Check a spec, print its JSON Schema, write an example.",
    "demo": "Design, verify and report an example, end to end.",
}


@final
class LazyGroup(click.Group):
    """A group that knows its commands by name and imports one only to run it or to show its help."""

    def list_commands(self, ctx: click.Context) -> list[str]:  # noqa: ARG002 (click's interface)
        """Return the names of all commands, in the order of the work."""
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:  # noqa: ARG002
        """Return a command by its name, or None."""
        if cmd_name not in COMMANDS:
            return None
        command: click.Command = import_module(f".commands.{cmd_name}", __package__).command
        return command

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:  # noqa: ARG002
        """Write the list of commands from their stored lines."""
        with formatter.section("Commands"):
            formatter.write_dl(list(COMMANDS.items()))


@click.group(cls=LazyGroup, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(__version__, prog_name="polewright")
def group() -> None:
    """Find pole patterns for flat permanent-magnet faces from a spec of the wanted behaviour.

    Exit codes: 0 done and every requirement met; 1 internal error; 2 bad input or usage; 3 done, but the best design
    misses a requirement; 4 proven impossible; 130 interrupted.
    """


def main() -> NoReturn:
    """Run the command line and exit."""
    # A pipeline's polite end is an interruption like Ctrl-C: what was found so far is saved.
    signal.signal(signal.SIGTERM, signal.default_int_handler)
    if hasattr(signal, "SIGPIPE"):
        # Whoever reads our output may stop early ("| head"): end quietly, as other tools do.
        signal.signal(signal.SIGPIPE, signal.SIG_DFL)
    sys.exit(run(sys.argv[1:]))


def run(arguments: Sequence[str]) -> int:
    """Run one command line and return its exit code; every error becomes a message."""
    as_json = "--json" in arguments
    command = next((word for word in arguments if not word.startswith("-")), "")
    try:
        code = group.main(list(arguments), prog_name="polewright", standalone_mode=False)
    except click.ClickException as error:
        error.show()
        _print_json(as_json, command, InputError(error.format_message()))
        return BAD_INPUT
    except InputError as error:
        _say(*error.lines())
        _print_json(as_json, command, error)
        return BAD_INPUT
    except PolewrightError as error:
        _say(f"error: {error}")
        _print_json(as_json, command, InputError(str(error)), status="error", stop_reason="internal error")
        return INTERNAL
    except (click.Abort, KeyboardInterrupt):
        _say("interrupted")
        _print_json(as_json, command, InputError("interrupted"), status="interrupted", stop_reason="interrupted")
        return INTERRUPTED
    except Exception as error:  # the one place that catches everything
        message = _unexpected(error)
        _say(message)
        _print_json(as_json, command, InputError(message), status="error", stop_reason="internal error")
        return INTERNAL
    return code if isinstance(code, int) else OK


def _say(*lines: str) -> None:
    for line in lines:
        click.echo(line, err=True)


def _print_json(as_json: bool, command: str, error: InputError, **changes: Any) -> None:
    if not as_json:
        return
    from .result import error_json

    click.echo(json.dumps(error_json(command, error) | changes, ensure_ascii=False, allow_nan=False, indent=2))


def _unexpected(error: Exception) -> str:
    """Write the traceback to a file and return what to tell the user."""
    # Only here are these needed, and a broken installation is no reason to load more for a help text.
    import tempfile
    import traceback

    what = f"internal error: {type(error).__name__}: {error}"
    try:
        with tempfile.NamedTemporaryFile(
            "w", prefix="polewright-error-", suffix=".txt", delete=False, encoding="utf-8", errors="backslashreplace"
        ) as file:
            file.write(f"polewright {__version__}\n{' '.join(sys.argv)}\n\n")
            traceback.print_exception(error, file=file)
    except OSError:
        return f"{what}\nThe traceback could not be written to a file. Please report it with the command you ran."
    return f"{what}\nThe traceback is in {file.name}; please report it with the command you ran."
