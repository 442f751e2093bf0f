"""Simulated voltages along a path, and the simulated stages beside their estimates."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.report.page.axis import Axis
from evenstage.report.page.element import element, number, picture, share, text
from evenstage.report.page.parts import Cell, Figure, Heading, Table
from evenstage.report.paper import Paper
from evenstage.report.scale import Scale, percent
from evenstage.simulation.results import Traces
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.report.page.element import Element
    from evenstage.report.page.parts import Part
    from evenstage.simulation.results import SimulatedPath

_HEIGHT: Final = 260
_TOP: Final = 44
_LANE: Final = 14

#: Drawn points of a curve, and drawn curves.
_POINTS: Final = 160
_CURVES: Final = 24
_PAPER: Final = Paper(unicode=True)


def waveform_parts(paths: Sequence[tuple[str, SimulatedPath]]) -> tuple[Part, ...]:
    """Return the voltages of paths on a common time axis, their stages estimated and simulated.

    Parameters
    ----------
    paths : sequence of (str, SimulatedPath)
        When each was so, as in ``before``, or empty where there is one only.
    """
    times = [path.traces.time for _, path in paths]
    first, last = min(time[0] for time in times), max(time[-1] for time in times)
    axis = Axis(float(first), float(last), "s")
    return tuple(
        part
        for when, path in paths
        for part in (_figure(path.traces.thinned(), when, axis), _stage_table(path, when))
    )


def _figure(traces: Traces, when: str, axis: Axis) -> Figure:
    low, high = float(traces.voltage.min()), float(traces.voltage.max())
    chosen = list(range(len(traces.nets)))[:_CURVES]
    lines = [_curve(traces, index, axis, (low, high)) for index in chosen]
    inner = element(
        "svg",
        *lines,
        viewBox=f"0 0 1000 {_HEIGHT}",
        preserveAspectRatio="none",
        x=0,
        y=_TOP,
        width="100%",
        height=_HEIGHT,
    )
    grid = element("svg", *axis.grid(_HEIGHT), x=0, y=_TOP, width="100%", height=_HEIGHT)
    floor = _TOP + _HEIGHT
    marks = [element("line", x1=0, x2="100%", y1=floor, y2=floor, class_="frame")]
    for value in axis.ticks():
        anchor = "middle" if axis.at(value) > 0.03 else ""
        marks.append(text(share(axis.at(value)), floor + 16, axis.label(value), "tick", anchor))
    marks.append(text("100%", floor + 16, axis.scale.unit, "tick", "end"))
    label = (
        f"Simulated voltages {when} of {', '.join(traces.nets[i] for i in chosen)} from "
        f"{engineering(low, 'V')} to {engineering(high, 'V')} over {axis.scale.text(axis.most)}"
    ).replace("  ", " ")
    chart = picture(
        label,
        grid,
        inner,
        *marks,
        *_numbers(traces, chosen, axis, (low, high)),
        class_="strip",
        height=floor + 22,
    )
    legend = tuple(_key(place, index, traces) for place, index in enumerate(chosen))
    return Figure((chart,), _caption(traces, when, low, high), legend)


def _caption(traces: Traces, when: str, low: float, high: float) -> str:
    left = len(traces.nets) - _CURVES
    more = f" The last {left} nets are left out." if left > 0 else ""
    return (
        f"Simulated voltages {when}, from {engineering(low, 'V')} to {engineering(high, 'V')}. "
        f"Numbers stand where a net crosses half of that.{more}"
    ).replace(" ,", ",")


def _style(index: int) -> str:
    return f"trace t{index % 4} d{index // 4 % 3}"


def _curve(traces: Traces, index: int, axis: Axis, ends: tuple[float, float]) -> Element:
    own = slice(index, index + 1)
    one = Traces(traces.nets[own], traces.time, traces.voltage[own]).thinned(_POINTS)
    places = " ".join(
        f"{number(1000 * axis.at(float(t)))},{number(_HEIGHT * _down(float(v), ends))}"
        for t, v in zip(one.time, one.voltage[0], strict=True)
    )
    return element(
        "polyline", points=places, class_=_style(index), vector_effect="non-scaling-stroke"
    )


def _down(voltage: float, ends: tuple[float, float]) -> float:
    low, high = ends
    return 0.97 - 0.94 * (voltage - low) / ((high - low) or 1.0)


def _numbers(
    traces: Traces, chosen: list[int], axis: Axis, ends: tuple[float, float]
) -> list[Element]:
    """Return a number over the place where each curve crosses the middle, in three lanes."""
    drawn = []
    middle = (ends[0] + ends[1]) / 2
    for index in chosen:
        above = traces.voltage[index] > middle
        crossings = np.flatnonzero(above[1:] != above[:-1])
        if len(crossings):
            place = share(axis.at(float(traces.time[crossings[-1] + 1])))
            lane = 12 + _LANE * (index % 3)
            drawn.append(text(place, lane, str(index), "tick", "middle"))
            drawn.append(
                element(
                    "line", x1=place, x2=place, y1=lane + 3, y2=_TOP + _HEIGHT / 2, class_="leader"
                )
            )
    return drawn


def _key(place: int, index: int, traces: Traces) -> Element:
    line = element("line", x1=0, x2=26, y1=8, y2=8, class_=_style(index))
    sample = element("svg", line, width=26, height=16, aria_hidden="true")
    return element(
        "span", sample, f" {place} {_PAPER.shorten(traces.nets[index], 28)}", class_="key"
    )


def _stage_table(path: SimulatedPath, when: str) -> Table:
    delays = [d for s in path.stages for d in (s.delay, s.estimate.delay)]
    delay = Scale.of([*delays, path.delay, path.estimated_delay], "s")
    rows = [
        (
            Cell(f"{place:<4}{_PAPER.shorten(one.estimate.instance, 28)}"),
            Cell(_PAPER.edge(one.estimate.edge) + " " + _PAPER.shorten(one.estimate.output, 20)),
            Cell(delay.number(one.estimate.delay)),
            Cell(delay.number(one.delay)),
            Cell(percent(one.delay, one.estimate.delay)),
        )
        for place, one in enumerate(path.stages, 1)
    ]
    rows.append(
        (
            Cell("whole path"),
            Cell(),
            Cell(delay.number(path.estimated_delay)),
            Cell(delay.number(path.delay)),
            Cell(percent(path.delay, path.estimated_delay)),
        )
    )
    headings = (
        Heading("stage"),
        Heading("output"),
        Heading(f"estimated, {delay.unit}", "number"),
        Heading(f"simulated, {delay.unit}", "number"),
        Heading("estimate against simulation", "number"),
    )
    return Table(f"Estimated and simulated {when}".strip(), headings, tuple(rows))
