"""A hierarchy of templates laid out flat: every instance, every net, every transistor.

All instances of one template are alike, so nothing is done per instance in Python. Instances are
numbered depth first in the order of the calls, which is the order a reader expects: the size of the
subtree below each call is known beforehand, hence also the number of each instance.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np
from numpy.typing import NDArray

from evenstage.errors import ElaborationError

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.netlist.elaboration.template import Template

Indices = NDArray[np.signedinteger]

#: Instances beyond which a block is refused before the memory is.
_MOST_INSTANCES: Final = 50_000_000
_OWN, _PORT = -1, -2


@dataclass(frozen=True, slots=True, kw_only=True)
class Flat:
    """The layout of one block.

    Global nets come first among the nets, then those of each instance in turn. A slot is a local
    net of an instance; ``slot_base[instance] + local net`` is its number.

    Parameters
    ----------
    template : Indices, shape (i,)
        Index of each instance's template.
    parent, card : Indices, shape (i,)
        Enclosing instance and calling card; -1 for the block itself.
    multiplier : FloatArray, shape (i,)
        Product over all enclosing calls.
    slot_base : Indices, shape (i,)
        First slot of each instance.
    net : Indices, shape (s,)
        Net of each slot.
    slot_of_net : Indices, shape (m,)
        The slot each net was made for; -1 for global nets.
    """

    template: Indices
    parent: Indices
    card: Indices
    multiplier: FloatArray
    slot_base: Indices
    net: Indices
    slot_of_net: Indices

    def nets_of(self, instance: Indices, local: Indices) -> Indices:
        """Return the nets of local nets of instances."""
        nets: Indices = self.net[self.slot_base[instance] + local]
        return nets


def ranges(starts: Indices, counts: Indices) -> Indices:
    """Return ``start, start + 1, ...`` for each start, ``count`` of them, one after the other."""
    before = np.cumsum(counts) - counts
    first: Indices = np.repeat(starts - before, counts)
    return np.add(first, np.arange(len(first)))


def starts_of(counts: Sequence[int]) -> Indices:
    """Return where each of some runs begins when they lie one after the other, and the end."""
    return np.concatenate([[0], np.cumsum(np.array(counts, np.int64))]).astype(np.int64)


def flatten(
    templates: Sequence[Template], callees: Sequence[Sequence[int]], global_words: IntArray
) -> Flat:
    """Lay out the first template and all it calls.

    Parameters
    ----------
    templates : sequence of Template
        Callers before callees; the block first.
    callees : sequence of sequence of int
        For each template the index of the template of each call.
    global_words : IntArray
        The words of the global nets.

    Raises
    ------
    ElaborationError
        If the block is too large to lay out.
    """
    tables = _Tables(templates, callees, global_words)
    placed = _place(tables)
    return _connect(tables, *placed, len(global_words))


class _Tables:
    """What the templates say, one after the other in arrays."""

    def __init__(
        self,
        templates: Sequence[Template],
        callees: Sequence[Sequence[int]],
        global_words: IntArray,
    ) -> None:
        self.call_start = starts_of([len(t.calls) for t in templates])
        self.callee = np.array([c for row in callees for c in row], np.int64)
        self.call_card = np.array([c.card for t in templates for c in t.calls], np.int64)
        self.call_multiplier = np.concatenate([t.call_multiplier for t in templates])
        pins = [call.nets for template in templates for call in template.calls]
        self.pin_start = starts_of([len(nets) for nets in pins])
        self.pins = np.array([net for nets in pins for net in nets], np.int64)
        self.slot_start = starts_of([len(t.outline.nets.words) for t in templates])
        # Of each local net: own to the instance, a port, or which global net.
        self.kind = np.concatenate(
            [_kinds(t, global_words, block=i == 0) for i, t in enumerate(templates)]
        )
        self.offset = self._offsets(callees)

    def _offsets(self, callees: Sequence[Sequence[int]]) -> Indices:
        """Return how far behind its caller each call's instance is numbered."""
        sizes = [1] * len(callees)
        offsets: list[list[int]] = [[] for _ in callees]
        for index in range(len(callees) - 1, -1, -1):
            for callee in callees[index]:
                offsets[index].append(sizes[index])
                sizes[index] += sizes[callee]
        if sizes[0] > _MOST_INSTANCES:
            message = f"the block has {sizes[0]} instances, more than {_MOST_INSTANCES}"
            raise ElaborationError(message, code="too-large")
        return np.array([offset for row in offsets for offset in row], np.int64)


def _kinds(template: Template, global_words: IntArray, *, block: bool) -> Indices:
    outline = template.outline
    kinds = np.full(len(outline.nets.words), _OWN, np.int64)
    # A port of the block that has the name of a global net is that net.
    for local in np.flatnonzero(np.isin(outline.nets.words, global_words)).tolist():
        if block or local >= outline.ports:
            kinds[local] = int(np.argmax(global_words == outline.nets.words[local]))
    if not block:
        kinds[: outline.ports] = _PORT
    return kinds


def _place(
    tables: _Tables,
) -> tuple[Indices, Indices, Indices, FloatArray, list[tuple[Indices, Indices]]]:
    """Give each instance its number.

    Returns
    -------
    template, parent, card : Indices, shape (i,)
        Of each instance.
    multiplier : FloatArray, shape (i,)
        Of each instance.
    levels : list of (Indices, Indices)
        Instances by depth, with the call each comes from.
    """
    ids = np.zeros(1, np.int64)
    template = np.zeros(1, np.int64)
    multiplier = np.ones(1)
    parent, card = -np.ones(1, np.int64), -np.ones(1, np.int64)
    found = [(ids, template, parent, card, multiplier)]
    levels: list[tuple[Indices, Indices]] = []
    while True:
        counts = (tables.call_start[1:] - tables.call_start[:-1])[template]
        calls = ranges(tables.call_start[template], counts)
        if len(calls) == 0:
            break
        parent = np.repeat(ids, counts)
        ids = parent + tables.offset[calls]
        with np.errstate(over="ignore"):
            multiplier = np.repeat(multiplier, counts) * tables.call_multiplier[calls]
        template = tables.callee[calls]
        found.append((ids, template, parent, tables.call_card[calls], multiplier))
        levels.append((ids, calls))
    columns = [np.concatenate(column) for column in zip(*found, strict=True)]
    order = np.argsort(columns[0])
    template, parent, card, multiplier = (column[order] for column in columns[1:])
    return template, parent, card, multiplier, levels


def _connect(
    tables: _Tables,
    template: Indices,
    parent: Indices,
    card: Indices,
    multiplier: FloatArray,
    levels: list[tuple[Indices, Indices]],
    globals_count: int,
) -> Flat:
    """Give every local net of every instance its net."""
    counts = (tables.slot_start[1:] - tables.slot_start[:-1])[template]
    base = np.cumsum(counts) - counts
    kind = tables.kind[ranges(tables.slot_start[template], counts)]
    own = np.flatnonzero(kind == _OWN)
    net = kind
    net[own] = globals_count + np.arange(len(own))
    for ids, calls in levels:
        pins = tables.pin_start[calls + 1] - tables.pin_start[calls]
        outer = (
            np.repeat(base[parent[ids]], pins) + tables.pins[ranges(tables.pin_start[calls], pins)]
        )
        net[ranges(base[ids], pins)] = net[outer]
    return Flat(
        template=template.astype(np.int32),
        parent=parent.astype(np.int32),
        card=card.astype(np.int32),
        multiplier=multiplier,
        slot_base=base,
        net=net.astype(np.int32),
        slot_of_net=np.concatenate([np.full(globals_count, -1, np.int64), own]),
    )
