"""Tables of stages with a chart in each row: when they switch, their efforts, their loads."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.page.axis import Axis
from evenstage.report.page.element import element, picture, share
from evenstage.report.page.parts import Cell, Heading, Table
from evenstage.report.paper import Paper
from evenstage.report.path_text import effort_mark
from evenstage.report.scale import Scale
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.report.page.element import Element
    from evenstage.report.page.sides import Pair, Seen, Sides
    from evenstage.timing.results import Path, Stage

#: Rows of a table of stages; what is left out stands in the remark.
_ROWS: Final = 120

#: What the parts of a delay and a load are called, and the style of each.
_KINDS: Final = ("own", "path", "side", "wire")
_KIND_NAMES: Final = ("own", "next input on the path", "side branches", "wire")

_EDGES: Final = Paper(unicode=True)


def time_table(sides: Sides) -> Table:
    """Return when each stage switches, on one time axis."""
    starts, ends = ([getattr(one, side) for one in sides.seen] for side in ("start", "end"))
    axis = Axis(min(starts), max(ends), "s")
    delay = Scale.of((one.stage.delay for one in sides.seen), "s", digits=3, least=1)
    width = Scale.of((one.stage.width for one in sides.seen), "m", digits=3)
    two = sides.before is not None
    whens = ["before", "after"] if two else [""]
    rows = [
        (
            _stage_cell(pair),
            Cell("\n".join(dict.fromkeys(_output(one) for one in pair.seen))),
            Cell(drawing=_bars(pair, axis, delay)),
            *(Cell(_figure(pair, when, delay.number, "delay")) for when in whens),
            *(Cell(_figure(pair, when, width.number, "width")) for when in whens),
        )
        for pair in sides.pairs
    ]
    headings = (
        Heading("stage"),
        Heading("output", "name"),
        Heading(f"switches, {axis.scale.unit}", "chart", axis.ruler("Time")),
        *(Heading(f"delay {when}, {delay.unit}".replace(" ,", ","), "number") for when in whens),
        *(Heading(f"width {when}, {width.unit}".replace(" ,", ","), "number") for when in whens),
    )
    legend = (key("bar before", "before"), key("bar after", "after")) if two else ()
    return _table("Stage delays on a common time axis", headings, rows, legend)


def effort_table(sides: Sides) -> Table:
    """Return each stage's effort against the best one, and what holds it."""
    efforts = [one.stage.stage_effort for one in sides.seen if one.stage.stage_effort > 0]
    best = sides.after.best_stage_effort
    values = [*efforts, *([best] if best > 0 else [])] or [1.0]
    axis = Axis(min(values) / 1.25, max(values) * 1.25, logarithmic=True)
    shown = Scale.of(values, digits=2, least=1)
    two = sides.before is not None
    whens = ["before", "after"] if two else [""]
    rows = []
    for pair in sides.pairs:
        row = [_stage_cell(pair), Cell(drawing=_efforts(pair, axis, best, shown))]
        row += [Cell(_figure(pair, when, shown.number, "stage_effort")) for when in whens]
        row += [Cell(_factors(pair.seen[-1].stage)), Cell(_remark(pair, sides))]
        rows.append(tuple(row))
    headings = (
        Heading("stage"),
        Heading("stage effort", "chart", axis.ruler("Stage effort")),
        *(Heading(f"f {when}".strip(), "number") for when in whens),
        Heading("g × h × b" + (" after" if two else ""), "name"),
        Heading("far off, held by" if sides.holds else "far off"),
    )
    legend: tuple[Element, ...] = (key("best", f"best stage effort {shown.number(best)}"),)
    legend += (
        (key("dot before", "before"), key("dot after", "after"))
        if two
        else (key("dot after", "stage"),)
    )
    return _table("Stage efforts, on a logarithmic axis", headings, rows, legend)


def load_table(sides: Sides, tau: float) -> Table:
    """Return what each stage's charged delay and load consist of.

    The delay that loads cause is shared among them in proportion to their capacitances; what a
    wire's resistance adds is not told apart.
    """
    stages = [one.stage for one in sides.seen]
    times = {stage: _time_parts(stage, tau) for stage in stages}
    caps = {stage: _cap_parts(stage) for stage in stages}
    time = Axis(0.0, max(sum(parts) for parts in times.values()) * 1.02, "s")
    load = Axis(0.0, max(sum(parts) for parts in caps.values()) * 1.02, "F")
    rows: list[tuple[Cell, ...]] = []
    for pair in sides.pairs:
        two = sides.before is not None
        rows.append(
            (
                _stage_cell(pair),
                Cell("\n".join(one.when for one in pair.seen) if two else ""),
                Cell(drawing=_stacks(pair, times, time, "charged delay")),
                Cell(drawing=_stacks(pair, caps, load, "capacitance")),
            )
        )
    headings = [
        Heading("stage"),
        Heading("when"),
        Heading(f"charged delay, {time.scale.unit}", "chart", time.ruler("Charged delay")),
        Heading(f"capacitance, {load.scale.unit}", "chart", load.ruler("Capacitance")),
    ]
    legend = tuple(
        key(f"part {kind}", name) for kind, name in zip(_KINDS, _KIND_NAMES, strict=True)
    )
    if sides.before is None:
        headings.pop(1)
        rows = [(row[0], *row[2:]) for row in rows]
    return _table("Charged delay and capacitance of each stage", tuple(headings), rows, legend)


