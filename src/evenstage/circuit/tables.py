"""Gates and their input pins in columns."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, TypeVar

import numpy as np

from evenstage.circuit.arc_plan import arc_plan
from evenstage.circuit.electrical import Scaled

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

    from evenstage.circuit.arc_plan import ArcPlan
    from evenstage.circuit.electrical import Electrical
    from evenstage.circuit.gate import GateForm
    from evenstage.netlist.devices import IntArray

_Kind = TypeVar("_Kind", bound=np.generic)

_ENTRIES_MAX = 1 << 20
"""Tables of arcs are worked out in parts of about so many numbers each: 8 MiB."""


@dataclass(frozen=True)
class AlikeGates:
    """All gates of one form.

    Parameters
    ----------
    form : GateForm
    gates : IntArray, shape (k,)
        Gate ids, ascending.
    devices : IntArray, shape (k, devices of a gate)
    nets : IntArray, shape (k, local nets)
    """

    form: GateForm
    gates: IntArray
    devices: IntArray
    nets: IntArray

    @cached_property
    def plans(self) -> tuple[ArcPlan, ...]:
        """Plans of the form's arcs in their order, a part of them each."""
        arcs, widest = (
            self.form.arcs,
            max((len(a.path) + len(a.moved) for a in self.form.arcs), default=1),
        )
        each = max(1, _ENTRIES_MAX // (widest * len(self.gates)))
        return tuple(arc_plan(self.form, arcs[i : i + each]) for i in range(0, len(arcs), each))


@dataclass(frozen=True)
class Pins:
    """Input pins, one per gate and net; capacitance of all the gate's transistors on that net, F.

    Shape ``(pins,)``; ``local`` is the pin's local net in the gate's form.
    """

    gate: IntArray
    net: IntArray
    local: IntArray
    cap: Scaled


def pins_of(alike: tuple[AlikeGates, ...], values: Electrical, more: Sequence[Pins] = ()) -> Pins:
    """Collect the pins of all gates, ordered by gate.

    Parameters
    ----------
    alike : tuple of AlikeGates
        At least one.
    values : Electrical
    more : sequence of Pins
        Channels that load nets from outside.
    """
    parts = [*(_pins_of_form(some, values) for some in alike), *more]
    order = np.argsort(np.concatenate([part.gate for part in parts]), kind="stable")
    return Pins(
        gate=_joined([part.gate for part in parts], order),
        net=_joined([part.net for part in parts], order),
        local=_joined([part.local for part in parts], order),
        cap=_joined_scaled([part.cap for part in parts], order),
    )


def _joined(columns: Sequence[NDArray[_Kind]], order: NDArray[np.intp]) -> NDArray[_Kind]:
    """Put the columns of several tables under each other, then in order."""
    return np.concatenate(columns)[order]


def _joined_scaled(columns: Sequence[Scaled], order: NDArray[np.intp]) -> Scaled:
    return Scaled(
        _joined([column.scaling for column in columns], order),
        _joined([column.fixed for column in columns], order),
    )


def _pins_of_form(some: AlikeGates, values: Electrical) -> Pins:
    """Return the inputs of all gates of a form, gate by gate."""
    columns_of_net: dict[int, list[int]] = {}
    for column, switch in enumerate(some.form.drawn):
        if switch.gate >= 0:
            columns_of_net.setdefault(switch.gate, []).append(column)
    inputs = list(columns_of_net)
    devices = some.devices[:, [column for own in columns_of_net.values() for column in own]]
    begins = np.cumsum([0, *(len(own) for own in columns_of_net.values())][:-1])
    scaling, fixed = (
        np.add.reduceat(part[devices], begins, axis=1).ravel() if inputs else np.zeros(0)
        for part in (values.gate.scaling, values.gate.fixed)
    )
    return Pins(
        gate=np.repeat(some.gates, len(inputs)),
        net=some.nets[:, inputs].ravel(),
        local=np.tile(np.array(inputs, np.int32), len(some.gates)),
        cap=Scaled(scaling, fixed),
    )
