"""Gates beside the static ones: what they are called, compute, and how hard they drive."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest

from evenstage.brief import Brief, ClockBrief
from evenstage.pattern import Pattern
from evenstage.timing.analyse import analyse
from support.blocks import block, circuit_of, inverter, nand, network, transistor

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit

FOOTED = network("n", "d", [("x", "a", "m", 2), ("m", "ck", "vss", 2)])
PRECHARGE = transistor("p", "x", "ck", "vdd", 1, "pre")
BUFFER = inverter("i", "x", "y", 1, 4)


def circuit(*cards: str, ports: str) -> Circuit:
    return circuit_of(block("\n".join(cards), ports))


def kinds(found: Circuit) -> dict[str, tuple[str, str]]:
    """Return kind and function of each gate by its output."""
    names = found.devices.net_names
    return {
        names[net]: (found.gate_kind(gate), found.gate_function(gate))
        for gate, net in enumerate(found.gate_output.tolist())
    }


def codes(found: Circuit) -> set[str]:
    return {notice.code for notice in found.notices}


class TestRatioed:
    def test_a_p_load_that_always_conducts(self) -> None:
        cards = nand("g", ["a", "b"], "k", 2, 2).split("\n")[:2]
        load = transistor("p", "k", "vss", "vdd", 1, "l")
        assert kinds(circuit(*cards, load, inverter("i", "k", "y", 1, 2), ports="a b y")) == {
            "k": ("ratioed gate", "!(a & b)"),
            "y": ("static gate", "!k"),
        }

    def test_the_mirror_image(self) -> None:
        cards = network("p", "d", [("y", "a", "vdd", 4), ("y", "b", "vdd", 4)])
        load = transistor("n", "y", "vdd", "vss", 0.3, "l")
        assert kinds(circuit(cards, load, ports="a b y")) == {"y": ("ratioed gate", "!(a & b)")}

    def test_the_load_that_is_too_strong_is_named(self) -> None:
        down = transistor("n", "y", "a", "vss", 1, "d")
        fine, poor = (
            circuit(down, transistor("p", "y", "vss", "vdd", width, "l"), ports="a y")
            for width in (0.6, 0.8)
        )
        assert "strong-load" not in codes(fine)
        (notice,) = (notice for notice in poor.notices if notice.code == "strong-load")
        assert "is 2.5 times that of the pull" in notice.message
        assert notice.names == ("md",)

    def test_the_output_moves_whole_when_the_pull_lets_go(self) -> None:
        """A load of 4 kohm charges 1 fF of the pull's drain and half of one of its own."""
        found = circuit(
            transistor("n", "y", "a", "vss", 1, "d"),
            transistor("p", "y", "vss", "vdd", 0.5, "l"),
            ports="a y",
        )
        rises = found.arcs.rising
        assert found.arcs.own_today[rises] == pytest.approx(4e3 * 1.5e-15)

    def test_a_load_that_wins_leaves_no_delay_without_bound(self) -> None:
        found = circuit(
            transistor("n", "y", "a", "vss", 1, "d"),
            transistor("p", "y", "vss", "vdd", 9, "l"),
            ports="a y",
        )
        assert analyse(found).paths[0].delay < 1e-9


