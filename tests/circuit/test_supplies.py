"""Where supplies are found, and what is none."""

from __future__ import annotations

import pytest

from evenstage.brief import Brief
from evenstage.circuit.supplies import find_supplies
from evenstage.errors import CircuitError, SettingsError
from evenstage.pattern import Pattern
from support.blocks import circuit_of, devices_of, plain_process


def inverter(high: str, low: str, bulk_high: str = "", bulk_low: str = "") -> str:
    return (
        f"mn y a {low} {bulk_low or low} nx w=1u l=0.1u\n"
        f"mp y a {high} {bulk_high or high} px w=2u l=0.1u\n"
    )


def supplies(cards: str, brief: Brief | None = None, head: str = "") -> tuple[set[str], set[str]]:
    """Return the names of the high and the low supplies of some cards."""
    devices = devices_of(f"* t\n{head}\n{cards}", plain_process(), brief)
    found = find_supplies(devices, brief)
    names = list(devices.net_names)
    return (
        {name for name, is_high in zip(names, found.is_high, strict=True) if is_high},
        {name for name, is_low in zip(names, found.is_low, strict=True) if is_low},
    )


class TestFindSupplies:
    @pytest.mark.parametrize(
        ("high", "low"), [("vdd", "vss"), ("VCC", "gnd"), ("vpwr", "vgnd"), ("dvdd!", "0")]
    )
    def test_by_name(self, high: str, low: str) -> None:
        assert supplies(inverter(high, low)) == ({high}, {low})

    def test_an_undeclared_rail_inside_a_subcircuit(self) -> None:
        leaf = ".subckt inv a y\n" + inverter("vdd", "vss") + ".ends\n"
        text = leaf + ".subckt top a y\nx1 a y inv\n.ends\n"
        assert supplies(text) == ({"x1.vdd"}, {"x1.vss"})

    def test_by_source(self) -> None:
        cards = inverter("up", "down") + "v1 up 0 1.8\nv2 down 0 -0.2\nv3 0 ref 0\n"
        assert supplies(cards) == ({"up"}, {"0", "down"})

    def test_a_source_on_a_gate_is_a_stimulus(self) -> None:
        high, _ = supplies(inverter("up", "0") + "v1 up 0 1.8\nvin a 0 1.8\n")
        assert high == {"up"}

    def test_by_bulk(self) -> None:
        assert supplies(inverter("up", "down")) == ({"up"}, {"down"})

    def test_by_bulk_the_most_frequent_channel_end(self) -> None:
        cards = "".join(
            inverter(f"up{k // 2}", "down", "well").replace("mn", f"mn{k}").replace("mp", f"mp{k}")
            for k in range(3)
        )
        cards += "md y2 a up0 up0 px w=1u l=0.1u\n"
        assert supplies(cards) == ({"up0"}, {"down"})

    def test_the_brief_decides_alone(self) -> None:
        brief = Brief(supplies_high=(Pattern("up"),), supplies_low=(Pattern("dn"),))
        cards = inverter("up", "dn") + inverter("vdd", "vss").replace("m", "mx")
        assert supplies(cards, brief) == ({"up"}, {"dn"})

    def test_a_signal_named_like_a_rail_is_a_signal(self) -> None:
        cards = inverter("vdd", "vss") + inverter("vdd", "vss").replace("m", "mx").replace(
            " a ", " vdd_ok "
        ).replace(" y ", " z ")
        assert supplies(cards) == ({"vdd"}, {"vss"})
        circuit = circuit_of(f"* t\n{cards}")
        assert len(circuit) == 2

    def test_a_pattern_that_fits_no_net(self) -> None:
        with pytest.raises(SettingsError, match="no supply fits 'vcc'"):
            supplies(inverter("vdd", "vss"), Brief(supplies_high=(Pattern("vcc"),)))

    @pytest.mark.parametrize(
        ("cards", "kind"),
        [
            ("mn y a low low nx w=1u l=0.1u\n", "high"),
            ("mp y a vdd vdd px w=1u l=0.1u\n", "low"),
        ],
    )
    def test_none_is_an_error(self, cards: str, kind: str) -> None:
        with pytest.raises(CircuitError, match=f"no {kind} supply found in 'the top level'"):
            supplies(cards)
