"""Recognition against the published functions of two openly licensed cell libraries.

The libraries and their Liberty files are not part of the project: the tests skip where the folder
beside the checkout is absent.
"""

from __future__ import annotations

import json
from dataclasses import replace
from functools import lru_cache
from pathlib import Path
from typing import TYPE_CHECKING, TypedDict

import pytest

from evenstage.brief import Brief
from evenstage.circuit.network import HIGH, LOW
from evenstage.circuit.recognise import recognise
from evenstage.errors import CircuitError
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read
from evenstage.pattern import Pattern
from evenstage.process.process import Process, Transistor
from support.logic import all_vectors, function_values, values
from support.switch_level import settled

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit

OPEN_CELLS = Path(__file__).parents[3] / "shared" / "data"


class Cell(TypedDict):
    """What ``cells.json`` says of one cell."""

    inputs: list[str]
    functions: dict[str, str]
    power: list[str]
    ground: list[str]
    combinational: bool
    sequential: bool
    tristate: bool
    transistors: int


pytestmark = pytest.mark.skipif(
    not (OPEN_CELLS / "cells.json").exists(), reason="the open cell data is not beside the checkout"
)


def process() -> Process:
    n = Transistor(
        models=(Pattern("*nmos"), Pattern("nfet*")),
        polarity="n",
        length=1.3e-7,
        r_w=2e-3,
        c_gate=1e-9,
        c_drain=1e-9,
    )
    p = replace(n, models=(Pattern("*pmos"), Pattern("pfet*")), polarity="p")
    return Process(name="any", supply=1.2, transistors=(n, p))


def cells_of(library: str) -> dict[str, Cell]:
    """Return the published facts of a library's cells."""
    facts: dict[str, dict[str, Cell]] = json.loads((OPEN_CELLS / "cells.json").read_text())
    return facts[library]


def files(library: str) -> list[Path]:
    folder = OPEN_CELLS / library
    return (
        sorted(folder.glob("*.cdl")) if library == "gf180_7t" else [folder / "sg13g2_stdcell.spice"]
    )


@lru_cache
def circuits(library: str) -> dict[str, Circuit | str]:
    """Return each cell's circuit, or why there is none."""
    facts = cells_of(library)
    found: dict[str, Circuit | str] = {}
    for path in files(library):
        netlist = read(path)
        for name, subcircuit in netlist.subcircuits.items():
            cell = facts[subcircuit.name]
            brief = Brief(
                supplies_high=tuple(Pattern(net) for net in cell["power"]),
                supplies_low=tuple(Pattern(net) for net in cell["ground"]),
            )
            try:
                found[subcircuit.name] = recognise(
                    elaborate(netlist, name, process(), brief), process(), brief
                )
            except CircuitError as error:
                found[subcircuit.name] = error.code
    return found


def agrees(circuit: Circuit, cell: Cell) -> bool:
    """Tell whether every output that is known computes its function; all must be known."""
    vectors = all_vectors(cell["inputs"])
    known = values(circuit, {net_of(circuit, name): value for name, value in vectors.items()})
    for output, function in cell["functions"].items():
        if net_of(circuit, output) not in known:
            return False
        expected = function_values(function, vectors)
        assert (known[net_of(circuit, output)] == expected).all(), f"{output} is not {function}"
    return True


def net_of(circuit: Circuit, name: str) -> int:
    net = circuit.net_id(name)
    assert net is not None, f"no net {name}"
    return net


@pytest.mark.parametrize(
    ("library", "right", "cells"), [("ihp_sg13g2", 52, 84), ("gf180_7t", 143, 229)]
)
def test_combinational_cells_compute_their_published_functions(
    library: str, right: int, cells: int
) -> None:
    """Every one of them, the multiplexers of transmission gates too, and none a wrong function."""
    facts = cells_of(library)
    found = circuits(library)
    assert len(found) == cells
    whole = 0
    for name, circuit in found.items():
        cell = facts[name]
        if cell["combinational"] and not cell["tristate"] and cell["inputs"]:
            assert not isinstance(circuit, str), f"{name}: {circuit}"
            assert not circuit.not_understood, name
            whole += agrees(circuit, cell)
    assert whole == right


@pytest.mark.parametrize(("library", "cells"), [("ihp_sg13g2", 6), ("gf180_7t", 14)])
def test_tri_state_cells_drive_their_function_while_enabled(library: str, cells: int) -> None:
    """Driven is as published for one level of the enable input, and not at all for the other."""
    facts, count = cells_of(library), 0
    for name, circuit in circuits(library).items():
        cell = facts[name]
        if not cell["tristate"] or not cell["inputs"]:
            continue
        assert not isinstance(circuit, str)
        assert not circuit.not_understood
        ((output, function),) = cell["functions"].items()
        net = net_of(circuit, output)
        assert circuit.gate_kind(int(circuit.driver_of_net[net])) == "tri-state gate"
        enable = next(pin for pin in cell["inputs"] if pin in {"EN", "TE_B"})
        vectors = all_vectors(cell["inputs"])
        wanted = function_values(function, vectors)
        for index, on in enumerate((vectors[enable] == (enable == "EN")).tolist()):
            one = {net_of(circuit, pin): bool(v[index]) for pin, v in vectors.items()}
            truth = settled(circuit, one)
            assert truth[net] == (bool(wanted[index]) if on else "floats")
            assert drives(circuit, net, truth) == (on, bool(wanted[index]) and on)
        count += 1
    assert count == cells


