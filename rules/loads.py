"""What a load draws, from the figures that its record gives."""

from __future__ import annotations

from dataclasses import dataclass

from rules.record import Load


@dataclass(frozen=True, slots=True)
class Drawn:
    """A load as the network takes it: one of the three is not zero."""

    current_a: float = 0.0
    power_w: float = 0.0
    conductance_s: float = 0.0

    def at(self, voltage_v: float) -> float:
        """Current at a voltage. [A]"""
        return self.current_a + self.power_w / voltage_v + self.conductance_s * voltage_v


def kind_of(load: Load) -> str:
    """The load's kind: as recorded, else it follows the figure given; empty where there is no figure."""
    if load.kind:
        return load.kind
    if load.power_w is not None:
        return "constant power"
    if load.resistance_ohm is not None:
        return "constant resistance"
    return "constant current" if load.current_a is not None else ""


def drawn(load: Load, nominal_voltage_v: float | None) -> Drawn | None:
    """
    What a load draws at design: its figure times ``simultaneous``; ``None`` where it is not known.

    A kind whose own figure is missing takes it from another at nominal voltage.

    Examples
    --------
    >>> drawn(Load(id="1", circuit_id="c", point="p1", tag="heater", kind="constant resistance", power_w=48.0), 48.0)
    Drawn(current_a=0.0, power_w=0.0, conductance_s=0.020833333333333332)
    """
    kind, share = kind_of(load), load.simultaneous_or_default
    own = {
        "constant current": load.current_a,
        "constant power": load.power_w,
        "constant resistance": load.resistance_ohm,
    }.get(kind)
    if own is not None:
        if kind == "constant current":
            return Drawn(current_a=own * share)
        return Drawn(power_w=own * share) if kind == "constant power" else Drawn(conductance_s=share / own)
    if not kind or nominal_voltage_v is None:
        return None
    current = _current_at(load, nominal_voltage_v)
    if current is None:
        return None
    if kind == "constant current":
        return Drawn(current_a=current * share)
    if kind == "constant power":
        return Drawn(power_w=current * nominal_voltage_v * share)
    return Drawn(conductance_s=current / nominal_voltage_v * share)


def _current_at(load: Load, voltage_v: float) -> float | None:
    if load.current_a is not None:
        return load.current_a
    if load.power_w is not None:
        return load.power_w / voltage_v
    return voltage_v / load.resistance_ohm if load.resistance_ohm is not None else None
