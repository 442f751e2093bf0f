"""Blocks with sizing variables, for tests of what a new width does to the text."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

from evenstage.netlist.edits import rewrite
from evenstage.netlist.elaborate import elaborate
from evenstage.netlist.handles import WidthHandles, width_handles
from evenstage.netlist.netlist import Netlist
from evenstage.netlist.read import read_bytes
from evenstage.netlist.sized_block import Slot
from evenstage.netlist.widths import WidthPlan, WidthWish, plan_widths
from evenstage.pattern import Pattern
from evenstage.process.process import Process, Transistor

if TYPE_CHECKING:
    from collections.abc import Collection, Mapping


def transistor(models: str, polarity: Any, **changed: Any) -> Transistor:
    """Return an invented transistor type."""
    constants = {"length": 60e-9, "r_w": 2e-3, "c_gate": 1.2e-9, "c_drain": 0.8e-9}
    return Transistor(models=(Pattern(models),), polarity=polarity, **(constants | changed))


def process(**changed: Any) -> Process:
    """Return an invented process with the types n* and p*."""
    types = (transistor("n*", "n", **changed), transistor("p*", "p", **changed))
    return Process(name="invented", supply=1.2, transistors=types)


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

    Each call of a leaf is a variable; so are all cards of any other subcircuit together, but for the
    names in ``apart``, which have variables of their own.
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
