"""Whether two netlists are one structure up to widths, and so compute the same function.

Compared are the transistors in their order: name and place of their cards, nets, models, lengths
and copies; capacitors, resistors, sources and ports likewise. Widths, fingers and diffusion are
free. Cards may come from copies of a definition: what counts is what is laid out.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

if TYPE_CHECKING:
    from collections.abc import Iterator

    from evenstage.netlist.devices import Devices, FloatArray, IntArray

#: What the name of a sized copy ends with.
_COPY_ENDING: Final = re.compile(r"_s\d+$")


@dataclass(frozen=True, slots=True, kw_only=True)
class StructureCheck:
    """What came of comparing a written netlist, read back, with the one it was made of.

    Parameters
    ----------
    same : bool or None
        Whether both are one structure up to widths; None: not compared.
    reason : str
        The first difference, or why nothing was compared; empty where they are the same.
    transistors : int
        How many were compared.
    """

    same: bool | None
    reason: str
    transistors: int


def compare_structure(before: Devices, after: Devices) -> StructureCheck:
    """Compare two blocks up to their widths."""
    reason = next(_differences(before, after), "")
    return StructureCheck(same=not reason, reason=reason, transistors=len(before))


def _differences(before: Devices, after: Devices) -> Iterator[str]:
    """Give differences in words; the finer ones count only where the coarser ones are none."""
    for what, old, new in (
        ("transistors", len(before), len(after)),
        ("capacitors", len(before.capacitance), len(after.capacitance)),
        ("instances", len(before.instance_parent), len(after.instance_parent)),
        ("nets", len(before.net_names), len(after.net_names)),
    ):
        if old != new:
            yield f"{old} {what} before, {new} after"
            return
    names = ([block.net_names[net] for net in block.ports] for block in (before, after))
    if before.ports != after.ports or next(names) != next(names):
        yield "the ports are others, or in another order"
    if not np.array_equal(before.instance_parent, after.instance_parent):
        yield "instances stand in others"
    if name := _renamed(before, after, before.instance_card, after.instance_card):
        yield f"instance '{name}' has another name"
    yield from _devices(before, after)
    yield from _rest(before, after)


def _devices(before: Devices, after: Devices) -> Iterator[str]:
    """Give differences of transistors."""
    if name := _renamed(before, after, before.card, after.card):
        yield f"card '{name}' has another name"
    for what, old, new in (
        ("stands in another instance", before.instance, after.instance),
        ("has its drain on another net", before.drain, after.drain),
        ("has its gate on another net", before.gate, after.gate),
        ("has its source on another net", before.source, after.source),
        ("has its bulk on another net", before.bulk, after.bulk),
        ("has another model", *_models(before, after)),
        ("has another length", before.length, after.length),
        ("has another number of copies", before.multiplier, after.multiplier),
    ):
        differs = np.flatnonzero(old != new)
        if len(differs):
            first = int(differs[0])
            name = before.card_path(int(before.card[first]), int(before.instance[first]))
            yield f"transistor '{name}' {what}"


def _rest(before: Devices, after: Devices) -> Iterator[str]:
    """Give differences of everything but transistors."""
    pairs: list[tuple[str, IntArray | FloatArray, IntArray | FloatArray]] = [
        ("capacitors lie between other nets", before.capacitor_nets, after.capacitor_nets),
        ("capacitors have other values", before.capacitance, after.capacitance),
        ("sources differ", np.array(before.source_nets), np.array(after.source_nets)),
    ]
    if (before.wires is None) != (after.wires is None):
        yield "only one has wires with resistance"
    if before.wires is not None and after.wires is not None:
        columns = ("net", "ends", "resistance", "drain", "gate", "source", "capacitor")
        pairs += [
            ("wires differ", getattr(before.wires, column), getattr(after.wires, column))
            for column in columns
        ]
    yield from (what for what, old, new in pairs if not np.array_equal(old, new))


def _renamed(before: Devices, after: Devices, old: IntArray, new: IntArray) -> str:
    """Return the name of the first card whose counterpart has another; empty where all agree.

    The block itself, card -1, has none. Each pair is looked at once, however many instances it has.
    """
    called = (old >= 0) & (new >= 0)
    pair = np.unique(old[called].astype(np.int64) << 32 | new[called])
    for one, other in zip((pair >> 32).tolist(), (pair & 0xFFFFFFFF).tolist(), strict=True):
        name = before.netlist.card_name(one)
        if name != after.netlist.card_name(other):
            return name
    return ""


def _models(before: Devices, after: Devices) -> tuple[IntArray, IntArray]:
    """Return a number for the model of each transistor, equal on both sides for equal ones."""
    numbers: dict[tuple[str, str], int] = {}
    tables = [
        np.array(
            [
                numbers.setdefault(
                    (_COPY_ENDING.sub("", model.name.lower()), model.polarity), len(numbers)
                )
                for model in block.models
            ],
            np.int32,
        )
        for block in (before, after)
    ]
    return tables[0][before.model], tables[1][after.model]
