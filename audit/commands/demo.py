"""``ohmwalk demo``: make a site file from an invented sample site and open it."""

from __future__ import annotations

from pathlib import Path

import click


@click.command(name="demo")
@click.argument("name", required=False)
@click.option("--to", "target", type=click.Path(path_type=Path), help="Site file to make; default: demo.ohmwalk, here.")
@click.option("--no-open", is_flag=True, help="Only make it, and say what to do next.")
@click.option("--overwrite", is_flag=True, help="Replace an existing file.")
@click.option("--by", metavar="NAME", help="Who saves.")
def command(name: str | None, target: Path | None, no_open: bool, overwrite: bool, by: str | None) -> int:
    """
    Make a site file from a packaged sample site, plant (the default), doors or station, and open it; an earlier demo here is
    opened as it is. Everything in it is invented.
    """
    from audit.demo import make_demo
    from audit.interface import open_interface
    from audit.settings import UserSettings
    from audit.terminal import is_terminal
    from rules.text import clean

    settings = UserSettings(by)
    path, is_new = make_demo(name, target, overwrite, settings)
    if is_terminal() and not no_open:
        return open_interface(path, settings)
    settings.opened(path)
    what = "made" if is_new else "the earlier demo, as it is:"
    line = f"{what} {path}, an invented building. Next: ohmwalk survey {path}, or ohmwalk check {path}"
    click.echo(clean(line), err=True)
    settings.tell()
    return 0
