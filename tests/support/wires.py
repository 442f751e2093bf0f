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
