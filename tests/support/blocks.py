"""Small blocks as netlist text, and the way from text to a circuit."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Final, TypedDict, Unpack

from evenstage.circuit.recognise import recognise
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read_bytes
from evenstage.pattern import Pattern
from evenstage.process.process import Process, Transistor

if TYPE_CHECKING:
    from evenstage.brief import Brief
    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.devices import Devices
    from evenstage.process.process import Junctions

UNIT_CAP = 1e-15
"""F of one micron of gate in the plain process; so capacitances in fF are widths in microns."""


class Constants(TypedDict, total=False):
    """Constants of a transistor type that tests choose, in SI units."""

    length: float
    r_w: float
    r_fixed: float
    stack: float
    c_gate: float
    c_gate_fixed: float
    c_drain: float
    c_drain_fixed: float
    slope: float
    slope_power: float
    shape: float
    shape_carry: float
    slope_stack: float
    shape_stack: float
    weak_swing: float
    drain_shared: float
    drain_inner: float
    junctions: Junctions
    width_min: float
    width_max: float
    width_step: float
    finger_width_max: float


def plain_process(
    gamma: float = 2.0, p_inv: float = 1.0, **constants: Unpack[Constants]
) -> Process:
    """Return the process the textbooks count widths in: no slopes, no fixed parts, long channels.

    The unit inverter has widths 1 um and gamma um, so that its rise and fall are equal and its
    input capacitance is 1 + gamma fF.
    """
    plain = Transistor(
        models=(Pattern("nx"),),
        polarity="n",
        length=1e-7,
        r_w=1e-3,
        c_gate=1e-9,
        c_drain=p_inv * 1e-9,
    )
    n = replace(plain, **constants)
    p = replace(n, models=(Pattern("px"),), polarity="p", r_w=gamma * n.r_w)
    return Process(name="plain", supply=1.0, transistors=(n, p), unit_width=1e-6, unit_ratio=gamma)


def devices_of(text: str, process: Process | None, brief: Brief | None = None) -> Devices:
    """Read and elaborate a netlist."""
    netlist = read_bytes(text.encode(), "block.sp", Path())
    return elaborate(netlist, process=process, brief=brief)


def circuit_of(text: str, process: Process | None = None, brief: Brief | None = None) -> Circuit:
    """Read, elaborate and recognise a netlist in the plain process, or another."""
    process = process or plain_process()
    return recognise(devices_of(text, process, brief), process, brief)


def block(cards: str, ports: str = "") -> str:
    """Wrap cards into one subcircuit ``top`` with supplies."""
    return f"* a block\n.global vdd vss\n.subckt top {ports}\n{cards}\n.ends\n"


SHIFTING_BLOCK: Final = """\
* invented: level shifters between two high supplies
.subckt inv a y vp vss
mn y a vss vss nx w=1u l=0.1u
mp y a vp vp px w=2u l=0.1u
.ends
.subckt lv a y vdd vddh vss
x1 a ab vdd vss inv
mnl l a vss vss nx w=4u l=0.1u
mnr r ab vss vss nx w=4u l=0.1u
mpl l r vddh vddh px w=1u l=0.1u
mpr r l vddh vddh px w=1u l=0.1u
x2 r y vddh vss inv
.ends
.subckt top a b c y z w vdd vddh vss
x1 a p vdd vss inv
x2 p q vdd vss inv
x3 q y vdd vddh vss lv
x4 b z vdd vddh vss lv
mt y c u vss nx w=1u l=0.1u
mt2 z b u vss nx w=1u l=0.1u
mh hb hold vss vss nx w=1u l=0.1u
mhp hb hold vddh vddh px w=2u l=0.1u
mk hold hb vss vss nx w=1u l=0.1u
mkp hold hb vddh vddh px w=2u l=0.1u
mw hold c b vss nx w=4u l=0.1u
md vss vddh vss vss nx w=4u l=0.1u
x5 u w vddh vss inv
.ends
"""
"""A block on two high supplies: level shifters, pass transistors and a storage cell."""


def transistor(kind: str, drain: str, gate: str, source: str, width: float, name: str) -> str:
    """Return a transistor's card; its bulk is tied to its rail."""
    rail = "vss" if kind == "n" else "vdd"
    return f"m{name} {drain} {gate} {source} {rail} {kind}x w={width:.12g}u l=0.1u"


def inverter(name: str, a: str, y: str, wn: float, wp: float) -> str:
    """Return an inverter's cards."""
    return "\n".join(
        [transistor("n", y, a, "vss", wn, f"{name}n"), transistor("p", y, a, "vdd", wp, f"{name}p")]
    )


def nand(name: str, inputs: list[str], y: str, wn: float | list[float], wp: float) -> str:
    """Return a NAND's cards; the first input is nearest to the output."""
    return _stack("n", name, inputs, y, wn) + "\n" + _side("p", name, inputs, y, wp)


def nor(name: str, inputs: list[str], y: str, wn: float, wp: float | list[float]) -> str:
    """Return a NOR's cards; the first input is nearest to the output."""
    return _stack("p", name, inputs, y, wp) + "\n" + _side("n", name, inputs, y, wn)


def _stack(kind: str, name: str, inputs: list[str], y: str, width: float | list[float]) -> str:
    rail = "vss" if kind == "n" else "vdd"
    nodes = [y, *(f"{name}{kind}{i}" for i in range(1, len(inputs))), rail]
    widths = width if isinstance(width, list) else [width] * len(inputs)
    return "\n".join(
        transistor(kind, nodes[i], gate, nodes[i + 1], widths[i], f"{name}{kind}{i}")
        for i, gate in enumerate(inputs)
    )


def _side(kind: str, name: str, inputs: list[str], y: str, width: float) -> str:
    rail = "vss" if kind == "n" else "vdd"
    return "\n".join(
        transistor(kind, y, gate, rail, width, f"{name}{kind}{i}") for i, gate in enumerate(inputs)
    )


def network(kind: str, name: str, edges: list[tuple[str, str, str, float]]) -> str:
    """Return one pull network from edges ``(node, gate, node, width)``."""
    return "\n".join(
        transistor(kind, a, gate, b, width, f"{name}{kind}{i}")
        for i, (a, gate, b, width) in enumerate(edges)
    )
