"""What a report prints of the record: each value with where it comes from, and what was assumed for a gap."""

from __future__ import annotations

import math

from audit.report.blocks import Cell, Column, Facts, Line, Table
from audit.report.line import line_of
from audit.report.phrases import figure_words, reading_words, time_words
from rules.assessment import CircuitResult
from rules.index import Index
from rules.limits import Limits
from rules.meters import instrument_row
from rules.record import Board, Circuit, Feed, Load, Reading, Row, Run, Site, Source
from rules.units import show, show_size

NOT_KNOWN = "not known"
NOT_RECORDED = "not recorded"
READING_DIGITS = 9
"""A reading keeps every digit that its meter showed."""
MOST_READ = 2
"""Values that stand above one point of a line; the table has all of them."""


LENGTH_WORDS = {
    "marks": "by the sheath's marks",
    "tape": "taped",
    "tdr": "by pulse echo",
    "paced": "paced",
    "drawing": "from a drawing",
    "guess": "guessed",
}
"""How a length was obtained, in words."""
TEMPERATURE_WORDS = {"probe": "by a probe", "air": "of the air beside it"}


def quantity(row: Row, field: str, value: float | None, unit: str, digits: int = 4) -> str:
    """A value in people's units and, where it differs, the text that was typed for it."""
    if value is None:
        return NOT_KNOWN
    text = show(value, unit, digits=digits)
    typed = row.as_typed(field)
    return text if typed is None or typed.strip() == text else f"{text} (typed “{typed}”)"


def or_assumed(recorded: str, default: str) -> str:
    """The recorded word, or the one that stands in for an empty cell, said to be assumed."""
    return recorded or f"{default} (assumed)"


def joined(*parts: str, by: str = ", ") -> str:
    """The parts that are not empty."""
    return by.join(part for part in parts if part)


def feed_words(index: Index, feed: Feed | None) -> str:
    """Tag and point of what feeds something."""
    if feed is None:
        return NOT_KNOWN
    rows: dict[str, Source] | dict[str, Board] | dict[str, Circuit]
    rows = {"sources": index.sources, "boards": index.boards}.get(feed.table, index.circuits)  # type: ignore[assignment]
    row = rows.get(feed.id)
    tag = row.tag if row is not None else feed.id.removeprefix("?")
    return f"{tag}:{feed.point}" if feed.point else tag


def board_title(index: Index, feed: Feed | None) -> str:
    """A heading of the walk: ``DB1, 48 V from RECT-A``."""
    if feed is not None and feed.table == "boards" and (board := index.boards.get(feed.id)) is not None:
        volts = "" if board.nominal_voltage_v is None else show(board.nominal_voltage_v, "V")
        fed = " + ".join(feed_words(index, one) for one in board.fed_by)
        return joined(board.tag, joined(volts, f"from {fed}" if fed else "", by=" "))
    if feed is not None and (source := index.sources.get(feed.id)) is not None:
        volts = "" if source.nominal_voltage_v is None else show(source.nominal_voltage_v, "V")
        return joined(source.tag, joined(volts, source.kind, by=" "))
    return f"fed from {feed_words(index, feed)}"


def location_of(index: Index, feed: Feed | None) -> str:
    """Where the board stands that a circuit is fed from."""
    board = index.boards.get(feed.id) if feed is not None else None
    return board.location if board is not None else ""


def device_words(circuit: Circuit) -> str:
    """The protective device with its rating, poles and leg."""
    if circuit.device == "none":
        return "no device"
    if not circuit.device:
        return "device not known"
    rating = show(circuit.rated_current_a, "A") if circuit.rated_current_a is not None else "rating not known"
    poles = f"{circuit.device_poles}-pole" if circuit.device_poles is not None else ""
    leg = f"in the {circuit.device_leg} leg" if circuit.device_leg in ("positive", "negative") else ""
    return joined(f"{circuit.device} {rating}", poles, leg)


def circuit_facts(index: Index, circuit: Circuit, result: CircuitResult) -> Facts:
    """The circuit's own row, each value with its provenance."""
    nominal = NOT_KNOWN
    if circuit.nominal_voltage_v is not None:
        nominal = quantity(circuit, "nominal_voltage_v", circuit.nominal_voltage_v, "V")
    elif result.nominal_voltage_v is not None:
        nominal = f"{show(result.nominal_voltage_v, 'V')} (taken from what feeds it)"
    allowed = NOT_KNOWN if result.allowed_drop_percent is None else f"{result.allowed_drop_percent:g} %"
    if circuit.allowed_drop_percent is None and result.allowed_drop_percent is not None:
        allowed += " (from the limits profile)"
    breaking = circuit.breaking_capacity_a
    rows = [
        ("Fed from", feed_words(index, circuit.fed_from)),
        ("Location", circuit.location or NOT_RECORDED),
        ("Nominal voltage", nominal),
        ("Device", device_words(circuit)),
        ("Breaking capacity", "" if breaking is None else show(breaking, "A")),
        ("Allowed drop", allowed),
        ("Not tested", circuit.not_tested),
        ("Notes", circuit.notes),
    ]
    return Facts(tuple((label, text) for label, text in rows if text), side_by_side=True)


