"""How supplies and parasitics are written.

Habits that netlists in the wild have: read, or refused with one clear message. One test or more
for each habit; the docstring says which habit it is.
"""

from __future__ import annotations

import pytest

from support.dialects import INV, TAIL, codes, laid


class TestSuppliesAndParasitics:
    @pytest.mark.parametrize(
        "rail", ["vdd!", "vcc", "vpwr", "dd", "sup", "vpb", "gnd!", "ss", "vnb"]
    )
    def test_names_of_rails_are_nets_like_others(self, rail: str) -> None:
        """Rails have many names; this room keeps them as they are."""
        devices = laid(f".global {rail}\n{INV}x1 a b {rail} {rail} inv\n")
        assert devices.net_names[min(devices.global_nets)] == rail

    def test_a_rail_inside_that_nobody_declared(self) -> None:
        """A global rail reaches into subcircuits; one that is not declared is a net of its own."""
        text = f".subckt s a y\nm1 y a vss vss nch {TAIL}\n.ends\nx1 a b s\nx2 a b s\n"
        assert len(set(laid(text).source.tolist())) == 2
        assert len(set(laid(".global VSS\n" + text).source.tolist())) == 1
        assert len(set(laid(text.replace("vss", "0")).source.tolist())) == 1

    def test_wells_apart_from_rails_and_several_supplies(self) -> None:
        """Wells and several supplies are nets like all others."""
        text = (
            f"m1 y a vss vpw nch {TAIL}\nm2 y a vddh vnw pch {TAIL}\nm3 z y vddl vnw pch {TAIL}\n"
        )
        devices = laid(text)
        assert len(set(devices.bulk.tolist()) | set(devices.source.tolist())) == 5

    def test_rails_fed_by_sources(self) -> None:
        """Sources of the block's own level are kept with their value."""
        devices = laid(f"{INV}x1 a b vdd 0 inv\nvdd vdd 0 dc 1.8\nvneg vbb 0 '-0.5'\n")
        assert [value for *_, value in devices.source_nets] == [1.8, -0.5]

    def test_rails_that_differ_by_case(self) -> None:
        """Rails that differ by case are one net."""
        devices = laid(f"m1 y a VSS vss nch {TAIL}\nm2 y b vss Vss nch {TAIL}\n")
        assert len({*devices.source.tolist(), *devices.bulk.tolist()}) == 1

    @pytest.mark.parametrize("value", ["0.022f", "2.2e-17", "'0.022f'", "c=0.022f", "0.022ff"])
    def test_extracted_capacitors(self, value: str) -> None:
        """Values of parasitics have a suffix or none."""
        devices = laid(f"m1 a b 0 0 nch {TAIL}\nc1 a 0 {value}\n")
        assert devices.capacitance.tolist() == pytest.approx([2.2e-17], rel=1e-9)

    def test_a_supply_that_is_reached_through_resistors_only(self) -> None:
        """Nets in parts are joined by their resistors; supplies keep their names."""
        text = (
            f"m1 net:1 a vss:2 vss nch {TAIL}\nm2 n_net_m2_d a vdd:1 vdd pch {TAIL}\n"
            "r1 net net:1 5\nr2 net n_net_m2_d 7\nr3 vss vss:2 1\nr4 vdd vdd:1 1.5\n"
        )
        devices = laid(text)
        names = devices.net_names
        assert len(set(devices.drain.tolist())) == 1
        assert [names[int(n)] for n in devices.source] == ["vss", "vdd"]
        assert "resistor-joined" in codes(devices)

    def test_ports_in_any_order(self) -> None:
        """The order of ports is that of the definition, whatever it is elsewhere."""
        swapped = INV.replace("a y vdd vss", "vss vdd y a")
        one, other = laid(INV + "x1 a b c d inv\n"), laid(swapped + "x1 d c b a inv\n")
        for pins in ("drain", "gate", "source", "bulk"):
            assert [one.net_names[int(n)] for n in getattr(one, pins)] == [
                other.net_names[int(n)] for n in getattr(other, pins)
            ]
