"""Groups to gates: every kind is tried in turn on every distinct network and surrounding."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from evenstage.circuit.context import Context, Surroundings
from evenstage.circuit.families import FAMILIES
from evenstage.circuit.gate import GateForm, recognise_network
from evenstage.circuit.groups import AlikeGroups
from evenstage.progress import tell

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.circuit.network import Switch
    from evenstage.netlist.devices import Devices, IntArray

_ROUNDS = 4
"""What one round recognises may be what another group waited for; chains of that are short."""


@dataclass(frozen=True)
class Sorted:
    """Groups with a form, and groups without one and why."""

    gates: tuple[tuple[GateForm, AlikeGroups], ...]
    strange: tuple[tuple[str, AlikeGroups], ...]


def sort_groups(devices: Devices, alike: Sequence[AlikeGroups], clocks: IntArray) -> Sorted:
    """Recognise static gates first, then whatever shows in the light of those already known.

    Parameters
    ----------
    devices : Devices
    alike : sequence of AlikeGroups
    clocks : IntArray
        Nets that the brief says are clocks.
    """
    found = _tapped(devices, _static(alike))
    for _ in range(_ROUNDS):
        again = _tapped(devices, _in_context(devices, found, clocks))
        done = len(again.gates) == len(found.gates)
        found = again
        if done or not found.strange:
            break
    return found


def _static(alike: Sequence[AlikeGroups]) -> Sorted:
    gates, strange = [], []
    for done, some in enumerate(alike):
        tell("recognising", done / len(alike))
        form = recognise_network(some.network)
        if isinstance(form, GateForm):
            gates.append((form, some))
        else:
            strange.append((form.reason, some))
    return Sorted(tuple(gates), tuple(strange))


def _in_context(devices: Devices, found: Sorted, clocks: IntArray) -> Sorted:
    """Try again the networks that are something else once their surroundings are known."""
    others = [some for _, some in found.strange]
    surroundings = Surroundings(devices, found.gates, others, clocks)
    gates, strange = list(found.gates), []
    for reason, some in found.strange:
        for context, rows in surroundings.split(some):
            part = rows_of(some, rows)
            form = _first_form(some.network, context)
            if isinstance(form, GateForm):
                gates.append((form, part))
            else:
                strange.append((form or reason, part))
    return Sorted(tuple(gates), tuple(strange))


def _first_form(network: tuple[Switch, ...], context: Context) -> GateForm | str:
    """Return the form of the first kind that fits, or why the last that looked closer does not."""
    reason = ""
    for family in FAMILIES:
        form = family(network, context)
        if isinstance(form, GateForm):
            return form
        reason = reason or form.reason
    return reason


def _tapped(devices: Devices, found: Sorted) -> Sorted:
    """Set aside gates whose inner nodes are used outside: they are more than that gate."""
    used = np.zeros(len(devices.net_names), bool)
    used[devices.gate] = True
    used[list(devices.ports)] = True
    gates, strange = [], list(found.strange)
    for form, some in found.gates:
        inner = _inner_nets(form)
        tapped = used[some.nets[:, inner]].any(axis=1)
        if tapped.any():
            reason = "an inner node of its networks is used as a signal"
            strange.append((reason, rows_of(some, np.flatnonzero(tapped))))
        if not tapped.all():
            gates.append((form, rows_of(some, np.flatnonzero(~tapped))))
    return Sorted(tuple(gates), tuple(strange))


def _inner_nets(form: GateForm) -> list[int]:
    """Return the local nets that are channel ends of the gate but not its output."""
    ends = {net for switch in form.drawn for net in (switch.a, switch.b) if net >= 0}
    return sorted(ends - {form.output})


def rows_of(some: AlikeGroups, rows: IntArray) -> AlikeGroups:
    """Return some of equal groups."""
    return AlikeGroups(some.network, some.devices[rows], some.nets[rows])