class TestDynamic:
    def test_with_a_foot(self) -> None:
        found = circuit(FOOTED, PRECHARGE, BUFFER, ports="a ck y")
        assert kinds(found)["x"] == ("dynamic gate, footed", "!(a & ck)")

    def test_without_a_foot(self) -> None:
        found = circuit(
            network("n", "d", [("x", "a", "vss", 1), ("x", "b", "vss", 1)]),
            PRECHARGE,
            BUFFER,
            ports="a b ck y",
        )
        assert kinds(found)["x"] == ("dynamic gate, unfooted", "!(a | b)")

    def test_only_evaluation_counts(self) -> None:
        """The output of the buffer rises, by the data or by the clock, and never falls."""
        found = analyse(circuit(FOOTED, PRECHARGE, BUFFER, ports="a ck y"), count=9)
        assert {(path.start, path.start_edge, path.edge) for path in found.paths} == {
            ("a", "rise", "rise"),
            ("ck", "rise", "rise"),
        }

    def test_an_output_stage_driven_apart_is_not_taken_for_one(self) -> None:
        found = circuit(
            transistor("p", "pad", "pg", "vdd", 8, "u"),
            transistor("n", "pad", "ng", "vss", 4, "d"),
            ports="pg ng pad",
        )
        assert not found.not_understood
        assert [part.kind for stage in found.stages for part in stage.form.parts] == [
            "tri-state gate"
        ]

    def test_a_port_that_a_network_pulls_down_is_precharged(self) -> None:
        found = circuit(
            network("n", "d", [("x", "a", "vss", 1), ("x", "b", "vss", 1)]),
            PRECHARGE,
            ports="a b ck x",
        )
        assert kinds(found)["x"] == ("dynamic gate, unfooted", "!(a | b)")

    def test_a_port_of_one_transistor_each_way_is_one_too_if_the_brief_names_the_clock(
        self,
    ) -> None:
        text = block(transistor("n", "x", "a", "vss", 1, "d") + "\n" + PRECHARGE, "a ck x")
        brief = Brief(clocks=(ClockBrief(nets=(Pattern("ck"),)),))
        assert kinds(circuit_of(text, None, brief))["x"] == ("dynamic gate, unfooted", "!a")


class TestSinglePhase:
    """A register of true single-phase clocking: three clocked stages and an inverter."""

    CARDS = (
        network("p", "a", [("x", "d", "k", 4), ("k", "ck", "vdd", 4)]),
        transistor("n", "x", "d", "vss", 2, "a"),
        transistor("p", "y", "ck", "vdd", 2, "b"),
        network("n", "b", [("y", "x", "j", 2), ("j", "ck", "vss", 2)]),
        transistor("p", "q", "y", "vdd", 4, "c"),
        network("n", "c", [("q", "ck", "h", 2), ("h", "y", "vss", 2)]),
        inverter("o", "q", "z", 1, 2),
    )

    def test_its_clock_is_told_from_its_data(self) -> None:
        found = kinds(circuit(*self.CARDS, ports="d ck z"))
        assert found["x"] == ("single-phase stage", "0 when d, 1 when !d & !ck, else kept")
        assert found["y"] == ("dynamic gate, footed", "!(x & ck)")
        assert found["q"] == ("single-phase stage", "0 when y & ck, 1 when !y, else kept")

    def test_data_end_before_the_clock_and_the_clock_runs_on(self) -> None:
        found = circuit(*self.CARDS, ports="d ck z")
        (latch,) = found.storage.elements
        assert (latch.kind, latch.loops[0].nets) == ("dynamic latch", (found.net_id("x"),))
        routes = {
            (path.start, *(s.output for s in path.stages)) for path in analyse(found, count=9).paths
        }
        assert {("d", "x"), ("ck", "y", "q", "z"), ("ck", "q", "z")} <= routes
        assert not any(route[0] == "d" and len(route) > 2 for route in routes)


