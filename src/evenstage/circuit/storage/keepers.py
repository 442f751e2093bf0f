"""Keepers that make no latch: of buses, and those that hold one level only.

A bus keeper holds what the last of several drivers left, and none of them stores anything in it:
the gate that listens drives nothing but the keeper, and either the drivers have no condition in
common or the bus is a port. A half-latch or level restorer holds one level; the other one leaks
away, so that a net with nothing else is a dynamic one.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from evenstage.circuit.storage.reading import BUS_KEEPER, CELL, LATCH

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from evenstage.circuit.gate import Weak
    from evenstage.circuit.network import Switch
    from evenstage.circuit.stage_form import StageForm
    from evenstage.circuit.stage_tables import AlikeStages
    from evenstage.circuit.storage.elements import Element, Storage
    from evenstage.circuit.tables import AlikeGates
    from evenstage.netlist.devices import Devices, IntArray

_ONE_LEVEL = "one level"


def without_kept(
    storage: Storage,
    devices: Devices,
    alike: Sequence[AlikeGates],
    stages: Sequence[AlikeStages],
) -> Storage:
    """Return the storage of a block in which keepers alone make no latches.

    Parameters
    ----------
    storage : Storage
    devices : Devices
    alike : sequence of AlikeGates
    stages : sequence of AlikeStages
    """
    told = _told(devices, alike, stages)
    if not told:
        return storage
    elements = (_as_told(element, told) for element in storage.elements)
    return replace(storage, elements=tuple(one for one in elements if one is not None))


def _as_told(element: Element, told: dict[int, str]) -> Element | None:
    nets = {net for loop in element.loops for net in loop.nets}
    what = told.get(next(iter(nets)), "") if len(nets) == 1 else ""
    if element.kind not in {LATCH, CELL} or not what:
        return element
    if what == _ONE_LEVEL:
        return None
    loops = tuple(replace(loop, clocks=(), data=(), writes=()) for loop in element.loops)
    return replace(element, kind=BUS_KEEPER, loops=loops)


def _told(
    devices: Devices, alike: Sequence[AlikeGates], stages: Sequence[AlikeStages]
) -> dict[int, str]:
    """Return what the nets with keepers are, where they are no latches."""
    gates_on = np.bincount(devices.gate, minlength=len(devices.net_names))
    is_port = np.zeros(len(devices.net_names), bool)
    is_port[list(devices.ports)] = True
    found: dict[int, str] = {}
    for drawn, node, weak, shared, nets in _kept(alike, stages):
        own = nets[:, node]
        if len({one.supply for one in weak}) == 1:
            found |= dict.fromkeys(own.tolist(), _ONE_LEVEL)
            continue
        turned = [drawn[d].gate for one in weak for place in one.devices for d in place]
        listeners = sorted({gate for gate in turned if gate >= 0})
        private = np.ones(len(own), bool)
        for gate in listeners:
            private &= gates_on[nets[:, gate]] == turned.count(gate)
        found |= dict.fromkeys(own[private & (shared | is_port[own])].tolist(), BUS_KEEPER)
    return found


_Kept = tuple["tuple[Switch, ...]", int, "tuple[Weak, ...]", bool, "IntArray"]


def _kept(alike: Sequence[AlikeGates], stages: Sequence[AlikeStages]) -> Iterator[_Kept]:
    """Yield drawing, node, keepers, whether its drivers share no condition, and nets."""
    for some in alike:
        weak = tuple(one for one in some.form.weak if one.is_keeper)
        if weak and some.form.floats:
            yield some.form.drawn, some.form.output, weak, False, some.nets
    for stage in stages:
        form = stage.form
        for node in dict.fromkeys(one.node for one in form.weak):
            weak = tuple(one for one in form.weak if one.node == node)
            yield form.drawn, node, weak, _drivers_apart(form, node), stage.nets


def _drivers_apart(form: StageForm, node: int) -> bool:
    """Tell whether what drives a node of a stage has no condition in common."""
    cubes = [cube for s in form.sinks if s.node == node for cube in (*s.high, *s.low)]
    return bool(cubes) and not frozenset.intersection(*cubes)
