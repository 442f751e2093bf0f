"""Sense amplifiers: cross-coupled pairs that tip over when they are enabled.

Before the enable both outputs stand alike; the enable then pulls at both through the n transistors
of the pair, until one output has won and turned the other's off. With one side taken as the
complement of the other, and what it does to itself left out, the rest is a stage: what precharges
the outputs, what the enable drives, and the inputs that tip the pair, which must have arrived
before and end their paths there. The p transistors of the pair are off until it has tipped.

A difference D between the outputs grows as ``exp(t / tau)``, tau the capacitance of an output over
the transconductance of the pair (from memory; as in any text on latches). With R the resistance
that discharges an output, the ln 2 of an RC response inside, ``tau = R C / ln 2`` to first order,
and half the supply is reached from a difference of D at

    t = R C ln(V / 2 D) / ln 2.

D is taken as a tenth of the supply (common practice, no source).
"""

from __future__ import annotations

import math
from dataclasses import replace
from typing import TYPE_CHECKING, Final

from evenstage.circuit.network import HIGH, LOW
from evenstage.circuit.storage.elements import Element, Loop
from evenstage.circuit.storage.reading import LATCH, SENSE_AMPLIFIER

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.circuit.network import Switch
    from evenstage.circuit.stage_form import Facts, StageArc, StageForm
    from evenstage.circuit.stage_tables import AlikeStages
    from evenstage.circuit.storage.elements import Storage

DIFFERENCE: Final = 0.1
"""Difference at the enable, as a share of the supply."""
REGENERATION: Final = math.log(0.5 / DIFFERENCE) / math.log(2)
"""Time to half the supply over the resistance times capacitance of an output."""


def apart_from_pairs(devices: tuple[Switch, ...], facts: Facts) -> tuple[tuple[Switch, ...], Facts]:
    """Return a drawing without the p transistors of its sense amplifiers, and facts that name them.

    Where the transistors of a pair stand at the supplies themselves it is a memory cell: a read
    leads through them, and a write overpowers its p transistors.
    """
    turned: dict[tuple[int, int, str], list[int]] = {}
    for index, device in enumerate(devices):
        for end in (device.a, device.b):
            if end >= 0 and device.gate >= 0:
                turned.setdefault((end, device.gate, device.polarity), []).append(index)
    result, pairs = list(devices), []
    for u, v, polarity in turned:
        opposite = turned.get((v, u, "n"), [])
        if polarity != "n" or u >= v or not opposite:
            continue
        pairs.append((u, v))
        for index in (*turned.get((u, v, "p"), ()), *turned.get((v, u, "p"), ())):
            result[index] = replace(devices[index], gate=HIGH)
    ties = (*facts.ties, *((u, v, False) for u, v in pairs))
    return tuple(result), replace(facts, ties=ties, pairs=tuple(pairs))


def sensing(form: StageForm, pairs: tuple[tuple[int, int], ...]) -> StageForm:
    """Return a stage whose arcs through pairs take as long as regeneration does.

    No cell writes another: of two word lines one is high.
    """
    outputs = {net for pair in pairs for net in pair}
    switches = form.network.switches
    cells = {
        net
        for switch in switches
        if switch.gate in outputs and LOW in (switch.a, switch.b)
        for net in (switch.gate, max(switch.a, switch.b))
    }
    arcs = tuple(
        replace(arc, factor=REGENERATION) if _by_pair(form, arc, outputs) else arc
        for arc in form.arcs
        if arc.output not in cells
        or not any(switches[index].gate in cells for index in arc.steps[-1].switches)
    )
    return replace(form, arcs=arcs, pairs=pairs)


def _by_pair(form: StageForm, arc: StageArc, outputs: set[int]) -> bool:
    """Tell whether an arc leads from an output of a pair through a transistor of the pair."""
    turned = {form.network.switches[index].gate for index in arc.steps[0].switches}
    return arc.output in outputs and turned <= outputs


def with_sense_amplifiers(storage: Storage, stages: Sequence[AlikeStages]) -> Storage:
    """Return the storage of a block with its timed sense amplifiers as they are timed.

    Parameters
    ----------
    storage : Storage
    stages : sequence of AlikeStages
    """
    found = [
        element
        for some in stages
        for pair in some.form.pairs
        for own in some.nets.tolist()
        for element in _elements(some.form, pair, own, storage)
    ]
    if not found:
        return storage
    nets = {net for element in found for loop in element.loops for net in loop.nets}
    others = [
        one
        for one in storage.elements
        if nets.isdisjoint(net for loop in one.loops for net in loop.nets)
    ]
    every = sorted((*others, *found), key=lambda one: min(one.loops[0].nets))
    return replace(storage, elements=tuple(every))


def _elements(
    form: StageForm, pair: tuple[int, int], own: list[int], storage: Storage
) -> list[Element]:
    """Return the element of one pair: its enable as clock, the other inputs as data.

    Of a cell what opens its passes is the clock.
    """
    root, inverted = storage.phases.root, storage.phases.inverted
    arcs = [arc for arc in form.arcs if arc.output in pair]
    enables = {
        (int(root[own[arc.input]]), bool(arc.input_rising ^ inverted[own[arc.input]]))
        for arc in arcs
        if arc.factor > 1 and arc.switching in arc.steps[-1].switches
    }
    kind = SENSE_AMPLIFIER if enables else LATCH
    if not enables:
        enables = {
            (int(root[own[arc.input]]), bool(arc.input_rising ^ inverted[own[arc.input]]))
            for arc in arcs
            if arc.switching in arc.steps[0].switches
        }
    clocks = {net for net, _ in enables}
    data = dict.fromkeys(own[arc.input] for arc in arcs)
    stored = tuple(net for net in data if int(root[net]) not in clocks)
    nets = tuple(sorted(own[net] for net in pair))
    return [Element(kind, (Loop(nets, tuple(sorted(enables)), stored),))]
