"""The built-in process."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from evenstage.process.generic import at_length, generic

if TYPE_CHECKING:
    from evenstage.process.process import Process

#: Model names met in openly published netlists, foundry prefixes taken off.
N_NAMES = (
    "n nch nch_lvt NMOS nmos_3p3 nfet_01v8 xx_nfet_01v8_lvt modn nshort nhv_nmos nsvt lv_nmos n18"
)
P_NAMES = (
    "p pch pch_lvt PMOS pmos_3p3 pfet_01v8 xx_pfet_01v8_hvt modp pshort phighvt psvt lv_pmos p18"
)
NOT_TRANSISTORS = "nand2 nor3 pad inv buf_n npn pnp pass_gate bench branch nwell pdiff res_n dff"


def fo4(process: Process) -> float:
    """Charged delay of an inverter of equal pull driving four of itself, at n width 1."""
    n, p = process.first("n"), process.first("p")
    q = 1 + (n.slope * p.shape + p.slope * n.shape) / 2
    ratio = p.r_w / n.r_w
    return q * n.r_w * (4 * (n.c_gate + ratio * p.c_gate) + n.c_drain + ratio * p.c_drain)


class TestNumbers:
    @pytest.mark.parametrize("nanometres", [65, 130, 180, 600])
    def test_fo4_is_a_third_of_a_picosecond_per_nanometre(self, nanometres: int) -> None:
        # Common practice, no source; within 30 % of published processes.
        process = at_length(generic(), nanometres * 1e-9)
        assert_allclose(fo4(process), nanometres / 3 * 1e-12, rtol=1e-9, atol=0)

    def test_gate_capacitance_per_micron(self) -> None:
        # Published values run from 1 to 2 fF/um over many generations (from memory).
        assert 1e-9 < generic().first("n").c_gate < 2e-9

    def test_parasitic_delay_of_the_inverter(self) -> None:
        n = generic().first("n")
        assert 0.5 <= n.c_drain / n.c_gate <= 1


class TestNames:
    @pytest.mark.parametrize("name", N_NAMES.split())
    def test_n(self, name: str) -> None:
        index = generic().type_of(name)
        assert index is not None
        assert generic().transistors[index].polarity == "n"

    @pytest.mark.parametrize("name", P_NAMES.split())
    def test_p(self, name: str) -> None:
        index = generic().type_of(name)
        assert index is not None
        assert generic().transistors[index].polarity == "p"

    @pytest.mark.parametrize("name", NOT_TRANSISTORS.split())
    def test_other_subcircuits_are_no_transistors(self, name: str) -> None:
        assert generic().type_of(name) is None


class TestAtLength:
    def test_notice_names_the_length(self) -> None:
        notices = at_length(generic(), 65e-9).notices
        assert [n.message for n in notices] == [
            (
                "no process file and no usable .model card: constants of the built-in generic"
                " process for a channel length of 65.0 nm; efforts and ratios mean something,"
                " absolute times are rough"
            ),
            "no supply voltage given: 800 mV assumed, ten volts per micron of channel length",
        ]

    def test_a_known_supply_stays(self) -> None:
        process = at_length(generic(supply=1.1), 65e-9)
        assert process.supply == 1.1
        assert [n.code for n in process.notices] == ["generic-process"]

    @pytest.mark.parametrize(("length", "supply"), [(20e-9, 0.8), (180e-9, 1.8), (2e-6, 5.0)])
    def test_an_assumed_supply_follows(self, length: float, supply: float) -> None:
        assert_allclose(at_length(generic(), length).supply, supply, rtol=1e-12, atol=0)

    def test_other_processes_stay(self) -> None:
        process = replace(generic(), origin="file")
        assert at_length(process, 65e-9) is process

    @settings(max_examples=40, deadline=None)
    @given(st.floats(10e-9, 5e-6), st.floats(10e-9, 5e-6))
    def test_the_last_length_counts(self, first: float, last: float) -> None:
        twice, once = at_length(at_length(generic(), first), last), at_length(generic(), last)
        assert twice.notices == once.notices
        assert twice.supply == once.supply
        assert_allclose(twice.first("p").r_w, once.first("p").r_w, rtol=1e-12, atol=0)
