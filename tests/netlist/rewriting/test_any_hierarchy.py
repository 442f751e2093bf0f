"""Any hierarchy, any sizes: run after run the text says the widths wished for, and no others."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.brief import Brief
from evenstage.circuit.recognise import recognise
from evenstage.errors import SettingsError
from evenstage.logic.same import compare_structure
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read_bytes
from evenstage.netlist.rewriting.edits import rewrite
from evenstage.netlist.rewriting.families import find_families
from evenstage.netlist.rewriting.handles import WidthHandles, width_handles
from evenstage.netlist.rewriting.widths import WidthWish, plan_widths
from evenstage.pattern import Pattern
from evenstage.sizing.copies import shared_sizes
from evenstage.sizing.named import leaves_named
from evenstage.sizing.partition import Partition, partition
from support.blocks import plain_process
from support.random_hierarchies import Hierarchy, random_hierarchy

if TYPE_CHECKING:
    from random import Random

    from evenstage.netlist.devices import Devices, FloatArray
    from evenstage.netlist.netlist import Netlist

PROCESS = plain_process()
ROUNDS = 8
"""In so many rounds at most sizes are tied until the leaves keep to their copies."""


class Step:
    """One run on a text: random factors for all sizes that may change."""

    def __init__(self, pick: Random, text: bytes, leaves: tuple[str, ...], copies: int) -> None:
        self.netlist = read(text)
        self.devices = elaborate(self.netlist, "top", PROCESS)
        self.brief = Brief(
            top="top", leaves=known_leaves(self.devices, leaves), copies_per_leaf=copies
        )
        circuit = recognise(self.devices, PROCESS, self.brief)
        parts = partition(circuit, self.brief)
        for _ in range(ROUNDS):
            handles = width_handles(self.devices, PROCESS, parts.variable_of, copies)
            factor = self._factors(pick, parts, handles)
            label = shared_sizes(parts, handles, factor, copies)
            if len(np.unique(label)) == len(parts):
                break
            parts = parts.tied(label)
        else:
            factor = np.ones(len(factor))
        self.parts, self.handles, self.factor = parts, handles, factor

    def _factors(self, pick: Random, parts: Partition, handles: WidthHandles) -> FloatArray:
        """Return a factor for each slot."""
        fixed = {parts.variable_of[slot] for slot in handles.cannot_change()}
        sizes = [
            1.0 if size in fixed else pick.choice([1.0, 0.5, 2.0, 3.0, 1.5])
            for size in range(len(parts))
        ]
        return np.array(sizes)[parts.of_slot]

    def written(self) -> bytes:
        """Return the text with these sizes."""
        drawn = self.devices.width[self.parts.first_device]
        wishes = [
            WidthWish(card=slot.card, caller=slot.caller, old=old, new=old * factor, why="r")
            for slot, old, factor in zip(
                self.parts.slots, drawn.tolist(), self.factor.tolist(), strict=True
            )
        ]
        plan = plan_widths(self.handles, wishes)
        assert plan.refused == ()
        main = self.netlist.sources[0]
        return rewrite(self.netlist, plan.edits).get(main.path, main.data)

    def widths(self) -> FloatArray:
        """Return the widths the transistors ought to have afterwards."""
        width: FloatArray = (
            self.devices.width * np.append(self.factor, 1.0)[self.parts.slot_of_device]
        )
        return width


def read(text: bytes) -> Netlist:
    return read_bytes(text, "a.sp", Path("/design"))


def known_leaves(devices: Devices, leaves: tuple[str, ...]) -> tuple[Pattern, ...]:
    """Return the names of leaves that a block has; others would be refused."""
    found = []
    for leaf in leaves:
        try:
            leaves_named(devices, [Pattern(leaf)])
        except SettingsError:
            continue
        found.append(Pattern(leaf))
    return tuple(found)


@given(st.randoms(use_true_random=False), st.sampled_from([0, 1, 2, 4]))
@settings(deadline=None, max_examples=20)
def test_texts_say_the_widths_wished_for(pick: Random, copies: int) -> None:
    drawn: Hierarchy = random_hierarchy(pick)
    text = drawn.text.encode()
    for _ in range(3):
        step = Step(pick, text, drawn.leaves, copies)
        text = step.written()
        after = elaborate(read(text), "top", PROCESS)
        assert compare_structure(step.devices, after).same
        np.testing.assert_allclose(after.width, step.widths(), rtol=1e-6, atol=0)
        assert_few_copies(step, read(text))


def assert_few_copies(step: Step, after: Netlist) -> None:
    """Check that no leaf has more copies than allowed, and that all new ones are called."""
    devices = elaborate(after, "top", PROCESS)
    leaves_named(devices, step.brief.leaves)
    parts = partition(recognise(devices, PROCESS, step.brief), step.brief)
    block = width_handles(devices, PROCESS, parts.variable_of).block
    known = find_families(step.netlist)
    for family in find_families(after).values():
        assert block.copies_called(family) <= max(
            step.brief.copies_per_leaf, step.handles.block.copies_called(family)
        )
        for copy in set(family.copies) - known.keys():
            assert block.bindings.callers(copy) != (None,)
