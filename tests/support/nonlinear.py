"""Small nonlinear circuits by hand: one transistor, chains and rings of inverters, RC networks."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np

from evenstage.simulation.channel import Channels
from evenstage.simulation.equations import Equations

if TYPE_CHECKING:
    from evenstage.netlist.devices import FloatArray


@dataclass
class Bench:
    """A circuit under construction; names stand for nodes, unknown ones first come first served."""

    unknown: list[str]
    given: list[str]
    rounding: float = 0.01
    devices: list[tuple[float, str, str, str, dict[str, float]]] = field(default_factory=list)
    capacitors: list[tuple[str, str, float]] = field(default_factory=list)
    resistors: list[tuple[str, str, float]] = field(default_factory=list)

    def node(self, name: str) -> int:
        return [*self.unknown, *self.given].index(name)

    def mos(self, sign: float, drain: str, gate: str, source: str, **constants: float) -> None:
        self.devices.append((sign, drain, gate, source, constants))

    def inverter(self, entry: str, output: str, size: float = 1.0, **constants: float) -> None:
        """Add an inverter at the nodes ``vdd`` and ``0``, its capacitances those of its size."""
        constants = {"gain": 0.5 * size} | constants
        self.mos(1.0, output, entry, "0", **constants)
        self.mos(-1.0, output, entry, "vdd", **constants)
        self.capacitors += [
            (entry, "0", size),
            (output, "0", 0.5 * size),
            (entry, output, 0.2 * size),
        ]

    def equations(self) -> Equations:
        plain = {"threshold": 0.2, "gain": 0.5, "alpha": 2.0, "knee": 1.0}
        rows = [
            plain | {"modulation": 0.0, "body": 0.0, "phi": 0.6} | constants
            for *_, constants in self.devices
        ]
        columns = [
            np.array([row[name] for row in rows], float)
            for name in ("threshold", "gain", "alpha", "knee", "modulation", "body", "phi")
        ]
        ends = np.array([[self.node(n) for n in d[1:4]] for d in self.devices], int).reshape(-1, 3)
        bulk = [self.node("0" if device[0] > 0 else "vdd") for device in self.devices]
        return Equations(
            unknown=len(self.unknown),
            given=len(self.given),
            channels=Channels(np.array([device[0] for device in self.devices]), *columns),
            drain=ends[:, 0],
            gate=ends[:, 1],
            source=ends[:, 2],
            bulk=np.array(bulk, int),
            capacitor_ends=self._ends(self.capacitors),
            capacitance=np.array([value for *_, value in self.capacitors], float),
            resistor_ends=self._ends(self.resistors),
            resistance=np.array([value for *_, value in self.resistors], float),
            rounding=self.rounding,
        )

    def _ends(
        self, elements: list[tuple[str, str, float]]
    ) -> np.ndarray[tuple[int, ...], np.dtype[np.int64]]:
        pairs = [[self.node(a), self.node(b)] for a, b, _ in elements]
        return np.array(pairs, np.int64).reshape(-1, 2).T


def level_1(
    drain: float, gate: float, source: float, *, threshold: float, k: float, modulation: float = 0.0
) -> float:
    """Return an n channel's level-1 current as the manuals write it, A; k is KP W/L."""
    if drain < source:
        return -level_1(source, gate, drain, threshold=threshold, k=k, modulation=modulation)
    over, across = gate - source - threshold, drain - source
    if over <= 0:
        return 0.0
    longer = 1 + modulation * across
    if across >= over:
        return k / 2 * over**2 * longer
    return k * (over - across / 2) * across * longer


def ladder(resistance: FloatArray, capacitance: FloatArray) -> Bench:
    """Return an RC ladder from the given node ``in``, one resistor before each capacitor."""
    names = [f"n{i}" for i in range(len(resistance))]
    bench = Bench(names, ["0", "in"])
    for before, name, r, c in zip(["in", *names], names, resistance, capacitance, strict=False):
        bench.resistors.append((before, name, float(r)))
        bench.capacitors.append((name, "0", float(c)))
    return bench
