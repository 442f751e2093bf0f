"""Which way a graph is swept."""

from __future__ import annotations

from importlib.util import find_spec
from typing import TYPE_CHECKING, Final

from evenstage.sizing.levelled import Levelled

if TYPE_CHECKING:
    from evenstage.sizing.softmax import Graph, Sweeps


#: Arcs from which compiled sweeps are worth loading.
_COMPILED_FROM: Final = 3_000


def sweeps(graph: Graph) -> Sweeps:
    """Return the quickest way to sweep a graph: compiled for large ones, where numba is there."""
    if len(graph.source) < _COMPILED_FROM or find_spec("numba") is None:
        return Levelled(graph)
    from evenstage.sizing.compiled import Compiled  # noqa: PLC0415 -- numba is slow to load

    return Compiled(graph)
