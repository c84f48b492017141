"""
The next reading: the one with the largest expected fall in entropy of the causes for its minutes.

``next_readings`` is what the rest of ``rules`` calls, for circuits that are not settled. Where the readings pose a
problem to the diagnosis the choice follows from its model (``candidates``, ``atoms``, ``outlook``, ``options``,
``choice``); where nothing was read, or the record lacks something, from what is missing (``first_reading``).
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence

from rules.assessment import Finding, NextReading
from rules.case import CircuitCase
from rules.diagnosis.atoms import ATOMS, FEWEST_SIZES
from rules.diagnosis.candidates import AGAIN, Meters, Posed, posed
from rules.diagnosis.choice import chosen, looked_at
from rules.diagnosis.first_reading import first_round, missing_record, named_reading
from rules.diagnosis.hypotheses import AS_RECORDED, BAD_CONNECTION, DOUBTFUL, SEMICONDUCTOR
from rules.diagnosis.lost_voltage import follow_voltage
from rules.diagnosis.named import named_places
from rules.diagnosis.options import TRIED
from rules.diagnosis.problem import Signature
from rules.diagnosis.spoken import spoken

ROOM = 2_500_000
"""Numbers in the largest array of a batch: memory grows with this, not with the site."""


def next_readings(cases: Sequence[CircuitCase], findings: Sequence[Sequence[Finding]] = ()) -> list[NextReading | None]:
    """
    What to read next on each of some circuits.

    Parameters
    ----------
    cases : sequence of CircuitCase
        Of one site; those that are not settled, since each costs some milliseconds.
    findings : sequence of sequences, optional
        What is found on each: places that they name to be read come first.

    Returns
    -------
    list of NextReading or None
        ``None`` where nothing is left to settle, or nothing can be read.
    """
    found: dict[int, NextReading | None] = {}
    looked: dict[int, Posed] = {}
    alike: dict[tuple[Signature, Signature], list[int]] = defaultdict(list)
    meters = Meters.of(cases[0].context.site) if cases else Meters()
    for number, case in enumerate(cases):
        found[number] = missing_record(case)
        named = named_places(case, findings[number]) if findings else ()
        if found[number] is None and (named or not _is_settled(case)):
            this = posed(case, meters, named)
            if this is None and named:
                found[number] = named_reading(case, meters, named[0])
            elif this is None:
                # a drop that was compared is not read again for causes that cannot be weighed, as over a shared return
                found[number] = follow_voltage(case) or first_round(case, meters) if case.drop is None else None
            else:
                looked[number] = this
                alike[this.read.signature, this.imagined.signature].append(number)
    for group in alike.values():
        together = max(1, ROOM // _numbers(looked[group[0]]))
        for start in range(0, len(group), together):
            some = group[start : start + together]
            batch = looked_at([looked[number] for number in some], cases[some[0]].limits)
            for place, number in enumerate(some):
                choice = chosen(batch, place)
                found[number] = None if choice is None else spoken(batch, place, choice)
    return [found[number] for number in range(len(cases))]


def _is_settled(case: CircuitCase) -> bool:
    """Settled at first sight: a cause of the whole circuit is probable enough, and no heat is left open beside it."""
    causes = case.diagnosis.causes if case.diagnosis is not None else ()
    if not causes or causes[0].probability < case.limits["next_reading.settled_at"]:
        return False
    if causes[0].cause == AS_RECORDED:
        return all((place.heat or 0.0) < case.limits["decision.sound_heat_share"] for place in causes)
    return causes[0].cause not in (BAD_CONNECTION, SEMICONDUCTOR, DOUBTFUL)


def _numbers(this: Posed) -> int:
    """Numbers in the largest array that one circuit of this structure needs: atoms or elements, times rows times doubts."""
    signature, branches, places = this.imagined.signature, len(this.imagined.names), 4 * len(this.imagined.names)
    looked_at = len(this.read.signature.rows) + sum(TRIED.values()) + len(this.rows_of(AGAIN))
    of_atoms = max(ATOMS, FEWEST_SIZES * places) * looked_at * (signature.sources + signature.gains + branches + 2)
    return max(of_atoms, 2 * places * len(signature.rows) * (signature.sources + 1))
