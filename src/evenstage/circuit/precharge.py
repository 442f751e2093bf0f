"""A block while it precharges: the arcs that evaluation leaves out."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from evenstage.circuit.carrying import carry

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.tables import AlikeGates
    from evenstage.netlist.devices import IntArray

PRECHARGED = "precharged"
"""Why paths end at a dynamic node while the block precharges."""
PRECHARGE = "precharge device"
"""Kind of a part that does nothing but precharge its node."""


def precharging(circuit: Circuit) -> Circuit | None:
    """Return the same block with the arcs of precharge in place of those of evaluation.

    Paths end at its dynamic nodes. None where nothing is precharged.

    Parameters
    ----------
    circuit : Circuit
    """
    nets = [
        *(some.nets[:, some.form.output] for some in circuit.alike if some.form.precharge),
        *(
            some.nets[:, arc.output]
            for some in circuit.stages
            for arc in dict.fromkeys(some.form.precharge)
        ),
    ]
    if not nets:
        return None
    alike = tuple(_precharged(some) for some in circuit.alike)
    stages = tuple(
        replace(some, form=replace(some.form, arcs=some.form.precharge))
        if some.form.precharge
        else some
        for some in circuit.stages
    )
    ends = dict.fromkeys(np.unique(np.concatenate(nets)).tolist(), PRECHARGED)
    # What stores on a dynamic node holds while it evaluates.
    kept = tuple(
        one
        for one in circuit.storage.elements
        if not any(net in ends for loop in one.loops for net in loop.nets)
    )
    storage = replace(circuit.storage, elements=kept)
    return carry(circuit, replace(circuit, alike=alike, stages=stages, ends=ends, storage=storage))


def _precharged(some: AlikeGates) -> AlikeGates:
    form = some.form
    return replace(some, form=replace(form, arcs=form.precharge)) if form.precharge else some


def precharge_devices(circuit: Circuit, gate: int) -> IntArray:
    """Return the transistors of a gate that precharge its output: device ids.

    Parameters
    ----------
    circuit : Circuit
        While it precharges, or not.
    gate : int
    """
    form, devices = circuit.alike[int(circuit.gate_form[gate])].form, circuit.gate_devices(gate)
    if not form.precharge:
        return devices
    along = {switch for arc in form.precharge for switch in arc.path}
    here = [column for column, own in enumerate(form.network.switch_of_device) if own in along]
    found: IntArray = devices[here]
    return found
