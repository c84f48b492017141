"""RC02: the record does not hold together."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, Severity
from rules.rule import SiteCase, rule


@rule(
    id="RC02",
    title="Record does not hold together",
    about="site",
    severity=Severity.WATCH,
    remedy="Correct the record where it says so; what cannot be computed meanwhile stands under not judged.",
    caution="Whatever rests on a contradictory record may be wrong: do not work from it.",
    source=Citation("ohmwalk, format of the site folder", clause="section by section", status="our own rule"),
)
def record_contradicts(case: SiteCase) -> Iterator[Finding]:
    """
    A row refers to what is not there, two rows have one tag, a number is outside what is accepted.

    **Finds**: a load at a point that no run reaches, which can come about when two laptops' records are combined.

    **Leaves alone**: empty cells, which are not known (RC01 says so where it matters).
    """
    context = case.context
    circuits = {row.id: row for row in context.recorded.circuits}
    tables = {problem.table for problem in context.problems} - {"site"}
    rows = {(table, row.id): row for table in tables for row in context.recorded.table(table)}
    seen: dict[str, int] = {}
    for problem in context.problems:
        row = rows.get((problem.table, problem.row))
        circuit = circuits.get(getattr(row, "circuit_id", "") or (problem.row if problem.table == "circuits" else ""))
        tag = getattr(row, "tag", "") or (getattr(row, "name", "") if problem.table == "runs" else "")
        where = " ".join(part for part in (problem.table, str(tag), problem.column) if part)
        count = seen[where] = seen.get(where, 0) + 1
        yield record_contradicts.finding(
            case,
            where if count == 1 else f"{where} ({count})",
            f"{problem.what}; {problem.accepted}" if problem.accepted else problem.what,
            numbers={},
            as_circuit=circuit.tag if circuit else None,
        )
