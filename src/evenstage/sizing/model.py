"""A timed circuit and its sizes to a convex programme.

Every delay is the charged Elmore delay ``q (sum R C + own)`` of an arc. With ``x_g`` the size of a
gate, its resistance is ``R / x_g``; the load on a net is linear, ``C = sum c_u x_u + c_0``; and the
own delay of the gates is a sum of ``R c x_h / x_g`` (`evenstage.circuit.arcs`). Multiplied out
these are the monomials of `evenstage.sizing.problem`. Where a gate's pull-up has a size of its own
each resistance goes with the side it is of, and each capacitance is a sum over both
(`evenstage.sizing.sides`).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from scipy.sparse import coo_array, csr_array

from evenstage.circuit.arcs import ranges
from evenstage.sizing.problem import Monomials, Problem
from evenstage.sizing.sides import Sides, sharing, sides_of
from evenstage.sizing.wire_terms import wire_terms
from evenstage.timing.sweep import end_offsets
from evenstage.timing.yardstick import arc_charges

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.sizing.variables import Variables
    from evenstage.sizing.wire_terms import WireTerms
    from evenstage.timing.graph import TimingGraph
    from evenstage.timing.results import Yardstick

_ROUNDING = 1e-9
"""Relative room that the rounding of sums is given at limits."""


@dataclass(frozen=True, kw_only=True)
class Limits:
    """What sizes must respect besides their own bounds.

    Parameters
    ----------
    ceiling_net, ceiling : IntArray and FloatArray, F, shape (inputs,)
        Most capacitance each block input may show.
    transition : float
        s; the slowest edge any gate may make.
    strict : bool
        Whether a stage that breaks the transition limit today must get better; else it may stay.
    share : float
        Part of the transition limit that each stage may use. Below 1 where slower inputs would
        carry stages that may stay beyond the limit.
    """

    ceiling_net: IntArray
    ceiling: FloatArray
    transition: float
    strict: bool = False
    share: float = 1.0


@dataclass(frozen=True)
class Model:
    """A circuit's delays as monomials in its sizes; built once, used for many programmes.

    Parameters
    ----------
    circuit : Circuit
        At today's sizes.
    graph : TimingGraph
    unit : Yardstick
    variables : Variables
    """

    circuit: Circuit
    graph: TimingGraph
    unit: Yardstick
    variables: Variables

    @cached_property
    def _sides(self) -> Sides | None:
        """Which side of each gate is what; None where all gates have one size."""
        return sides_of(self.circuit) if self.variables.partition.is_apart else None

    @cached_property
    def _size(self) -> IntArray:
        """Size of both sides of each gate, that of nobody last, shape (gates + 1, 2)."""
        nobody = np.full((1, 2), len(self.variables))
        return np.concatenate([self.variables.partition.of_gate, nobody]).astype(np.int32)

    @cached_property
    def load(self) -> csr_array:
        """Load on each net as a linear form: F per unit of each size, the constant last."""
        circuit, n = self.circuit, len(self.variables)
        pins, nets = circuit.pins, len(circuit.devices.net_names)
        everything, sides = np.arange(nets), self._sides
        upper = np.zeros(len(pins.net)) if sides is None else sides.pin_cap
        rows = np.concatenate([pins.net, pins.net, pins.net, everything])
        columns = np.concatenate(
            [*self._size[pins.gate].T, np.full(len(pins.net) + nets, n, np.int32)]
        )
        values = np.concatenate(
            [pins.cap.scaling - upper, upper, pins.cap.fixed, circuit.fixed_cap]
        )
        form = coo_array((values, (rows, columns)), shape=(nets, n + 1)).tocsr()
        form.sum_duplicates()
        form.eliminate_zeros()
        return form

    @cached_property
    def elmore(self) -> Monomials:
        """Elmore delay of every circuit arc, s; row = circuit arc."""
        arcs, n, size = self.circuit.arcs, len(self.variables), self._size
        charges, own, form, sides = arcs.charges, arcs.own, self.load, self._sides
        # Where all gates have one size both columns say the same.
        of_charge, of_term = (0, 0) if sides is None else (sides.charge, sides.term)
        count = np.diff(form.indptr)[charges.net]
        entry = ranges(form.indptr[charges.net], count)
        charging = (
            np.repeat(charges.arc, count),
            np.repeat(charges.resistance, count) * form.data[entry],
            form.indices[entry],
            np.repeat(size[charges.owner, of_charge], count),
        )
        through = size[own.resistance_owner, of_term]
        upper = np.zeros(len(own.arc)) if sides is None else sides.term_delay
        lower = (own.arc, own.today - upper, size[own.capacitance_owner, 0], through)
        parts = [charging, lower]
        if sides is not None:
            parts.append((own.arc, upper, size[own.capacitance_owner, 1], through))
        return _monomials(parts, n)

    def problem(
        self, lower: FloatArray, upper: FloatArray, spend: FloatArray, limits: Limits
    ) -> Problem:
        """Return the programme for some bounds, costs per unit of size, and limits."""
        graph, driven = self.graph, np.flatnonzero(self.graph.start_drive > 0)
        shift, wired = len(driven), self._wires.ends
        end_node = graph.end + np.int32(shift)
        behind = np.arange(len(wired), dtype=np.int32) + np.int32(len(graph) + shift)
        sources = [np.arange(shift), end_node[wired], graph.source + shift]
        targets = [graph.start[driven] + shift, behind, graph.target + shift]
        end_node[wired] = behind
        limit, count = self._limits(limits)
        begin_node = graph.start.astype(np.int64) + shift
        begin_node[driven] = np.arange(shift)
        return Problem(
            lower=lower,
            upper=upper,
            spend=spend,
            spend_fixed=0.0,
            nodes=len(graph) + shift + len(wired),
            start_node=begin_node.astype(np.int32),
            start_arrival=graph.start_arrival,
            arc_source=np.concatenate(sources).astype(np.int32),
            arc_target=np.concatenate(targets).astype(np.int32),
            delay=self._delays(driven),
            end_node=end_node,
            end_offset=end_offsets(graph),
            limit=limit,
            limits=count,
        )

    @property
    def arcs(self) -> int:
        """Number of the programme's arcs; the graph's are the last of them."""
        driven = int((self.graph.start_drive > 0).sum())
        return driven + len(self._wires.ends) + len(self.graph.arc)

    def _delays(self, driven: IntArray) -> Monomials:
        """Return the delays of the programme's arcs.

        Outside drivers come first, then the wires to ends, then the graph's arcs, each with the
        wire before it.
        """
        charge = arc_charges(self.circuit.arcs, self.circuit.process, self.unit)
        shift = len(driven) + len(self._wires.ends)
        elmore, which = self.elmore, self.graph.arc
        heads = np.searchsorted(elmore.row, np.arange(len(charge) + 1))
        count = np.diff(heads)[which]
        entry = ranges(heads[which], count)
        arcs = (
            np.repeat(np.arange(len(which)) + shift, count),
            elmore.coefficient[entry] * charge[elmore.row[entry]],
            elmore.plus[entry],
            elmore.minus[entry],
        )
        form, nets = self.load, self.graph.net[self.graph.start[driven]]
        wide = np.diff(form.indptr)[nets]
        outside = ranges(form.indptr[nets], wide)
        drivers = (
            np.repeat(np.arange(len(driven)), wide),
            form.data[outside] * np.repeat(self.graph.start_drive[driven], wide),
            form.indices[outside],
            np.full(len(outside), len(self.variables)),
        )
        wires = self._wires
        constant = np.full(len(wires.row), len(self.variables), np.int32)
        row = np.where(wires.is_end, len(driven) + wires.row, shift + wires.row)
        along = [(row, wires.delay, self._size[wires.gate, 0], constant)]
        if self._sides is not None and len(row):
            doubled = wire_terms(self._sides.doubled, self.graph, self.unit).delay
            upper = sharing(wires.delay, doubled)
            along = [
                (row, wires.delay - upper, self._size[wires.gate, 0], constant),
                (row, upper, self._size[wires.gate, 1], constant),
            ]
        return _monomials([drivers, arcs, *along], len(self.variables))

    @cached_property
    def _wires(self) -> WireTerms:
        """Charged delay of the wires before the graph's arcs and to its ends."""
        return wire_terms(self.circuit, self.graph, self.unit)

    def _limits(self, limits: Limits) -> tuple[Monomials, int]:
        """Return input ceilings and transition limits as sums that must stay below 1.

        A limit met exactly today must not be broken by the rounding of its sum.
        """
        form, n = self.load, len(self.variables)
        nets = limits.ceiling_net
        wide = np.diff(form.indptr)[nets]
        entry = ranges(form.indptr[nets], wide)
        ceilings = (
            np.repeat(np.arange(len(nets)), wide),
            form.data[entry] / np.repeat(limits.ceiling * (1 + _ROUNDING), wide),
            form.indices[entry],
            np.full(len(entry), n),
        )
        most, number = self.elmore_limit(limits), self.transition_row(limits)
        elmore = self.elmore
        kept = number[elmore.row] >= 0
        transitions = (
            number[elmore.row[kept]],
            elmore.coefficient[kept] / (most[elmore.row[kept]] * (1 + _ROUNDING)),
            elmore.plus[kept],
            elmore.minus[kept],
        )
        return _monomials([ceilings, transitions], n), self.limit_count(limits)

    def limit_count(self, limits: Limits) -> int:
        """Return how many rows the limits take: input ceilings, then transitions."""
        limited = np.isfinite(self.elmore_limit(limits))
        return len(limits.ceiling_net) + int(limited.sum())

    def transition_row(self, limits: Limits) -> IntArray:
        """Return the row of the limit on each arc's transition, -1 for none, shape (arcs,)."""
        limited = np.isfinite(self.elmore_limit(limits))
        number = np.cumsum(limited) - 1 + len(limits.ceiling_net)
        return np.where(limited, number, -1).astype(np.int32)

    def elmore_limit(self, limits: Limits) -> FloatArray:
        """Return the Elmore delay up to which an arc keeps a transition limit, s, shape (arcs,).

        If every stage keeps ``shape E <= sqrt(1 - carry^2) T`` and no input is slower than T, then
        no edge is: the carried part adds at most ``carry T``. Where the whole transition of the
        input rides on, as from outside through pass transistors, each may make half of ``T^2``.
        """
        arcs = self.circuit.arcs
        share = np.sqrt(np.where(arcs.shape_carry < 1, 1 - arcs.shape_carry**2, 0.5))
        shaped = arcs.shape > 0
        most = np.full(len(arcs.gate), np.inf)
        most[shaped] = share[shaped] / arcs.shape[shaped] * limits.transition * limits.share
        if limits.strict:
            return most
        kept: FloatArray = np.maximum(most, arcs.elmore(self.circuit.net_cap))
        return kept


def _monomials(
    parts: list[tuple[IntArray, FloatArray, IntArray, IntArray]], constant: int
) -> Monomials:
    """Put parts together, sorted by row, equal monomials of a row added, zeros left out."""
    row, coefficient, plus, minus = (
        np.concatenate([np.asarray(part[k]) for part in parts]) for k in range(4)
    )
    kept = coefficient > 0
    row, coefficient, plus, minus = row[kept], coefficient[kept], plus[kept], minus[kept]
    same = plus == minus  # x/x is the constant 1 whatever the size
    plus, minus = np.where(same, constant, plus), np.where(same, constant, minus)
    order = np.lexsort((minus, plus, row))
    key = np.stack([row, plus, minus])[:, order]
    first = np.flatnonzero((np.diff(key, axis=1, prepend=-1) != 0).any(axis=0))
    total = np.add.reduceat(coefficient[order], first) if len(first) else coefficient
    return Monomials(
        row=key[0, first].astype(np.int32),
        coefficient=total,
        plus=key[1, first].astype(np.int32),
        minus=key[2, first].astype(np.int32),
    )