def runs_table(index: Index, circuit: Circuit, limits: Limits) -> Table | None:
    """One row a run; ``None`` where there is none."""
    site = index.site
    rows: list[tuple[Cell, ...]] = [
        (
            str(run.number),
            f"{run.from_point} to {index.end_of(run)}",
            _length(run),
            joined(_size(run), f"{run.parallel} in parallel" if run.parallel_or_default > 1 else ""),
            joined(or_assumed(run.material, "copper"), or_assumed(run.stranding, "stranded")),
            _temperature(run, site, limits),
            _return(run),
            joined(run.insulation, run.method, f"{run.grouped} grouped" if run.grouped is not None else "", run.notes),
        )
        for run in index.runs_of(circuit.id)
    ]
    columns = (
        Column("Run", "right"), Column("From, to", share=2), Column("Length, one way", share=3),
        Column("Size", share=2), Column("Metal", share=3), Column("Temperature", share=3),
        Column("Return", share=3), Column("Remarks", share=3),
    )  # fmt: skip
    return Table(columns, tuple(rows), "Runs") if rows else None


def loads_table(index: Index, circuit: Circuit) -> Table | None:
    """One row a load; ``None`` where there is none."""
    rows: list[tuple[Cell, ...]] = [
        (
            load.tag,
            load.point,
            _draw(load),
            _window(load),
            f"{load.simultaneous:g}" if load.simultaneous is not None else "1 (assumed)",
            joined(or_assumed(load.function, "ordinary"), load.notes),
        )
        for load in index.loads_of(circuit.id)
    ]
    columns = (
        Column("Load", share=4), Column("At", share=3), Column("Draws", share=5), Column("Needs", share=4),
        Column("Simultaneous", share=3), Column("Function, remarks", share=5),
    )  # fmt: skip
    return Table(columns, tuple(rows), "Loads") if rows else None


def readings_table(index: Index, place_id: str, visit: str | None = None) -> Table | None:
    """
    Every reading on a circuit or busbar under its load state: value, unit, points, time, meter and surveyor.

    ``visit``, where given, leaves out other visits and readings that were replaced.
    """
    readings = index.readings_of(place_id)
    successors = {reading.replaces_id: reading for reading in readings if reading.replaces_id}
    states: dict[tuple[str, str], list[Reading]] = {}
    for reading in readings:
        if visit is None or (reading.visit_or_default == visit and reading.id not in index.replaced):
            states.setdefault((reading.visit_or_default, reading.round), []).append(reading)
    rows: list[tuple[Cell, ...]] = []
    for (visit_tag, round_name), of_state in states.items():
        dates = {time_words(reading.taken_at)[:10] for reading in of_state}
        date = dates.pop() if len(dates) == 1 else ""
        rows.append((joined(visit_tag, f"round {round_name}", date, _load_state(of_state, index)),))
        rows += [_reading_row(reading, date, successors, index) for reading in of_state]
    columns = (
        Column("Reading", share=8), Column("Value", "right", share=4), Column("Taken at", share=3),
        Column("Meter, range", share=6), Column("By", share=4), Column("Remarks", share=7),
    )  # fmt: skip
    return Table(columns, tuple(rows), "Readings") if rows else None


def _reading_row(reading: Reading, date: str, successors: dict[str, Reading], index: Index) -> tuple[Cell, ...]:
    taken = time_words(reading.taken_at)
    return (
        reading_words(reading),
        as_shown(reading, index),
        (taken.removeprefix(date).strip() if date else taken) or NOT_RECORDED,
        _meter(reading),
        reading.by or NOT_RECORDED,
        _remarks(reading, successors),
    )


def as_shown(reading: Reading, index: Index) -> str:
    """A reading with the decimals of the meter's display: 53.500 V where it shows thousandths."""
    row = instrument_row(reading, index)
    large = abs(reading.value) >= 0.1  # smaller ones are shown in thousandths
    step = row.resolution or 0.0 if row is not None else 0.0
    if large and step > 0 and reading.as_typed("value") is None:
        decimals = max(0, math.ceil(-math.log10(step) - 1e-9))
        if math.isclose(round(reading.value, decimals), reading.value, rel_tol=1e-12):
            # the sign between number and unit comes from the one formatter
            unit = show(1.0, reading.unit).partition(" ")[2]
            return f"{reading.value:.{decimals}f} {unit}"
    return quantity(reading, "value", reading.value, reading.unit, READING_DIGITS)


def _load_state(readings: list[Reading], index: Index) -> str:
    """The currents read in a round, by which its load state is known."""
    said = [
        f"{show(reading.value, 'A', digits=READING_DIGITS)} at {reading.at}"
        for reading in readings
        if reading.quantity == "current" and reading.id not in index.replaced and not reading.is_unloaded
    ]
    if not said:
        return "no load current recorded"
    return "load current " + "; ".join(said[:MOST_READ]) + ("; …" if len(said) > MOST_READ else "")