def drives(circuit: Circuit, net: int, truth: dict[int, bool | str]) -> tuple[bool, bool]:
    """Return whether the gate of a net drives under some values, and whether high."""
    for some in circuit.stages:
        for sink, nets in ((s, n) for s in some.form.sinks for n in some.nets):
            if nets[sink.node] == net:
                high, low = (
                    any(all(truth[int(nets[i])] == v for i, v in cube) for cube in cubes)
                    for cubes in (sink.high, sink.low)
                )
                return high or low, high
    gate = int(circuit.driver_of_net[net])
    some_gates = circuit.alike[int(circuit.gate_form[gate])]
    network, nets = some_gates.form.network, some_gates.nets[int(circuit.gate_row[gate])]
    column = sum(int(truth[int(nets[i])] is True) << row for row, i in enumerate(network.inputs))
    high = bool(network.conducts(some_gates.form.output, HIGH)[column])
    low = bool(network.conducts(some_gates.form.output, LOW)[column])
    return high or low, high


@pytest.mark.parametrize(("library", "outputs"), [("ihp_sg13g2", 52), ("gf180_7t", 149)])
def test_outputs_as_switches_have_their_published_functions(library: str, outputs: int) -> None:
    """Of every combinational cell, tri-state ones included, whatever its gates were taken for."""
    facts, right = cells_of(library), 0
    for name, circuit in circuits(library).items():
        cell = facts[name]
        if isinstance(circuit, str) or not cell["combinational"] or not cell["inputs"]:
            continue
        vectors = all_vectors(cell["inputs"])
        found = circuit.evaluate(vectors)
        for output, function in cell["functions"].items():
            expected = function_values(function, vectors)
            assert found[output].tolist() == expected.astype(int).tolist(), f"{name}.{output}"
            written = circuit.function(output)
            assert written.undecided == "0"
            assert (function_values(str(written), vectors) == expected).all(), str(written)
            right += 1
    assert right == outputs


#: What the special cells of both libraries are, by the stem of their names; common names of the
#: field, the libraries' own documents where the name says less.
KINDS = {
    "dff": "flip-flop", "sdff": "flip-flop", "dfr": "flip-flop", "sdf": "flip-flop",
    "lat": "latch", "dlh": "latch", "dll": "latch",
    "icgt": "clock gate", "lgcp": "clock gate", "slgcp": "clock gate",
    "hold": "bus keeper", "sighold": "bus keeper",
    "fillcap": "decoupling", "decap": "decoupling", "tie": "tie",
}  # fmt: skip
CLOCKS = {"CLK": True, "CLKN": False, "E": True, "GATE": True, "GATE_N": False}
"""Level of the clock pins after which, or during which, a cell shows its data."""
WRITES = {"RN", "SETN", "RESET_B", "SET_B"}
"""Set and reset pins; all act when low."""


def kind_of(name: str) -> str | None:
    """Return what a special cell is called, None for what is no special cell."""
    stem = name.removeprefix("gf180mcu_fd_sc_mcu7t5v0__").removeprefix("sg13g2_")
    fits = [start for start in KINDS if stem.startswith(start)]
    return KINDS[max(fits, key=len)] if fits else None


def found_kinds(circuit: Circuit) -> list[str]:
    """Return what a cell was taken for: its storage, or what stands outside all logic."""
    stored = [element.kind for element in circuit.storage.elements]
    return stored or sorted({part.role for part in circuit.apart})


@pytest.mark.parametrize(("library", "special"), [("ihp_sg13g2", 21), ("gf180_7t", 62)])
def test_special_cells_are_named_as_what_they_are(library: str, special: int) -> None:
    """Every sequential cell, bus keeper, tie and decoupling cell is named right, and no other so.

    A cell holds one storage element, however many latches it is drawn of.
    """
    facts, right, wrong = cells_of(library), [], {}
    for name, circuit in circuits(library).items():
        if isinstance(circuit, str):
            continue
        wanted, found = kind_of(name), found_kinds(circuit)
        if found == ([wanted] if wanted else []):
            right.append(name)
        else:
            wrong[name] = found
        assert facts[name]["sequential"] == (wanted in {"flip-flop", "latch", "clock gate"})
    assert not wrong
    assert sum(kind_of(name) is not None for name in right) == special


@pytest.mark.parametrize("library", ["ihp_sg13g2", "gf180_7t"])
def test_sequential_cells_have_their_clock_data_set_and_reset(library: str) -> None:
    """By the pins of the libraries' own lists; the level of a clock by its name."""
    facts = cells_of(library)
    for name, circuit in circuits(library).items():
        cell = facts[name]
        if isinstance(circuit, str) or not cell["sequential"]:
            continue
        (element,) = circuit.storage.elements
        names = circuit.devices.net_names
        (clock, level), *others = ((names[net].upper(), level) for net, level in element.clocks)
        assert not others
        writes = {names[net].upper(): level for net, level in element.writes}
        pins = {pin.upper() for pin in cell["inputs"]}
        if element.kind == "clock gate":
            # Its latch is open while the clock it gates is at rest.
            assert (clock, level) in {("CLK", False), ("CLKN", True)}, name
        else:
            assert CLOCKS[clock] == level, name
        assert writes == dict.fromkeys(pins & WRITES, False), name
        data = {names[net].upper() for net in element.data}
        assert data, name
        # Data enter by pins, or through a gate before the first latch.
        assert data <= pins - writes.keys() - {clock} or data.isdisjoint(pins), name


@pytest.mark.parametrize("library", ["ihp_sg13g2", "gf180_7t"])
def test_no_combinational_cell_holds_anything(library: str) -> None:
    facts = cells_of(library)
    for name, circuit in circuits(library).items():
        if not isinstance(circuit, str) and facts[name]["combinational"]:
            assert not circuit.storage.elements, name
