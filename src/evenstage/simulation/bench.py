"""One path of a circuit, cut out, integrated, and measured."""

from __future__ import annotations

import math
from contextlib import suppress
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.errors import Notice, SimulationError
from evenstage.simulation.crossings import last_crossing, transition
from evenstage.simulation.excerpt import excerpt, route_of
from evenstage.simulation.groups import Groups
from evenstage.simulation.integrate import integrate
from evenstage.simulation.parameters import parameters
from evenstage.simulation.results import SimulatedPath, SimulatedStage, Traces
from evenstage.simulation.strength import STEEPEST
from evenstage.timing.vectors import can_look, path_logic, standing, vector_of
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.circuit.circuit import Circuit
    from evenstage.logic.paths import PathLogic
    from evenstage.netlist.devices import FloatArray
    from evenstage.simulation.excerpt import Excerpt
    from evenstage.simulation.integrate import Accuracy, Waveforms
    from evenstage.simulation.parameters import Parameters
    from evenstage.simulation.results import SideBranches
    from evenstage.timing.results import Path
    from evenstage.timing.sweep import Timing

#: Circuits settle for so many FO4 before the edge.
_SETTLING: Final = 20.0

#: A path has so many times its estimate, and FO4 besides, to arrive.
_PATIENCE: Final = (20.0, 100.0)

#: A voltage this near to where it ends, as a share of the supply, has arrived.
_ARRIVED: Final = 0.04


def counted_paths(paths: Sequence[Path]) -> str:
    """Return how many paths there are, in words."""
    return "one path" if len(paths) == 1 else f"{len(paths)} paths"


Steps = tuple[object, ...]
"""The edges of a path, by name."""


def steps(path: Path) -> Steps:
    """Return the edges of a path: those of equal paths of two netlists are equal."""
    return path.start, path.start_edge, *((stage.output, stage.edge) for stage in path.stages)


class Bench:
    """What all simulations of a run share.

    Parameters
    ----------
    strength : float
        See `evenstage.simulation.strength.strength`.
    side_branches : {"gates", "capacitances"}
    accuracy : Accuracy, optional
    conflicts : int
        See `evenstage.simulation.simulate.simulate`.
    """

    def __init__(
        self,
        strength: float,
        side_branches: SideBranches,
        accuracy: Accuracy | None,
        conflicts: int,
    ) -> None:
        self._strength = strength
        self._with_gates = side_branches == "gates"
        self._accuracy = accuracy
        self._conflicts = conflicts
        self._parameters: dict[int, Parameters] = {}
        self._groups: dict[int, Groups] = {}
        self._logic: dict[int, PathLogic] = {}
        self._searched: dict[str, list[Path]] = {}
        self._held: dict[Steps, tuple[tuple[str, bool], ...]] = {}

    @property
    def notices(self) -> list[Notice]:
        """Why side inputs of which paths were not held as a vector says."""
        return [
            Notice(
                "own-side-inputs",
                f"the side inputs of {counted_paths(paths)} are held at values that suit the"
                " path's own gates, each by itself; no input vector says which"
                f" occur together: {reason}",
                names=tuple(dict.fromkeys(f"{path.start} to {path.end}" for path in paths)),
            )
            for reason, paths in self._searched.items()
        ]

    def groups(self, circuit: Circuit) -> Groups:
        """Return the groups of a circuit, found once."""
        if id(circuit) not in self._groups:
            self._groups[id(circuit)] = Groups(circuit)
        return self._groups[id(circuit)]

    def _path_logic(self, circuit: Circuit) -> PathLogic:
        if id(circuit) not in self._logic:
            self._logic[id(circuit)] = path_logic(circuit)
        return self._logic[id(circuit)]

    def _decided(self, circuit: Circuit, path: Path) -> tuple[dict[int, bool], str]:
        """Return what a path's vector decides, by net; or why there is none.

        Raises
        ------
        SimulationError
            ``false-path``.
        """
        vector, reason = path.vector, "nobody looked for one"
        if self._conflicts and can_look(circuit):
            logic = self._path_logic(circuit)
            vector = vector_of(logic, circuit, path, self._conflicts)
            if vector.verdict == "switches":
                return standing(logic, circuit, path, vector), ""
            reason = vector.reason or "none switches the path alone"
        if vector is not None and vector.verdict == "false":
            raise SimulationError(
                f"no input vector lets the path from {path.start} to {path.end} switch, whatever"
                " the delays; leave it out with [[ignore]] in the brief, or choose another with"
                " --from and --to",
                code="false-path",
            )
        return {}, reason

    def _part(self, timing: Timing, path: Path) -> tuple[Excerpt, str]:
        """Cut a path out of its circuit; tell, too, why no vector says what holds its side inputs.

        A path that was simulated in another circuit keeps the values it had there, so that both
        delays are those of the same input vector.
        """
        circuit, names = timing.circuit, self._held.get(steps(path), ())
        decided, reason = self._decided(circuit, path)
        same = {net: level for name, level in names if (net := circuit.net_id(name)) is not None}
        for told in [same, decided] if same else [decided]:
            with suppress(SimulationError):
                return self._excerpt(timing, path, told), reason
        return self._excerpt(timing, path, decided), reason

    def _excerpt(self, timing: Timing, path: Path, decided: dict[int, bool]) -> Excerpt:
        circuit, unit = timing.circuit, timing.unit
        if id(circuit) not in self._parameters:
            self._parameters[id(circuit)] = parameters(circuit, self._strength)
        groups = self.groups(circuit)
        route = route_of(groups, path)
        graph = timing.graph
        start = np.flatnonzero(
            (graph.net[graph.start] == route.nets[0])
            & (graph.rising[graph.start] == (path.start_edge == "rise"))
        )[0]
        return excerpt(
            groups,
            self._parameters[id(circuit)],
            route,
            transition=max(float(graph.start_transition[start]), STEEPEST * unit.fo4),
            # The estimate's resistances hold the ln 2 of an RC response.
            drive=float(graph.start_drive[start]) / math.log(2),
            with_gates=self._with_gates,
            decided=decided,
        )

    def run(self, timing: Timing, path: Path) -> SimulatedPath:
        """Simulate one path.

        Raises
        ------
        SimulationError
            Where it cannot be; see `excerpt`, `integrate`; ``false-path``; ``no-edge``.
        """
        circuit, unit = timing.circuit, timing.unit
        part, reason = self._part(timing, path)
        route = part.route
        if reason and part.held:
            self._searched.setdefault(reason, []).append(path)
        supply, unknown = circuit.process.supply, part.layout.equations.unknown
        on_path = np.array(part.watched)
        moving = on_path[on_path < unknown]
        goal = np.array([route.edges[int(net)][1] for net in part.layout.net[moving]]) * supply

        def arrived(_time: float, voltage: FloatArray) -> bool:
            return bool((np.abs(voltage[moving] - goal) < _ARRIVED * supply).all())

        patience = _PATIENCE[0] * path.delay + _PATIENCE[1] * unit.fo4
        waves = integrate(
            part.layout.equations,
            part.ramps,
            part.initial,
            (-_SETTLING * unit.fo4, patience),
            unit=unit.tau,
            supply=supply,
            accuracy=self._accuracy,
            finished=arrived,
        )
        found = _measured(timing, path, part, waves, by_vector=not reason)
        self._held.setdefault(steps(path), found.held)
        return found


