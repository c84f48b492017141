"""What stands in for an empty field, and what each field means: shown beside it while it is filled in."""

from __future__ import annotations

from audit.tui.entry.fields import SITE, Field
from rules.index import Index
from rules.limits import Limits
from rules.nominal import nominal_v
from rules.record import Circuit, Row, Site, Source
from rules.units import show, show_size

_ASSUMED = {
    ("runs", "material"): "copper",
    ("runs", "stranding"): "stranded",
    ("runs", "length_by"): "drawing",
    ("runs", "temperature_by"): "assumed",
    ("runs", "parallel"): "1",
    ("runs", "return_conductor"): "own",
    ("loads", "simultaneous"): "1",
    ("loads", "function"): "ordinary",
    ("loads", "kind"): "from the figure given",
    (SITE, "limits"): "general",
}
"""As the format has it (section "Where a cell is empty")."""

MEANING = {
    ("sources", "working_voltage_v"): "at its terminals under load",
    ("sources", "lowest_voltage_v"): "at its terminals at the end of discharge",
    ("sources", "fed_from"): "of a converter: CIRCUIT:POINT",
    ("sources", "category"): "what a meter at its terminals must have at least",
    ("boards", "fed_by"): "a source, several as RECT-1 + BATT-A, a circuit, or CIRCUIT:POINT",
    ("boards", "location"): "the heading in the walk",
    ("boards", "category"): "what a meter on it and its circuits must have at least",
    ("circuits", "fed_from"): "the board or source that it is on",
    ("circuits", "allowed_drop_percent"): "of nominal, from the board to each load",
    ("circuits", "not_tested"): "the reason, where it could not be measured",
    ("circuits", "device_leg"): "the leg that the device interrupts",
    ("runs", "from_point"): "way for the first run, else where an earlier run ends",
    ("runs", "to_point"): "a name of your own; board:TAG closes a mesh",
    ("runs", "one_way_length_m"): "one way, along the cable: 12.5 or 45 ft",
    ("runs", "length_by"): "how the length was obtained",
    ("runs", "size"): "2.5 mm2, 12 AWG, 4/0 AWG, 250 kcmil",
    ("runs", "parallel"): "cables side by side",
    ("runs", "grouped"): "loaded circuits together",
    ("runs", "conductor_temperature_c"): "of the conductor while it was read",
    ("runs", "return_conductor"): "own, shared:NAME or structure",
    ("loads", "point"): "where it is connected",
    ("loads", "current_a"): "or its power, or its resistance",
    ("loads", "lowest_voltage_v"): "what it needs at least",
    ("loads", "simultaneous"): "share of it that is on at once, 0 to 1",
    ("loads", "function"): "life safety and trip or close are never load-tested without permission",
    ("instruments", "full_scale"): "largest value of this range; empty holds every value",
    ("instruments", "counts"): "of the accuracy: ± 0.5 % + 2 counts",
    ("instruments", "resolution"): "the smallest step of the display",
    ("instruments", "zero"): "what it shows at nothing; it is taken off each reading",
    ("instruments", "category"): "as printed on it: CAT III 600 V",
    ("instruments", "rated_voltage_v"): "the highest d.c. voltage that it may be connected to",
    ("visits", "kind"): "what the visit was for",
    (SITE, "extent"): "what the survey covers",
    (SITE, "limitations"): "what it does not cover, and why",
    (SITE, "limits"): "name of the limits profile",
}
"""A few words on the fields whose name alone does not say it."""


def assumed(field: Field, row: Row | Site, index: Index, limits: Limits | None) -> str:
    """What counts while a field is empty; empty where nothing stands in."""
    known = _ASSUMED.get((field.table, field.name))
    if known is not None:
        return known
    if isinstance(row, Circuit) and field.name == "nominal_voltage_v":
        volts = nominal_v(row, index)
        return "" if volts is None else f"{show(volts, 'V')}, of what feeds it"
    if isinstance(row, Circuit) and field.name == "allowed_drop_percent" and limits is not None:
        return f"{limits['drop.allowed_percent']:g} %, of the limits profile"
    if isinstance(row, Source) and field.name == "working_voltage_v" and row.nominal_voltage_v is not None:
        return f"{show(row.nominal_voltage_v, 'V')}, nominal"
    if field.table == "runs" and field.name == "conductor_temperature_c":
        ambient = index.site.ambient_temperature_c
        if ambient is not None:
            return f"{show(ambient, 'degC')}, the site's ambient"
        return "" if limits is None else f"{show(limits['ambient.assumed_c'], 'degC')}, of the limits profile"
    if field.table == "runs" and field.name in ("return_size", "return_material"):
        size = getattr(row, "size", "")
        return f"same as outwards{f', {show_size(size)}' if size and field.name == 'return_size' else ''}"
    return ""
