"""``ohmwalk check``: run every rule and print the findings."""

from __future__ import annotations

from pathlib import Path

import click

from rules.assessment import Severity

SITE = click.argument("site", type=click.Path(path_type=Path))


@click.command(name="check")
@SITE
@click.option("--json", "as_json_", is_flag=True, help="Print one JSON object instead of text.")
@click.option("--circuit", "circuits", metavar="TAG", multiple=True, help="Only this circuit.")
@click.option("--visit", metavar="NAME", help="Judge on this visit instead of the latest.")
@click.option(
    "--fail-on",
    type=click.Choice([str(severity) for severity in Severity]),
    help="Exit with 1 if a finding is at or above this severity.",
)
def command(site: Path, as_json_: bool, circuits: tuple[str, ...], visit: str | None, fail_on: str | None) -> int:
    """Run every rule on SITE, a site file or a site folder, and print the findings."""
    from audit.opening import judge_site, only, open_site, settings_place

    if len(circuits) > 1:
        raise click.UsageError("--circuit stands there twice; accepted: one circuit")
    record = open_site(site)
    assessment = judge_site(record, visit, settings_place(site), explain=as_json_)
    if circuits:
        assessment = only(assessment, circuits[0])
    if as_json_:
        from audit.report.as_json import as_json, as_text

        click.echo(as_text(as_json(assessment)).encode(), nl=False)  # UTF-8 whatever the terminal's
    else:
        from audit.report.text import print_check

        print_check(record, assessment)
    if fail_on is None:
        return 0
    return int(any(finding.severity.rank <= Severity(fail_on).rank for finding in assessment.findings))
