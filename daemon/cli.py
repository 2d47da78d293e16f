"""The command line: which commands there are. Each is imported when it is called, for a cold start is felt."""

from __future__ import annotations

import sys
from importlib import import_module

import click

# The command, the module it is in, and its line in the list of commands.
_COMMANDS = {
    "watch": ("cli_watch", "Watch files and folders; analyse on each save; serve the dashboard."),
    "check": ("cli_check", "Analyse one export once and print the result."),
    "history": ("cli_history", "List boards, or the revisions of one."),
    "compare": ("cli_history", "What changed between two revisions, and what it did."),
    "baseline": ("cli_history", "Pin what newer revisions are compared against."),
    "curve": ("cli_curve", "The curve behind a check, as CSV."),
    "demo": ("cli_demo", "Make a small board, watch it, play a few saves, serve the dashboard."),
}


class _Commands(click.Group):
    """A group that knows its commands by name only, until one is called."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return list(_COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        if cmd_name not in _COMMANDS:
            return None
        command = getattr(import_module(f"reactance.daemon.{_COMMANDS[cmd_name][0]}"), cmd_name)
        assert isinstance(command, click.Command)
        return command

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        with formatter.section("Commands"):
            formatter.write_dl([(name, line) for name, (_, line) in _COMMANDS.items()])


@click.command(cls=_Commands, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(package_name="reactance", prog_name="reactance")
@click.option(
    "--history",
    "history_file",
    envvar="REACTANCE_HISTORY",
    metavar="FILE",
    help="The history's database; by default history.sqlite in the user's data folder for reactance.",
)
@click.pass_context
def reactance(ctx: click.Context, history_file: str | None) -> None:
    """Says what each save of a schematic did to the duty of every capacitor.

    \b
    Examples:
      $ reactance check board.edn
      $ reactance watch --once .
    """
    ctx.obj = history_file


def main() -> None:
    """The console script."""
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="replace")  # a terminal that lacks µ or Ω is no reason to stop
    reactance(prog_name="reactance")
