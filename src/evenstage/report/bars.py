"""A time axis in text and bars drawn to its scale."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from evenstage.report.paper import Paper
    from evenstage.report.scale import Scale

#: Half cells of a bar's end: nothing, left half, right half, all.
_BLOCKS: Final = {(False, False): " ", (True, False): "▌", (False, True): "▐", (True, True): "█"}
_LINES: Final = {(False, False): " ", (True, False): "╸", (False, True): "╺", (True, True): "━"}
#: An axis shorter than this, s, has no length worth dividing.
_SHORTEST: Final = 1e-21

_STEPS: Final = (1.0, 2.0, 5.0, 10.0)


@dataclass(frozen=True, slots=True)
class TimeAxis:
    """Times from ``start`` to ``end`` (s) over so many character cells.

    Parameters
    ----------
    start, end : float
        s.
    width : int
        Cells.
    scale : Scale
        The unit of the tick labels.
    paper : Paper
    """

    start: float
    end: float
    width: int
    scale: Scale
    paper: Paper

    def labels(self) -> str:
        """Return the line of tick labels; the last carries the unit if there is room."""
        line = ""
        for tick in self._ticks():
            text = self._label(tick)
            place = self._cell(tick)
            if place + len(text) <= self.width and (not line or place > len(line)):
                line = line.ljust(place) + text
        unit = f" {self.scale.unit}"
        return line + unit if len(line) + len(unit) <= self.width else line

    def ruler(self) -> str:
        """Return the axis itself, a mark under the first sign of each tick label."""
        dash, mark = ("─", "┬") if self.paper.unicode else ("-", "+")
        marks = {self._cell(tick) for tick in self._ticks()}
        return "".join(mark if cell in marks else dash for cell in range(self.width))

    def bar(self, start: float, end: float, *, thin: bool = False) -> str:
        """Return a bar between two times; too short for its place, it is a mark."""
        parts = 2 if self.paper.unicode else 1
        first, last = self._place(start, parts), self._place(end, parts)
        if last <= first:
            cell = min(first // parts, self.width - 1)
            return " " * cell + ("▏" if self.paper.unicode else "|")
        if parts == 1:
            return " " * first + ("-" if thin else "=") * (last - first)
        filled = [first <= half < last for half in range(last + last % 2)]
        signs = _LINES if thin else _BLOCKS
        return "".join(signs[pair] for pair in zip(filled[::2], filled[1::2], strict=True))

    def _place(self, time: float, parts: int) -> int:
        """Return where a time is, counted in so many parts of a cell."""
        span = self.end - self.start
        share = (time - self.start) / span if span > 0 else 0.0
        return round(parts * self.width * min(max(share, 0.0), 1.0))

    def _cell(self, time: float) -> int:
        return min(self._place(time, 1), self.width - 1)

    def _step(self) -> float:
        """Return the tick distance: 1, 2 or 5 times a power of ten, labels well apart."""
        span = self.end - self.start
        apart = len(f"{self.end / self.scale.factor:.3g}") + 3
        least = span * apart / self.width
        power = 10.0 ** math.floor(math.log10(least))
        return next(power * step for step in _STEPS if power * step >= least * (1 - 1e-9))

    def _ticks(self) -> list[float]:
        if self.end - self.start < _SHORTEST:
            return [self.start]
        step = self._step()
        first = math.ceil(self.start / step - 1e-9)
        last = math.floor(self.end / step + 1e-9)
        return [number * step for number in range(first, last + 1)]

    def _label(self, time: float) -> str:
        return f"{time / self.scale.factor:g}"
