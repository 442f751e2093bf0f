"""Sizings as documents."""

from __future__ import annotations

from typing import Final, get_args

from evenstage.logic.same import StructureCheck
from evenstage.report.document.corners import SIZED_CORNERS
from evenstage.report.document.shape import (
    NUMBER,
    TEXT,
    TRUTH,
    WHOLE,
    Depending,
    Field,
    InUnits,
    Shape,
    Told,
    Within,
    many,
    optional,
    words,
)
from evenstage.report.document.timing import ANALYSIS, NOTICES
from evenstage.sizing.results import (
    Change,
    FewChanges,
    FewChangesPoint,
    Hold,
    LimitPrice,
    PricedLimit,
    Sizing,
    StageHold,
    TradeOff,
    TradeOffPoint,
)

#: What a bound can be about, and the ending of keys in its unit.
_UNITS: Final = {"delay": "s", "width": "m", "energy": "f"}

_STRUCTURE: Final = Shape(
    StructureCheck,
    Field("same", "same", optional(TRUTH)),
    Field("reason", "reason", TEXT),
    Field("transistors", "transistors", WHOLE),
)

_CHANGE: Final = Shape(
    Change,
    Field("card", "card", TEXT),
    Field("file", "file", TEXT),
    Field("line", "line", WHOLE),
    Field("instance", "instance", TEXT),
    Field("occurrences", "occurrences", WHOLE),
    Field("parameter", "parameter", TEXT),
    Field("old_m", "old", NUMBER),
    Field("new_m", "new", NUMBER),
    Told("factor", lambda change: change.factor),
    Field("alone_s", "alone", NUMBER),
    Field("last_s", "last", NUMBER),
    Field("why", "why", TEXT),
)

_HOLD: Final = Shape(
    StageHold,
    Field("instance", "instance", TEXT),
    Field("hold", "hold", words(*get_args(Hold))),
)

_FEW_CHANGES_POINT: Final = Shape(
    FewChangesPoint,
    Field("cards", "cards", WHOLE),
    Field("charged_delay_s", "charged_delay", NUMBER),
)

_FEW_CHANGES: Final = Shape(
    FewChanges,
    Field("asked", "asked", WHOLE),
    Within("today", (Field("charged_delay_s", "today_charged_delay", NUMBER),)),
    Field("bound_s", "bound", NUMBER),
    Field("every_set_tried", "every_set_tried", TRUTH),
    Field("points", "points", many(_FEW_CHANGES_POINT.kind)),
)


def _point(spend: str) -> Shape[TradeOffPoint]:
    """Return the shape of a point whose spend is width or energy."""
    return Shape(
        TradeOffPoint,
        Field("charged_delay_s", "charged_delay", NUMBER),
        Field("delay_s", "delay", NUMBER),
        InUnits({"width": "spend_m", "energy": "spend_f"}, "spend", lambda _: spend),
        InUnits({"width": "bound_m", "energy": "bound_f"}, "bound", lambda _: spend),
        Field("gap", "gap", NUMBER),
        Field("one_percent_buys_s", "one_percent_buys", optional(NUMBER)),
    )


_TRADE_OFF: Final = Shape(
    TradeOff,
    Field("spend", "spend", words("width", "energy")),
    Within(
        "today",
        (
            Field("charged_delay_s", "today_charged_delay", NUMBER),
            InUnits(
                {"width": "spend_m", "energy": "spend_f"},
                "today_spend",
                lambda curve: str(curve.spend),
            ),
        ),
    ),
    Field("knee", "knee", optional(WHOLE)),
    Depending(
        "points",
        "points",
        lambda curve: many(_point(curve.spend).kind),
        many(_point("width").kind),
    ),
)


def _price(bound_on: str) -> Shape[LimitPrice]:
    """Return the shape of what limits buy in what a bound is about."""
    return Shape(
        LimitPrice,
        Field("limit", "limit", words(*get_args(PricedLimit))),
        Field("name", "name", TEXT),
        InUnits({on: f"buys_{unit}" for on, unit in _UNITS.items()}, "buys", lambda _: bound_on),
    )


SIZING: Final = Shape(
    Sizing,
    Field("goal", "goal", TEXT),
    Field("asked_delay_s", "asked_delay", optional(NUMBER)),
    Field("bound_on", "bound_on", words(*_UNITS)),
    InUnits(
        {on: f"bound_{unit}" for on, unit in _UNITS.items()},
        "bound",
        lambda sizing: str(sizing.bound_on),
    ),
    Field("gap", "gap", NUMBER),
    Field("sharing_loss", "sharing_loss", NUMBER),
    Field("rounding_loss", "rounding_loss", NUMBER),
    Field("least_delay_s", "least_delay", NUMBER),
    Within(
        "total_width_m",
        (
            Field("before", "total_width_before", NUMBER),
            Field("after", "total_width_after", NUMBER),
        ),
    ),
    Field("free_cards", "free_cards", WHOLE),
    Field("fixed_cards", "fixed_cards", WHOLE),
    Field("already_done", "already_done", TRUTH),
    Field("structure", "structure", optional(_STRUCTURE.kind)),
    Field("changes", "changes", many(_CHANGE.kind)),
    Field("holds", "holds", many(_HOLD.kind)),
    Field("trade_off", "trade_off", optional(_TRADE_OFF.kind)),
    Depending(
        "prices",
        "prices",
        lambda sizing: many(_price(sizing.bound_on).kind),
        many(_price("delay").kind),
    ),
    Field("few_changes", "few", optional(_FEW_CHANGES.kind)),
    Field("corners", "corners", optional(SIZED_CORNERS)),
    Field("notices", "notices", NOTICES),
    Field("before", "before", ANALYSIS.kind),
    Field("after", "after", ANALYSIS.kind),
)
