"""``ohmwalk rules``: the rules, or one rule's page with the limits in force."""

from __future__ import annotations

from pathlib import Path

import click


@click.command(name="rules")
@click.argument("id", required=False)
@click.option("--site", type=click.Path(path_type=Path), help="With the limits in force for this site file or folder.")
@click.option("--json", "as_json_", is_flag=True, help="Print one JSON object instead of text.")
def command(id: str | None, site: Path | None, as_json_: bool) -> None:  # noqa: A002  # as it is called in the help
    """List the rules, or print the page of rule ID: what it finds, its limits with their sources, and its cautions."""
    from audit.opening import limits_in_force, open_site, settings_place
    from audit.rules_text import print_rule, print_rules, rule_of, rules_json
    from rules import limits
    from rules.record import Site
    from rules.rule import catalogue

    chosen = None if id is None else rule_of(id)
    in_force = limits.of(Site(name="")) if site is None else limits_in_force(open_site(site), settings_place(site))
    if as_json_:
        from audit.report.as_json import as_text

        rules = catalogue() if chosen is None else (chosen,)
        click.echo(as_text(rules_json(rules, in_force)).encode(), nl=False)  # UTF-8 whatever the terminal's
    elif chosen is None:
        print_rules(in_force)
    else:
        print_rule(chosen, in_force)