def circuit_line(index: Index, circuit: Circuit, result: CircuitResult) -> Line | None:
    """The circuit from left to right with the voltages of the round that is judged."""
    read: dict[str, list[str]] = {}
    for reading in index.readings_of(circuit.id):
        of_round = result.drop is not None and (reading.visit_or_default, reading.round) == (
            result.visit,
            result.drop.round,
        )
        whole = reading.quantity == "voltage" and reading.leg in ("", "both") and reading.id not in index.replaced
        if of_round and whole and not reading.is_unloaded:
            read.setdefault(reading.at, []).append(show(reading.value, "V", digits=READING_DIGITS))
    shown = {
        point: ", ".join(texts[:MOST_READ]) + (" …" if len(texts) > MOST_READ else "") for point, texts in read.items()
    }
    designs = {point.point: figure_words(point.design) for point in result.points if point.design is not None}
    device = "" if circuit.device == "none" else _device_short(circuit)
    return line_of(index, circuit, _stretch, device, shown, designs)


def _device_short(circuit: Circuit) -> str:
    rating = "" if circuit.rated_current_a is None else show(circuit.rated_current_a, "A")
    return joined(circuit.device or "device not known", rating, by=" ")


def _stretch(run: Run) -> str:
    length = "length not known" if run.one_way_length_m is None else show(run.one_way_length_m, "m")
    return f"{length} · {show_size(run.size) if run.size else 'size not known'}"


def _length(run: Run) -> str:
    text = quantity(run, "one_way_length_m", run.one_way_length_m, "m")
    if run.one_way_length_m is None:
        return text
    by = run.length_by_or_default
    return f"{text}, {LENGTH_WORDS.get(by, by)}{'' if run.length_by else ' (assumed)'}"


def _size(run: Run) -> str:
    if not run.size:
        return NOT_KNOWN
    text = show_size(run.size)
    typed = run.as_typed("size")
    return text if typed is None or typed.strip() in (text, run.size) else f"{text} (typed “{typed}”)"


def _temperature(run: Run, site: Site, limits: Limits) -> str:
    if run.conductor_temperature_c is not None:
        text = quantity(run, "conductor_temperature_c", run.conductor_temperature_c, "degC")
        return (
            f"{text}, {TEMPERATURE_WORDS[run.temperature_by]}"
            if run.temperature_by in ("probe", "air")
            else f"{text} (assumed)"
        )
    if site.ambient_temperature_c is not None:
        return f"{show(site.ambient_temperature_c, 'degC')} (the site's ambient, assumed)"
    return f"{show(limits['ambient.assumed_c'], 'degC')} (from the limits profile, assumed)"


def _return(run: Run) -> str:
    kind = or_assumed(run.return_conductor, "own")
    if run.return_or_default == "structure":
        return kind
    return joined(
        kind,
        show_size(run.return_size) if run.return_size else "same size (assumed)" if run.return_conductor else "",
        run.return_material,
    )


def _draw(load: Load) -> str:
    figures = (
        ("current_a", load.current_a, "A"),
        ("power_w", load.power_w, "W"),
        ("resistance_ohm", load.resistance_ohm, "ohm"),
    )
    given = [quantity(load, field, value, unit) for field, value, unit in figures if value is not None]
    kind = load.kind or ("kind from the figure given" if given else "")
    peak = "" if load.peak_current_a is None else f"peak {show(load.peak_current_a, 'A')}"
    time = "" if load.peak_time_s is None else f"for {show(load.peak_time_s, 's')}"
    return joined(" / ".join(given) or NOT_KNOWN, kind, joined(peak, time, by=" "))


def _window(load: Load) -> str:
    lowest = "" if load.lowest_voltage_v is None else f"at least {show(load.lowest_voltage_v, 'V')}"
    highest = "" if load.highest_voltage_v is None else f"at most {show(load.highest_voltage_v, 'V')}"
    return joined(lowest, highest) or NOT_KNOWN


def _meter(reading: Reading) -> str:
    if not reading.instrument:
        return "not recorded (counts as a poor meter)"
    scale = "" if reading.full_scale is None else f"range {show(reading.full_scale, reading.unit)}"
    return joined(reading.instrument, scale)


def _remarks(reading: Reading, successors: dict[str, Reading]) -> str:
    successor = successors.get(reading.id)
    resistor = reading.test_resistor_ohm
    leg = f" to {reading.test_resistor_leg}" if reading.test_resistor_leg else ""
    replaced = ""
    if successor is not None:
        by = f" by {successor.tag}" if successor.tag else ""
        replaced = f"REPLACED{by}, not judged: {successor.reason or 'no reason given'}"
    return joined(
        f"tag {reading.tag}" if reading.tag else "",
        replaced,
        "loads off" if reading.is_unloaded else "",
        "" if resistor is None else f"test resistor {show(resistor, 'ohm')}{leg}",
        reading.notes,
        by="; ",
    )
