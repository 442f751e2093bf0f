"""The path as a drawing: a tile for each stage, wires running on from one tile to the next.

Tiles wrap like words, so that the drawing fits any page without getting smaller. All tiles of a
drawing have one height, and the path crosses their edges at one height.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

from evenstage.report.page.element import element, number, picture, text
from evenstage.report.page.parts import Figure
from evenstage.report.page.symbols import draw, reach, symbol_of
from evenstage.report.paper import Paper
from evenstage.report.path_text import branch_families
from evenstage.report.words import RISING, counted
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.report.page.element import Element
    from evenstage.report.page.sides import Pair, Seen, Sides
    from evenstage.timing.results import Stage

#: px: a tile, where symbols begin, where side branches leave the wire, and how far a lane's wire
#: and its first side branch lie below its upper edge.
_TILE: Final = 232
_SYMBOL: Final = 30
_DROP: Final = 120
_WIRE: Final = 62
_FIRST: Final = 130
_ROW: Final = 18
_HEAD: Final = 24

#: Signs of a name that fit beside the word at its right, above an output wire, and before a
#: capacitance: a sign of the fixed-width face is 6.7 px wide.
_NAME_ROOM: Final = 25
_NET_ROOM: Final = 14
_BRANCH_ROOM: Final = 19

#: Of a path with more stages, the first and the last ones are drawn.
_STAGES_SHOWN: Final = 40

#: Smallest and largest size of a symbol.
_SIZES: Final = (0.36, 1.0)


@dataclass(frozen=True, slots=True)
class _Lane:
    """One path's part of all tiles: its upper edge, its height, and the number of branch rows."""

    when: str
    top: float
    height: float


def path_figure(sides: Sides) -> Figure | None:
    """Return the drawing of one path, or of two, one above the other."""
    if not sides.pairs:
        return None
    widest = max(one.stage.width for one in sides.seen)
    whens = ["before", "after"] if sides.before is not None else [""]
    lanes, top = [], float(_HEAD)
    for when in whens:
        most = max((len(_loads(one.stage)) for one in sides.seen if one.when == when), default=0)
        height = _FIRST + _ROW * most
        lanes.append(_Lane(when, top, height))
        top += height + 6
    kept, left_out = _kept(sides.pairs)
    tiles = tuple(_tile(pair, lanes, top, widest, sides) for pair in kept)
    return Figure(tiles, _caption(sides, left_out))


def _kept(pairs: Sequence[Pair]) -> tuple[list[Pair], int]:
    if len(pairs) <= _STAGES_SHOWN:
        return list(pairs), 0
    half = _STAGES_SHOWN // 2
    return [*pairs[:half], *pairs[-half:]], len(pairs) - _STAGES_SHOWN


def _caption(sides: Sides, left_out: int) -> str:
    what = (
        "The area of a symbol grows with the total transistor width of its gate. Under the output "
        "wire hangs what else it drives, each with its capacitance."
    )
    words = [what]
    if sides.before is not None:
        words.append("Hollow symbols: before; filled: after.")
    if left_out:
        words.append(f"{counted(left_out, 'stage')} in the middle of the path not drawn.")
    return " ".join(words)


def _tile(
    pair: Pair, lanes: Sequence[_Lane], height: float, widest: float, sides: Sides
) -> Element:
    drawn = [
        element("rect", x=0, y=0, width=_TILE, height=20, class_="band"),
        text(8, 14.5, f"stage {pair.number}", "strong"),
    ]
    for lane in lanes:
        one = pair.before if lane.when == "before" else pair.after
        drawn.extend(_lane(one, lane, widest, sides))
    return picture(
        _told(pair),
        *drawn,
        class_="tile",
        width=_TILE,
        height=height,
        viewBox=f"0 0 {_TILE} {number(height)}",
    )


def _told(pair: Pair) -> str:
    """Return a tile in words."""
    told = []
    for one in pair.seen:
        stage = one.stage
        when = f"{one.when}: " if one.when else ""
        loads = "; ".join(f"{name} {engineering(cap, 'F')}" for name, cap, _ in _loads(stage))
        told.append(
            f"{when}{symbol_of(stage.function).name} {stage.instance}, "
            f"width {engineering(stage.width, 'm')}, output {stage.output} "
            f"{RISING[stage.edge]} after {engineering(stage.delay, 's')}"
            + (f"; it also drives {loads}" if loads else "")
        )
    return f"Stage {pair.number}. {'. '.join(told)}."


