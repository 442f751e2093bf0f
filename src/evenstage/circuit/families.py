"""The kinds of gates, in the order in which they are tried.

Each kind is one function from a drawn network and its `Context` to a `GateForm`, or to the reason
why it is not of that kind. The first that fits decides; if none does, the first reason is told.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.circuit.gate import recognise_network
from evenstage.circuit.kinds.cross_coupled import cross_coupled
from evenstage.circuit.kinds.dynamic import dynamic
from evenstage.circuit.kinds.floating import floating
from evenstage.circuit.kinds.kept import kept
from evenstage.circuit.kinds.ratioed import ratioed

if TYPE_CHECKING:
    from collections.abc import Callable

    from evenstage.circuit.context import Context
    from evenstage.circuit.gate import GateForm, Unrecognised
    from evenstage.circuit.network import Switch

    Family = Callable[[tuple[Switch, ...], Context], GateForm | Unrecognised]


def complementary(devices: tuple[Switch, ...], context: Context) -> GateForm | Unrecognised:
    """Recognise static complementary gates, some of whose inputs are complements of others."""
    inputs = {device.gate for device in devices}
    return recognise_network(
        devices, tuple(pair for pair in context.complements if pair[1] in inputs)
    )


PLAIN: tuple[Family, ...] = (complementary, dynamic, ratioed, floating)
FAMILIES: tuple[Family, ...] = (complementary, kept(PLAIN), cross_coupled, *PLAIN[1:])
