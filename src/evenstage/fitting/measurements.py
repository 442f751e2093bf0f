"""Measured delays of cells, in columns."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.source import Span


@dataclass(frozen=True, slots=True)
class Query:
    """What one measured arc is: an edge at the output of a cell, caused by one of its inputs."""

    subcircuit: str
    input: str
    output: str
    rising: bool


@dataclass(frozen=True, kw_only=True)
class Measurements:
    """Delays that a simulator or a laboratory found; shape ``(n,)`` each.

    Parameters
    ----------
    queries : tuple of Query
        The different arcs measured.
    query : IntArray
        Index into ``queries``.
    transition : FloatArray, s
        Of the input, as a ramp over the full swing.
    load : FloatArray, F
        At the output.
    delay : FloatArray, s
        From 50 % to 50 %.
    output_transition : FloatArray, s
        As that of the input; NaN where not measured.
    input_cap : FloatArray, F
        Capacitance of the input pin; NaN where not measured.
    places : tuple of Span
        Where each row stands; empty where they come from no file.
    """

    queries: tuple[Query, ...]
    query: IntArray
    transition: FloatArray
    load: FloatArray
    delay: FloatArray
    output_transition: FloatArray
    input_cap: FloatArray
    places: tuple[Span, ...] = field(default=(), repr=False)

    def __len__(self) -> int:
        return len(self.query)

    @property
    def subcircuits(self) -> tuple[str, ...]:
        """The cells measured, in the order of their first row."""
        return tuple(dict.fromkeys(query.subcircuit for query in self.queries))

    def only(self, chosen: BoolArray) -> Measurements:
        """Return some of the rows; the queries stay."""
        rows = np.flatnonzero(chosen)
        return Measurements(
            queries=self.queries,
            query=self.query[rows],
            transition=self.transition[rows],
            load=self.load[rows],
            delay=self.delay[rows],
            output_transition=self.output_transition[rows],
            input_cap=self.input_cap[rows],
            places=tuple(self.places[row] for row in rows.tolist()) if self.places else (),
        )
