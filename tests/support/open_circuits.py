"""Open benchmark circuits as sizing problems: ISCAS and EPFL netlists mapped to gates.

The netlists travel in the package `circuitgraph` (MIT licence), which is only a carrier here: its
files are read with a small reader of our own, for gates of Verilog's built-in kinds. AND and OR
become NAND and NOR with an inverter, gates of more than four inputs are split, and each gate has
one size and one node. Costs, efforts and loads are invented: logical efforts and parasitic delays
of the method of logical effort (Sutherland, Sproull and Harris, 1999), one unit of wire per fan-out
and an outside load of 40.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field, replace
from importlib.util import find_spec
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from evenstage.sizing.problem import Monomials, Problem

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.sizing.problem import FloatArray

_STATEMENT = re.compile(r"(\w+)\s+(?:[^\s(]+\s*)?\(([^)]*)\)\s*;|assign\s+(.*?)=(.*?);", re.DOTALL)
_PORTS = re.compile(r"\b(input|output)\s+(.*?);", re.DOTALL)
_KINDS = frozenset({"not", "buf", "and", "or", "nand", "nor", "xor", "xnor"})
_MOST_PINS = 4


@dataclass
class Gates:
    """Gates of one output each; sources are nets, an int each, inputs of the block first."""

    kind: list[str] = field(default_factory=list)
    sources: list[list[int]] = field(default_factory=list)
    output: list[int] = field(default_factory=list)
    nets: dict[str, int] = field(default_factory=dict)

    def net(self, name: str) -> int:
        """Return the number of a net by name."""
        return self.nets.setdefault(name.strip(), len(self.nets))

    def add(self, kind: str, sources: Sequence[int], output: int | None = None) -> int:
        """Add a gate as inverters, NANDs, NORs and XORs; return its output."""
        if output is None:
            output = self.net(f"#{len(self.nets)}")
        if kind in {"and", "or", "buf"}:
            inverse = {"and": "nand", "or": "nor", "buf": "not"}[kind]
            return self.add("not", [self.add(inverse, sources)], output)
        if kind in {"nand", "nor"} and len(sources) == 1:
            kind = "not"
        while len(sources) > (2 if kind.startswith("x") else _MOST_PINS):
            sources = self._halved(kind, sources)
        self.kind.append(kind)
        self.sources.append(list(sources))
        self.output.append(output)
        return output

    def _halved(self, kind: str, sources: Sequence[int]) -> list[int]:
        inner = {"nand": "and", "nor": "or", "xor": "xor", "xnor": "xor"}[kind]
        size = 2 if kind.startswith("x") else _MOST_PINS
        chunks = [sources[k : k + size] for k in range(0, len(sources), size)]
        return [part[0] if len(part) == 1 else self.add(inner, part) for part in chunks]


def netlist_path(name: str) -> Path | None:
    """Return where a netlist of the package lies, or None where the package is absent."""
    spec = find_spec("circuitgraph")
    if spec is None or spec.origin is None:
        return None
    return Path(spec.origin).parent / "netlists" / f"{name}.v"


def read_gates(text: str) -> tuple[Gates, list[int]]:
    """Return the gates of a flat netlist and the nets that leave it."""
    text = re.sub(r"//[^\n]*", "", text)
    gates, outputs = Gates(), []
    alias: dict[str, str] = {}
    for match in _PORTS.finditer(text):
        if match[1] == "output":
            outputs += [name.strip() for name in match[2].split(",")]
    found = []
    for match in _STATEMENT.finditer(text):
        if match[3]:
            alias[match[3].strip()] = match[4].strip()
        elif match[1] in _KINDS:
            found.append((match[1], [name.strip() for name in match[2].split(",")]))
    for kind, (output, *sources) in found:
        pins = list(dict.fromkeys(gates.net(alias.get(name, name)) for name in sources))
        gates.add(kind, pins, gates.net(output))
    return gates, [gates.net(alias.get(name, name)) for name in outputs]


@dataclass(frozen=True)
class Setting:
    """What surrounds a circuit, all in units of a smallest inverter."""

    lower: float = 1.0
    upper: float = 64.0
    wire: float = 1.0
    outside: float = 40.0
    driver: float = 10.0


def circuit_problem(
    name: str, setting: Setting | None = None, *, copies: int = 1, spread: float = 0.0
) -> Problem:
    """Return the sizing problem of a circuit of the package.

    Parameters
    ----------
    name : str
        Such as ``c432``.
    setting : Setting, optional
    copies, spread : int and float
        So many copies side by side, each parasitic delay and load off by up to this share.
    """
    path = netlist_path(name)
    assert path is not None
    gates, outputs = read_gates(path.read_text(encoding="utf-8"))
    return gates_problem(gates, outputs, setting or Setting(), copies=copies, spread=spread)


def gates_problem(
    gates: Gates, outputs: Sequence[int], setting: Setting, *, copies: int = 1, spread: float = 0.0
) -> Problem:
    """Return the sizing problem of some gates."""
    order = _depth_first(gates, outputs)
    table = _Table(gates, outputs, order, setting)
    rng = np.random.default_rng(7)
    return _assembled([table.copy(rng, spread) for _ in range(copies)], table, setting)


def _depth_first(gates: Gates, outputs: Sequence[int]) -> list[int]:
    """Return gates in a topological order in which neighbours stand close together."""
    driver = {net: gate for gate, net in enumerate(gates.output)}
    seen, order = [False] * len(gates.kind), []
    for net in [*outputs, *gates.output]:
        stack = [(driver[net], False)] if net in driver else []
        while stack:
            gate, done = stack.pop()
            if done:
                order.append(gate)
            elif not seen[gate]:
                seen[gate] = True
                stack.append((gate, True))
                stack += [(driver[s], False) for s in gates.sources[gate] if s in driver]
    return order


class _Table:
    """Arcs and loads of one copy: inputs are fixed drivers, then come gates in order."""

    def __init__(
        self, gates: Gates, outputs: Sequence[int], order: Sequence[int], setting: Setting
    ) -> None:
        place = {gates.output[gate]: k for k, gate in enumerate(order)}
        used = dict.fromkeys(net for gate in order for net in gates.sources[gate])
        inputs = [net for net in used if net not in place]
        self.inputs, self.gates = len(inputs), len(order)
        node = {net: len(inputs) + k for net, k in place.items()}
        node.update({net: k for k, net in enumerate(inputs)})
        pins = [(node[net], k) for k, gate in enumerate(order) for net in gates.sources[gate]]
        self.source, self.sink = np.array(pins, dtype=np.int64).T
        kinds = [(gates.kind[gate], len(gates.sources[gate])) for gate in order]
        self.effort = np.array([_effort(*kind) for kind in kinds])
        self.parasitic = np.array([4.0 if kind[0] == "x" else float(k) for kind, k in kinds])
        self.pins = np.array([float(k) for _, k in kinds])
        nodes = len(inputs) + len(order)
        fanout = np.bincount(self.source, minlength=nodes)
        leaves = np.zeros(nodes, bool)
        leaves[[node[net] for net in outputs if net in node]] = True
        self.end = np.flatnonzero((leaves | (fanout == 0)) & (np.arange(nodes) >= len(inputs)))
        self.load = setting.wire * fanout + setting.outside * np.bincount(self.end, minlength=nodes)

    def copy(self, rng: np.random.Generator, spread: float) -> tuple[FloatArray, FloatArray]:
        """Return loads per node and parasitic delays per gate of a copy."""
        off = rng.uniform(1 - spread, 1 + spread, len(self.load) + self.gates)
        return self.load * off[: len(self.load)], self.parasitic * off[len(self.load) :]


def _effort(kind: str, pins: int) -> float:
    """Return the logical effort of a gate."""
    match kind:
        case "nand":
            return (pins + 2) / 3
        case "nor":
            return (2 * pins + 1) / 3
        case "not":
            return 1.0
        case _:
            return 4.0


def _assembled(
    copies: Sequence[tuple[FloatArray, FloatArray]], table: _Table, setting: Setting
) -> Problem:
    """Return the problem of all copies; nodes per copy: outside drivers, inputs, gates."""
    every, shift = len(copies), 2 * table.inputs + table.gates
    constant = every * table.gates
    by_source = np.argsort(table.source, kind="stable")
    first = np.searchsorted(table.source[by_source], np.arange(table.inputs + table.gates + 1))
    arc_from = np.concatenate([np.arange(table.inputs), table.source + table.inputs])
    arc_to = np.concatenate([np.arange(table.inputs), table.sink + table.inputs]) + table.inputs
    drives = np.concatenate([np.arange(table.inputs), table.sink + table.inputs])
    count = np.diff(first)[drives]
    row = np.repeat(np.arange(len(drives)), count)
    begin = np.repeat(first[drives] - np.cumsum(count) + count, count)
    pin = by_source[np.arange(len(row)) + begin]
    gate = drives - table.inputs
    parts = []
    for k, (load, parasitic) in enumerate(copies):
        base, arcs = k * table.gates, k * len(drives)
        per = np.where(gate < 0, 1.0 / setting.driver, 1.0)
        own = np.where(gate < 0, constant, base + gate)
        still = np.flatnonzero(gate >= 0)
        loaded = np.flatnonzero(load[drives] > 0)
        none = np.full(len(still) + len(loaded), constant)
        parts.append(
            (
                arcs + np.concatenate([row, still, loaded]),
                np.concatenate(
                    [
                        per[row] * table.effort[table.sink[pin]],
                        parasitic[gate[still]],
                        (per * load[drives])[loaded],
                    ]
                ),
                np.concatenate([base + table.sink[pin], none]),
                np.concatenate([own[row], none[: len(still)], own[loaded]]),
            )
        )
    offset = np.arange(every)[:, None] * shift
    ends = (offset + table.end + table.inputs).ravel()
    starts = (offset + np.arange(table.inputs)).ravel()
    nothing = np.zeros(0, np.int32)
    return Problem(
        lower=np.full(constant, setting.lower),
        upper=np.full(constant, setting.upper),
        spend=np.tile(3.0 * table.effort * table.pins, every),
        spend_fixed=0.0,
        nodes=every * shift,
        start_node=starts.astype(np.int32),
        start_arrival=np.zeros(len(starts)),
        arc_source=(offset + arc_from).ravel().astype(np.int32),
        arc_target=(offset + arc_to).ravel().astype(np.int32),
        delay=Monomials(
            row=np.concatenate([part[0] for part in parts]).astype(np.int32),
            coefficient=np.concatenate([part[1] for part in parts]),
            plus=np.concatenate([part[2] for part in parts]).astype(np.int32),
            minus=np.concatenate([part[3] for part in parts]).astype(np.int32),
        ),
        end_node=ends.astype(np.int32),
        end_offset=np.zeros(len(ends)),
        limit=Monomials(row=nothing, coefficient=np.zeros(0), plus=nothing, minus=nothing),
        limits=0,
    )


def two_edges(problem: Problem, *, fall: float = 0.8, tied: int = 10) -> Problem:
    """Return a circuit with a rising and a falling edge per gate, ties and input ceilings.

    Every arc inverts; falling edges are quicker by `fall`, rising ones slower by as much. Of every
    `tied` gates two share one size. The gates of each input may show twice their smallest load.
    """
    n, arcs = len(problem.lower), len(problem.arc_source)
    index = np.append(np.where(np.arange(n) % tied == 1, np.arange(n) - 1, np.arange(n)), n)
    edge = np.repeat([0, 1], arcs)
    terms = problem.delay
    speed = np.repeat([fall, 2.0 - fall], len(terms.row))
    starts = np.repeat(problem.start_node, 2) * 2
    starts[1::2] += 1
    ends = np.repeat(problem.end_node, 2) * 2
    ends[1::2] += 1
    delay = Monomials(
        row=np.concatenate([terms.row, terms.row + arcs]).astype(np.int32),
        coefficient=np.tile(terms.coefficient, 2) * speed,
        plus=np.tile(index[terms.plus], 2).astype(np.int32),
        minus=np.tile(index[terms.minus], 2).astype(np.int32),
    )
    outside = np.flatnonzero(np.isin(problem.arc_source, problem.start_node))
    loads = np.flatnonzero(np.isin(terms.row, outside) & (terms.plus < n))
    which = np.searchsorted(outside, terms.row[loads])
    plus, none = index[terms.plus[loads]], np.full(len(loads), n)
    least = np.bincount(which, terms.coefficient[loads] * problem.lower[plus], len(outside))
    limit = Monomials(
        row=which.astype(np.int32),
        coefficient=terms.coefficient[loads] / (2.0 * least[which]),
        plus=plus.astype(np.int32),
        minus=none.astype(np.int32),
    )
    return replace(
        problem,
        nodes=2 * problem.nodes,
        start_node=starts.astype(np.int32),
        start_arrival=np.repeat(problem.start_arrival, 2),
        arc_source=(2 * np.tile(problem.arc_source, 2) + 1 - edge).astype(np.int32),
        arc_target=(2 * np.tile(problem.arc_target, 2) + edge).astype(np.int32),
        delay=delay,
        end_node=ends.astype(np.int32),
        end_offset=np.repeat(problem.end_offset, 2),
        limit=limit,
        limits=len(outside),
    )
