"""The command group. Each command's code is imported only when it is called."""

from __future__ import annotations

import sys
from importlib import import_module
from io import TextIOWrapper

import click

from meterlens import __version__
from meterlens.errors import MeterlensError

__all__ = ["main", "program"]

#: Command → (module, function, what it does), in the order of a user's first day.
COMMANDS = {
    "demo": ("demo_command", "demo", "Make the demo site and go through all that is built."),
    "init": ("store_commands", "init", "Make a new site folder with a commented site.toml."),
    "ingest": ("store_commands", "ingest", "Read meter exports into the store."),
    "check": ("study_commands", "check", "Look at the quality of the record."),
    "review": ("study_commands", "review", "Review each month: energy, demand, PF, imbalance."),
    "periods": ("study_commands", "periods", "List the periods that need attention."),
    "dashboard": ("study_commands", "dashboard", "Write the static pages."),
    "query": ("store_commands", "query", "Ask the store: a shipped query by name, or SQL."),
    "export": ("store_commands", "export", "Write a view of the store to a file."),
}


class LazyGroup(click.Group):
    """A group that knows its commands' names and summaries without importing them."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """All names, in the order of the table."""
        del ctx
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """Import one command's module and return the command."""
        del ctx
        if cmd_name not in COMMANDS:
            return None
        module, function, _ = COMMANDS[cmd_name]
        command = getattr(import_module(f"meterlens.cli.{module}"), function)
        assert isinstance(command, click.Command)
        return command

    def resolve_command(
        self, ctx: click.Context, args: list[str]
    ) -> tuple[str | None, click.Command | None, list[str]]:
        """Name the nearest command where there is none of that name."""
        try:
            return super().resolve_command(ctx, args)
        except click.UsageError as error:
            from difflib import get_close_matches

            near = get_close_matches(args[0], COMMANDS, n=1, cutoff=0.5) if args else []
            if not near:
                raise
            hint = f"No such command {args[0]!r}. Did you mean {near[0]!r}?"
            raise click.UsageError(hint, ctx) from error

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        """The table of commands, from their summaries."""
        del ctx
        with formatter.section("Commands"):
            formatter.write_dl([(name, about) for name, (_, _, about) in COMMANDS.items()])


@click.group(cls=LazyGroup, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(__version__, prog_name="meterlens")
def program() -> None:
    """Interval exports of metered three-phase services, answered month by month.

    Begin with "meterlens demo", or with "meterlens init DIR" for a site of your own.
    """


def main() -> None:
    """Run the program; an error that ends a command is one message and exit code 1."""
    for stream in (sys.stdout, sys.stderr):
        # A terminal that lacks a letter shows a mark for it, and the command goes on.
        if isinstance(stream, TextIOWrapper):
            stream.reconfigure(errors="replace")
    try:
        program()
    except MeterlensError as error:
        print(f"meterlens: {error}", file=sys.stderr)
        sys.exit(1)
    except (KeyboardInterrupt, RuntimeError) as error:
        # The database answers Ctrl-C with an error of its own.
        if isinstance(error, RuntimeError) and "nterrupt" not in str(error):
            raise
        print("meterlens: interrupted; the store is as it was", file=sys.stderr)
        sys.exit(1)
