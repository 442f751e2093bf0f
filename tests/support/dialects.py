"""A netlist of a few cards, read and laid out, for tests of habits."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from evenstage.errors import EvenstageError
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read_bytes

if TYPE_CHECKING:
    from evenstage.netlist.devices import Devices
    from evenstage.netlist.netlist import Card, Netlist

INV = """.subckt inv a y vdd vss
mn y a vss vss nch w=1u l=0.1u
mp y a vdd vdd pch w=2u l=0.1u
.ends
"""
TAIL = "w=1u l=0.1u"


def text_of(text: str | bytes) -> Netlist:
    """Read a netlist that begins after a comment line."""
    data = text if isinstance(text, bytes) else text.encode()
    return read_bytes(b"* t\n" + data, "top.sp", Path("absent"))


def laid(text: str | bytes, top: str | None = None) -> Devices:
    return elaborate(text_of(text), top)


def only_card(text: str) -> Card:
    netlist = text_of(text)
    assert len(netlist) == 1
    return netlist.card(0)


def refusal(text: str | bytes) -> str:
    """Return the first line of what is said to a netlist."""
    with pytest.raises(EvenstageError) as caught:
        laid(text)
    return str(caught.value).split("\n", maxsplit=1)[0]


def codes(devices: Devices) -> set[str]:
    return {notice.code for notice in (*devices.notices, *devices.netlist.notices)}


def microns(devices: Devices) -> list[float]:
    return [round(width * 1e6, 9) for width in devices.width.tolist()]
