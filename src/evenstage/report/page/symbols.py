"""Distinctive-shape symbols of gates, after IEEE Std 91-1984, drawn from the gate's function.

A transmission gate is two triangles tip to tip; a compound gate is drawn as its last operation with
the first one at an input; what is none of these is a box.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final, Literal

from evenstage.report.page.element import element, number

if TYPE_CHECKING:
    from evenstage.report.page.element import Element

Shape = Literal["buffer", "and", "or", "pass", "box"]

#: Width and height of a symbol at full size, px.
WIDTH: Final = 58
HEIGHT: Final = 60
_BUBBLE: Final = 4.0

#: Outlines in a square from (0, 0) to (1, 1): commands, and coordinates to be scaled.
_OUTLINES: Final[dict[Shape, str]] = {
    "buffer": "M 0 0 L 1 .5 L 0 1 Z",
    "and": "M 0 0 L .5 0 C .78 0 1 .22 1 .5 C 1 .78 .78 1 .5 1 L 0 1 Z",
    "or": "M 0 0 L .3 0 C .65 0 .88 .25 1 .5 C .88 .75 .65 1 .3 1 L 0 1 C .22 .7 .22 .3 0 0 Z",
    "pass": "M 0 .1 L 1 .9 L 1 .1 L 0 .9 Z",
    "box": "M 0 0 L 1 0 L 1 1 L 0 1 Z",
}
_NAMES: Final[dict[Shape, str]] = {
    "buffer": "buffer",
    "and": "AND",
    "or": "OR",
    "pass": "transmission gate",
    "box": "other circuit",
}
_NAME: Final = re.compile(r"[^\s!&|()]+")


@dataclass(frozen=True, slots=True)
class Symbol:
    """What to draw for a function.

    Parameters
    ----------
    shape : {"buffer", "and", "or", "pass", "box"}
    inner : shape, optional
        Of the operation at an input of a compound gate.
    inverted : bool
    inputs : int
    switched : bool
        Whether it drives only at times.
    """

    shape: Shape
    inner: Shape | None
    inverted: bool
    inputs: int
    switched: bool

    @property
    def name(self) -> str:
        """What the symbol is called, as in ``NAND`` or ``AND-OR-invert``."""
        if self.inner is not None:
            first, last = _NAMES[self.inner], _NAMES[self.shape]
            return f"{first}-{last}{'-invert' if self.inverted else ''}"
        if self.shape == "buffer" and self.inverted:
            return "tri-state inverter" if self.switched else "inverter"
        if self.shape in {"and", "or"} and self.inverted:
            return f"N{_NAMES[self.shape]}"
        return _NAMES[self.shape]


def symbol_of(function: str) -> Symbol:
    """Return the symbol of a function such as ``!(a & b | c)``, a box where it is told otherwise.

    Examples
    --------
    >>> symbol_of("!(a & b)").name, symbol_of("!(a & b | c)").name, symbol_of("!a").name
    ('NAND', 'AND-OR-invert', 'inverter')
    """
    body, when, _ = function.partition(" when ")
    if ";" in function or "," in function or not function.strip():
        return Symbol("box", None, inverted=False, inputs=1, switched=bool(when))
    inverted = body.startswith("!") and _is_whole(body[1:])
    body = body[1:] if inverted else body
    while body.startswith("(") and _is_whole(body):
        body = body[1:-1]
    inputs = max(len(set(_NAME.findall(body))), 1)
    switched = bool(when)
    outer = next((sign for sign in "|&" if sign in _outermost(body)), "")
    if not outer:
        shape: Shape = "pass" if switched and not inverted else "buffer"
        return Symbol(shape, None, inverted, 1, switched)
    other = "&" if outer == "|" else "|"
    shapes: dict[str, Shape] = {"&": "and", "|": "or"}
    inner = shapes[other] if other in body else None
    return Symbol(shapes[outer], inner, inverted, inputs, switched)


def _is_whole(text: str) -> bool:
    """Tell whether a text is one name, or one pair of brackets with all in it."""
    if _NAME.fullmatch(text):
        return True
    return text.startswith("(") and text.endswith(")") and not _outermost(text).strip()


def _outermost(text: str) -> str:
    """Return what stands in no brackets."""
    depth, kept = 0, []
    for sign in text:
        depth -= sign == ")"
        if depth == 0 and sign not in "()":
            kept.append(sign)
        depth += sign == "("
    return "".join(kept)


def draw(symbol: Symbol, x: float, y: float, size: float, class_: str) -> list[Element]:
    """Return a symbol with its left edge at x and its middle at y, and the wires at its inputs.

    The path enters at (x - 14, y); the output leaves at ``x + reach(symbol, size)``.

    Parameters
    ----------
    symbol : Symbol
    x, y : float
        px.
    size : float
        1 for full size.
    class_ : str
        Style of the outline.
    """
    wide, high = WIDTH * size, HEIGHT * size
    drawn = _inputs(symbol, x, y, high)
    body = x
    if symbol.inner is not None:
        body, wide = x + 0.3 * wide, 0.7 * wide
        drawn.append(
            _outline(symbol.inner, (x, y - 0.42 * high), (wide * 0.56, high * 0.4), class_)
        )
        drawn.append(_line(x, y + 0.22 * high, body + 0.12 * wide, y + 0.22 * high))
    drawn.append(_outline(symbol.shape, (body, y - high / 2), (wide, high), class_))
    if symbol.inverted:
        center = body + wide + _BUBBLE
        drawn.append(element("circle", cx=center, cy=y, r=_BUBBLE, class_=class_))
    if symbol.switched:
        drawn.append(_line(body + wide / 2, y - high * 0.5 - 5, body + wide / 2, y - high * 0.26))
    return drawn


def reach(symbol: Symbol, size: float) -> float:
    """Return how far to the right of its left edge a symbol goes, px."""
    return WIDTH * size + (2 * _BUBBLE if symbol.inverted else 0)


def _inputs(symbol: Symbol, x: float, y: float, high: float) -> list[Element]:
    """Return the path's wire to one input and stubs at the others."""
    inside = x + (0.12 * high if symbol.shape == "or" and symbol.inner is None else 0)
    if symbol.inner is not None:
        low, top = y + 0.22 * high, y - 0.22 * high
        return [
            _path(f"M {number(x - 14)} {number(y)} V {number(top)} H {number(x + 3)}"),
            _line(x - 8, low, x, low),
        ]
    count = min(symbol.inputs, 5)
    if count == 1:
        return [_line(x - 14, y, inside, y)]
    steps = [high * 0.7 * (i / (count - 1) - 0.5) for i in range(count)]
    taken = (count - 1) // 2
    first = f"M {number(x - 14)} {number(y)} V {number(y + steps[taken])} H {number(inside)}"
    others = [step for i, step in enumerate(steps) if i != taken]
    return [_path(first), *(_line(x - 8, y + step, inside, y + step) for step in others)]


def _outline(
    shape: Shape, corner: tuple[float, float], size: tuple[float, float], class_: str
) -> Element:
    """Return the outline of a shape in a box given by its upper left corner and its size."""
    words, place = [], 0
    for word in _OUTLINES[shape].split():
        if word.isalpha():
            words.append(word)
            continue
        words.append(number(corner[place] + float(word) * size[place]))
        place = 1 - place
    return element("path", d=" ".join(words), class_=class_)


def _line(x1: float, y1: float, x2: float, y2: float) -> Element:
    return element("line", x1=x1, y1=y1, x2=x2, y2=y2, class_="wire")


def _path(commands: str) -> Element:
    return element("path", d=commands, class_="wire")
