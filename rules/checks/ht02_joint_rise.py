"""HT02: a termination or device is hotter than a similar one, or than the ambient, by more than it should be."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.case import CircuitCase
from rules.heat import Hot, claims_end, hot_joints
from rules.rise import rises_of
from rules.rule import DOUBTS_OF_READINGS, rule
from rules.units import show


@rule(
    id="HT02",
    title="Joint hotter than similar ones",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Read millivolts across it and across a similar one at the same current; where they are alike, look for what else heats it. "
    "Then isolate, cut back and remake it.",
    caution="A probe on a live terminal needs insulation for the full system voltage. Bare metal shows cooler in an infrared picture than "
    "it is. Do not tighten a hot joint live.",
    source=Citation("ANSI/NETA MTS", "", "Table 100.18, seen second-hand", "verified"),
    also=(
        Citation("rise of a joint by the square of its current", status="common practice, no source"),
        Citation("IEC 60898-1", "2015", "rise of 60 K at a breaker's terminals", "from-memory"),
        Citation("NFPA 70B", "", "7.4.5: at 40 % of normal load or more, seen second-hand", "from-memory"),
    ),
    limits=(
        "joint_rise",
        "joint_scaling",
        "ambient",
        "decision",
        "temperature_doubt",
        "load_share",
        "heat",
        "termination",
        *DOUBTS_OF_READINGS,
    ),
)
def joint_rise(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    A termination or device is much hotter than a similar one, or than the ambient. It was read beyond doubt above the
    coolest similar one of the same round and current, or above the ambient, and its rise is scaled to full load by the
    square of the current: practice, since a rise follows the current to the power of 1.5 to 2. Over similar ones it is for
    watch from 4 K and soon from 15 K on; over the ambient from 21 K and 40 K on. Below 40 % of full load nothing is scaled:
    the rise as read stands. Every reading has the doubt of the probe's contact beside the meter's. Over the ambient, a device
    counts from 60 K and 80 K on, since its terminals may warm by 60 K; two ends of a run that are alike hot have the conductor's
    own heat and count only above what its insulation bears. A temperature with nothing beside it is held against the
    profile's ambient, with its doubt, and is for soon where it is above what the insulation bears.

    **Finds**: 62 °C at one end of a run and 38 °C at the other, at half load: 24 K, 96 K at full load.

    **Leaves alone**: 40 °C and 38 °C at full load; a breaker with 70 °C at 25 °C of ambient; a joint
    that VD02 or HT01 reports, with its temperature there.
    """
    hot = {found.joint.place for found in hot_joints(case) if isinstance(found, Hot)}
    for place, rise in rises_of(case).items():
        if claims_end(case, place) or any(set(place.split()) <= set(other.split()) for other in hot):
            continue
        if rise.severity is not None:
            yield joint_rise.finding(
                case,
                place,
                rise.words,
                numbers={"temperature": rise.read, "rise": rise.rise, "rise at full load": rise.scaled},
                severity=rise.severity,
            )
        elif rise.open and rise.full:
            scaled = show(rise.scaled.value, "K", rise.scaled.u)
            yield joint_rise.gap(case, place, f"not settled: {scaled} above {rise.above} at full load")
        elif not rise.full and rise.rise.value > 0:
            yield joint_rise.gap(case, place, rise.words)
