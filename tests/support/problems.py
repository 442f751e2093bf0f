"""Sizing problems written down as people would: delays as lists of terms."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from evenstage.sizing.problem import Monomials, Problem

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

#: Coefficient, size above the line and size below it; None is the constant 1.
Term = tuple[float, int | None, int | None]


@dataclass(frozen=True)
class Arc:
    """An arc from node to node with the terms of its delay."""

    source: int
    target: int
    delay: Sequence[Term]


def monomials(rows: Sequence[Sequence[Term]], sizes: int) -> Monomials:
    """Return rows of terms as arrays."""
    flat = [(row, *term) for row, terms in enumerate(rows) for term in terms]

    def index(which: int | None) -> int:
        return sizes if which is None else which

    return Monomials(
        row=np.array([row for row, _, _, _ in flat], dtype=np.int32),
        coefficient=np.array([c for _, c, _, _ in flat], dtype=np.float64),
        plus=np.array([index(plus) for _, _, plus, _ in flat], dtype=np.int32),
        minus=np.array([index(minus) for _, _, _, minus in flat], dtype=np.int32),
    )


def problem(
    arcs: Sequence[Arc],
    lower: Sequence[float],
    upper: Sequence[float],
    *,
    starts: Mapping[int, float],
    ends: Mapping[int, float],
    spend: Sequence[float] | None = None,
    spend_fixed: float = 0.0,
    limits: Sequence[Sequence[Term]] = (),
) -> Problem:
    """Return a problem; starts are arrivals and ends offsets by node."""
    n = len(lower)
    every = [*starts, *ends, *(node for arc in arcs for node in (arc.source, arc.target))]
    return Problem(
        lower=np.array(lower, dtype=np.float64),
        upper=np.array(upper, dtype=np.float64),
        spend=np.ones(n) if spend is None else np.array(spend, dtype=np.float64),
        spend_fixed=spend_fixed,
        nodes=max(every) + 1,
        start_node=np.array(list(starts), dtype=np.int32),
        start_arrival=np.array(list(starts.values()), dtype=np.float64),
        arc_source=np.array([arc.source for arc in arcs], dtype=np.int32),
        arc_target=np.array([arc.target for arc in arcs], dtype=np.int32),
        delay=monomials([arc.delay for arc in arcs], n),
        end_node=np.array(list(ends), dtype=np.int32),
        end_offset=np.array(list(ends.values()), dtype=np.float64),
        limit=monomials(limits, n),
        limits=len(limits),
    )


def chain_problem(
    logical_effort: Sequence[float],
    parasitic: Sequence[float],
    branching: Sequence[float],
    c_in: float,
    c_out: float,
    *,
    side_load: Sequence[float] | None = None,
    spend: Sequence[float] | None = None,
    spend_fixed: float = 0.0,
    wide: float = 1e4,
) -> Problem:
    """Return a path whose sizes are input capacitances, the first one given.

    Stage i has delay ``g_i (b_i C_{i+1} + side_i) / C_i + p_i`` in units of tau.
    """
    n = len(logical_effort)
    side = [0.0] * n if side_load is None else side_load
    arcs = []
    for i, (g, p, b) in enumerate(zip(logical_effort, parasitic, branching, strict=True)):
        load: Term = (g * b, i + 1, i) if i + 1 < n else (g * b * c_out, None, i)
        terms = [(p, None, None), load, (g * side[i], None, i)]
        arcs.append(Arc(i, i + 1, [term for term in terms if term[0] > 0.0]))
    return problem(
        arcs,
        [c_in, *[c_in / wide] * (n - 1)],
        [c_in, *[c_in * wide] * (n - 1)],
        starts={0: 0.0},
        ends={n: 0.0},
        spend=spend,
        spend_fixed=spend_fixed,
    )


def random_problem(
    seed: int, gates: int, *, depth: int, near: int | None = None, wide: float = 64.0
) -> Problem:
    """Return an invented block: gates with a rising and a falling edge each, in layers.

    Every gate has one size and up to three inputs from the layer before it, with `near` only from
    neighbours; each input lets a falling edge cause a rising one and the reverse. Inputs of the
    block have a ceiling for their capacitance; gates that drive nothing end a path.
    """
    rng = np.random.default_rng(seed)
    per_layer = max(1, gates // depth)
    inputs = max(2, per_layer)
    driven = _wiring(rng, gates, per_layer, inputs, near)
    sinks: list[list[tuple[int, float]]] = [[] for _ in range(inputs + gates)]
    for gate, sources in enumerate(driven):
        effort = (len(sources) + 2) / 3
        for source in sources:
            sinks[source].append((gate, effort * float(rng.uniform(0.8, 1.3))))
    arcs = [
        Arc(
            2 * source + 1 - edge,
            2 * (inputs + gate) + edge,
            _delay(rng, gate, sinks[inputs + gate]),
        )
        for gate, sources in enumerate(driven)
        for source in sources
        for edge in (0, 1)
    ]
    ceilings = [
        [(effort / (4.0 * sum(e for _, e in pins)), gate, None) for gate, effort in pins]
        for pins in sinks[:inputs]
        if pins
    ]
    last = [gate for gate in range(gates) if not sinks[inputs + gate]]
    return problem(
        arcs,
        [1.0] * gates,
        [wide] * gates,
        starts=dict.fromkeys(range(2 * inputs), 0.0),
        ends={2 * (inputs + gate) + edge: 0.0 for gate in last for edge in (0, 1)},
        spend=rng.uniform(1.0, 3.0, gates).tolist(),
        spend_fixed=10.0,
        limits=ceilings,
    )


def tied(question: Problem, seed: int) -> Problem:
    """Return a problem in which some sizes are one, some cannot move, and some limits are tight."""
    rng = np.random.default_rng(seed)
    n = len(question.lower)
    index = np.append(np.where(rng.random(n) < 0.3, rng.integers(0, n, n), np.arange(n)), n)
    lower, upper = question.lower.copy(), question.upper.copy()
    fixed = rng.random(n) < 0.15
    lower[fixed] = upper[fixed] = rng.uniform(1.0, 8.0, int(fixed.sum()))
    question = replace(question, lower=lower, upper=upper)
    delay, limit = (
        replace(terms, plus=index[terms.plus], minus=index[terms.minus])
        for terms in (question.delay, question.limit)
    )
    question = replace(question, delay=delay, limit=limit)
    middle = question.limit_sums(np.sqrt(lower * upper))
    tight = replace(limit, coefficient=limit.coefficient / (2.0 * middle)[limit.row])
    return replace(question, limit=tight)


def _wiring(
    rng: np.random.Generator, gates: int, per_layer: int, inputs: int, near: int | None
) -> list[list[int]]:
    """Return the sources of each gate: block inputs first, then gates."""
    driven = []
    for gate in range(gates):
        layer, place = divmod(gate, per_layer)
        first, count = (0, inputs) if layer == 0 else (inputs + (layer - 1) * per_layer, per_layer)
        pins = int(rng.integers(1, 4))
        chosen = (
            rng.integers(0, count, pins)
            if near is None
            else np.clip(place + rng.integers(-near, near + 1, pins), 0, count - 1)
        )
        driven.append(sorted({first + int(which) for which in chosen}))
    return driven


def _delay(rng: np.random.Generator, gate: int, pins: list[tuple[int, float]]) -> list[Term]:
    """Return the delay of one arc: parasitic, wire or outside load, and the driven gates."""
    drive = float(rng.uniform(0.7, 1.2))
    outside = float(len(pins)) if pins else 40.0
    loads: list[Term] = [(drive * effort, sink, gate) for sink, effort in pins]
    return [(1.5 * drive, None, None), (drive * outside, None, gate), *loads]
