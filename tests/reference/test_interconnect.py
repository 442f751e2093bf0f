"""Wires against published numbers: bounds, the distributed line, repeaters.

Sources, all recomputed and cited from memory unless said otherwise: Rubinstein, Penfield and
Horowitz, "Signal delay in RC tree networks", IEEE Transactions on CAD 2(3), 1983; Gupta, Tutuianu
and Pileggi, "The Elmore delay as a bound for RC trees with generalized input signals", IEEE
Transactions on CAD 16(1), 1997 (abstract seen); Sakurai, "Closed-form expressions for
interconnection delay", IEEE JSSC 18(4), 1983; Bakoglu, "Circuits, Interconnections, and Packaging
for VLSI", 1990; Weste and Harris, "CMOS VLSI Design", 2005; Rabaey, Chandrakasan and Nikolic,
"Digital Integrated Circuits", 2003.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.optimize import minimize

from evenstage.circuit.rc_network import RCNetwork
from support.wires import Driven, FloatArray, Net, ladder, random_tree

LN2 = math.log(2)


def behind(driver: float, net: Net) -> Net:
    """Return a net with its driver's resistance as its first resistor, from a new node 0."""
    ends = np.concatenate([[[0], [1]], net.ends + 1], axis=1)
    return Net(ends, np.array([driver, *net.resistance]), np.array([0.0, *net.capacitance]))


def network(net: Net) -> RCNetwork:
    return RCNetwork(net.ends, net.resistance, np.arange(len(net.capacitance)) == 0)


def elmore(net: Net) -> float:
    """Return the Elmore delay of the last node."""
    return float(network(net).moments(net.capacitance).first[-1])


@dataclass(frozen=True)
class Bounds:
    """Rubinstein, Penfield and Horowitz 1983: T_P, T_De, T_Re of a node, and what they bound."""

    t_p: float
    t_d: float
    t_r: float

    @classmethod
    def of(cls, net: Net, node: int) -> Bounds:
        tree, every = network(net), np.arange(len(net.capacitance))
        own = tree.shared_resistance(every, every)
        shared = tree.shared_resistance(np.full(len(every), every[node]), every)
        weight = net.capacitance
        return cls(
            float(own @ weight), float(shared @ weight), float(shared**2 @ weight / own[node])
        )

    def least(self, t: float) -> float:
        if t <= self.t_d - self.t_r:
            return 0.0
        if t <= self.t_p - self.t_r:
            return 1 - self.t_d / (t + self.t_r)
        return 1 - self.t_d / self.t_p * math.exp(-(t - self.t_p + self.t_r) / self.t_p)

    def most(self, t: float) -> float:
        if t <= self.t_d - self.t_r:
            return 1 - (self.t_d - t) / self.t_p
        return 1 - self.t_r / self.t_p * math.exp(-(t - self.t_d + self.t_r) / self.t_r)


def published_network(sections: int = 400) -> Net:
    """15 ohm to 2 F; from there 8 ohm to 7 F, and a line of 3 ohm and 4 F to 9 F."""
    line = ladder(sections, pi=True, resistance=3.0, capacitance=4.0)
    ends = np.concatenate([[[0], [1]], [[1], [2]], [[1], [3]], line.ends[:, 1:] + 2], axis=1)
    resistance = np.array([15.0, 8.0, *line.resistance])
    capacitance = np.array([0.0, 2.0 + line.capacitance[0], 7.0, *line.capacitance[1:]])
    capacitance[-1] += 9.0
    return Net(ends, resistance, capacitance)


class TestBounds:
    def test_the_published_network(self) -> None:
        """T_P = 419, T_De = 363, T_Re = 6033/18."""
        found = Bounds.of(published_network(), -1)
        assert_allclose(found.t_p, 419, rtol=1e-9, atol=0)
        assert_allclose(found.t_d, 363, rtol=1e-9, atol=0)
        assert_allclose(found.t_r, 6033 / 18, rtol=1e-6, atol=0)

    @pytest.mark.parametrize(
        ("t", "least", "most"),
        [
            (20, 0, 0.18138), (40, 0.03243, 0.22860), (100, 0.16644, 0.35503),
            (200, 0.34342, 0.52141), (500, 0.67913, 0.80446), (1000, 0.90271, 0.95601),
            (2000, 0.99105, 0.99777),
        ],
    )  # fmt: skip
    def test_its_voltage_bounds(self, t: float, least: float, most: float) -> None:
        """The table of that network, recomputed."""
        found = Bounds.of(published_network(), -1)
        assert_allclose([found.least(t), found.most(t)], [least, most], rtol=0, atol=6e-6)

    @pytest.mark.parametrize("seed", range(60))
    def test_elmore_lies_above_the_delay_and_never_by_more_than_one_deviation(
        self, seed: int
    ) -> None:
        """Gupta, Tutuianu and Pileggi 1997: mu - sigma <= t_50 <= mu, at every node."""
        rng = np.random.default_rng(seed)
        tree, driver = random_tree(rng, 12), float(rng.uniform(0.05, 3))
        exact, net = Driven(tree, driver), behind(driver, tree)
        found = network(net).moments(net.capacitance)
        deviation = np.sqrt(2 * found.second - found.first**2)
        for node in range(len(tree.capacitance)):
            late = exact.delay(node)
            mean = float(found.first[node + 1])
            assert max(0.0, mean - float(deviation[node + 1])) <= late * (1 + 1e-9)
            assert late <= mean * (1 + 1e-9)

    @pytest.mark.parametrize("seed", range(60))
    def test_every_response_lies_between_the_voltage_bounds(self, seed: int) -> None:
        rng = np.random.default_rng(1000 + seed)
        tree, driver = random_tree(rng, 12), float(rng.uniform(0.05, 3))
        exact, node = Driven(tree, driver), int(rng.integers(len(tree.capacitance)))
        found = Bounds.of(behind(driver, tree), node + 1)
        assert found.t_r <= found.t_d * (1 + 1e-12)
        assert found.t_d <= found.t_p * (1 + 1e-12)
        for t in np.geomspace(0.05, 5, 12) * found.t_d:
            voltage = exact.voltage(node, float(t))
            assert found.least(float(t)) <= voltage + 1e-9
            assert voltage <= found.most(float(t)) + 1e-9


