"""The command line, a thin skin: a table of commands that are imported when they are called for."""

import errno
import io
import os
import signal
import sys
import threading
import traceback
from collections.abc import Callable, Sequence
from contextlib import suppress
from dataclasses import dataclass
from importlib import import_module

import click

from streamhost.errors import StreamhostError, nearest

MACHINE_FAILED = 3
OUR_FAULT = 70
INTERRUPTED = 130
NOBODY_READS = 141
NO_ROOM = (errno.ENOSPC, errno.EDQUOT, errno.EFBIG, errno.EIO)

OURS = "This is a fault of streamhost, not of what you asked. Please report it with all the lines above."


@dataclass(frozen=True)
class Entry:
    """Where a command is, as "module:function", and what it does in a line."""

    place: str
    help: str

    def load(self) -> click.Command:
        module, _, function = self.place.partition(":")
        command = getattr(import_module(module), function)
        assert isinstance(command, click.Command), f"{self.place} is no command"
        return command


COMMANDS = {
    "render": Entry("streamhost.commands.render:render", "An audio file through one realization."),
    "compare": Entry(
        "streamhost.commands.compare:compare",
        "All realizations of one filter on one signal: a table, the audio, the differences.",
    ),
    "measure": Entry("streamhost.commands.measure:measure", "What a design review asks of one realization, and its limits."),
    "profile": Entry("streamhost.commands.profile:profile", "What each realization costs, here and on a core of yours."),
    "listen": Entry("streamhost.commands.listen:listen", "Realizations side by side, one of them heard."),
    "draw": Entry("streamhost.commands.draw:draw", "The block diagram of a realization, as text or SVG."),
    "import": Entry("streamhost.commands.import_:import_", "Coefficients from a foreign file, as a preset."),
    "forms": Entry("streamhost.commands.forms:forms", "What can be chosen; one form explained."),
}


class LazyGroup(click.Group):
    """A group that shows its commands from the table and imports only the one that is called."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        return COMMANDS[cmd_name].load() if cmd_name in COMMANDS else None

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        with formatter.section("Commands"):
            formatter.write_dl([(name, entry.help) for name, entry in COMMANDS.items()])

    def resolve_command(
        self, ctx: click.Context, args: list[str]
    ) -> tuple[str | None, click.Command | None, list[str]]:
        name = args[0]
        if name not in COMMANDS and not name.startswith("-"):
            known = ", ".join(COMMANDS)
            raise click.UsageError(f'there is no command "{name}": {known}.{nearest(name, COMMANDS)}', ctx)
        return super().resolve_command(ctx, args)


def _show_version(ctx: click.Context, param: click.Parameter, value: bool) -> None:
    if not value or ctx.resilient_parsing:
        return
    from streamhost.commands.common import version

    click.echo(f"streamhost {version()}")
    ctx.exit()


@click.group(
    cls=LazyGroup,
    invoke_without_command=True,
    context_settings={"help_option_names": ["-h", "--help"]},
    epilog="Exit status: 0 done; 1 done, and a limit is not met; 2 the request is wrong; 3 the machine failed us; "
           "130 interrupted; 141 nobody reads the output; 70 a fault of ours.",
)
@click.option("--version", is_flag=True, is_eager=True, expose_value=False, callback=_show_version,
              help="Show the version and exit.")
@click.pass_context
def streamhost(ctx: click.Context) -> None:
    """Hear, measure and hand over every realization of a digital filter in the arithmetic of its target."""
    if ctx.invoked_subcommand is None:
        click.echo(ctx.get_help())


def main(arguments: Sequence[str] | None = None) -> int:
    """Runs the command line and returns its exit status; a command returns its own status or None for 0."""
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="replace")  # a terminal without the minus sign shows a mark instead
    given = list(sys.argv[1:] if arguments is None else arguments)
    _unwind_when_told_to_end()
    return _guarded(lambda: _run(given))


def _unwind_when_told_to_end() -> None:
    """SIGTERM and a closed terminal end the work as Ctrl-C does, so that nothing half-written stays."""
    if threading.current_thread() is threading.main_thread():
        for name in ("SIGTERM", "SIGHUP"):
            if hasattr(signal, name):
                signal.signal(getattr(signal, name), signal.default_int_handler)


def _run(arguments: list[str]) -> int:
    try:
        _complete_for_shell()
        with streamhost.make_context("streamhost", list(arguments), obj=tuple(arguments)) as ctx:
            status = streamhost.invoke(ctx)
    except click.exceptions.Exit as end:
        status = end.exit_code
    sys.stdout.flush()
    return status or 0


def _guarded(run: Callable[[], int]) -> int:
    """What `run` returns, or the exit status of what went wrong, which is told in one paragraph on stderr."""
    try:
        return run()
    except StreamhostError as error:
        return _tell(str(error), error.exit_status)
    except click.ClickException as error:
        return _tell(_usage_text(error), error.exit_code)
    except (KeyboardInterrupt, click.Abort):
        return _tell("Interrupted.", INTERRUPTED)
    except BrokenPipeError:
        _abandon_stdout()
        return NOBODY_READS
    except MemoryError:
        return _tell("The machine has not enough memory for this.", MACHINE_FAILED)
    except Exception as error:
        if isinstance(error, OSError) and error.errno in NO_ROOM:
            _abandon_stdout()
            return _tell(f"The machine could not take what was written: {error.strerror}.", MACHINE_FAILED)
        traceback.print_exc()
        return _tell(OURS, OUR_FAULT)


def _usage_text(error: click.ClickException) -> str:
    message = error.format_message()
    message = message[:1].upper() + message[1:]
    ctx = error.ctx if isinstance(error, click.UsageError) else None
    path = ctx.command_path if ctx else "streamhost"
    return f"{path}: {message.rstrip()} ({path} --help lists what there is.)"


def _tell(paragraph: str, status: int) -> int:
    with suppress(OSError):  # the terminal may be closed
        click.echo(paragraph, err=True)
    return status


def _abandon_stdout() -> None:
    """What is still buffered goes nowhere, so that the interpreter does not stumble over it on its way out."""
    with suppress(io.UnsupportedOperation):
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())


def _complete_for_shell() -> None:
    """Answers the completion scripts that `_STREAMHOST_COMPLETE=bash_source streamhost` (or zsh, fish) prints."""
    variable = "_STREAMHOST_COMPLETE"
    if instruction := os.environ.get(variable):
        from click.shell_completion import shell_complete

        raise click.exceptions.Exit(shell_complete(streamhost, {}, "streamhost", variable, instruction))


if __name__ == "__main__":
    sys.exit(main())
