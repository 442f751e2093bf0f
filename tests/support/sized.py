"""Blocks with sizing variables, for tests of what a new width does to the text."""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING, get_args

import numpy as np
import pytest

from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read_bytes
from evenstage.netlist.rewriting.edits import rewrite
from evenstage.netlist.rewriting.handles import WidthHandles, width_handles
from evenstage.netlist.rewriting.sized_block import Slot
from evenstage.netlist.rewriting.widths import WidthPlan, WidthWish, plan_widths
from evenstage.pattern import Pattern
from evenstage.process.process import Polarity, Process, Transistor

if TYPE_CHECKING:
    from collections.abc import Collection, Mapping

    from evenstage.netlist.devices import Devices
    from evenstage.netlist.netlist import Netlist


def process(**changed: object) -> Process:
    """Return an invented process with the types n* and p*, some keys of both changed."""
    types = tuple(
        Transistor(
            models=(Pattern(f"{polarity}*"),),
            polarity=polarity,
            length=60e-9,
            r_w=2e-3,
            c_gate=1.2e-9,
            c_drain=0.8e-9,
        )
        for polarity in get_args(Polarity)
    )
    changed_types = tuple(replace(kind, **changed) for kind in types)  # type: ignore[arg-type]  # checked by each test
    return Process(name="invented", supply=1.2, transistors=changed_types)


def sized(
    text: bytes | Netlist,
    *,
    leaves: Collection[str] = (),
    apart: Collection[str] = (),
    using: Process | None = None,
    copies: int = 4,
    top: str | None = None,
) -> WidthHandles:
    """Return the handles of a block.

    Each call of a leaf is a variable; so are all cards of any other subcircuit together, but for
    the names in ``apart``, which have variables of their own.
    """
    netlist = read_bytes(text, "a.sp", Path("/design")) if isinstance(text, bytes) else text
    using = using or process()
    devices = elaborate(netlist, top, using)
    numbers: dict[object, int] = {}
    variable_of = {}
    for number, instance in zip(devices.card.tolist(), devices.instance.tolist(), strict=True):
        card = netlist.card(number)
        caller = int(devices.instance_card[instance]) if card.scope in leaves else None
        variable: object = card.scope if caller is None else caller
        if card.name in apart:
            variable = (variable, card.name)
        variable_of[Slot(number, caller)] = numbers.setdefault(variable, len(numbers))
    return width_handles(devices, using, variable_of, copies)


def slot_name(handles: WidthHandles, slot: Slot) -> str:
    """Return a short name: ``m1``, or ``x1.m1`` on a call of a leaf."""
    names = [handles.block.netlist.card(n).name for n in (slot.caller, slot.card) if n is not None]
    return ".".join(names)


def wish_list(
    handles: WidthHandles, factors: Mapping[str, float], why: str = "reason"
) -> list[WidthWish]:
    """Return wishes by slot name, or by the part of it before the dot."""
    wishes = []
    for slot, handle in handles.items():
        name = slot_name(handles, slot)
        factor = factors.get(name, factors.get(name.split(".")[0]))
        if factor is not None:
            old = handle.drawing.width
            new = handle.drawable(old * factor, 5e-9)
            wishes.append(WidthWish(card=slot.card, caller=slot.caller, old=old, new=new, why=why))
    return wishes


def planned(handles: WidthHandles, factors: Mapping[str, float], why: str = "reason") -> WidthPlan:
    """Return the plan for some factors by slot name."""
    return plan_widths(handles, wish_list(handles, factors, why))


def rewritten(handles: WidthHandles, plan: WidthPlan) -> bytes:
    """Return the main file after a plan."""
    main = handles.block.netlist.sources[0]
    return rewrite(handles.block.netlist, plan.edits).get(main.path, main.data)


@dataclass(frozen=True, slots=True)
class Laid:
    """A transistor of a block without its width."""

    nets: tuple[str, ...]
    model: str
    length: float
    multiplier: float


def laid_out(devices: Devices) -> dict[str, Laid]:
    """Return how each transistor is connected, by its path."""
    pins = np.stack([devices.drain, devices.gate, devices.source, devices.bulk], axis=1)
    return {
        devices.card_path(int(devices.card[i]), int(devices.instance[i])): Laid(
            tuple(devices.net_names[net] for net in pins[i]),
            devices.models[devices.model[i]].name,
            float(devices.length[i]),
            float(devices.multiplier[i]),
        )
        for i in range(len(devices))
    }


def widths(devices: Devices) -> dict[str, float]:
    """Return the width of each transistor, m, by its path."""
    return {
        devices.card_path(int(card), int(instance)): float(width)
        for card, instance, width in zip(devices.card, devices.instance, devices.width, strict=True)
    }


def assert_reads_back(handles: WidthHandles, plan: WidthPlan) -> Devices:
    """Check that the rewritten text has the same circuit with the widths said to be written."""
    before = handles.block.devices
    netlist = read_bytes(rewritten(handles, plan), "a.sp", Path("/design"))
    after = elaborate(netlist, before.top or None, handles.block.process)
    factor = {Slot(w.card, w.caller): w.new / w.old for w in plan.written}
    callers = before.instance_card[before.instance].tolist()
    slots = [
        Slot(card, caller) if Slot(card, caller) in handles else Slot(card)
        for card, caller in zip(before.card.tolist(), callers, strict=True)
    ]
    expected = [
        width * factor.get(slot, 1.0)
        for slot, width in zip(slots, before.width.tolist(), strict=True)
    ]
    assert laid_out(after) == laid_out(before)
    assert widths(after) == pytest.approx(
        dict(zip(widths(before), expected, strict=True)), rel=1e-9, abs=0
    )
    return after


def check(
    before: bytes,
    after: bytes,
    factors: Mapping[str, float],
    *,
    leaves: Collection[str] = (),
    top: str | None = None,
) -> None:
    """Compare a rewritten text, and that it reads back with the widths said to be written."""
    handles = sized(before, leaves=leaves, top=top)
    plan = planned(handles, factors)
    assert plan.refused == ()
    assert_reads_back(handles, plan)
    assert rewritten(handles, plan).decode("latin-1") == after.decode("latin-1")
