"""RD12: a clamp shows a current where none flows."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, Severity
from rules.calc.agreement import probability_apart
from rules.calc.doubt import Weighted, total
from rules.case import CircuitCase
from rules.meters import worth
from rules.places import joined
from rules.record import Figure, Reading
from rules.rule import DOUBTS_OF_READINGS, BoardCase, rule
from rules.taken import taken_on
from rules.units import show


@rule(
    id="RD12",
    title="Clamp shows current with the loads off",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Zero the clamp around the conductor with the loads off and read again; where that is not possible, record what it shows as "
    "the zero of its range. See that every load is off.",
    caution="What it shows may be current: a load that is not off, a leak, or a second supply. Do not take the conductor for dead.",
    source=Citation(
        "manuals of Hall-effect clamps: zero at the place, residual magnetism", status="common practice, no source"
    ),
    limits=("decision", *DOUBTS_OF_READINGS),
    also_about=("board", "source"),
)
def clamp_with_loads_off(case: CircuitCase | BoardCase) -> Iterator[Finding]:
    """
    A clamp shows current while the loads are off (``loads_off``). The reading of current, or of residual current, lies beyond
    the clamp's counts and display, once the recorded zero of its range is taken off.

    **Finds**: 0.31 A by a 1.5 % + 5 counts clamp of 0.01 A: every current read with it is off by about as much.

    **Leaves alone**: 0.05 A by the same, which is within its counts; a current that was read with the loads on.
    """
    context = case.context
    alike: dict[tuple[str, ...], list[Reading]] = {}
    for row in taken_on(case):
        if row.is_unloaded and row.quantity in ("current", "residual"):
            alike.setdefault((row.quantity, row.at, row.leg, row.round, row.instrument), []).append(row)
    for (quantity, at, leg, name, meter), rows in alike.items():
        value, u = total(Weighted(1 / len(rows), worth(row, context.index, context.limits).shown) for row in rows)
        if probability_apart(value, u) < context.limits["decision.beyond_doubt"]:
            continue
        by = meter or "a clamp that is not recorded"
        off = sum(row.value for row in rows) / len(rows) - value
        where = (f"{quantity} at {at}{f' {leg}' if leg else ''}", f"round {name}", meter)
        yield clamp_with_loads_off.finding(
            case,
            joined(*where),
            f"{by} showed {show(value, 'A', u)} at {at} with the loads off"
            + (f", the recorded zero of {show(off, 'A')} taken off" if off else ""),
            numbers={"current": Figure(value, "A", u)},
            consequences=(f"every current read with {by} on that range may be off by about as much",),
        )
