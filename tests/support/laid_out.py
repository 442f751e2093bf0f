"""A small text laid out, and its columns with names."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read_bytes

if TYPE_CHECKING:
    from evenstage.netlist.devices import Devices
    from evenstage.process.process import Process

INVERTER = """
.subckt inv a y vdd vss wn=1u wp='2*wn'
mn y a vss vss nch w=wn l=0.1u
mp y a vdd vdd pch w=wp l=0.1u
.ends
"""


def block(text: str, top: str | None = None, process: Process | None = None) -> Devices:
    """Elaborate a text that has no title."""
    return elaborate(read_bytes(f"* t\n{text}".encode(), "t.sp", Path()), top, process)


def pins(devices: Devices) -> list[tuple[str, str, str, str]]:
    """Return the net names of each transistor: drain, gate, source, bulk."""
    columns = (devices.drain, devices.gate, devices.source, devices.bulk)
    names = devices.net_names
    return [(names[d], names[g], names[s], names[b]) for d, g, s, b in zip(*columns, strict=True)]


def paths(devices: Devices) -> list[str]:
    """Return the name of each transistor's card with its instance path."""
    rows = zip(devices.card.tolist(), devices.instance.tolist(), strict=True)
    return [devices.card_path(card, instance) for card, instance in rows]


def microns(devices: Devices) -> list[float]:
    return [round(width * 1e6, 9) for width in devices.width.tolist()]
