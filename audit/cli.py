"""
The command line: each command lies in a module of its own and is imported when it is called.

``main`` turns errors into lines and exit statuses: 2 for a user's mistake, 3 for a file that is not
a site file, 130 when interrupted, 70 with a traceback for a fault of the program.
"""

from __future__ import annotations

import importlib
import os
import sys
import traceback
from collections.abc import Sequence

import click

COMMANDS = {
    "backup": "copy a site file, safe while others save in it",
    "check": "run every rule on a site and print the findings",
    "demo": "make a site file from an invented sample site and open it",
    "drop": "compute the drop of one run, without a site",
    "history": "who changed what in a site file, and when",
    "intake": "take a site folder or single tables into a site file",
    "report": "write the audit report of a site",
    "rules": "show the rules, or one rule's page with its limits and sources",
    "survey": "open the terminal interface on a site file",
    "tables": "show the reference data and limits profiles in use, with source and status",
    "unload": "write a site file as a site folder",
    "verify": "look whether a site file is whole",
}
"""Name and one line of each command, so that help imports none of them."""

WRONG_USE, PROGRAM_FAULT, INTERRUPTED = 2, 70, 130


class LazyGroup(click.Group):
    """Imports a command's module when the command is asked for."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return sorted(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        if cmd_name not in COMMANDS:
            return None
        module = importlib.import_module(f"audit.commands.{cmd_name}")
        command: click.Command = module.command
        return command

    def resolve_command(
        self, ctx: click.Context, args: list[str]
    ) -> tuple[str | None, click.Command | None, list[str]]:
        if args and args[0] not in COMMANDS and not args[0].startswith("-"):
            raise click.UsageError(
                f"no command {args[0]!r}{_nearest(args[0])}; there are: {', '.join(sorted(COMMANDS))}"
            )
        return super().resolve_command(ctx, args)

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        with formatter.section("Commands"):
            formatter.write_dl(sorted(COMMANDS.items()))


@click.group(
    cls=LazyGroup,
    invoke_without_command=True,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
)
@click.version_option(package_name="ohmwalk", message="%(prog)s %(version)s")
@click.pass_context
def group(context: click.Context) -> int:
    """
    Audit d.c. distribution in existing buildings: compare measured with computed voltage drop, with the
    doubt of both.

    What is reported is what was recorded and measured. It never says that something is safe: local code and a
    licensed person decide.

    Without a command: the site files opened last, one of them to be chosen.
    """
    if context.invoked_subcommand is None:
        from audit.recent import choose_recent

        return choose_recent()
    return 0


def main(args: Sequence[str] | None = None) -> None:
    """Run a command and leave with its exit status."""
    sys.exit(run(args))


def run(args: Sequence[str] | None = None) -> int:
    """Run a command; its exit status."""
    from audit.errors import AuditError
    from db.errors import SiteError
    from rules.errors import RulesError

    if sys.stdout is None:
        from audit.no_output import NoOutput

        sys.stdout = NoOutput()
    try:
        status = group.main(args=args, prog_name="ohmwalk", standalone_mode=False)
        sys.stdout.flush()
        return status if isinstance(status, int) else 0
    except click.exceptions.Exit as leave:
        return leave.exit_code
    except (click.Abort, KeyboardInterrupt):
        return INTERRUPTED
    except click.ClickException as error:
        where = error.ctx.command_path if isinstance(error, click.UsageError) and error.ctx else "ohmwalk"
        return _complain([f"{where}: {error.format_message()}"], WRONG_USE)
    except AuditError as error:
        return _complain(error.lines, error.exit_status)
    except SiteError as error:
        return _complain(str(error).splitlines(), error.exit_status)
    except RulesError as error:
        return _complain(str(error).splitlines(), WRONG_USE)
    except BrokenPipeError:
        # whoever read our output has left; nothing more is to be said to them
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    except OSError as error:
        place = f"{error.filename}: " if error.filename else ""
        return _complain([f"{place}{error.strerror or error}"], WRONG_USE)
    except Exception:
        traceback.print_exc()
        return PROGRAM_FAULT


def _complain(lines: Sequence[str], status: int) -> int:
    from rules.text import clean

    for line in lines:
        click.echo(clean(line), err=True)
    return status


def _nearest(word: str) -> str:
    import difflib

    close = difflib.get_close_matches(word, COMMANDS, 1)
    return f"; did you mean {close[0]!r}?" if close else ""
