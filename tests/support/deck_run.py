"""A measuring deck run as a simulator would: its cards read by the program, its transistors
integrated, and each of its measure cards answered from the waveforms.

The nonlinear channels are those of `evenstage.simulation`; sources, ramps and measure cards are
taken from the deck's own text.
"""

from __future__ import annotations

import re
from dataclasses import astuple, dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from evenstage.circuit.recognise import recognise
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read
from evenstage.simulation.channel import Channels
from evenstage.simulation.crossings import last_crossing
from evenstage.simulation.equations import Equations
from evenstage.simulation.integrate import Accuracy, integrate
from evenstage.simulation.parameters import ROUNDING_SHARE, parameters
from evenstage.simulation.ramps import Ramps, constant
from evenstage.simulation.strength import strength
from evenstage.timing.yardstick import yardstick
from evenstage.units import parse_number

if TYPE_CHECKING:
    from pathlib import Path

    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.devices import IntArray
    from evenstage.process.process import Process
    from evenstage.simulation.integrate import Waveforms
    from evenstage.simulation.parameters import Parameters

#: A tenth of a percent of a delay is enough here.
_ACCURACY = Accuracy(relative=1e-3, absolute=1e-4)

_NUMBER = r"([-+\d.]+[a-z]*|'supply')"
_SOURCE = re.compile(rf"v(\d+) i\1 0 pwl\(0 {_NUMBER} (\S+) {_NUMBER} (\S+) {_NUMBER}\)")
_DIFFERENCE = re.compile(
    r"\.measure tran (\w+) trig v\((\w+)\) val='([\d.]+)\*supply' (rise|fall)=1 "
    r"targ v\((\w+)\) val='([\d.]+)\*supply' (rise|fall)=1"
)
_QUOTIENT = re.compile(r"\.measure tran (\w+) param='(\w+)/([\d.]+)'")
_ANALYSIS = re.compile(r"\.tran \S+ (\S+)")


@dataclass(frozen=True)
class DeckRun:
    """A deck on disk, with the process that plays the foundry's models."""

    path: Path
    process: Process

    def results(self) -> dict[str, float]:
        """Return every measured value by its name."""
        found: dict[str, float] = {}
        waves = {row: self._waves(row) for row in self._sources}
        for name, trig, low, way, targ, high, other in _DIFFERENCE.findall(self._text):
            row = int(targ[1:])
            begin, end = (
                self._crossing(row, waves[row], net, float(part), rising=edge == "rise")
                for net, part, edge in ((trig, low, way), (targ, high, other))
            )
            found[name] = end - begin
        for name, over, under in _QUOTIENT.findall(self._text):
            found[name] = found[over] / float(under)
        return found

    @cached_property
    def _text(self) -> str:
        return self.path.read_text()

    @cached_property
    def _circuit(self) -> Circuit:
        devices = elaborate(read(self.path), process=self.process)
        return recognise(devices, self.process)

    @cached_property
    def _parameters(self) -> Parameters:
        known = self._circuit.process
        return parameters(self._circuit, strength(known, yardstick(known)))

    @cached_property
    def _sources(self) -> dict[int, tuple[float, float, float, float]]:
        """Level before and after, begin and end of every ramp."""
        supply = self.process.supply

        def level(text: str) -> float:
            return supply if text == "'supply'" else parse_number(text)

        return {
            int(row): (level(first), level(last), parse_number(begin), parse_number(end))
            for row, first, begin, again, end, last in _SOURCE.findall(self._text)
            if first == again
        }

    @cached_property
    def _row_of_device(self) -> IntArray:
        devices = self._circuit.devices
        paths = [devices.instance_path(i) for i in range(len(devices.instance_parent))]
        return np.array([int(path[1:]) if path else -1 for path in paths])[devices.instance]

    def _nodes(self, row: int) -> tuple[list[int], list[int]]:
        """Return the unknown nets of a row, its output first, and the given ones."""
        circuit = self._circuit
        devices, mine = circuit.devices, np.flatnonzero(self._row_of_device == row)
        given = [circuit.net_id(name) for name in ("0", "high", f"i{row}")]
        met = np.unique([devices.drain[mine], devices.gate[mine], devices.source[mine]])
        output = circuit.net_id(f"o{row}")
        assert output is not None
        inner = [net for net in met.tolist() if net not in given and net != output]
        return [output, *inner], [net for net in given if net is not None]

    def _waves(self, row: int) -> Waveforms:
        before, after, begin, end = self._sources[row]
        supply, (unknown, given) = self.process.supply, self._nodes(row)
        equations = self._equations(row, unknown, given)
        found = _ANALYSIS.search(self._text)
        assert found is not None
        stop = parse_number(found[1])
        levels = np.array([0.0, supply, before])
        settled = integrate(
            equations,
            constant(levels),
            np.zeros(len(unknown)),
            (0.0, 20 * stop),
            unit=end - begin,
            supply=supply,
            accuracy=_ACCURACY,
        )
        ramps = Ramps(
            levels, np.array([0.0, supply, after]), np.full(3, begin), np.full(3, end - begin)
        )
        return integrate(
            equations,
            ramps,
            settled.voltage[:, -1],
            (0.0, stop),
            unit=end - begin,
            supply=supply,
            accuracy=_ACCURACY,
        )

    def _equations(self, row: int, unknown: list[int], given: list[int]) -> Equations:
        devices, values = self._circuit.devices, self._parameters
        mine = np.flatnonzero(self._row_of_device == row)
        place = {net: number for number, net in enumerate([*unknown, *given])}

        def nodes(nets: IntArray) -> IntArray:
            return np.array([place[net] for net in nets.tolist()])

        drain, gate, source, bulk = (
            nodes(nets[mine])
            for nets in (devices.drain, devices.gate, devices.source, devices.bulk)
        )
        (wire,) = np.flatnonzero((devices.capacitor_nets == unknown[0]).any(axis=0))
        pairs = [
            (gate, bulk, values.gate_bulk),
            (gate, source, values.gate_source),
            (gate, drain, values.gate_drain),
            (drain, bulk, values.drain_bulk),
            (source, bulk, values.source_bulk),
        ]
        ends = [np.stack([a, b]) for a, b, _ in pairs] + [np.array([[0], [place[given[0]]]])]
        capacitance = [value[mine] for *_, value in pairs] + [devices.capacitance[[wire]]]
        channels = values.channels
        return Equations(
            unknown=len(unknown),
            given=len(given),
            channels=Channels(*(column[mine] for column in astuple(channels))),
            drain=drain,
            gate=gate,
            source=source,
            bulk=bulk,
            capacitor_ends=np.concatenate(ends, axis=1),
            capacitance=np.concatenate(capacitance),
            resistor_ends=np.zeros((2, 0), int),
            resistance=np.zeros(0),
            rounding=ROUNDING_SHARE * self.process.supply,
        )

    def _crossing(
        self, row: int, waves: Waveforms, net: str, part: float, *, rising: bool
    ) -> float:
        """Return when a net first crosses a part of the supply, s."""
        supply = self.process.supply
        if net == f"i{row}":
            before, after, begin, end = self._sources[row]
            assert rising == (after > before)
            return begin + (end - begin) * (part * supply - before) / (after - before)
        found = last_crossing(waves, 0, part * supply, rising=rising)
        assert found is not None, f"{net} never crosses"
        return found