class TestDistributedLine:
    @pytest.mark.parametrize("sections", [1, 2, 3, 7, 50])
    def test_sections(self, sections: int) -> None:
        """``RC (N + 1)/(2 N)`` with capacitors at the ends of sections, RC/2 split in halves."""
        late = elmore(ladder(sections, pi=False))
        assert_allclose(late, (sections + 1) / (2 * sections), rtol=1e-12, atol=0)
        assert_allclose(elmore(ladder(sections, pi=True)), 0.5, rtol=1e-12, atol=0)

    def test_second_moment(self) -> None:
        """5/24 (RC)^2: the line's transfer function is 1/cosh sqrt(s RC)."""
        net = ladder(2000, pi=True)
        second = float(network(net).moments(net.capacitance).second[-1])
        assert_allclose(second, 5 / 24, rtol=1e-6, atol=0)

    def test_the_two_moment_delay_is_that_of_the_series(self) -> None:
        """0.37875 RC from the series solution; ln 2 times Elmore is 8.5 % low."""
        metric = LN2 * 0.5**2 / math.sqrt(5 / 24)
        assert_allclose(metric, 0.37875, rtol=3e-3, atol=0)
        assert_allclose(LN2 * 0.5 / 0.37875, 1 - 0.085, rtol=1e-3, atol=0)

    @pytest.mark.parametrize(
        ("driver", "load"), [(0.1, 0.1), (0.5, 0.5), (1.0, 0.2), (3.0, 1.0), (0.2, 2.0)]
    )
    def test_driver_line_and_load(self, driver: float, load: float) -> None:
        """T_50 = 0.377 RC + 0.693 (R_t C + R_t C_t + R C_t), Sakurai 1983, within 4 %."""
        net = ladder(200, pi=True)
        loaded = Net(net.ends, net.resistance, net.capacitance + load * np.eye(201)[-1])
        whole = behind(driver, loaded)
        found = network(whole).moments(whole.capacitance)
        metric = LN2 * float(found.first[-1]) ** 2 / math.sqrt(float(found.second[-1]))
        closed = 0.377 + 0.693 * (driver + driver * load + load)
        assert_allclose(metric, closed, rtol=0.04, atol=0)


class TestRepeaters:
    def test_repeated_wire(self) -> None:
        """Least delay per length (2 + sqrt(2 (1 + p))) sqrt(R C' r c), Weste and Harris.

        Width sqrt(R c/(r C')), spacing sqrt(2 R C' (1 + p)/(r c)); here all four are 1.
        """

        def per_length(log_sizes: FloatArray) -> float:
            width, length = map(float, np.exp(log_sizes))
            line = ladder(4, pi=True, resistance=length, capacitance=length)
            line.capacitance[0] += 0.5 * width
            line.capacitance[-1] += width
            return elmore(behind(1 / width, line)) / length

        found = minimize(
            per_length, np.array([0.3, 0.1]), method="Nelder-Mead", options={"xatol": 1e-7}
        )
        width, length = np.exp(found.x)
        assert_allclose([width, length], [1.0, math.sqrt(3)], rtol=1e-3, atol=0)
        assert_allclose(found.fun, 2 + math.sqrt(3), rtol=1e-6, atol=0)

    def test_bakoglu(self) -> None:
        """T_min = 2.458 sqrt(R0 C0 Rw Cw), with 0.7 and 0.4 for lumps and lines."""

        def total(log_sizes: FloatArray) -> float:
            sections, size = map(float, np.exp(log_sizes))
            part = ladder(1, pi=True, resistance=1 / sections, capacitance=1 / sections)
            lumped = behind(1 / size, Net(part.ends, part.resistance, np.zeros(2)))
            lumps = Net(lumped.ends, lumped.resistance, np.array([0, 1 / sections, size]))
            return sections * (0.7 * elmore(lumps) + 0.4 / sections**2)

        least = minimize(
            total, np.array([0.1, 0.1]), method="Nelder-Mead", options={"xatol": 1e-7}
        ).fun
        assert_allclose(least, 2 * (0.7 + math.sqrt(0.4 * 0.7)), rtol=1e-6, atol=0)
        assert_allclose(least, 2.458, rtol=1e-3, atol=0)

    def test_five_millimetres(self) -> None:
        """5 mm by 0.32 um at 0.05 ohm/sq and 0.2 fF/um, 694 ohm, 4 fF: Elmore 1.09 ns (1.1)."""
        line = ladder(1, pi=True, resistance=781.25, capacitance=1e-12)
        line.capacitance[-1] += 4e-15
        assert_allclose(elmore(behind(2500 / 3.6, line)), 1.091e-9, rtol=1e-3, atol=0)
