"""A command group that knows its commands by a table and imports one when it is called."""

from collections.abc import Mapping
from importlib import import_module
from typing import Any

import click
from click.shell_completion import CompletionItem


class LazyGroup(click.Group):
    """Help, completion and suggestions come from the table; only a call imports a command.

    Args:
        table: Command name to module and one-line help; the module's ``command`` is the command.
    """

    def __init__(self, *args: Any, table: Mapping[str, tuple[str, str]], **rest: Any) -> None:  # noqa: ANN401 - click's own
        super().__init__(*args, **rest)
        self.table = table

    def list_commands(self, ctx: click.Context) -> list[str]:  # noqa: ARG002 - click's signature
        """Return the names in the order of the table."""
        return list(self.table)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:  # noqa: ARG002
        """Import a command's module and return the command."""
        if cmd_name not in self.table:
            return None
        command: click.Command = import_module(self.table[cmd_name][0]).command
        return command

    def resolve_command(
        self, ctx: click.Context, args: list[str]
    ) -> tuple[str | None, click.Command | None, list[str]]:
        """Find a command, or suggest the nearest names of the table."""
        if args and args[0] not in self.table and not args[0].startswith("-"):
            raise click.NoSuchCommand(args[0], possibilities=list(self.table), ctx=ctx)
        return super().resolve_command(ctx, args)

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:  # noqa: ARG002
        """Write the table without importing anything."""
        with formatter.section("Commands"):
            formatter.write_dl([(name, text) for name, (_, text) in self.table.items()])

    def shell_complete(self, ctx: click.Context, incomplete: str) -> list[CompletionItem]:
        """Complete command names from the table, and options as always."""
        names = [
            CompletionItem(name, help=text)
            for name, (_, text) in self.table.items()
            if name.startswith(incomplete)
        ]
        return names + click.Command.shell_complete(self, ctx, incomplete)
