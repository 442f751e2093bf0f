"""RC networks for tests, and their exact responses from the eigenvalues of the whole network."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import eigh
from scipy.optimize import brentq

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]


@dataclass(frozen=True)
class Net:
    """One net: node 0 is the driver's; resistor ``k`` joins nodes ``ends[:, k]``."""

    ends: IntArray
    resistance: FloatArray
    capacitance: FloatArray

    def conductance(self) -> FloatArray:
        """Return the conductance matrix of all nodes."""
        matrix = np.zeros((len(self.capacitance),) * 2)
        for (a, b), r in zip(self.ends.T.tolist(), self.resistance.tolist(), strict=True):
            matrix[a, a] += 1 / r
            matrix[b, b] += 1 / r
            matrix[a, b] -= 1 / r
            matrix[b, a] -= 1 / r
        return matrix


@dataclass(frozen=True)
class Driven:
    """A net behind a resistor from a source that rises from 0 to 1 in a ramp, all C > 0."""

    net: Net
    resistance: float

    @cached_property
    def modes(self) -> tuple[FloatArray, FloatArray]:
        """Rates and, node by node, the weights with which they fade."""
        matrix = self.net.conductance()
        matrix[0, 0] += 1 / self.resistance
        scale = 1 / np.sqrt(self.net.capacitance)
        rates, shapes = eigh(scale[:, None] * matrix * scale)
        source = np.zeros(len(scale))
        source[0] = 1 / self.resistance
        return rates, scale[:, None] * shapes * (shapes.T @ (scale * source)) / rates

    def voltage(self, node: int, time: float, ramp: float = 0.0) -> float:
        """Return the voltage of a node."""
        rates, weights = self.modes
        if ramp == 0:
            return float(weights[node] @ (1 - np.exp(-rates * max(time, 0.0))))
        done, rest = max(time, 0.0), max(time - ramp, 0.0)
        risen = done - (1 - np.exp(-rates * done)) / rates
        risen -= rest - (1 - np.exp(-rates * rest)) / rates
        return float(weights[node] @ risen) / ramp

    def crossing(self, node: int, level: float, ramp: float = 0.0) -> float:
        """Return when a node crosses a level."""
        longest = 100 / float(self.modes[0].min()) + ramp
        return float(brentq(lambda t: self.voltage(node, t, ramp) - level, 0, longest, rtol=1e-12))

    def delay(self, node: int, ramp: float = 0.0) -> float:
        """Return the 50 % delay of a node."""
        return self.crossing(node, 0.5, ramp) - ramp / 2


def random_tree(rng: np.random.Generator, most: int = 25) -> Net:
    """Return a tree; parents come before their children."""
    count = int(rng.integers(2, most))
    parents = [int(rng.integers(max(0, k - 4), k)) for k in range(1, count)]
    ends = np.array([parents, range(1, count)], np.intp)
    return Net(ends, rng.uniform(0.1, 1, count - 1), rng.uniform(0.05, 1, count) ** 2)


def random_mesh(rng: np.random.Generator) -> Net:
    """Return a tree with further resistors, some of them parallel to others."""
    tree = random_tree(rng)
    count = len(tree.capacitance)
    extra = rng.integers(0, count, (2, count))
    extra = extra[:, extra[0] != extra[1]]
    return Net(
        np.concatenate([tree.ends, extra], axis=1),
        np.concatenate([tree.resistance, rng.uniform(0.1, 1, extra.shape[1])]),
        tree.capacitance,
    )


def ladder(sections: int, *, pi: bool, resistance: float = 1.0, capacitance: float = 1.0) -> Net:
    """Return a line of equal sections, each with its capacitor at its end or half at both."""
    each = np.full(sections + 1, capacitance / sections)
    if pi:
        each[[0, -1]] /= 2
    else:
        each[0] = 0.0
    return Net(
        np.array([range(sections), range(1, sections + 1)], np.intp),
        np.full(sections, resistance / sections),
        each,
    )


def wire_cards(net: str, rc: Net, *, first: int = 0) -> list[str]:
    """Return cards of a net: node 0 is called as the net, the others ``net:1``, ``net:2``, ..."""

    def name(node: int) -> str:
        return f"{net}:{node}" if node else net

    ends = rc.ends.T.tolist()
    cards = [
        f"r{net}{first + k} {name(a)} {name(b)} {r:.17g}"
        for k, ((a, b), r) in enumerate(zip(ends, rc.resistance.tolist(), strict=True))
    ]
    cards += [
        f"c{net}{first + k} {name(k)} vss {c:.17g}"
        for k, c in enumerate(rc.capacitance.tolist())
        if c > 0
    ]
    return cards


def wired_block(seed: int, gates: int = 7) -> str:
    """Return a block of inverters and NANDs whose nets are random trees and meshes.

    Drains, gates and the port ``y`` hang on nodes of their own choice.
    """
    rng = np.random.default_rng(seed)
    cards, spots = [], {"i0": ["i0"], "i1": ["i1"]}
    for index in range(gates):
        out = f"n{index}"
        rc = random_mesh(rng) if rng.random() < 0.4 else random_tree(rng, 9)
        rc = Net(rc.ends, 400 * rc.resistance, 4e-15 * rc.capacitance)
        cards += wire_cards(out, rc)
        nodes = [out, *(f"{out}:{k}" for k in range(1, len(rc.capacitance)))]

        def spot(among: list[str]) -> str:
            return str(rng.choice(among))

        width = float(rng.uniform(0.5, 4))
        nets = list(spots)[-3:]
        inputs = [spots[str(rng.choice(nets))] for _ in range(1 if rng.random() < 0.5 else 2)]
        inner = "vss"
        for k, pin in enumerate(inputs):
            below = inner if k == 0 else f"s{index}"
            above = spot(nodes) if k == len(inputs) - 1 else f"s{index}"
            cards.append(f"mn{index}{k} {above} {spot(pin)} {below} vss nx w={width:.9g}u l=0.1u")
            cards.append(
                f"mp{index}{k} {spot(nodes)} {spot(pin)} vdd vdd px w={1.7 * width:.9g}u l=0.1u"
            )
        spots[out] = nodes
    last = spots[f"n{gates - 1}"]
    cards += [f"rend {last[-1]} y 250", "cend y vss 9f"]
    return "* wires\n.global vdd vss\n.subckt top i0 i1 y\n" + "\n".join(cards) + "\n.ends\n"