class TestKept:
    KEEPER = transistor("p", "x", "y", "vdd", 0.4, "k")

    def test_a_keeper_loads_and_is_no_arc(self) -> None:
        bare, kept = (
            circuit(FOOTED, PRECHARGE, BUFFER, *more, ports="a ck y")
            for more in ([], [self.KEEPER])
        )
        assert kinds(kept)["x"] == ("dynamic gate, footed, kept", "!(a & ck)")
        assert kept.storage.elements == ()
        names = kept.devices.net_names
        pairs = {
            (names[a], names[b]) for a, b in zip(kept.arcs.input, kept.arcs.output, strict=True)
        }
        assert pairs == {("a", "x"), ("ck", "x"), ("x", "y")}
        x, y = kept.net_id("x"), kept.net_id("y")
        assert y is not None
        assert kept.net_cap[y] == pytest.approx(0.4e-15)
        # Its drain of 0.4 um beside 3 um of the gate's own, through the 1 kohm of the stack.
        own = [
            found.arcs.own_today[(found.arcs.output == x) & (found.arcs.input == found.net_id("a"))]
            for found in (bare, kept)
        ]
        assert own[1].max() - own[0].max() == pytest.approx(0.4e-12)

    def test_a_strong_keeper_is_named(self) -> None:
        """It has 2 kohm/um against 1 kohm of the stack: two micron are as strong."""
        weak, strong = (
            circuit(
                FOOTED, PRECHARGE, BUFFER, transistor("p", "x", "y", "vdd", w, "k"), ports="a ck y"
            )
            for w in (0.9, 1.6)
        )
        assert "strong-keeper" not in codes(weak)
        (notice,) = (notice for notice in strong.notices if notice.code == "strong-keeper")
        assert "1.2 times" in notice.message

    def test_a_c_element_with_its_keeper(self) -> None:
        found = circuit(
            network("n", "d", [("x", "a", "m", 4), ("m", "b", "vss", 4), ("x", "y", "vss", 0.2)]),
            network("p", "u", [("x", "a", "k", 8), ("k", "b", "vdd", 8), ("x", "y", "vdd", 0.4)]),
            BUFFER,
            ports="a b y",
        )
        assert kinds(found)["x"] == (
            "C-element, kept",
            "0 when a & b, 1 when !a & !b, else kept",
        )
        assert [element.kind for element in found.storage.elements] == ["C-element"]
        found_paths = analyse(found, count=9).paths
        assert {(path.start, path.edge) for path in found_paths} == {
            (start, edge) for start in "ab" for edge in ("rise", "fall")
        }


class TestCrossCoupled:
    """A level shifter: a differential pair of n transistors under cross-coupled p loads."""

    PAIR = "\n".join([
        network("n", "x", [("l", "a", "vss", 4), ("r", "ab", "vss", 4)]),
        "mpl l r vddh vddh px w=1u l=0.1u", "mpr r l vddh vddh px w=1u l=0.1u",
    ])  # fmt: skip
    HIGH = "mpo y r vddh vddh px w=2u l=0.1u\nmno y r vss vss nx w=1u l=0.1u"

    def test_both_sides_are_named_and_hold_nothing(self) -> None:
        found = circuit(inverter("i", "a", "ab", 1, 2), self.PAIR, self.HIGH, ports="a y vddh")
        assert kinds(found)["l"] == ("cross-coupled pull-up", "!a")
        assert kinds(found)["r"] == ("cross-coupled pull-up", "!ab")
        assert [one.kind for one in found.storage.elements] == ["loop that never holds"]

    def test_a_side_rises_after_the_other_has_fallen(self) -> None:
        found = circuit(inverter("i", "a", "ab", 1, 2), self.PAIR, self.HIGH, ports="a y vddh")
        routes = {
            tuple(f"{s.output}{s.edge[0]}" for s in path.stages)
            for path in analyse(found, count=9).paths
        }
        assert ("lf", "rr", "yf") in routes
        assert "loop-cut" not in codes(found)

    def test_the_load_fights_the_fall(self) -> None:
        """Four micron of n, 1/4 kohm, against one of p, 2 kohm: 1 / (4 - 0.5) kohm is left."""
        found = circuit(inverter("i", "a", "ab", 1, 2), self.PAIR, self.HIGH, ports="a y vddh")
        falls = (found.arcs.output == found.net_id("l")) & ~found.arcs.rising
        assert found.arcs.output_resistance[falls] == pytest.approx(1e3 / 3.5)

    def test_a_net_between_supplies_is_named_unless_it_is_shifted(self) -> None:
        low = inverter("i", "a", "ab", 1, 2)
        shifted = circuit(low, self.PAIR, self.HIGH, ports="a y vddh")
        assert "supply-crossed" not in codes(shifted)
        found = circuit(low, self.HIGH.replace(" r ", " ab "), ports="a y vddh")
        (notice,) = (notice for notice in found.notices if notice.code == "supply-crossed")
        assert "'ab' leads from 'vdd' to 'vddh'" in notice.message
