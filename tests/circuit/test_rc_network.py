"""Moments of RC networks, against plain sums over trees and dense solutions of meshes."""

from __future__ import annotations

from time import process_time

import numpy as np
import pytest
from numpy.testing import assert_allclose

from evenstage.circuit.rc_network import Moments, RCNetwork
from support.wires import Net, random_mesh, random_tree

SEEDS = range(40)


def network(net: Net, driven: list[int] | None = None) -> RCNetwork:
    held = np.zeros(len(net.capacitance), bool)
    held[driven or [0]] = True
    return RCNetwork(net.ends, net.resistance, held)


def moments(net: Net) -> Moments:
    return network(net).moments(net.capacitance)


def walked(net: Net, weight: list[float]) -> list[float]:
    """Return ``sum R_k w_k`` at every node of a tree, resistor by resistor."""
    below = list(weight)
    edges = list(zip(*net.ends.tolist(), net.resistance.tolist(), strict=True))
    for parent, child, _ in reversed(edges):
        below[parent] += below[child]
    found = [0.0] * len(weight)
    for parent, child, r in edges:
        found[child] = found[parent] + r * below[child]
    return found


class TestTrees:
    """Elmore: each resistor delays by itself times all capacitance behind it."""

    @pytest.mark.parametrize("seed", SEEDS)
    def test_both_moments_are_sums_along_the_way(self, seed: int) -> None:
        net = random_tree(np.random.default_rng(seed))
        first = walked(net, net.capacitance.tolist())
        second = walked(net, [c * m for c, m in zip(net.capacitance, first, strict=True)])
        found = moments(net)
        assert_allclose(found.first, first, rtol=1e-11, atol=0)
        assert_allclose(found.second, second, rtol=1e-11, atol=0)

    def test_a_hand_worked_branch(self) -> None:
        """A 2 ohm stem with 3 F, then 5 ohm to 7 F and 11 ohm to 13 F."""
        ends = np.array([[0, 1, 1], [1, 2, 3]])
        net = Net(ends, np.array([2.0, 5.0, 11.0]), np.array([100.0, 3.0, 7.0, 13.0]))
        assert_allclose(moments(net).first, [0, 46, 81, 189], rtol=1e-14, atol=0)
        assert_allclose(moments(net).second[1], 2 * (3 * 46 + 7 * 81 + 13 * 189), rtol=1e-14)


class TestMeshes:
    @pytest.mark.parametrize("seed", SEEDS)
    def test_moments_are_those_of_the_dense_matrix(self, seed: int) -> None:
        net = random_mesh(np.random.default_rng(seed))
        inverse = np.linalg.inv(net.conductance()[1:, 1:])
        first = inverse @ net.capacitance[1:]
        second = inverse @ (net.capacitance[1:] * first)
        assert_allclose(moments(net).first, [0, *first], rtol=1e-10, atol=0)
        assert_allclose(moments(net).second, [0, *second], rtol=1e-10, atol=0)

    def test_a_loop_halves_the_way_to_its_far_side(self) -> None:
        ends = np.array([[0, 0, 1, 2], [1, 2, 3, 3]])
        net = Net(ends, np.ones(4), np.array([0.0, 0.0, 0.0, 1.0]))
        assert_allclose(moments(net).first, [0, 0.5, 0.5, 1.0], rtol=1e-14, atol=1e-15)

    def test_several_drivers_share_the_work(self) -> None:
        """Driven from both ends, the middle of a line sees two ways in parallel."""
        ends = np.array([[0, 1, 2, 3], [1, 2, 3, 4]])
        net = Net(ends, np.ones(4), np.array([0.0, 0.0, 1.0, 0.0, 0.0]))
        found = network(net, [0, 4]).moments(net.capacitance).first
        assert_allclose(found, [0, 0.5, 1, 0.5, 0], rtol=1e-14, atol=0)


class TestManyNets:
    """Nets that do not touch are solved at once, and know nothing of each other."""

    def side_by_side(self) -> tuple[list[Net], RCNetwork, np.ndarray]:
        nets = [random_mesh(np.random.default_rng(seed)) for seed in range(12)]
        starts = np.cumsum([0, *(len(net.capacitance) for net in nets)])
        ends = [net.ends + start for net, start in zip(nets, starts, strict=False)]
        driven = np.zeros(starts[-1], bool)
        driven[starts[:-1]] = True
        resistance = np.concatenate([net.resistance for net in nets])
        return nets, RCNetwork(np.concatenate(ends, axis=1), resistance, driven), starts

    def test_moments(self) -> None:
        nets, together, _ = self.side_by_side()
        found = together.moments(np.concatenate([net.capacitance for net in nets]))
        alone = np.concatenate([moments(net).second for net in nets])
        assert_allclose(found.second, alone, rtol=1e-10, atol=0)

    def test_shared_resistance_is_the_inverse_of_the_conductance(self) -> None:
        nets, together, starts = self.side_by_side()
        count = len(together)
        node, other = (grid.ravel() for grid in np.meshgrid(np.arange(count), np.arange(count)))
        whole = np.zeros((count, count))
        for net, start in zip(nets, starts, strict=False):
            here = slice(start + 1, start + len(net.capacitance))
            whole[here, here] = np.linalg.inv(net.conductance()[1:, 1:])
        found = together.shared_resistance(node, other)
        assert_allclose(found, whole[node, other], rtol=1e-9, atol=1e-12)

    def test_shared_resistance_weighs_capacitance_to_the_elmore_delay(self) -> None:
        net = random_mesh(np.random.default_rng(3))
        every = np.arange(len(net.capacitance))
        shared = network(net).shared_resistance(np.full(len(every), every[-1]), every)
        assert_allclose(shared @ net.capacitance, moments(net).first[-1], rtol=1e-11, atol=0)


class TestEdges:
    def test_a_node_that_nobody_drives_is_refused(self) -> None:
        with pytest.raises(ValueError, match="joined to no driven node"):
            RCNetwork(np.array([[0, 2], [1, 3]]), np.ones(2), np.array([True, False, False, False]))

    def test_driven_nodes_alone(self) -> None:
        alone = RCNetwork(np.zeros((2, 0), int), np.zeros(0), np.array([True, True]))
        assert_allclose(alone.moments(np.ones(2)).first, [0, 0], rtol=0, atol=0)
        assert_allclose(alone.shared_resistance(np.array([0]), np.array([1])), [0], rtol=0, atol=0)

    def test_ten_thousand_nodes_take_less_than_a_tenth_of_a_second(self) -> None:
        """The fastest of five, mesh of 100 x 100; measured 20 ms."""
        grid = np.arange(10_000).reshape(100, 100)
        across = np.stack([grid[:, :-1].ravel(), grid[:, 1:].ravel()])
        down = np.stack([grid[:-1].ravel(), grid[1:].ravel()])
        net = Net(np.concatenate([across, down], axis=1), np.ones(19_800), np.full(10_000, 1e-15))
        seconds = []
        for _ in range(5):
            begin = process_time()
            moments(net)
            seconds.append(process_time() - begin)
        assert min(seconds) < 0.1
