"""Total width, or switched capacitance, against delay: what is known of the trade."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

from evenstage.report.page.axis import Axis
from evenstage.report.page.element import element, number, picture, text
from evenstage.report.page.parts import Cell, Figure, Heading, Table
from evenstage.report.scale import Scale
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.report.page.element import Element
    from evenstage.report.page.parts import Part

_WIDTH: Final = 620
_HEIGHT: Final = 300
_LEFT: Final = 62
_RIGHT: Final = 24
_TOP: Final = 30
_BOTTOM: Final = 46

#: What is spent, and the unit it is measured in.
_SPENT: Final = {"width": ("total width", "m"), "energy": ("switched capacitance", "F")}


@dataclass(frozen=True, slots=True)
class TradePoint:
    """One way to size the block.

    Parameters
    ----------
    spend, delay : float
        m of total width or F of switched capacitance; s, the worst charged delay.
    label : str
        Empty for a point that is there for the curve alone.
    """

    spend: float
    delay: float
    label: str = ""


def trade_parts(
    points: Sequence[TradePoint], bound: float | None, what: str = "width"
) -> tuple[Part, ...]:
    """Return the points on a plane of delay and total width, and the same as a table.

    Parameters
    ----------
    points : sequence of TradePoint
        With unlabelled ones they make a curve.
    bound : float, optional
        s; no widths within the limits are faster.
    what : str
        What is spent: ``width`` or ``energy``.
    """
    if not points:
        return ()
    delays = [*(point.delay for point in points), *([bound] if bound else [])]
    name, unit = _SPENT[what]
    widths = [point.spend for point in points]
    across, upward = _axis(delays, "s"), _axis(widths, unit)
    drawn = [*_frame(across, upward, what)]
    if bound:
        x = _x(across, bound)
        drawn.append(element("line", x1=x, x2=x, y1=_TOP, y2=_HEIGHT - _BOTTOM, class_="best"))
        drawn.append(text(x + 6, _TOP - 10, "least possible delay", "strong"))
    curve = sorted((point for point in points if not point.label), key=lambda p: p.delay)
    if len(curve) > 1:
        places = [f"{number(_x(across, p.delay))},{number(_y(upward, p.spend))}" for p in curve]
        drawn.append(element("polyline", points=" ".join(places), class_="curve"))
        for p in curve:
            x, y = _x(across, p.delay), _y(upward, p.spend)
            drawn.append(element("circle", cx=x, cy=y, r=2.5, class_="joint"))
    named = [point for point in points if point.label]
    drawn.extend(_markers(named, across, upward))
    label = f"{name} against delay: ".capitalize() + "; ".join(
        f"{p.label} {engineering(p.delay, 's')}, {engineering(p.spend, unit)}" for p in named
    )
    chart = picture(
        label,
        *drawn,
        class_="plane",
        width=_WIDTH,
        height=_HEIGHT,
        viewBox=f"0 0 {_WIDTH} {_HEIGHT}",
    )
    caption = f"Worst charged delay to the right, {name} upwards."
    if len(curve) > 1:
        caption += " The curve is the least for each delay, off the grid."
    return Figure((chart,), caption), _point_table([*named, *curve], bound, (name, unit))


def _axis(values: Sequence[float], unit: str) -> Axis:
    low, high = min(values), max(values)
    spare = max(0.18 * (high - low), 0.04 * high)
    return Axis(max(low - spare, 0.0), high + spare, unit)


def _x(axis: Axis, value: float) -> float:
    return _LEFT + axis.at(value) * (_WIDTH - _LEFT - _RIGHT)


def _y(axis: Axis, value: float) -> float:
    return _HEIGHT - _BOTTOM - axis.at(value) * (_HEIGHT - _TOP - _BOTTOM)


def _frame(across: Axis, upward: Axis, what: str) -> list[Element]:
    floor, right = _HEIGHT - _BOTTOM, _WIDTH - _RIGHT
    drawn = [
        element("line", x1=_LEFT, x2=right, y1=floor, y2=floor, class_="frame"),
        element("line", x1=_LEFT, x2=_LEFT, y1=_TOP, y2=floor, class_="frame"),
        text(right, _HEIGHT - 8, f"delay, {across.scale.unit}", "tick", "end"),
        text(0, 14, f"{what}, {upward.scale.unit}", "tick"),
    ]
    for value in across.ticks():
        x = _x(across, value)
        drawn.append(element("line", x1=x, x2=x, y1=_TOP, y2=floor, class_="grid"))
        drawn.append(text(x, floor + 18, across.label(value), "tick", "middle"))
    for value in upward.ticks():
        y = _y(upward, value)
        drawn.append(element("line", x1=_LEFT, x2=right, y1=y, y2=y, class_="grid"))
        drawn.append(text(_LEFT - 8, y + 4, upward.label(value), "tick", "end"))
    return drawn


def _markers(points: Sequence[TradePoint], across: Axis, upward: Axis) -> list[Element]:
    """Return the labelled points, labels moved apart where they would touch."""
    drawn: list[Element] = []
    taken: list[tuple[float, float, float]] = []
    for place, point in enumerate(points):
        x, y = _x(across, point.delay), _y(upward, point.spend)
        long = 7.5 * len(point.label)
        to_right = x + 14 + long < _WIDTH - _RIGHT
        left = x + 12 if to_right else x - 12 - long
        line = y - 10
        while any(abs(line - b) < 17 and left < c and a < left + long for a, b, c in taken):
            line -= 17
        taken.append((left, line, left + long))
        drawn.append(_marker(place, x, y))
        anchor = "" if to_right else "end"
        drawn.append(text(x + 12 if to_right else x - 12, line, point.label, "strong", anchor))
    return drawn


def _marker(place: int, x: float, y: float) -> Element:
    """Return a hollow circle, a filled one, a square or a diamond."""
    if place == 0:
        return element("circle", cx=x, cy=y, r=6, class_="dot before")
    if place == 1:
        return element("circle", cx=x, cy=y, r=6, class_="dot after")
    if place == 2:
        return element("rect", x=x - 5, y=y - 5, width=10, height=10, class_="dot after")
    corners = f"{number(x)},{number(y - 7)} {number(x + 7)},{number(y)} "
    corners += f"{number(x)},{number(y + 7)} {number(x - 7)},{number(y)}"
    return element("polygon", points=corners, class_="dot after")


def _point_table(
    points: Sequence[TradePoint], bound: float | None, spent: tuple[str, str]
) -> Table:
    name, unit = spent
    delay = Scale.of([*(p.delay for p in points), *([bound] if bound else [])], "s")
    width = Scale.of((p.spend for p in points), unit)
    named = {(p.delay, p.spend) for p in points if p.label}
    shown = [p for p in points if p.label or (p.delay, p.spend) not in named]
    rows = [
        (Cell(p.label or "on the curve"), Cell(delay.number(p.delay)), Cell(width.number(p.spend)))
        for p in sorted(shown, key=lambda p: (p.delay, p.spend))
    ]
    if bound:
        rows.insert(0, (Cell("least possible delay"), Cell(delay.number(bound)), Cell("–")))
    headings = (
        Heading("widths"),
        Heading(f"worst charged delay, {delay.unit}", "number"),
        Heading(f"{name}, {width.unit}", "number"),
    )
    return Table("The same in numbers", headings, tuple(rows), names=False)
