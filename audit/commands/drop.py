"""``ohmwalk drop``: one quick computation without a site."""

from __future__ import annotations

import click

from rules.record import METALS, STRANDINGS, columns

_RUN = dict(columns("runs"))
BY = _RUN["length_by"].choices
INSULATIONS = tuple(word for word in _RUN["insulation"].choices if word != "unknown")


@click.command(name="drop")
@click.argument("values", nargs=-1, required=True, metavar="QUANTITIES...")
@click.option("--material", type=click.Choice(METALS, case_sensitive=False), help="Metal; default: copper.")
@click.option("--stranding", type=click.Choice(STRANDINGS, case_sensitive=False), help="Default: stranded.")
@click.option("--parallel", type=click.IntRange(1, 100), metavar="N", help="Conductors side by side in each leg.")
@click.option("--return-size", metavar="SIZE", help="Size of the way back; default: the same.")
@click.option("--return-material", type=click.Choice(METALS, case_sensitive=False), help="Default: the same.")
@click.option("--length-by", type=click.Choice(BY), help="How the length was obtained; default: drawing.")
@click.option("--temperature", metavar="TEMPERATURE", help="Of the conductor; default: that in service.")
@click.option("--ambient", metavar="TEMPERATURE", help="Of the air; default: of the limits profile.")
@click.option("--insulation", type=click.Choice(INSULATIONS, case_sensitive=False), help="For the capacity.")
@click.option("--method", metavar="METHOD", help="Installation method, such as C; for the capacity.")
@click.option(
    "--grouped", type=click.IntRange(1, 1000), metavar="N", help="Loaded circuits together; for the capacity."
)
@click.option("--allowed", metavar="PERCENT", help="Allowed drop; default: of the limits profile.")
@click.option("--lowest", metavar="VOLTAGE", help="Voltage that the load needs.")
@click.option("--duty", metavar="PERCENT", help="Share of the year in which the load is on; for the energy lost.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object instead of text.")
def command(values: tuple[str, ...], as_json: bool, **chosen: str | int | None) -> None:
    """
    Compute the drop of one run with one load.

    QUANTITIES are known by their units, in any order: one-way length, size, nominal voltage, and the load's current,
    power or resistance; an allowed drop and the conductor's temperature if wished.

    \b
    ohmwalk drop 29m 4mm2 8A 24V
    ohmwalk drop 95ft 12AWG 60W 48V 5% --lowest 40.5V
    ohmwalk drop 12.5m 16mm2 90A 48V --material aluminium --ambient 40C
    """
    from audit.drop.reading import Options, understand
    from rules import limits
    from rules.one_run import answer, sufficient
    from rules.record import Site

    in_force = limits.of(Site(name="drop"))
    options = Options(**{name: value for name, value in chosen.items() if value is not None})  # type: ignore[arg-type]
    understood = understand(values, options, in_force)
    found = answer(understood.asked, in_force)
    enough = sufficient(understood.asked, in_force)
    if as_json:
        from audit.drop.as_json import as_json as document
        from audit.report.as_json import as_text

        click.echo(as_text(document(understood, found, enough)).encode(), nl=False)
    else:
        from audit.drop.text import print_drop

        print_drop(understood, found, enough, in_force)
