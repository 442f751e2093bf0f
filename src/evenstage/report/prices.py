"""What limits would buy if they left more room."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.scale import Scale
from evenstage.report.words import listed

if TYPE_CHECKING:
    from evenstage.report.paper import Paper
    from evenstage.sizing.results import PricedLimit, Sizing

_UNIT: Final = {"delay": "s", "width": "m", "energy": "F"}
_WORDS: Final[dict[PricedLimit, str]] = {
    "input": "10 % more capacitance at {}",
    "transition": "transitions 10 % slower than the limit",
    "greatest width": "a greatest width 10 % larger at {}",
    "least width": "a least width 10 % smaller at {}",
    "fixed": "{}, which may not change, 10 % wider or narrower",
    "budget": "10 % more to spend",
    "skew": "10 % more skew at {}",
}
#: Lines, and names on one of them.
_LINES: Final = 6
_NAMES: Final = 3


def price_lines(paper: Paper, sizing: Sizing) -> list[str]:
    """Return a line for each limit, the dearest first; limits that buy the same share one."""
    if not sizing.prices:
        return []
    unit = _UNIT[sizing.bound_on]
    scale = Scale.of((price.buys for price in sizing.prices), unit, digits=3)
    alike: dict[tuple[PricedLimit, str], list[str]] = {}
    for price in sizing.prices:
        alike.setdefault((price.limit, scale.text(price.buys)), []).append(price.name)
    lines = []
    for (limit, buys), names in list(alike.items())[:_LINES]:
        each = ", each" if len(names) > 1 else ""
        text = f"{buys}: {_WORDS[limit].format(listed(names, _NAMES))}{each}"
        lines += paper.paragraph(text, indent=2, hanging=4)
    if len(alike) > _LINES:
        lines += paper.paragraph(f"and {len(alike) - _LINES} more that buy less", indent=2)
    what = {"delay": "the least worst charged delay", "width": "the least width"}
    goal = what.get(sizing.bound_on, "the least switched capacitance")
    same = "" if sizing.bound_on == "delay" else " at the same charged delay"
    text = f"Each by itself and at most: {goal}{same} falls by no more than this."
    return [*lines, "", *paper.paragraph(text, indent=2)]
