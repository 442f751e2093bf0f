"""What a fit found: constants, and how far predictions lie from measurements."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.fit_text import UNITS, confusion_text
from evenstage.report.page.axis import Axis
from evenstage.report.page.element import element, picture, share
from evenstage.report.page.parts import Cell, Heading, Paragraph, Table
from evenstage.report.page.stage_tables import key
from evenstage.report.paper import Paper

if TYPE_CHECKING:
    from evenstage.fitting.results import Fit, Residuals
    from evenstage.report.page.element import Element
    from evenstage.report.page.parts import Part

_ROWS: Final = 150
_PAPER: Final = Paper(unicode=True)


def residual_parts(fit: Fit) -> tuple[Part, ...]:
    """Return the residuals by gate, largest first as they were measured."""
    whole = [one for one in (fit.single, fit.several) if one is not None]
    shown = [*whole, *fit.gates[:_ROWS]]
    if not shown:
        return ()
    most = max(max(one.high, abs(one.bias)) for one in shown) * 1.06 or 0.01
    axis = Axis(-100 * most, 100 * most)
    rows = tuple(
        (
            Cell(f"all of {one.name}" if one in whole else _PAPER.shorten(one.name, 32)),
            Cell(str(one.count), sort=str(one.count)),
            Cell(drawing=_range(one, axis), sort=repr(one.bias)),
            Cell(f"{100 * one.bias:+.1f}", sort=repr(one.bias)),
            Cell(f"{100 * one.median:.1f}", sort=repr(one.median)),
            Cell(f"{100 * one.high:.1f}", sort=repr(one.high)),
        )
        for one in shown
    )
    headings = (
        Heading("gate"),
        Heading("rows", "number"),
        Heading("predicted less measured, %", "chart", axis.ruler("Residual in percent")),
        Heading("bias, %", "number"),
        Heading("median, %", "number"),
        Heading("19 of 20, %", "number"),
    )
    left = len(fit.gates) - _ROWS
    remark = f"{left} more gates are in the JSON." if left > 0 else ""
    legend = (
        key("dot after", "bias"),
        key("bar before", "half within"),
        key("bar faint", "19 of 20 within"),
    )
    return (Table("Residuals by gate", headings, rows, legend, remark, sortable=True),)


def constant_parts(fit: Fit) -> tuple[Part, ...]:
    """Return the fitted constants, and what the measurements do not tell apart."""
    rows = tuple(
        (
            Cell(one.models),
            Cell(one.key),
            Cell(f"{one.value:.4g}", sort=repr(one.value)),
            Cell("" if one.error is None else f"{one.error:.2g}", sort=repr(one.error or 0.0)),
            Cell(UNITS.get(one.key, "")),
            Cell(one.told),
        )
        for one in fit.constants
    )
    headings = (
        Heading("models"),
        Heading("constant"),
        Heading("value", "number"),
        Heading("standard error", "number"),
        Heading("unit"),
        Heading("how it is known"),
    )
    confused = tuple(Paragraph(confusion_text(one), "Not told apart") for one in fit.confusions)
    return (Table("Fitted constants", headings, rows, sortable=True), *confused)


def _range(one: Residuals, axis: Axis) -> Element:
    zero = share(axis.at(0.0))
    drawn = [*axis.grid(24), element("line", x1=zero, x2=zero, y1=0, y2=24, class_="frame")]
    for size, height, style in ((one.high, 4, "bar faint"), (one.median, 8, "bar before")):
        left, right = axis.at(-100 * size), axis.at(100 * size)
        drawn.append(
            element(
                "rect",
                x=share(left),
                width=share(right - left),
                y=12 - height / 2,
                height=height,
                class_=style,
            )
        )
    bias = share(axis.at(100 * one.bias))
    drawn.append(element("circle", cx=bias, cy=12, r=4, class_="dot after"))
    label = f"{one.name}: bias {100 * one.bias:+.1f} %, median {100 * one.median:.1f} %"
    return picture(label, *drawn, height=24)
