"""A fitted process as text: the constants, how far to trust them, and where the model misses."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.frame import framed
from evenstage.report.paper import PLAIN, Paper
from evenstage.report.table import Column, first_that_fits
from evenstage.report.words import counted, labelled, section
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.fitting.results import Confusion, Deck, Fit, FittedConstant, Residuals

#: Units of the constants as the process file has them.
UNITS: Final = {
    "r_w": "ohm*m",
    "r_fixed": "ohm",
    "c_gate": "F/m",
    "c_gate_fixed": "F",
    "c_drain": "F/m",
    "c_drain_fixed": "F",
}


def fit_report(fit: Fit, paper: Paper = PLAIN) -> str:
    """Return a fit as text."""
    lines = section("Constants", _constant_lines(paper, fit.constants))
    lines += section("What the measurements do not tell apart", _confused(paper, fit.confusions))
    lines += section("Predicted against measured", _residual_lines(paper, fit))
    lines += section("The fit", _base_lines(paper, fit))
    subject = paper.paragraph(f"{fit.source}, cells of {fit.cells}")
    return framed(paper, subject, fit_answer(fit), lines, fit.notices)


def deck_report(deck: Deck, paper: Paper = PLAIN) -> str:
    """Return what a measuring deck measures as text."""
    answer = (
        f"{deck.output} measures {counted(deck.arcs, 'arc')} of {counted(len(deck.cells), 'cell')} "
        f"at {deck.measurements // deck.arcs} points each. Add your models to it, let your "
        f"simulator run it, and keep what it prints; {deck.table_output} holds the names of the "
        "results. Then: evenstage fit TABLE --results PRINTED --netlist CELLS --output FILE."
    )
    return framed(paper, (), answer, (), deck.notices)


def fit_answer(fit: Fit) -> str:
    """Return the one thing to know first."""
    parts = [
        f"{one.median:.1%} for {name} (19 of 20 within {one.high:.1%})"
        for one, name in ((fit.single, "one stage"), (fit.several, "several"))
        if one is not None
    ]
    where = f" Written to {fit.output}." if fit.output else ""
    return (
        f"Delays are met to a median of {' and '.join(parts)}, over {fit.used} of "
        f"{counted(fit.measured, 'measurement')}.{where}"
    ).replace("%", " %")


def _constant_lines(paper: Paper, constants: Sequence[FittedConstant]) -> list[str]:
    rows, before = [], ""
    for one in constants:
        unit = UNITS.get(one.key, "")
        error = "" if one.error is None else f"{one.error:.2g}"
        remark = "" if one.told == "measured" else one.told
        shown = one.models if one.models != before else ""
        rows.append([shown, one.key, f"{one.value:.4g}", error, unit, remark])
        before = one.models
    columns = [
        Column("models", kind="name"),
        Column("constant"),
        Column("value", align="right"),
        Column("error", align="right"),
        Column("unit"),
        Column("", kind="name"),
    ]
    _, table = first_that_fits(paper, [(columns, rows)], indent=2)
    return [
        *table.lines(rows),
        "",
        *paper.paragraph(
            "error: standard error, residuals taken as independent; the model's own error is not "
            "in it.",
            indent=2,
        ),
    ]


def _confused(paper: Paper, confusions: Sequence[Confusion]) -> list[str]:
    return [
        line
        for one in confusions
        for line in paper.paragraph(confusion_text(one), indent=2, hanging=4)
    ]


def confusion_text(one: Confusion) -> str:
    """Return which constants the measurements do not tell apart, and how far they may be off."""
    names = [f"{key} ({polarity})" for polarity, key in one.constants]
    if len(names) == 1:
        text = f"{names[0]} is hardly told: it may be off by {one.spread:.0%} of its scale"
    else:
        text = (
            f"{', '.join(names[:-1])} and {names[-1]}: their sum of effects is known, each "
            f"alone may be off by {one.spread:.0%} of its scale"
        )
    return text.replace("%", " %") + "."


def _residual_lines(paper: Paper, fit: Fit) -> list[str]:
    rows = [_residual_row(one) for one in fit.gates]
    rows += [_residual_row(one) for one in (fit.single, fit.several) if one is not None]
    columns = [
        Column("gate", kind="name"),
        Column("stages", align="right"),
        Column("rows", align="right"),
        Column("bias %", align="right"),
        Column("median %", align="right"),
        Column("19 of 20 %", align="right"),
        Column("transition %", align="right"),
    ]
    _, table = first_that_fits(paper, [(columns, rows)], indent=2)
    return [
        *table.lines(rows),
        "",
        *paper.paragraph(
            "of the larger of the measured delay and that of an inverter driving one; transition: "
            "median for the output's.",
            indent=2,
        ),
    ]


def _residual_row(one: Residuals) -> list[str]:
    return [
        f"all of {one.name}" if one.name.endswith(("stage", "stages")) else one.name,
        str(one.stages),
        str(one.count),
        f"{100 * one.bias:+.1f}",
        f"{100 * one.median:.1f}",
        f"{100 * one.high:.1f}",
        "" if one.transition is None else f"{100 * one.transition:.1f}",
    ]


def _base_lines(paper: Paper, fit: Fit) -> list[str]:
    least, most = (engineering(t, "s") for t in (fit.transition_least, fit.transition_most))
    window = (
        f"transitions from {least} to {most}, as in chains of inverters that drive one to sixteen "
        f"of themselves; {fit.used} of {counted(fit.measured, 'row')} lie there"
    )
    return [
        *labelled(paper, "window", window),
        *labelled(paper, "process", f"{fit.process.name}: FO4 {engineering(fit.fo4, 's')}"),
    ]
