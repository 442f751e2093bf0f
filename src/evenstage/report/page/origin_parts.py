"""How to make a page again: the program, what it was asked, what it read."""

from __future__ import annotations

import shlex
from typing import TYPE_CHECKING, Final

from evenstage.report.page.parts import Cell, Heading, Paragraph, Table, cells
from evenstage.report.paper import Paper
from evenstage.units import engineering

if TYPE_CHECKING:
    from evenstage.process.process import Process
    from evenstage.report.origin import Origin
    from evenstage.report.page.parts import Part
    from evenstage.timing.results import Yardstick

#: Files whose digests are shown.
_FILES: Final = 60


def origin_parts(origin: Origin, yardstick: Yardstick | None) -> tuple[Part, ...]:
    """Return version, command line, digests and process constants."""
    parts: list[Part] = [
        Paragraph(f"evenstage {origin.version}", "Program"),
        Paragraph(shlex.join(["evenstage", *origin.arguments]), "Command", command=True),
    ]
    if yardstick is not None:
        told = (
            f"{yardstick.process}: tau {engineering(yardstick.tau, 's')}, "
            f"FO4 {engineering(yardstick.fo4, 's')}, p_inv {yardstick.p_inv:.3g}, "
            f"input of the unit inverter {engineering(yardstick.input_cap, 'F')}"
        )
        parts.append(Paragraph(told, "Yardstick"))
    if origin.files:
        parts.append(_files(origin))
    if origin.process is not None:
        parts.append(_constants(origin.process))
    return tuple(parts)


def _files(origin: Origin) -> Table:
    paper = Paper(unicode=True)
    rows = tuple(cells(paper.shorten(f.name, 48), f.sha256) for f in origin.files[:_FILES])
    left = len(origin.files) - _FILES
    remark = f"{left} more files were read." if left > 0 else ""
    return Table("Files", (Heading("file"), Heading("SHA-256", "digest")), rows, remark=remark)


def _constants(process: Process) -> Table:
    headings = ("models", "type", "length", "r × w", "r fixed", "gate", "drain")
    rows = tuple(
        (
            Cell(", ".join(pattern.text for pattern in one.models)),
            *cells(
                f"{one.polarity}MOS",
                engineering(one.length, "m"),
                engineering(one.r_w, "Ωm"),
                engineering(one.r_fixed, "Ω"),
                f"{engineering(one.c_gate * 1e-6, 'F')}/um",
                f"{engineering(one.c_drain * 1e-6, 'F')}/um",
            ),
        )
        for one in process.transistors
    )
    title = f"Process {process.name}, supply {engineering(process.supply, 'V')}"
    aligned = tuple(
        Heading(words, "text" if place < 2 else "number") for place, words in enumerate(headings)
    )
    return Table(title, aligned, rows)
