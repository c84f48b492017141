"""The object ``ohmwalk.drop/1``: quantities in SI units, as in ``check --json``; what is not known is left out."""

from __future__ import annotations

from importlib.metadata import version
from typing import Any

from audit.drop.phrases import caution_texts
from audit.drop.reading import Understood
from audit.report.as_json import quantity
from rules.calc.ampacity import Capacity
from rules.calc.peak import energy_kwh_a_year
from rules.one_run import Answer
from rules.record import Figure
from rules.text import clean

SCHEMA_NAME = "ohmwalk.drop/1"
"""What the object calls itself; the number grows when a key changes its meaning."""


def as_json(understood: Understood, found: Answer, enough: Answer | None) -> dict[str, Any]:
    """What was understood, what follows, and what would suffice (left out where nothing would)."""
    document = {
        "schema": SCHEMA_NAME,
        "program": version("ohmwalk"),
        "read": _read(understood),
        "temperature": quantity(found.temperature),
        "temperature_is": found.warmth.value,
        "resistance": quantity(found.loop),
        "supplied": found.carried is not None,
        "most": quantity(found.most),
        **_carried(found),
        **_capacity(found),
        "sufficient": _sufficient(enough),
        "cautions": list(caution_texts(understood.asked.nominal_v)),
    }
    return _known(document)


def _read(understood: Understood) -> dict[str, Any]:
    asked = understood.asked
    run = asked.run
    return _known(
        {
            "length": quantity(Figure(run.one_way_length_m or 0.0, "m")),
            "length_by": run.length_by_or_default,
            "size": run.size,
            "material": run.material_or_default,
            "stranding": run.stranding_or_default,
            "parallel": run.parallel_or_default,
            "return_size": run.return_size_or_default,
            "return_material": run.return_material_or_default,
            "load": quantity(Figure(understood.load_value, understood.load.unit)),
            "load_kind": f"constant {understood.load.name.removeprefix('load ')}",
            "nominal": quantity(Figure(asked.nominal_v, "V")),
            "allowed": quantity(Figure(asked.allowed_percent / 100, "1")),
            "lowest": None if asked.lowest_v is None else quantity(Figure(asked.lowest_v, "V")),
            "ambient": quantity(Figure(asked.ambient_c, "degC")),
        }
    )


def _carried(found: Answer) -> dict[str, Any]:
    carried = found.carried
    if carried is None:
        return {}
    lowest = carried.lowest_verdict
    return {
        "current": quantity(carried.current),
        "drop": quantity(carried.drop),
        "share": quantity(carried.share),
        "at_load": quantity(carried.at_load),
        "heat": quantity(carried.loss),
        "energy_a_year": _energy(found),
        "margin": quantity(carried.margin),
        "verdict": carried.verdict.value,
        "lowest_margin": quantity(carried.lowest_margin),
        "lowest_verdict": None if lowest is None else lowest.value,
        "may_collapse": carried.may_collapse,
    }


def _energy(found: Answer) -> dict[str, Any] | None:
    """Lost a year at the stated duty. [J]"""
    carried, duty = found.carried, found.asked.duty
    if carried is None or duty is None:
        return None
    return quantity(Figure(3.6e6 * energy_kwh_a_year(carried.loss.value, duty), "J"))


def _capacity(found: Answer) -> dict[str, Any]:
    capacity = found.capacity
    if capacity is None:
        return {"capacity_not_known": clean(found.capacity_gap)}
    return {"capacity": _of_capacity(capacity), "above_capacity": found.is_above_capacity}


def _of_capacity(capacity: Capacity) -> dict[str, Any]:
    terminal_a = capacity.terminal_a
    device_a = capacity.largest_device_a
    return _known(
        {
            "ampacity": quantity(Figure(capacity.ampacity_a, "A")),
            "tabulated": quantity(Figure(capacity.tabulated_a, "A")),
            "column": capacity.column,
            "ambient_factor": quantity(Figure(capacity.ambient_factor, "1")),
            "grouping_factor": quantity(Figure(capacity.grouping_factor, "1")),
            "terminals": None if terminal_a is None else quantity(Figure(terminal_a, "A")),
            "largest_device": None if device_a is None else quantity(Figure(device_a, "A")),
            "table": capacity.table,
            "source": capacity.source,
            "edition": capacity.edition,
            "status": capacity.status,
            "assumed": list(capacity.assumed),
            "notes": list(capacity.notes),
        }
    )


def _sufficient(enough: Answer | None) -> dict[str, Any] | None:
    if enough is None or enough.carried is None:
        return None
    run, capacity = enough.asked.run, enough.capacity
    return _known(
        {
            "size": run.size,
            "parallel": run.parallel_or_default,
            "drop": quantity(enough.carried.drop),
            "share": quantity(enough.carried.share),
            "margin": quantity(enough.carried.margin),
            "ampacity": None if capacity is None else quantity(Figure(capacity.ampacity_a, "A")),
        }
    )


def _known(document: dict[str, Any]) -> dict[str, Any]:
    return {key: value for key, value in document.items() if value is not None}
