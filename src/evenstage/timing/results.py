"""What an analysis and a comparison say: frozen values in SI units, for people and reports."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Literal

import networkx as nx

from evenstage.tabular import Row, Tabular, row
from evenstage.units import engineering

if TYPE_CHECKING:
    from evenstage.errors import Notice
    from evenstage.logic.paths import PathVector
    from evenstage.timing.sweep import Timing

Edge = Literal["rise", "fall"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Yardstick:
    """The unit inverter of a process, by which everything is measured.

    Parameters
    ----------
    process : str
        Name of the process.
    tau, p_inv, fo4 : float
        s; dimensionless; s: unit of delay, parasitic delay of the unit inverter in tau, delay of
        the unit inverter driving four of itself.
    input_cap : float
        F, of the unit inverter.
    charge_rise, charge_fall : float
        q of design: charged delay over Elmore delay of an output edge.
    transition_rise, transition_fall : float
        s, of a chain of fan-out-of-four inverters.
    """

    process: str
    tau: float
    p_inv: float
    fo4: float
    input_cap: float
    charge_rise: float
    charge_fall: float
    transition_rise: float
    transition_fall: float


@dataclass(frozen=True, slots=True, kw_only=True)
class SideBranch:
    """Something that loads a stage's output without being on the path.

    Parameters
    ----------
    instance : str
        Path of the gate or card; empty for the load outside the block.
    pin : str
        Net name of the pin inside the loading gate's subcircuit, or ``wire`` for a capacitor card,
        ``load`` for what the brief puts outside.
    cap : float
        F.
    """

    instance: str
    pin: str
    cap: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Stage:
    """One stage on a path; delays in s, capacitances in F, efforts dimensionless.

    ``stage_effort = logical_effort * electrical_effort * branching_effort`` and ``charged_delay =
    tau * (stage_effort + parasitic_delay)``. ``arrival`` is that at the next input along this path,
    ``delay`` its difference to the stage before. ``load_cap`` is what hangs outside the gate: the
    next input on the path, side branches and wire; ``on_path_cap`` the first of these alone.
    ``wire_delay`` is the part of the delay that resistance along the net makes (before the first
    stage, too), ``wire_cap`` the part of the load that is capacitor cards, and ``effective_cap``
    what the driver sees of the load in the delay, None where nothing hides any of it.
    ``instance`` is the gate whose input switches, ``through`` the others that the signal takes.
    """

    instance: str
    subcircuit: str
    function: str
    input: str
    output: str
    edge: Edge
    arrival: float
    delay: float
    charged_delay: float
    transition: float
    logical_effort: float
    electrical_effort: float
    branching_effort: float
    stage_effort: float
    parasitic_delay: float
    input_cap: float
    load_cap: float
    on_path_cap: float
    self_cap: float
    width: float
    side_branches: tuple[SideBranch, ...]
    wire_delay: float = 0.0
    wire_cap: float = 0.0
    effective_cap: float | None = None
    through: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Path:
    """A path from an input to a path end, slowest stages and all.

    ``delay`` is the arrival at its end; it counts from ``start_arrival``, when the input switches
    (plus the delay of an outside driver, where the brief gives one). ``best_stage_effort``,
    ``best_stage_count`` and ``least_delay`` are the textbook answers with today's branching.
    ``vector`` is what lets the path switch; None where nobody looked.
    """

    start: str
    start_edge: Edge
    start_arrival: float
    end: str
    edge: Edge
    corner: str
    delay: float
    charged_delay: float
    required: float | None
    logical_effort: float
    branching_effort: float
    electrical_effort: float
    path_effort: float
    parasitic_delay: float
    best_stage_effort: float
    best_stage_count: int
    least_delay: float
    stages: tuple[Stage, ...]
    vector: PathVector | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class PathEnd:
    """The latest arrival at one path end; ``charged_delay`` is the later of both edges' own.

    ``why`` says what ends a path there: ``output`` or the kind of unrecognised circuit it enters.
    """

    net: str
    edge: Edge
    delay: float
    charged_delay: float
    required: float | None
    why: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Precharge:
    """How a dynamic node gets back to where it evaluates from; no path of the block.

    Parameters
    ----------
    net : str
    edge : Edge
    instance : str
        The gate that precharges it.
    devices : tuple of str
        The transistors that do.
    clock : str
        Where the latest signal that leads to it comes from, as a rule the clock.
    clock_edge : Edge
    delay : float
        s, from that edge to half the supply.
    transition : float
        s, of the ramp.
    phase : float, optional
        s, how long the level after that edge lasts; None where the brief does not say.
    """

    net: str
    edge: Edge
    instance: str
    devices: tuple[str, ...]
    clock: str
    clock_edge: Edge
    delay: float
    transition: float
    phase: float | None

    @property
    def complete(self) -> float:
        """When the node is at the supply: at the end of its ramp, s."""
        return self.delay + self.transition / 2


@dataclass(frozen=True, slots=True, kw_only=True)
class Counts:
    """Sizes of a block."""

    devices: int
    nets: int
    gates: int
    stages: int


@dataclass(frozen=True, slots=True, kw_only=True)
class Analysis(Tabular):
    """The slowest paths of a block.

    Parameters
    ----------
    source : str
        The netlist's file as the user named it.
    top : str
        The block.
    yardstick : Yardstick
    counts : Counts
    paths : tuple of Path
        Slowest first.
    ends : tuple of PathEnd
        Slowest first.
    worst_transition : float
        s; the slowest edge in the block.
    total_width : float
        m, all transistors, copies counted.
    switched_cap : float
        F, gates, diffusion and wires of the block.
    input_caps : tuple of (str, float)
        F, per block input.
    notices : tuple of Notice
    timing : Timing, optional
        What everything was read off: circuit, graph and arrivals in columns; not compared.
    false_paths : tuple of Path
        Passed over for ``paths``: no input vector lets them switch; slowest first.
    precharges : tuple of Precharge
        Of every dynamic node that a clock reaches, the latest first; apart from all paths.
    """

    source: str
    top: str
    yardstick: Yardstick
    counts: Counts
    paths: tuple[Path, ...]
    ends: tuple[PathEnd, ...]
    worst_transition: float
    total_width: float
    switched_cap: float
    input_caps: tuple[tuple[str, float], ...]
    notices: tuple[Notice, ...]
    timing: Timing | None = field(default=None, repr=False, compare=False)
    false_paths: tuple[Path, ...] = ()
    precharges: tuple[Precharge, ...] = ()

    @property
    def headline(self) -> str:
        """The slowest path in one line."""
        slowest = self.paths[0]
        return (
            f"{self.top or self.source}: {slowest.start} to {slowest.end} takes "
            f"{engineering(slowest.delay, 's')} through {len(slowest.stages)} stages"
        )

    def tables(self) -> dict[str, list[Row]]:
        """Return paths, their stages and side branches, path ends and precharges; SI units.

        Paths and stages are numbered from 1.
        """
        stages = [
            (number, place, stage)
            for number, path in enumerate(self.paths, 1)
            for place, stage in enumerate(path.stages, 1)
        ]
        return {
            "stages": [row(stage, path=number, stage=place) for number, place, stage in stages],
            "side_branches": [
                row(branch, path=number, stage=place)
                for number, place, stage in stages
                for branch in stage.side_branches
            ],
            "paths": [row(path, path=number) for number, path in enumerate(self.paths, 1)],
            "ends": [row(end) for end in self.ends],
            "precharges": [
                row(one, complete=one.complete) | {"devices": ", ".join(one.devices)}
                for one in self.precharges
            ],
        }

    def graph(self) -> nx.DiGraph[tuple[str, str]]:
        """Return the paths as one graph.

        A node is a net and its edge, as in ``("y", "rise")``, with both as attributes and the
        ``arrival`` there; an edge is a stage, with all plain values of it and the number of the
        slowest ``path`` it is on, from 1.
        """
        found: nx.DiGraph[tuple[str, str]] = nx.DiGraph()
        for number, path in reversed(list(enumerate(self.paths, 1))):
            here = (path.start, path.start_edge)
            found.add_node(here, net=here[0], edge=here[1], arrival=path.start_arrival)
            for stage in path.stages:
                there = (stage.output, stage.edge)
                found.add_node(there, net=there[0], edge=there[1], arrival=stage.arrival)
                found.add_edge(here, there, **row(stage, path=number))
                here = there
        return found


@dataclass(frozen=True, slots=True, kw_only=True)
class WidthDifference:
    """One card of one instance in two netlists; m; None where it exists in only one."""

    instance: str
    card: str
    model: str
    before: float | None
    after: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Difference(Tabular):
    """Two netlists of one design side by side.

    Parameters
    ----------
    before, after : Analysis
        ``paths[0]`` of each is its slowest.
    widths : tuple of WidthDifference
        Cards whose width differs or that exist in only one netlist; one line per instance path.
    unchanged : int
        Transistors with the same width in both.
    same_path_after : Path or None
        The slowest path of ``before`` as it is in ``after`` (None: it no longer exists).
    same_path_before : Path or None
        The slowest path of ``after`` as it was in ``before``.
    only_before, only_after : tuple of str
        Instances and nets that exist in only one netlist.
    """

    before: Analysis
    after: Analysis
    widths: tuple[WidthDifference, ...]
    unchanged: int
    same_path_after: Path | None
    same_path_before: Path | None
    only_before: tuple[str, ...]
    only_after: tuple[str, ...]

    @property
    def headline(self) -> str:
        """Both slowest paths in one line."""
        old, new = self.before.paths[0].delay, self.after.paths[0].delay
        return (
            f"{engineering(old, 's')} before, {engineering(new, 's')} after; "
            f"{len(self.widths)} widths differ"
        )

    def tables(self) -> dict[str, list[Row]]:
        """Return the widths that differ, and the stages of both slowest paths; SI units."""
        stages = {
            f"stages_{when}": [
                row(stage, stage=place) for place, stage in enumerate(analysis.paths[0].stages, 1)
            ]
            for when, analysis in (("before", self.before), ("after", self.after))
        }
        return {"widths": [row(width) for width in self.widths], **stages}
