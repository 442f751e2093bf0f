"""A block made ready for goals: its sizes, limits and costs in one engine."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.sizing.engine import Engine
from evenstage.sizing.joint import Joint
from evenstage.sizing.limits import limits_of, spend_of
from evenstage.sizing.model import Model

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.brief import Brief
    from evenstage.sizing.timed import Timed
    from evenstage.sizing.variables import Variables
    from evenstage.sizing.wishes import Original, Wishes


def engine_of(
    block: Timed, brief: Brief, wishes: Wishes, originals: Sequence[Original], free: Variables
) -> Engine:
    """Return the engine of a block.

    What it costs, width or capacitance, is that in the first corner.

    Parameters
    ----------
    block : Timed
        As drawn.
    brief : Brief
    wishes : Wishes
    originals : sequence of Original
        For each corner the limits that an earlier run recorded.
    free : Variables
        Which sizes may move, and how far.

    Raises
    ------
    InfeasibleError
        Where an input is above its ceiling and nothing on it may change.
    SettingsError
        Where a pattern of the brief fits no input.
    """
    spend = spend_of(block.corners[0].circuit, free, wishes.spend)
    return Engine(
        joint=Joint(tuple(Model(one.circuit, one.graph, one.unit, free) for one in block.corners)),
        limits=tuple(
            limits_of(timing, brief, original, free)
            for timing, original in zip(block.corners, originals, strict=True)
        ),
        spend=spend.per_size,
        spend_fixed=spend.fixed,
        wishes=wishes,
        cost_today=originals[0].spend or spend.today,
    )
