"""Constants from level-1 cards."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import solve_ivp

from evenstage.process.models import process_from_models

if TYPE_CHECKING:
    from collections.abc import Mapping

    from evenstage.process.process import Process, Transistor

#: Invented cards in the range of a 180 nm planar process.
N = {"level": 1.0, "vto": 0.45, "kp": 170e-6, "tox": 4e-9, "lambda": 0.05}
P = {"vto": -0.45, "uo": 80.0, "tox": 4e-9}
JUNCTION = {"cj": 1e-3, "cjsw": 0.2e-9, "pb": 0.8, "mj": 0.5, "mjsw": 0.33}


def derive(
    n: Mapping[str, float] = N,
    p: Mapping[str, float] = P,
    supply: float | None = 1.8,
    length: float | None = 0.18e-6,
) -> Process | None:
    return process_from_models([("nch", "NMOS", n), ("pch", "pmos", p)], supply, length)


def n_of(process: Process | None) -> Transistor:
    assert process is not None
    return process.first("n")


class TestConstants:
    def test_resistance(self) -> None:
        # Rabaey et al., equations 3.42 and 3.43, times ln 2.
        current = 170e-6 / 2 / 0.18e-6 * 1.35**2
        expected = math.log(2) * 0.75 * 1.8 / current * (1 - 7 / 9 * 0.05 * 1.8)
        assert_allclose(n_of(derive()).r_w, expected, rtol=1e-12, atol=0)

    def test_transconductance_from_mobility(self) -> None:
        process = derive()
        assert process is not None
        k = 80e-4 * 3.9 * 8.8541878128e-12 / 4e-9
        current = k / 2 / 0.18e-6 * 1.35**2
        assert_allclose(
            process.first("p").r_w, math.log(2) * 0.75 * 1.8 / current, rtol=1e-12, atol=0
        )

    def test_gate_with_overlaps(self) -> None:
        # Companion to a published textbook, example 2.9: t_ox 20 nm, W 1.8 um, L 1.2 um, overlap
        # 0.15 um: 2.835 fF of channel, 0.4725 fF per overlap (permittivity there 3.5e-11 F/m).
        overlap = 0.15e-6 * 3.5e-11 / 20e-9
        cards = {"ld": 0.15e-6, "cgso": overlap, "cgdo": overlap, "tox": 20e-9}
        c_gate = n_of(derive(N | cards, P | cards, length=1.2e-6)).c_gate
        channel = 2.835e-15 * 3.9 * 8.8541878128e-12 / 3.5e-11
        assert_allclose(c_gate * 1.8e-6, channel + 3 * 0.4725e-15, rtol=1e-6, atol=0)

    def test_junctions_are_averaged_over_what_an_edge_sees(self) -> None:
        # K_eq at PB 0.8 V, MJ 0.5 of 0 to 0.9 V 0.813756, of 0.9 to 1.8 V 0.613400 (quadrature).
        process = derive(N | JUNCTION, P | JUNCTION)
        n, p = n_of(process).junctions, process.first("p").junctions if process else None
        assert n is not None
        assert p is not None
        assert_allclose([n.rise.area, n.fall.area], [0.813756e-3, 0.613400e-3], rtol=2e-6, atol=0)
        assert (p.rise, p.fall) == (n.fall, n.rise)
        assert n.fall.edge > 0.2e-9 * 0.613400

    def test_overlaps_and_whole_junctions(self) -> None:
        """The drain overlap counts twice; CBD and CBS stand in for CJ; CGBO stays."""
        extra = {"cgdo": 0.3e-9, "cgbo": 0.1e-9, "cbd": 2e-15, "ld": 0.01e-6}
        n = n_of(derive(N | JUNCTION | extra))
        assert n.junctions is not None
        rise = n.junctions.rise
        assert (rise.area, rise.overlap, rise.source_fixed) == (0.0, 0.6e-9, 0.0)
        assert_allclose(rise.drain_fixed, 0.813756 * 2e-15, rtol=2e-6, atol=0)
        assert_allclose(n.c_gate_fixed, 0.1e-9 * 0.16e-6, rtol=1e-12, atol=0)

    def test_published_geometry(self) -> None:
        """Companion to a published textbook, example 2.9: L_d 3.6 um, W 1.8 um, C_j0 0.3 fF/um^2,
        C_jsw 0.8 fF/um: bottom 1.944 fF, side walls without the gate's edge 7.2 fF. At zero bias;
        a supply of 1 mV leaves the junctions there.
        """
        cards = N | {"cj": 0.3e-3, "cjsw": 0.8e-9, "vto": 1e-4}
        junctions = n_of(derive(cards, cards, supply=1e-3)).junctions
        assert junctions is not None
        extent, width = 3.6e-6, 1.8e-6
        bottom = junctions.rise.area * extent * width
        side = junctions.rise.edge * (2 * extent + width)
        assert_allclose([bottom, side], [1.944e-15, 7.2e-15], rtol=1e-3, atol=0)

    def test_drain_of_usual_geometry(self) -> None:
        transistor = n_of(derive(N | JUNCTION | {"cgdo": 0.3e-9}))
        junctions = transistor.junctions
        assert junctions is not None
        area, edge = (
            (getattr(junctions.rise, name) + getattr(junctions.fall, name)) / 2
            for name in ("area", "edge")
        )
        width, reach = 2e-6, 2.5 * 0.18e-6
        by_hand = area * width * reach + edge * (width + 2 * reach)
        assert_allclose(
            transistor.c_drain * width + transistor.c_drain_fixed,
            by_hand + 2 * 0.3e-9 * width,
            rtol=1e-12,
            atol=0,
        )

    def test_no_junction_data_means_as_much_as_a_gate(self) -> None:
        process = derive(N | JUNCTION)
        assert process is not None
        p = process.first("p")
        assert (p.c_drain, p.c_drain_fixed, p.junctions) == (p.c_gate, 0.0, None)
        assert [(x.code, x.names) for x in process.notices] == [("drain-assumed", ("pch",))]

    def test_devices_in_series_count_in_full(self) -> None:
        # Exact for level 1 without modulation and body effect.
        assert n_of(derive()).stack == 1.0


class TestWhatSuffices:
    @pytest.mark.parametrize(
        "n",
        [
            {key: value for key, value in N.items() if key != "vto"},
            {key: value for key, value in N.items() if key != "kp"},
            {key: value for key, value in N.items() if key != "tox"},
            N | {"level": 3.0},
            N | {"vto": 2.0},
            N | {"vto": 0.0},
            N | {"ld": 0.1e-6},
            N | {"cj": -1.0},
            N | {"lambda": 1.0},
            N | {"pb": 0.0},
        ],
    )
    def test_a_card_that_does_not(self, n: Mapping[str, float]) -> None:
        assert derive(n) is None

    def test_no_cards(self) -> None:
        assert process_from_models([]) is None
        assert process_from_models([("d1", "d", N), ("nch", "nmos", N)]) is None

    def test_bins_are_one_model(self) -> None:
        process = process_from_models([("nch.1", "nmos", N), ("pch", "pmos", P)], 1.8)
        assert process is not None
        assert process.type_of("NCH") == 0

    def test_an_unsuitable_card_beside_suitable_ones_is_passed_over(self) -> None:
        cards = [("nat", "nmos", N | {"vto": 0.0}), ("nch", "nmos", N), ("pch", "pmos", P)]
        process = process_from_models(cards, 1.8)
        assert process is not None
        assert (process.type_of("nat"), process.type_of("nch")) == (None, 0)


class TestAssumptions:
    def test_supply_from_the_threshold(self) -> None:
        process = derive(N | JUNCTION, P | JUNCTION, supply=None)
        assert process is not None
        assert_allclose(process.supply, 2.25, rtol=1e-12, atol=0)
        (notice,) = process.notices
        assert notice.message == (
            "no supply voltage given: 2.25 V assumed, five times the mean threshold of the"
            " model cards"
        )

    def test_length_from_the_oxide(self) -> None:
        assert_allclose(n_of(derive(length=None)).length, 180e-9, rtol=1e-12, atol=0)


def chain_delay(v: float) -> float:
    """Integrate a chain of equal level-1 inverters; delay of a late stage in C/(k V_DD)."""
    stages = 7

    def current(gate: float, drain: float) -> float:
        overdrive = gate - v
        return (overdrive - drain / 2) * drain if drain < overdrive else max(overdrive, 0) ** 2 / 2

    def slope(t: float, y: np.ndarray) -> list[float]:
        gates = [min(1.0, 2 * t), *y[:-1]]
        return [current(1 - g, 1 - o) - current(g, o) for g, o in zip(gates, y, strict=True)]

    start = [1.0 - i % 2 for i in range(stages)]
    times = np.linspace(0, 30, 3001)
    waves = solve_ivp(slope, (0, 30), start, t_eval=times, rtol=1e-5, atol=1e-7, max_step=0.2).y
    crossings = [times[np.argmax((wave > 0.5) != (wave[0] > 0.5))] for wave in waves]
    return float(crossings[5] - crossings[4])


class TestAgainstSimulatedChains:
    @pytest.mark.parametrize("v", [0.1, 0.2, 0.3])
    def test_delay_with_repeating_transitions(self, v: float) -> None:
        cards = {"vto": v, "kp": 1.0, "tox": 4e-9}
        n = n_of(derive(cards, cards, supply=1.0, length=0.18e-6))
        elmore = n.r_w / 0.18e-6
        transition = n.shape * elmore / math.sqrt(1 - n.shape_carry**2)
        simulated = chain_delay(v)
        assert_allclose(elmore + n.slope * transition, simulated, rtol=0.04, atol=0)
        assert elmore + n.slope * n.shape * elmore < 0.93 * simulated
