"""Groups that are no single gate to stages: what is known around each, and what it is then."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from evenstage.circuit.context import Surroundings
from evenstage.circuit.function import Literal
from evenstage.circuit.kinds.kept import with_nets, without_keepers
from evenstage.circuit.rows import distinct_rows
from evenstage.circuit.sensing import apart_from_pairs, sensing
from evenstage.circuit.sorting import rows_of
from evenstage.circuit.stage import FEEDS_BACK, recognise_stage
from evenstage.circuit.stage_form import Facts, StageForm
from evenstage.progress import tell

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from evenstage.brief import Brief
    from evenstage.circuit.context import Context
    from evenstage.circuit.gate import Unrecognised
    from evenstage.circuit.groups import AlikeGroups
    from evenstage.circuit.network import BoolArray, Switch
    from evenstage.circuit.sorting import Sorted
    from evenstage.netlist.devices import Devices, IntArray
    from evenstage.pattern import Pattern

_DOUBLINGS = 32
"""Chains of inverters are followed over 2 to this power of them; what goes on is a loop."""


@dataclass(frozen=True)
class StagesFound:
    """Groups that are stages, and groups that are nothing known and why."""

    stages: tuple[tuple[StageForm, AlikeGroups], ...]
    strange: tuple[tuple[str, AlikeGroups], ...]


def sort_stages(
    devices: Devices, found: Sorted, brief: Brief | None, clocks: IntArray
) -> StagesFound:
    """Recognise the stages among groups that are no single gate.

    Parameters
    ----------
    devices : Devices
    found : Sorted
        The gates, whose inverters tell which signals are complements, and the groups left over.
    brief : Brief, optional
        Its inputs and outputs tell which way open ends go.
    clocks : IntArray
        Nets that it says are clocks.
    """
    stages, strange = [], []
    if found.strange:
        around = _Around(devices, found, brief, clocks)
        others = [some for _, some in found.strange]
        surroundings = Surroundings(devices, found.gates, others, clocks)
        for done, (reason, whole) in enumerate(found.strange):
            tell("recognising stages", done / len(found.strange))
            for context, placed in surroundings.split(whole):
                some = rows_of(whole, placed)
                for facts, rows in around.split(some):
                    form = _recognised(some.network, facts, context)
                    part = rows_of(some, rows)
                    if isinstance(form, StageForm):
                        stages.append((form, part))
                    else:
                        strange.append((form.reason or reason, part))
    return StagesFound(tuple(stages), tuple(strange))


def _recognised(
    network: tuple[Switch, ...], facts: Facts, context: Context
) -> StageForm | Unrecognised:
    """Recognise a stage without its keepers if it has some, which whatever drives overpowers."""
    rest, keepers = without_keepers(network, context)
    form = recognise_stage(rest, facts)
    pairs: tuple[tuple[int, int], ...] = ()
    if not isinstance(form, StageForm) and form.reason == FEEDS_BACK:
        without, told = apart_from_pairs(rest, facts)
        amplifier = recognise_stage(without, told) if told.pairs else form
        if isinstance(amplifier, StageForm):
            amplifier = sensing(amplifier, told.pairs)
            pairs, form = (told.pairs, amplifier) if amplifier.arcs else ((), form)
    if not keepers and not pairs:
        return form
    if not isinstance(form, StageForm):
        return recognise_stage(network, facts)
    parts = (
        replace(
            part,
            drawn=tuple(network[column] for column in columns),
            network=with_nets(part.network, network),
        )
        for part, columns in zip(form.parts, form.columns, strict=True)
    )
    return replace(
        form,
        drawn=network,
        network=with_nets(form.network, network),
        parts=tuple(parts),
        weak=keepers,
    )


class _Around:
    """What is known of every net of a block; columns of shape ``(nets,)``."""

    def __init__(
        self, devices: Devices, found: Sorted, brief: Brief | None, clocks: IntArray
    ) -> None:
        nets = len(devices.net_names)
        self._root, self._same = _roots(found, nets)
        self._gating = np.bincount(devices.gate, minlength=nets) > 0
        self._clock = np.zeros(nets, bool)
        self._clock[clocks] = True
        for form, some in found.gates:
            for local in form.precharging_clocks:
                self._clock[some.nets[:, local]] = True
        self._open = np.zeros(nets, bool)
        self._open[list(devices.ports)] = True
        self._open[[net for plus, minus, _ in devices.source_nets for net in (plus, minus)]] = True
        self._seen = self._gating | self._open
        ends = np.unique(np.concatenate([some.nets.ravel() for _, some in found.strange]))
        inputs = [p for one in (brief.inputs if brief else ()) for p in one.nets]
        outputs = [p for one in (brief.outputs if brief else ()) for p in one.nets]
        # Names are put together on demand, and that takes its time.
        names = [devices.net_names[net] for net in ends.tolist()] if inputs or outputs else []
        self._input = _named(nets, ends, names, inputs)
        self._output = _named(nets, ends, names, outputs)
        self._open |= self._input

    def split(self, some: AlikeGroups) -> Iterator[tuple[Facts, IntArray]]:
        """Yield the distinct facts that equal groups stand in, each with the rows of its groups."""
        ends = list(dict.fromkeys(n for s in some.network for n in (s.a, s.b) if n >= 0))
        asked = list(dict.fromkeys([s.gate for s in some.network if s.gate >= 0] + ends))
        root, same = self._root[some.nets[:, asked]], self._same[some.nets[:, asked]]
        first = np.stack([(root == column[:, None]).argmax(axis=1) for column in root.T], axis=1)
        straight = same == np.take_along_axis(same, first, axis=1)
        here = some.nets[:, ends]
        marks = [
            column[here]
            for column in (self._seen, self._gating, self._open, self._input, self._output)
        ]
        inputs = list(dict.fromkeys(s.gate for s in some.network if s.gate >= 0))
        table = np.concatenate([first, straight, *marks, self._clock[some.nets[:, inputs]]], axis=1)
        kinds, inverse = distinct_rows(table)
        for index, kind in enumerate(kinds.tolist()):
            ties = zip(asked, kind[: len(asked)], kind[len(asked) :], strict=False)
            flags = [
                tuple(end for end, flag in zip(ends, kind[begin:], strict=False) if flag)
                for begin in range(2 * len(asked), len(kind) - len(inputs), len(ends))
            ]
            seen, gating, open_, given, taken = flags
            turned = zip(inputs, kind[len(kind) - len(inputs) :], strict=True)
            facts = Facts(
                ties=tuple((a, asked[b], bool(same)) for a, b, same in ties if a != asked[b]),
                seen=seen,
                gating=gating,
                open=open_,
                inputs=given,
                outputs=taken,
                clocks=tuple(net for net, is_clock in turned if is_clock),
            )
            yield facts, np.flatnonzero(inverse == index).astype(np.int32)


def _named(
    nets: int, among: IntArray, names: Sequence[str], patterns: Sequence[Pattern]
) -> BoolArray:
    """Tell which nets some patterns name; what fits none is told elsewhere."""
    found = np.zeros(nets, bool)
    if patterns:
        found[among] = [any(p.fits(name) for p in patterns) for name in names]
    return found


def _roots(found: Sorted, nets: int) -> tuple[IntArray, BoolArray]:
    """Return for each net where the chain of inverters before it begins, and whether it is equal.

    Nets in or behind a loop of inverters stand for themselves.
    """
    parent, same = np.arange(nets, dtype=np.int32), np.ones(nets, bool)
    for form, some in found.gates:
        if isinstance(form.pull_down, Literal) and form.kind == "static gate":
            driven = some.nets[:, form.output]
            parent[driven], same[driven] = some.nets[:, form.pull_down.net], False
    drawn = parent
    for _ in range(_DOUBLINGS):
        if (parent[parent] == parent).all():
            break
        same, parent = same == same[parent], parent[parent]
    settled = drawn[parent] == parent
    return np.where(settled, parent, np.arange(nets, dtype=np.int32)), same | ~settled
