"""What each size's change does on its own, in every corner."""

from __future__ import annotations

from dataclasses import fields
from typing import TYPE_CHECKING

import numpy as np

from evenstage.timing.trials import Trials, tried

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.sizing.partition import Partition
    from evenstage.sizing.timed import Timed
    from evenstage.timing.sweep import Timing


def tried_sizes(
    block: Timed,
    factor: FloatArray,
    parts: Partition,
    sizes: IntArray,
    watched: Sequence[tuple[IntArray, FloatArray]] = (),
) -> list[Trials]:
    """Time every change of one size by itself, once in each corner.

    A trial takes whole gates. Where pull-up and pull-down have sizes of their own the changes of
    either side are tried in a round of their own.

    Parameters
    ----------
    block : Timed
        As it is.
    factor : FloatArray, shape (devices,)
        By what each device's width changes when all changes are made.
    parts : Partition
    sizes : IntArray
        Which sizes are tried; trials come in this order.
    watched : sequence of (IntArray, FloatArray)
        For each corner, nets whose capacitance is wanted, and the Elmore limit of each circuit arc,
        s; empty: none.
    """
    nothing = np.zeros(0, np.int32)
    every = watched or [(nothing, np.full(len(one.circuit.arcs), np.inf)) for one in block.corners]
    return [
        _in_corner(timing, factor, parts, sizes, *some)
        for timing, some in zip(block.corners, every, strict=True)
    ]


def _in_corner(
    timing: Timing,
    factor: FloatArray,
    parts: Partition,
    sizes: IntArray,
    nets: IntArray,
    elmore_limit: FloatArray,
) -> Trials:
    rounds, places = [], []
    for side in (0, 1):
        place = np.flatnonzero(parts.side[sizes] == side)
        if not len(place):
            continue
        number = np.full(len(parts) + 1, -1, np.int32)
        number[sizes[place]] = np.arange(len(place))
        mine = number[parts.of_device] >= 0
        changed = timing.circuit.resized(np.where(mine, factor, 1.0))
        trial = number[parts.of_gate[:, side]]
        found = tried(timing, changed, trial, nets=nets, elmore_limit=elmore_limit)
        rounds.append(found)
        places.append(place)
    return _in_order(rounds, places)


def _in_order(rounds: Sequence[Trials], places: Sequence[IntArray]) -> Trials:
    """Put the trials of several rounds in the order of the sizes."""
    if len(rounds) == 1:
        return rounds[0]
    order = np.argsort(np.concatenate(places), kind="stable")
    columns = {
        field.name: np.concatenate([getattr(one, field.name) for one in rounds], axis=-1)
        for field in fields(Trials)
    }
    return Trials(**{name: values[..., order] for name, values in columns.items()})
