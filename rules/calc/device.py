"""Resistance of protective devices, from the loss that their product standards allow."""

from __future__ import annotations

from rules.tables.loader import group

TYPICAL_SHARE = 0.6
"""Typical loss over the product standard's largest; a choice of this project, common practice, no source."""

_CEILINGS = {
    "breaker B": "breaker_loss",
    "breaker C": "breaker_loss",
    "breaker D": "breaker_loss",
    "fuse gG": "fuse_gg_loss",
}


def device_resistance_ohm(
    device: str, rated_current_a: float | None, poles: int = 1, typical_share: float = TYPICAL_SHARE
) -> float | None:
    """
    Resistance that the current of a circuit meets in its protective device, cold or warm.

    Parameters
    ----------
    device : str
        As recorded: none, breaker B, breaker C, breaker D, fuse gG, fuse blade, electronic; empty for not known.
    rated_current_a : float or None
        ``None`` for not known. [A]
    poles : int
        Poles in series in the circuit: 2 where both legs are switched.
    typical_share : float
        Typical loss over the largest that the product standard allows (breakers and gG fuses).

    Returns
    -------
    float or None
        Its mean; 0 where there is no device, ``None`` where device or rating is not known to the tables. [Ω]

    Notes
    -----
    A breaker or gG fuse: share × largest loss at rated current / rated current², a pole. A blade fuse: its
    maker's cold resistance at exactly that rating. Electronic: volts at rated current / rated current.

    References
    ----------
    IEC 60898-1; IEC 60269-2: both from memory, see ``ohmwalk tables``.

    Examples
    --------
    >>> round(device_resistance_ohm("breaker C", 16.0) * 1e3, 2)
    8.2
    >>> device_resistance_ohm("none", None), device_resistance_ohm("breaker C", None)
    (0.0, None)
    """
    if device == "none":
        return 0.0
    if rated_current_a is None or rated_current_a <= 0:
        return None
    one_pole = _one_pole_ohm(device, rated_current_a, typical_share)
    return None if one_pole is None else poles * one_pole


def _one_pole_ohm(device: str, rated_current_a: float, typical_share: float) -> float | None:
    if device == "electronic":
        return group("electronic_drop").value("voltage_v") / rated_current_a
    if device == "fuse blade":
        column = ("rated_current_a", "resistance_ohm")
        known = group("fuse_blade").numbers(*column) | group("fuse_blade_more").numbers(*column)
        return known.get(rated_current_a)
    if device not in _CEILINGS:
        return None
    losses = group(_CEILINGS[device]).numbers("rated_current_up_to_a", "loss_w")
    loss_w = next((loss for up_to, loss in losses.items() if rated_current_a <= up_to), None)
    return None if loss_w is None else typical_share * loss_w / rated_current_a**2
