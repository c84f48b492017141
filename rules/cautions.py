"""
The usual cautions of the trade, by what the site holds.

They are shown before live readings, in help and in reports. Limits defer to local code and licensed practice.
"""

from __future__ import annotations

from dataclasses import dataclass

from rules.assessment import Citation
from rules.record import Site

SHOCK_LIMIT_V = 60.0
"""Ripple-free d.c. above which basic protection is asked for in dry places. [V] IEC 61140, from memory."""

ARC_VOLTAGE_V = 100.0
"""Lowest system voltage of the d.c. arc-flash table. [V] NFPA 70E-2018, Table 130.7(C)(15)(b), verified, secondary."""


@dataclass(frozen=True, slots=True)
class Caution:
    """One caution and where it comes from."""

    id: str
    text: str
    source: Citation


LIVE_READINGS = Caution(
    "live",
    "Live readings are work on live parts: only by people who may, with the duty holder's permission. One probe clipped, one hand; "
    "no tools in a live terminal, and nothing is tightened or opened while current flows.",
    Citation("FIST 3-6", "1998", "battery safety", "verified"),
)
METER = Caution(
    "meter",
    "Leads in the voltage jacks, never in the current jack; fused leads, a meter of category III or better whose d.c. range covers "
    "the highest voltage of the system. Prove it on a known source before and after. Start on auto volts: a millivolt reading "
    "becomes the full voltage if a joint opens.",
    Citation("meter practice on d.c. systems", status="common practice, no source"),
)
BATTERY = Caution(
    "battery",
    "A battery cannot be switched off and gives thousands of amperes into a short circuit: no jewellery, insulated tools, eye "
    "protection; no ohmmeter across a cell; mind acid and hydrogen.",
    Citation("DOE-HDBK-1084", "1995", "battery hazards", "verified"),
)
SHOCK = Caution(
    "shock",
    "The site has more than 60 V d.c. between conductors, which can kill: cover or isolate what is not being measured, and prove dead "
    "before touching.",
    Citation("IEC 61140", "2016", "ripple-free d.c. limits", "from-memory"),
)
ARC = Caution(
    "arc",
    "At 100 V d.c. and more an arc can hold and burn at a distance: protective clothing by an arc-flash assessment, enclosures closed "
    "wherever they can be, and never a plug or fuse drawn under load.",
    Citation("NFPA 70E", "2018", "Table 130.7(C)(15)(b)", "verified"),
)
PV = Caution(
    "pv",
    "A PV string is live whenever there is light: never open a connector under load.",
    Citation("PV practice", status="common practice, no source"),
)
LICENSED = Caution(
    "licensed",
    "What is reported is what was recorded and measured. It does not say that anything is safe to touch or complies: local code and a "
    "licensed person decide.",
    Citation("ohmwalk", status="our own rule"),
)


def highest_voltage_v(site: Site) -> float:
    """The highest voltage that the record names for any source, board or circuit, or that was read. [V]"""
    named = [source.highest_voltage_v for source in site.sources]
    named += [source.working_voltage_v for source in site.sources]
    named += [source.nominal_voltage_v for source in site.sources]
    named += [abs(reading.value) for reading in site.readings if reading.quantity == "voltage"]
    named += [board.nominal_voltage_v for board in site.boards]
    named += [circuit.nominal_voltage_v for circuit in site.circuits]
    return max((volts for volts in [*named, site.nominal_voltage_v] if volts is not None), default=0.0)


def cautions_of(site: Site) -> tuple[Caution, ...]:
    """The cautions that apply to a site, the most general first."""
    highest = highest_voltage_v(site)
    kinds = {source.kind for source in site.sources}
    return tuple(
        caution
        for caution, applies in (
            (LIVE_READINGS, True),
            (METER, True),
            (BATTERY, "battery" in kinds or not kinds),
            (SHOCK, highest > SHOCK_LIMIT_V),
            (ARC, highest >= ARC_VOLTAGE_V),
            (PV, "pv" in kinds),
            (LICENSED, True),
        )
        if applies
    )