def _table(
    caption: str,
    headings: tuple[Heading, ...],
    rows: Sequence[tuple[Cell, ...]],
    legend: tuple[Element, ...],
) -> Table:
    left_out = len(rows) - _ROWS
    remark = f"{left_out} more stages are in the JSON." if left_out > 0 else ""
    return Table(caption, headings, tuple(rows[:_ROWS]), legend, remark)


def _stage_cell(pair: Pair) -> Cell:
    gates = dict.fromkeys(one.stage.instance for one in pair.seen)
    shown = [_EDGES.shorten(gate, 28) for gate in gates]
    return Cell(f"{pair.number:<4}" + "\n    ".join(shown))


def _output(one: Seen) -> str:
    return f"{_EDGES.edge(one.stage.edge)}\N{NO-BREAK SPACE}{_EDGES.shorten(one.stage.output, 18)}"


def _figure(pair: Pair, when: str, shown: object, name: str) -> str:
    one = pair.before if when == "before" else pair.after
    if one is None or not callable(shown):
        return "–"
    return str(shown(getattr(one.stage, name)))


def _bars(pair: Pair, axis: Axis, scale: Scale) -> Element:
    drawn = axis.grid(26)
    told = []
    for one in pair.seen:
        start, end = axis.at(one.start), axis.at(one.end)
        before = one.when == "before"
        box = {"y": 5, "height": 6} if before else {"y": 13 if one.when else 7, "height": 9}
        long = max(end - start, 0.002)
        style = "bar before" if before else "bar after"
        drawn.append(element("rect", x=share(start), width=share(long), **box, class_=style))
        told.append(f"{one.when} {scale.text(one.start)} to {scale.text(one.end)}".strip())
    return picture(f"Stage {pair.number} switches {', '.join(told)}", *drawn, height=26)


def _efforts(pair: Pair, axis: Axis, best: float, scale: Scale) -> Element:
    at = share(axis.at(best))
    drawn = [
        *axis.grid(26),
        element("line", x1=at, x2=at, y1=0, y2=26, class_="best"),
    ]
    known = [one for one in pair.seen if one.stage.stage_effort > 0]
    if len(known) == 2:
        x1, x2 = (share(axis.at(one.stage.stage_effort)) for one in known)
        drawn.append(element("line", x1=x1, x2=x2, y1=13, y2=13, class_="joining"))
    for one in known:
        style = "dot before" if one.when == "before" else "dot after"
        place = share(axis.at(one.stage.stage_effort))
        drawn.append(element("circle", cx=place, cy=13, r=5, class_=style))
    told = ", ".join(f"{one.when} {scale.number(one.stage.stage_effort)}".strip() for one in known)
    label = f"Stage {pair.number}: stage effort {told or 'none'}; best {scale.number(best)}"
    return picture(label, *drawn, height=26)


def _factors(stage: Stage) -> str:
    return (
        f"{stage.logical_effort:.2f} × {stage.electrical_effort:.2f} × {stage.branching_effort:.2f}"
    )


def _remark(pair: Pair, sides: Sides) -> str:
    marks = []
    if pair.after is not None:
        path: Path = sides.after
        stage = pair.after.stage
        marks = [effort_mark(stage, path), sides.holds.get(stage.instance, "")]
    return ", ".join(mark for mark in marks if mark)


def _cap_parts(stage: Stage) -> tuple[float, ...]:
    """Return own, path, side and wire capacitance of a stage's output, F."""
    side = max(stage.load_cap - stage.on_path_cap - stage.wire_cap, 0.0)
    return stage.self_cap, stage.on_path_cap, side, stage.wire_cap


def _time_parts(stage: Stage, tau: float) -> tuple[float, ...]:
    """Return what own, path, side and wire capacitance make of a stage's charged delay, s."""
    _, path, side, wire = _cap_parts(stage)
    load = path + side + wire
    own = min(tau * stage.parasitic_delay, stage.charged_delay)
    per_cap = (stage.charged_delay - own) / load if load > 0 else 0.0
    return own, path * per_cap, side * per_cap, wire * per_cap


def _stacks(pair: Pair, parts: dict[Stage, tuple[float, ...]], axis: Axis, what: str) -> Element:
    two = len(pair.seen) > 1
    height = 34 if two else 24
    drawn, told = axis.grid(height), []
    for row, one in enumerate(pair.seen):
        y, place = (4 + 14 * row if two else 6), 0.0
        amounts = parts[one.stage]
        for kind, amount in zip(_KINDS, amounts, strict=True):
            if amount > 0:
                long = axis.at(amount)
                drawn.append(
                    element(
                        "rect",
                        x=share(place),
                        width=share(long),
                        y=y,
                        height=11,
                        class_=f"part {kind}",
                    )
                )
                place += long
        words = [
            f"{name} {engineering(amount, axis.unit)}"
            for name, amount in zip(_KIND_NAMES, amounts, strict=True)
        ]
        told.append(f"{one.when} {', '.join(words)}".strip())
    return picture(f"Stage {pair.number}, {what}: {'; '.join(told)}", *drawn, height=height)


def key(style: str, words: str) -> Element:
    """Return an entry of a legend: a sample and its meaning."""
    kind = style.split(maxsplit=1)[0]
    if kind == "dot":
        sample = element("circle", cx=9, cy=8, r=5, class_=style)
    elif kind == "best":
        sample = element("line", x1=9, x2=9, y1=0, y2=16, class_=style)
    else:
        height = 6 if style == "bar before" else 10
        sample = element("rect", x=1, y=8 - height / 2, width=16, height=height, class_=style)
    drawn = element("svg", sample, width=18, height=16, aria_hidden="true")
    return element("span", drawn, f" {words}", class_="key")
