"""Latches without feedback: a net that keeps its charge while what drives it is off.

A transmission gate or a clocked inverter into a gate stores on the capacitance of the net between
them. It is one where everything that drives the net waits for one condition: of a multiplexer's
inputs each has its own. If the brief names clocks, only they make such latches. What a dynamic gate
puts out is no data: it moves after its clock, and the edge runs on through what the clock has
opened.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from evenstage.circuit.function import And, Expression, Literal, Not, When
from evenstage.circuit.kinds.floating import SINGLE_PHASE, TRI_STATE
from evenstage.circuit.storage.elements import DYNAMIC, Element, Loop

if TYPE_CHECKING:
    from collections.abc import Iterable, Iterator, Sequence

    from evenstage.circuit.gate import GateForm
    from evenstage.circuit.literals import Condition
    from evenstage.circuit.network import BoolArray
    from evenstage.circuit.stage_form import Sink, StageForm
    from evenstage.circuit.stage_tables import AlikeStages
    from evenstage.circuit.storage.elements import Storage
    from evenstage.circuit.storage.phases import Phases
    from evenstage.circuit.tables import AlikeGates
    from evenstage.netlist.devices import Devices, IntArray


@dataclass(frozen=True, slots=True)
class _Latch:
    """A net of a form that may be one; all nets are local."""

    net: int
    clocks: tuple[Condition, ...]
    data: tuple[int, ...]


@dataclass(frozen=True)
class _Facts:
    """Nets by what they are: phases, and columns of shape (nets,)."""

    phases: Phases
    may_be: BoolArray
    is_clock: BoolArray
    is_dynamic: BoolArray


def with_dynamic(
    storage: Storage,
    devices: Devices,
    alike: Sequence[AlikeGates],
    stages: Sequence[AlikeStages],
    clocks: IntArray,
) -> Storage:
    """Return the storage of a block with its latches without feedback.

    Parameters
    ----------
    storage : Storage
        The loops of the block.
    devices : Devices
    alike : sequence of AlikeGates
    stages : sequence of AlikeStages
    clocks : IntArray
        Nets that the brief says are clocks; where there are any, no other counts.
    """
    facts = _Facts(
        storage.phases,
        _candidates(storage, devices),
        _clocks(storage, clocks),
        _dynamic_nets(alike, stages, len(devices.net_names)),
    )
    found = [
        *(
            one
            for some in alike
            if some.form.floats and some.form.arcs
            for latch in _of_gate(some.form)
            for one in _elements(latch, some.nets, facts)
        ),
        *(
            one
            for some in stages
            for sink in some.form.sinks
            for latch in _of_sink(some.form, sink)
            for one in _elements(latch, some.nets, facts)
        ),
    ]
    if not found:
        return storage
    every = sorted((*storage.elements, *found), key=lambda one: min(one.loops[0].nets))
    return replace(storage, elements=tuple(every))


def _candidates(storage: Storage, devices: Devices) -> BoolArray:
    """Tell which nets gates listen to, though no port and in no loop, shape (nets,)."""
    found = np.zeros(len(devices.net_names), bool)
    found[devices.gate] = True
    found[list(devices.ports)] = False
    for element in storage.elements:
        for loop in element.loops:
            found[list(loop.nets)] = False
    return found


def _clocks(storage: Storage, clocks: IntArray) -> BoolArray:
    found = np.full(len(storage.phases.root), not len(clocks))
    found[storage.phases.root[clocks]] = True
    return found


def _dynamic_nets(
    alike: Sequence[AlikeGates], stages: Sequence[AlikeStages], nets: int
) -> BoolArray:
    found = np.zeros(nets, bool)
    for some in alike:
        if some.form.precharge:
            found[some.nets[:, some.form.output]] = True
    for stage in stages:
        for arc in stage.form.precharge:
            found[stage.nets[:, arc.output]] = True
    return found


def _of_gate(form: GateForm) -> Iterator[_Latch]:
    clocks: tuple[Condition, ...] = ()
    if form.kind == TRI_STATE and isinstance(form.function, When):
        clocks = tuple(_conditions(form.function.condition))
    elif form.kind == SINGLE_PHASE:
        polarity = {p: {s.gate for s in form.network.switches if s.polarity == p} for p in "np"}
        (clock,) = polarity["n"] ^ polarity["p"]
        clocks = ((clock, clock in polarity["n"]),)
    used = {net for net, _ in clocks}
    data = tuple(net for net in form.network.inputs if net not in used)
    if clocks and data:
        yield _Latch(form.output, clocks, data)


def _conditions(expression: Expression) -> Iterator[Condition]:
    """Yield the conditions that a conjunction is made of."""
    for term in expression.terms if isinstance(expression, And) else (expression,):
        if isinstance(term, Literal):
            yield term.net, True
        elif isinstance(term, Not) and isinstance(term.term, Literal):
            yield term.term.net, False


def _of_sink(form: StageForm, sink: Sink) -> Iterator[_Latch]:
    if not (sink.high and sink.low):
        return
    clocks = tuple(sorted(frozenset.intersection(*sink.high, *sink.low)))
    data = tuple(dict.fromkeys(arc.input for arc in form.arcs if arc.output == sink.node))
    if clocks:
        yield _Latch(sink.node, clocks, data)


def _elements(latch: _Latch, nets: IntArray, facts: _Facts) -> Iterable[Element]:
    """Yield the latches of all groups of one form."""
    root, inverted = facts.phases.root, facts.phases.inverted
    for row in np.flatnonzero(facts.may_be[nets[:, latch.net]]).tolist():
        own = nets[row]
        clocks = {
            (int(root[own[net]]), bool(level ^ inverted[own[net]])) for net, level in latch.clocks
        }
        if all(facts.is_clock[net] for net, _ in clocks):
            used = {net for net, _ in clocks}
            data = dict.fromkeys(int(own[net]) for net in latch.data)
            stored = tuple(
                net for net in data if int(root[net]) not in used and not facts.is_dynamic[net]
            )
            if stored:
                loop = Loop((int(own[latch.net]),), tuple(sorted(clocks)), stored)
                yield Element(DYNAMIC, (loop,))
