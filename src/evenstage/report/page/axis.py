"""Axes of charts that stretch with the page: positions are shares of the width."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

from evenstage.report.page.element import element, picture, share, text
from evenstage.report.scale import Scale, plain

if TYPE_CHECKING:
    from evenstage.report.page.element import Element


@dataclass(frozen=True, slots=True)
class Axis:
    """A linear or logarithmic axis.

    Parameters
    ----------
    least, most : float
        SI units; greater than zero where logarithmic.
    unit : str
        Empty for numbers without one.
    logarithmic : bool
    """

    least: float
    most: float
    unit: str = ""
    logarithmic: bool = False

    def __post_init__(self) -> None:
        if not self.most > self.least:
            # One value alone: an axis must have a length all the same.
            long = abs(self.least) or (1e-12 if self.unit else 1.0)
            object.__setattr__(self, "most", self.least + long)

    def at(self, value: float) -> float:
        """Return where a value lies, 0 at the left and 1 at the right end, within both."""
        return min(max(self._at(value), 0.0), 1.0)

    def _at(self, value: float) -> float:
        if self.logarithmic:
            if value <= 0:
                return 0.0
            return math.log(value / self.least) / math.log(self.most / self.least)
        return (value - self.least) / (self.most - self.least)

    @property
    def scale(self) -> Scale:
        """The unit that the labels are in."""
        return Scale.of([self.least, self.most], self.unit, digits=3)

    def ticks(self) -> list[float]:
        """Return some five round values, in SI units."""
        factor = self.scale.factor
        least, most = self.least / factor, self.most / factor
        if self.logarithmic:
            powers = range(math.floor(math.log10(least)), math.ceil(math.log10(most)) + 1)
            values = [digit * 10.0**power for power in powers for digit in (1, 2, 5)]
            if most / least > 1000:
                values = [10.0**power for power in powers]
        else:
            step = _step((most - least) / 5)
            values = [step * i for i in range(math.ceil(least / step), math.ceil(most / step))]
        inside = [value * factor for value in values if least <= value * (1 + 1e-9)]
        return [value for value in inside if self.at(value) <= 0.95]

    def label(self, value: float) -> str:
        """Return a round value as it stands on the axis; all of a linear axis have one look."""
        shown = value / self.scale.factor
        if self.logarithmic:
            return plain(shown, max(0, -math.floor(math.log10(shown) + 1e-9)))
        step = _step((self.most - self.least) / self.scale.factor / 5)
        return plain(shown, max(0, -math.floor(math.log10(step) + 1e-9)))

    def ruler(self, name: str) -> Element:
        """Return the axis with its labels, 18 px high."""
        marks = []
        for value in self.ticks():
            place = self.at(value)
            anchor = "middle" if place > 0.03 else ""
            marks.append(text(share(place), 11, self.label(value), "tick", anchor))
            marks.append(element("line", x1=share(place), x2=share(place), y1=14, y2=18))
        unit = f" in {self.scale.unit}" if self.unit else ""
        kind = "logarithmic axis" if self.logarithmic else "axis"
        ends = f"from {self.label(self.least)} to {self.scale.text(self.most)}"
        return picture(f"{name}{unit}, {kind} {ends}", *marks, class_="ruler", height=18)

    def grid(self, height: float) -> list[Element]:
        """Return faint lines at the ticks."""
        return [
            element("line", x1=p, x2=p, y1=0, y2=height, class_="grid")
            for p in (share(self.at(value)) for value in self.ticks())
        ]


def _step(rough: float) -> float:
    power = 10.0 ** math.floor(math.log10(rough))
    return next(step * power for step in (1, 2, 5, 10) if step * power >= rough * (1 - 1e-9))