def _lane(one: Seen | None, lane: _Lane, widest: float, sides: Sides) -> list[Element]:
    y = lane.top + _WIRE
    right = [text(_TILE - 8, lane.top + 14, lane.when, "quiet", "end")] if lane.when else []
    if one is None:
        return [
            *right,
            element("line", x1=0, x2=_TILE, y1=y, y2=y, class_="wire absent"),
            text(_TILE / 2, y - 8, "not on this path", "quiet", "middle"),
        ]
    stage, symbol = one.stage, symbol_of(one.stage.function)
    size = _SIZES[0] + (_SIZES[1] - _SIZES[0]) * (stage.width / widest) ** 0.5
    style = "gate hollow" if one.when == "before" else "gate filled"
    begin = 0 if stage is not _first(one, sides) else 6
    output = _SYMBOL + reach(symbol, size)
    paper = Paper(unicode=True)
    drawn = [
        text(8, lane.top + 14, paper.shorten(stage.instance, _NAME_ROOM), "name"),
        *right,
        element("line", x1=begin, x2=_SYMBOL - 14, y1=y, y2=y, class_="wire"),
        element("line", x1=output, x2=_TILE, y1=y, y2=y, class_="wire"),
        *draw(symbol, _SYMBOL, y, size, style),
    ]
    if begin:
        drawn.append(element("circle", cx=begin, cy=y, r=3, class_="pin"))
    net = f"{paper.edge(stage.edge)} {paper.shorten(stage.output, _NET_ROOM)}"
    drawn += [
        text(_TILE - 8, y - 8, net, "name", "end"),
        text(_TILE - 8, y + 17, engineering(stage.delay, "s"), "figure", "end"),
        text(8, lane.top + _WIRE + 45, engineering(stage.width, "m"), "quiet"),
    ]
    return [*drawn, *_hanging(stage, lane)]


def _first(one: Seen, sides: Sides) -> Stage | None:
    path = sides.before if one.when == "before" else sides.after
    return path.stages[0] if path is not None else None


def _hanging(stage: Stage, lane: _Lane) -> list[Element]:
    """Return the side branches and the wire of a stage, hanging on its output."""
    loads = _loads(stage)
    if not loads:
        return []
    y, top = lane.top + _WIRE, lane.top + _FIRST
    last = top + _ROW * (len(loads) - 1)
    paper = Paper(unicode=True)
    down = f"M {_DROP} {number(y)} V {number(top - 12)} H 14 V {number(last)}"
    drawn = [
        element("circle", cx=_DROP, cy=y, r=2.5, class_="joint"),
        element("path", d=down, class_="wire thin"),
    ]
    for row, (name, cap, kind) in enumerate(loads):
        middle = top + _ROW * row
        drawn += [
            *_glyph(kind, middle),
            text(44, middle + 4, paper.shorten(name, _BRANCH_ROOM), "name"),
            text(_TILE - 8, middle + 4, engineering(cap, "F"), "figure", "end"),
        ]
    return drawn


def _glyph(kind: str, y: float) -> list[Element]:
    """Return a small gate, or a capacitor, at the end of a short wire."""
    if kind == "gate":
        return [
            element("line", x1=14, x2=24, y1=y, y2=y, class_="wire thin"),
            element(
                "path",
                d=f"M 24 {number(y - 5)} L 35 {number(y)} L 24 {number(y + 5)} Z",
                class_="branch",
            ),
        ]
    return [
        element("line", x1=14, x2=26, y1=y, y2=y, class_="wire thin"),
        element("line", x1=26, x2=26, y1=y - 6, y2=y + 6, class_="wire"),
        element("line", x1=31, x2=31, y1=y - 6, y2=y + 6, class_="wire"),
        element("line", x1=31, x2=37, y1=y, y2=y, class_="wire thin"),
    ]


def _loads(stage: Stage) -> list[tuple[str, float, str]]:
    """Return what hangs on a stage's output: name, capacitance, ``gate`` or ``wire``."""
    families = branch_families(Paper(unicode=True), stage)
    return [
        (family.what, family.cap, "wire" if _is_wire(family.what) else "gate")
        for family in families
        if family.cap > 0
    ]


def _is_wire(what: str) -> bool:
    return what.endswith((" wire", " load", "outside the block", " on the way"))
