"""The supply voltage, where nobody gives one."""

from __future__ import annotations

from typing import Final

from evenstage.errors import Notice
from evenstage.units import engineering

#: Code of the notice that the supply voltage was assumed.
SUPPLY_ASSUMED: Final = "supply-assumed"

_PER_LENGTH: Final = 1.0e7
_RANGE: Final = (0.8, 5.0)
_OVER_THRESHOLD: Final = 5.0


def supply_for_length(length: float) -> float:
    """Return the usual supply for a channel length, V (common practice, no source).

    Ten volts per micron, within 0.8 V and 5 V.
    """
    least, most = _RANGE
    return min(most, max(least, _PER_LENGTH * length))


def supply_for_threshold(threshold: float) -> float:
    """Return the usual supply for a threshold, V: five times it (common practice, no source)."""
    return _OVER_THRESHOLD * threshold


def supply_notice(supply: float, rule: str) -> Notice:
    """Return the notice that a supply was assumed by a rule."""
    message = f"no supply voltage given: {engineering(supply, 'V')} assumed, {rule}"
    return Notice(SUPPLY_ASSUMED, message)
