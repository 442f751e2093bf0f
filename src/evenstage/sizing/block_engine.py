"""A block made ready for goals: its sizes, limits and costs in one engine."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.sizing.engine import Engine
from evenstage.sizing.limits import limits_of, spend_of
from evenstage.sizing.model import Model

if TYPE_CHECKING:
    from evenstage.brief import Brief
    from evenstage.sizing.variables import Variables
    from evenstage.sizing.wishes import Original, Wishes
    from evenstage.timing.sweep import Timing


def engine_of(
    timing: Timing, brief: Brief, wishes: Wishes, original: Original, free: Variables
) -> Engine:
    """Return the engine of a block.

    Parameters
    ----------
    timing : Timing
        The block as drawn.
    brief : Brief
    wishes : Wishes
    original : Original
        Limits that an earlier run recorded.
    free : Variables
        Which sizes may move, and how far.

    Raises
    ------
    InfeasibleError
        Where an input is above its ceiling and nothing on it may change.
    SettingsError
        Where a pattern of the brief fits no input.
    """
    spend = spend_of(timing.circuit, free, wishes.spend)
    return Engine(
        model=Model(timing.circuit, timing.graph, timing.unit, free),
        limits=limits_of(timing, brief, original, free),
        spend=spend.per_size,
        spend_fixed=spend.fixed,
        wishes=wishes,
        cost_today=original.spend or spend.today,
    )
