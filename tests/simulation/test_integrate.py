"""The integrator against another method, and what happens where it cannot go on."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import solve_ivp

from evenstage.errors import SimulationError
from evenstage.simulation.crossings import last_crossing, transition
from evenstage.simulation.integrate import Accuracy, integrate
from evenstage.simulation.ramps import constant, switching
from support.nonlinear import Bench, level_1

if TYPE_CHECKING:
    from evenstage.netlist.devices import FloatArray

SHARP = Accuracy(relative=1e-7, absolute=1e-9)
FINE = Accuracy(relative=1e-5, absolute=1e-7)


def chain(names: list[str], entry: str) -> Bench:
    """Return a chain of equal inverters."""
    bench = Bench(names, ["0", "vdd", "in"])
    for before, output in zip([entry, *names], names, strict=False):
        bench.inverter(before, output)
    return bench


class TestAgainstAnotherMethod:
    def test_two_inverters(self) -> None:
        # An explicit method of order 8 on the equations written out by hand, level 1 unrounded.
        bench = chain(["a", "y"], "in")
        bench.rounding = 1e-4
        ramps = switching(np.array([0.0, 1.0, 0.0]), np.array([0.0, 1.0, 1.0]), 0.0, 3.0)
        waves = integrate(
            bench.equations(),
            ramps,
            np.array([1.0, 0.0]),
            (-1.0, 40.0),
            unit=1.0,
            supply=1.0,
            accuracy=SHARP,
        )
        # Coupling 0.2 from in to a and from a to y; a carries 0.5 of its own and 1 of the next.
        matrix = np.array([[0.5 + 1.0 + 0.2 + 0.2, -0.2], [-0.2, 0.5 + 0.2]])

        def pull(entry: float, output: float) -> float:
            down = level_1(output, entry, 0.0, threshold=0.2, k=1.0)
            return -level_1(1 - output, 1 - entry, 0.0, threshold=0.2, k=1.0) + down

        def slope(time: float, v: FloatArray) -> FloatArray:
            entry, rate = min(max(time / 3, 0.0), 1.0), 1 / 3 if 0 < time < 3 else 0.0
            leaving = [pull(entry, v[0]) - 0.2 * rate, pull(v[0], v[1])]
            return np.linalg.solve(matrix, -np.array(leaving))

        other = solve_ivp(
            slope,
            (-1.0, 40.0),
            [1.0, 0.0],
            method="DOP853",
            rtol=1e-9,
            atol=1e-11,
            max_step=0.02,
            dense_output=True,
        )
        times = np.array([0.5, 2.0, 3.5, 5.0, 8.0, 20.0])
        assert other.sol is not None
        assert_allclose(waves.at(times), other.sol(times), rtol=0, atol=2e-5)

    def test_usual_accuracy_is_good_to_a_thousandth(self) -> None:
        delays = []
        for accuracy in (Accuracy(), SHARP):
            bench = chain([f"n{i}" for i in range(6)], "in")
            ramps = switching(np.array([0.0, 1.0, 0.0]), np.array([0.0, 1.0, 1.0]), 0.0, 3.0)
            waves = integrate(
                bench.equations(),
                ramps,
                np.array([1.0, 0.0] * 3),
                (-1.0, 100.0),
                unit=1.0,
                supply=1.0,
                accuracy=accuracy,
            )
            delays.append(last_crossing(waves, 5, 0.5, rising=True))
        usual, sharp = delays
        assert usual is not None
        assert sharp is not None
        assert_allclose(usual, sharp, rtol=1e-3, atol=0)


class TestRing:
    def test_period_is_twice_the_stages_times_their_delay(self) -> None:
        # LE, chapter 1 (from memory): a ring of N inverters oscillates with 2 N stage delays.
        names = [f"r{i}" for i in range(5)]
        ring = chain(names, names[-1])
        waves = integrate(
            ring.equations(),
            constant(np.array([0.0, 1.0, 0.0])),
            np.array([0.0, 1.0] * 2 + [0.0]),
            (0.0, 200.0),
            unit=1.0,
            supply=1.0,
            accuracy=FINE,
        )
        times = np.linspace(60.0, 200.0, 100_001)
        high = waves.at(times)[0] >= 0.5
        rises = times[1:][high[1:] & ~high[:-1]]
        period = rises[-1] - rises[-2]
        line = [f"n{i}" for i in range(12)]
        straight = integrate(
            chain(line, "in").equations(),
            switching(np.array([0.0, 1.0, 0.0]), np.array([0.0, 1.0, 1.0]), 0.0, 4.0),
            np.array([1.0, 0.0] * 6),
            (-1.0, 100.0),
            unit=1.0,
            supply=1.0,
            accuracy=FINE,
        )
        # Two stages far from both ends: a rise and a fall.
        ends = [last_crossing(straight, i, 0.5, rising=i % 2 == 1) for i in (7, 9)]
        assert ends[0] is not None
        assert ends[1] is not None
        assert_allclose(period, 5 * (ends[1] - ends[0]), rtol=2e-3, atol=0)


class TestStopping:
    def test_too_many_steps_say_when(self) -> None:
        bench = chain(["a", "y"], "in")
        with pytest.raises(SimulationError, match=r"stopped at .*: it took more than 3 steps"):
            integrate(
                bench.equations(),
                constant(np.array([0.0, 1.0, 1.0])),
                np.array([1.0, 0.0]),
                (0.0, 40.0),
                unit=1.0,
                supply=1.0,
                accuracy=Accuracy(most_steps=3),
            )

    def test_a_current_out_of_range_says_when(self) -> None:
        # A transistor that nothing can hold: its current leaves the numbers once it opens.
        bench = chain(["a", "y"], "in")
        bench.mos(1.0, "y", "in", "0", gain=1e300, alpha=40.0)
        ramps = switching(np.array([0.0, 1.0, 0.0]), np.array([0.0, 1.0, 1.0]), 10e-12, 5e-12)
        with pytest.raises(SimulationError) as caught:
            integrate(
                bench.equations(),
                ramps,
                np.array([1.0, 0.0]),
                (0.0, 40e-12),
                unit=1e-12,
                supply=1.0,
            )
        assert caught.value.code == "simulation-stopped"
        assert re.match(
            r"the simulation stopped at 1\d(\.\d+)? ps: .*; look for a transistor or a resistor"
            r" whose size is out of all proportion to the others$",
            caught.value.message,
        )

    def test_ends_once_enough_is_known(self) -> None:
        bench = chain(["a", "y"], "in")
        waves = integrate(
            bench.equations(),
            constant(np.array([0.0, 1.0, 1.0])),
            np.array([1.0, 0.0]),
            (0.0, 1e6),
            unit=1.0,
            supply=1.0,
            finished=lambda _, v: bool(v[1] > 0.95),
        )
        assert waves.time[-1] < 100


class TestCrossings:
    def test_none_where_a_node_stays(self) -> None:
        bench = chain(["a"], "in")
        waves = integrate(
            bench.equations(),
            constant(np.array([0.0, 1.0, 0.0])),
            np.array([1.0]),
            (0.0, 10.0),
            unit=1.0,
            supply=1.0,
        )
        assert last_crossing(waves, 0, 0.5, rising=False) is None
        assert transition(waves, 0, 1.0, rising=False) is None
