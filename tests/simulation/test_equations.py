"""Kirchhoff's law of small circuits against other ways to write it."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.linalg import expm

from evenstage.simulation.integrate import Accuracy, integrate
from evenstage.simulation.ramps import constant, switching
from support.nonlinear import Bench, ladder

SEED = 7301
SHARP = Accuracy(relative=1e-8, absolute=1e-10)


def chain(stages: int) -> Bench:
    """Return a chain of coupled inverters of growing size."""
    names = [f"n{i}" for i in range(stages)]
    bench = Bench(names, ["0", "vdd", "in"])
    for i, (entry, output) in enumerate(zip(["in", *names], names, strict=False)):
        bench.inverter(entry, output, size=1.0 + i % 3, alpha=1.4, knee=0.7, modulation=0.1)
    return bench


class TestJacobian:
    def test_is_that_of_the_slope(self) -> None:
        equations = chain(6).equations()
        unknown = np.random.default_rng(SEED).uniform(0.0, 1.0, 6)
        given, change, step = np.array([0.0, 1.0, 0.4]), np.array([0.0, 0.0, 0.2]), 1e-6
        found = equations.jacobian(unknown, given).toarray()
        columns = [
            (
                equations.slope(unknown + step * one, given, change)
                - equations.slope(unknown - step * one, given, change)
            )
            / (2 * step)
            for one in np.eye(6)
        ]
        expected = np.stack(columns, axis=1)
        assert_allclose(found, expected, rtol=1e-4, atol=1e-5 * np.abs(expected).max())

    def test_stays_sparse_in_a_long_chain(self) -> None:
        equations = chain(120).equations()
        found = equations.jacobian(np.full(120, 0.5), np.array([0.0, 1.0, 0.5]))
        assert found.nnz < 0.3 * 120**2


class TestLinear:
    @pytest.mark.parametrize("size", [1, 4, 9])
    def test_step_response_is_the_matrix_exponential(self, size: int) -> None:
        random = np.random.default_rng(SEED + size)
        r, c = random.uniform(0.5, 2.0, size), random.uniform(0.5, 2.0, size)
        bench = ladder(r, c)
        # A coupling capacitor from end to end makes the capacitance matrix full.
        if size > 1:
            bench.capacitors.append(("n0", f"n{size - 1}", 0.7))
        waves = integrate(
            bench.equations(),
            constant(np.array([0.0, 1.0])),
            np.zeros(size),
            (0.0, 20.0),
            unit=1.0,
            supply=1.0,
            accuracy=SHARP,
        )
        conductance, capacitance = np.zeros((size, size)), np.diag(c)
        for i in range(size):
            conductance[i, i] += 1 / r[i]
            if i:
                conductance[i - 1 : i + 1, i - 1 : i + 1] += np.array([[1, -1], [-1, 0]]) / r[i]
        if size > 1:
            capacitance[[0, -1], [0, -1]] += 0.7
            capacitance[[0, -1], [-1, 0]] -= 0.7
        rate = np.linalg.solve(capacitance, conductance)
        for time in (0.3, 2.0, 11.0):
            expected = 1 - expm(-rate * time) @ np.ones(size)
            assert_allclose(waves.at(time), expected, rtol=0, atol=1e-6)


class TestConservation:
    def test_supply_delivers_c_v_squared_per_rise(self) -> None:
        # An output that rises from 0 to V takes the charge C V out of the supply, so the energy
        # C V^2; half of it is lost in the transistor, whatever its law. Rabaey et al., Digital
        # Integrated Circuits, 2nd ed. 2003, section 5.5 (from memory).
        bench = Bench(["out"], ["0", "vdd", "in"])
        bench.mos(-1.0, "out", "in", "vdd", alpha=1.3, knee=0.6)
        bench.capacitors.append(("out", "0", 2.5))
        equations, given = bench.equations(), np.array([0.0, 1.0, 0.0])
        waves = integrate(
            equations,
            constant(given),
            np.zeros(1),
            (0.0, 200.0),
            unit=1.0,
            supply=1.0,
            accuracy=SHARP,
        )
        times = np.linspace(0.0, 200.0, 4_001)
        currents = [
            equations.supply_current(np.concatenate([v, given]), np.zeros(4), 2)
            for v in waves.at(times).T
        ]
        assert_allclose(np.trapezoid(currents, times), 2.5, rtol=1e-3, atol=0)

    def test_no_charge_is_made_or_lost(self) -> None:
        equations = chain(5).equations()
        random = np.random.default_rng(SEED)
        unknown, given = random.uniform(0, 1, 5), np.array([0.0, 1.0, 0.3])
        change = np.array([0.0, 0.0, 0.5])
        moving = np.concatenate([equations.slope(unknown, given, change), change])
        voltage = np.concatenate([unknown, given])
        fed = [equations.supply_current(voltage, moving, node) for node in range(8)]
        # What the unknown nodes are fed is nothing; what the given ones feed adds up to nothing.
        assert_allclose(fed[:5], 0.0, rtol=0, atol=1e-12)
        assert_allclose(sum(fed[5:]), 0.0, rtol=0, atol=1e-12)
        assert max(np.abs(fed[5:])) > 0.1


class TestRamps:
    def test_bend_at_begin_and_end(self) -> None:
        ramps = switching(np.array([0.0, 1.0]), np.array([0.0, 0.0]), 1.0, 2.0)
        assert ramps.corners == (1.0, 3.0)
        assert_allclose(ramps.at(2.0), [0.0, 0.5], rtol=1e-12, atol=0)
