"""What changed copies of a circuit keep: nothing that a changed field is part of."""

from __future__ import annotations

from dataclasses import fields, replace
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
import pytest

from evenstage.circuit.carrying import RESTS_ON, carry
from evenstage.circuit.circuit import Circuit
from support.blocks import block, circuit_of, inverter, plain_process

if TYPE_CHECKING:
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.process.process import Process


def circuit() -> Circuit:
    cards = [inverter("a", "i", "m", 1, 2), inverter("b", "m", "o", 1, 2), "cm m 0 3f"]
    return circuit_of(block("\n".join(cards), "i o"), plain_process())


def doubled(process: Process) -> Process:
    kinds = tuple(
        replace(one, r_w=2 * one.r_w, c_gate=3 * one.c_gate) for one in process.transistors
    )
    return replace(process, transistors=kinds)


def warmed(some: Circuit) -> Circuit:
    for name in RESTS_ON:
        getattr(some, name)
    return some


def read(some: Circuit) -> list[FloatArray | IntArray]:
    elmore = some.arcs.elmore(some.net_cap)
    return [some.net_cap, elmore, some.pins.cap.today, some.driven, some.wire_cap]


def test_names_are_properties_and_fields_of_circuits() -> None:
    known = {one.name for one in fields(Circuit)}
    for name, needed in RESTS_ON.items():
        assert isinstance(getattr(Circuit, name), cached_property)
        assert set(needed) <= known


def test_what_rests_on_other_fields_is_handed_on() -> None:
    old = warmed(circuit())
    new = carry(old, replace(old, notices=()))
    assert all(vars(new)[name] is vars(old)[name] for name in RESTS_ON)


@pytest.mark.parametrize("field", ["process", "drive", "coupling", "outside_cap"])
def test_values_are_those_of_a_circuit_made_anew(field: str) -> None:
    old = warmed(circuit())
    nets = len(old.devices.net_names)
    changed = {
        "process": replace(old, process=doubled(old.process)),
        "drive": replace(old, drive=np.full(nets, 7.0)),
        "coupling": replace(old, coupling=0.5),
        "outside_cap": replace(old, outside_cap=np.full(nets, 1e-15)),
    }[field]
    anew = replace(changed)
    carried = carry(old, changed)
    for found, expected in zip(read(carried), read(anew), strict=True):
        np.testing.assert_array_equal(found, expected)
    assert (vars(carried)["electrical"] is vars(old)["electrical"]) == (field != "process")