def _measured(
    timing: Timing, path: Path, part: Excerpt, waves: Waveforms, *, by_vector: bool
) -> SimulatedPath:
    """Read delays and transitions off the waveforms.

    Raises
    ------
    SimulationError
        ``no-edge`` where a stage never crosses half the supply.
    """
    circuit, route, layout = timing.circuit, part.route, part.layout
    supply, unknown = circuit.process.supply, layout.equations.unknown
    nodes = part.watched
    crossings: list[float] = []
    for net, node in zip(route.nets, nodes, strict=True):
        rising = route.edges[net][1]
        if node >= unknown:
            crossings.append(float(part.ramps.duration[node - unknown]) / 2)
            continue
        found = last_crossing(waves, node, supply / 2, rising=rising)
        if found is None:
            raise SimulationError(
                f"net '{circuit.devices.net_names[net]}' has not crossed half the supply by"
                f" {engineering(float(waves.time[-1]), 's')}; its stage does not switch with the"
                " side inputs held as found",
                code="no-edge",
            )
        crossings.append(found)
    stages = tuple(
        SimulatedStage(
            stage,
            crossings[place + 1] - crossings[place],
            transition(waves, nodes[place + 1], supply, rising=stage.edge == "rise"),
        )
        for place, stage in enumerate(path.stages)
    )
    names = circuit.devices.net_names
    return SimulatedPath(
        estimate=path,
        stages=stages,
        delay=crossings[-1] - crossings[0],
        held=tuple((names[net], level) for net, level in sorted(part.held.items())),
        by_vector=by_vector,
        devices=len(layout.devices),
        nodes=unknown,
        steps=len(waves.time) - 1,
        side_gates=part.side_gates,
        traces=_traces([names[net] for net in route.nets], nodes, part, waves),
    )


def _traces(names: Sequence[str], nodes: Sequence[int], part: Excerpt, waves: Waveforms) -> Traces:
    """Return the voltages along the path at the integrator's times, from the edge on."""
    seen = waves.time >= 0
    given = np.array([part.ramps.at(time) for time in waves.time[seen].tolist()]).T
    both = np.concatenate([waves.voltage[:, seen], given])
    return Traces(tuple(names), waves.time[seen], both[list(nodes)])
