"""Cells that a process is fitted to in simulation: an inverter, a NAND2 and a NOR2."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from evenstage.process.process import Process


def cells(process: Process) -> str:
    """Return an inverter, a NAND2 and a NOR2 of the unit inverter's drive."""
    n, p = process.first("n"), process.first("p")
    wn = (process.unit_width or 4 * n.length) * 1e6
    wp = wn * (process.unit_ratio or p.r_w / n.r_w)
    names = [kind.models[0].text.replace("*", "") for kind in (n, p)]
    lengths = [kind.length * 1e6 for kind in (n, p)]

    def card(name: str, drain: str, gate: str, source: str, width: float) -> str:
        kind = 0 if name.startswith("mn") else 1
        rail = ("vss", "vdd")[kind]
        return (
            f"{name} {drain} {gate} {source} {rail} {names[kind]} w={width:.5g}u"
            f" l={lengths[kind]:.5g}u"
        )

    lines = ["* cells", ".global vdd vss", ".subckt inv a y"]
    lines += [card("mn", "y", "a", "vss", wn), card("mp", "y", "a", "vdd", wp), ".ends"]
    lines += [".subckt nand2 a b y", card("mn1", "y", "a", "m", 2 * wn)]
    lines += [card("mn2", "m", "b", "vss", 2 * wn), card("mp1", "y", "a", "vdd", wp)]
    lines += [card("mp2", "y", "b", "vdd", wp), ".ends", ".subckt nor2 a b y"]
    lines += [card("mp1", "y", "a", "m", 2 * wp), card("mp2", "m", "b", "vdd", 2 * wp)]
    lines += [card("mn1", "y", "a", "vss", wn), card("mn2", "y", "b", "vss", wn), ".ends", ""]
    return "\n".join(lines)
