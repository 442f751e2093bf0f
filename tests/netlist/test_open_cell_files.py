"""Two openly licensed cell libraries, read whole; the counts come from their makers' own files.

Sources: IHP Open PDK, sg13g2_stdcell, and gf180mcu_fd_sc_mcu7t5v0 of GlobalFoundries, both
Apache-2.0; see README.md in the data folder.
"""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read

DATA = Path(__file__).parents[3] / "shared" / "data"

pytestmark = pytest.mark.skipif(not DATA.is_dir(), reason="the folder of open cells is absent")


def cells(library: str) -> dict[str, int]:
    """Return the number of transistors of each cell."""
    described = json.loads((DATA / "cells.json").read_text("utf-8"))[library]
    return {name: cell["transistors"] for name, cell in described.items()}


@pytest.mark.parametrize("file", ["sg13g2_stdcell.spice", "sg13g2_stdcell.cdl"])
def test_one_file_with_all_cells(file: str) -> None:
    netlist = read(DATA / "ihp_sg13g2" / file)
    found = {s.name: elaborate(netlist, s.name) for s in netlist.subcircuits.values()}
    assert {name: len(devices) for name, devices in found.items()} == cells("ihp_sg13g2")
    inverter = found["sg13g2_inv_1"]
    assert inverter.width.tolist() == [0.74e-6, 1.12e-6]
    assert inverter.length.tolist() == [0.13e-6] * 2
    assert [model.polarity for model in inverter.models] == ["n", "p"]
    assert netlist.notices == ()


def test_one_file_a_cell() -> None:
    files = sorted((DATA / "gf180_7t").glob("*.cdl"))
    found = {}
    for file in files:
        devices = elaborate(read(file))
        found[devices.top] = len(devices)
    assert found == cells("gf180_7t")
