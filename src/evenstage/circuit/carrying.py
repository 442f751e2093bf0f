"""What a circuit has worked out already and a changed copy of it need not work out again."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit

_PINS: Final = ("devices", "process", "alike", "stages")
_CARDS: Final = ("devices", "supplies", "coupling")
_DRIVERS: Final = ("devices", "alike", "stages", "gate_output")

RESTS_ON: Final = {
    "electrical": ("devices", "process"),
    "capacitor_value": _CARDS,
    "wire_cap": _CARDS,
    "strange_cap": ("devices", "process", "not_understood"),
    "apart_cap": ("devices", "process", "apart"),
    "pins": _PINS,
    "_pins_by_net": _PINS,
    "_capacitors_by_net": ("devices",),
    "arcs": (*_PINS, *_CARDS, "apart", "drive"),
    "_place": ("alike", "gate_output"),
    "gate_form": ("alike", "gate_output"),
    "gate_row": ("alike", "gate_output"),
    "gate_of_device": ("devices", "alike"),
    "_names": ("devices",),
    "driver_of_net": _DRIVERS,
    "is_part": _DRIVERS,
    "driven": _DRIVERS,
    "total_width": ("devices",),
}
"""Fields of a circuit that each of its properties is worked out from."""


def carry(old: Circuit, new: Circuit) -> Circuit:
    """Hand on what a circuit has worked out to a copy with some fields changed, and return that."""
    known = vars(old)
    for name, fields in RESTS_ON.items():
        if name in known and all(getattr(old, one) is getattr(new, one) for one in fields):
            vars(new).setdefault(name, known[name])
    return new
