"""Two analyses of one design side by side.

Transistors are matched by instance path and card name, in any case; nets by name. Nothing else
needs to agree, so hand-edited netlists compare as well as those the program wrote.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from evenstage.timing.results import Difference, WidthDifference
from evenstage.timing.search import leading_arcs
from evenstage.timing.stages import describe

if TYPE_CHECKING:
    from evenstage.netlist.devices import Devices, FloatArray, IntArray
    from evenstage.timing.results import Analysis, Path
    from evenstage.timing.search import ArcPath
    from evenstage.timing.sweep import Timing


def compare(before: Analysis, after: Analysis) -> Difference:
    """Compare two analyses.

    Raises
    ------
    ValueError
        Where one carries no timing.

    Examples
    --------
    >>> from evenstage import analyse, elaborate, read, read_brief, read_process, recognise, resize
    >>> folder = "sample_netlists/pad_predriver"
    >>> process = read_process(f"{folder}/process.toml")
    >>> brief = read_brief(f"{folder}/brief.toml")
    >>> devices = elaborate(read(f"{folder}/netlist.sp"), None, process, brief)
    >>> analysis = analyse(recognise(devices, process, brief), brief)
    >>> compare(analysis, resize(analysis, brief).after).headline
    '907 ps before, 802 ps after; 12 widths differ'
    """
    if before.timing is None or after.timing is None:
        message = "an analysis without its timing cannot be compared"
        raise ValueError(message)
    names = _Names()
    old = _Side(before.timing.circuit.devices, names)
    new = _Side(after.timing.circuit.devices, names)
    widths, unchanged = _widths(old, new)
    return Difference(
        before=before,
        after=after,
        widths=widths,
        unchanged=unchanged,
        same_path_after=_same_path(before.paths[0], after.timing),
        same_path_before=_same_path(after.paths[0], before.timing),
        only_before=_only(old, new),
        only_after=_only(new, old),
    )


class _Names(dict[str, int]):
    """A number for every name, in any case, the same on both sides."""

    def __missing__(self, name: str) -> int:
        self[name] = len(self)
        return self[name]


@dataclass(frozen=True)
class _Side:
    """One netlist's transistors by instance path and card name."""

    devices: Devices
    names: _Names

    @cached_property
    def paths(self) -> list[str]:
        """The path of every instance."""
        return [self.devices.instance_path(i) for i in range(len(self.devices.instance_parent))]

    @cached_property
    def keys(self) -> IntArray:
        """A number for each transistor's full name, shape (devices,)."""
        block = self.devices
        path = np.array([self.names[path.lower()] for path in self.paths], np.int64)
        cards, of_device = np.unique(block.card, return_inverse=True)
        card = np.array(
            [self.names[block.netlist.card(int(number)).name.lower()] for number in cards],
            np.int64,
        )
        keys: IntArray = path[block.instance] << 32 | card[of_device]
        return keys

    def named(self, device: int, before: float | None, after: float | None) -> WidthDifference:
        """Return the difference of one transistor."""
        block = self.devices
        return WidthDifference(
            instance=self.paths[int(block.instance[device])],
            card=block.netlist.card(int(block.card[device])).name,
            model=block.models[int(block.model[device])].name,
            before=before,
            after=after,
        )


def _widths(old: _Side, new: _Side) -> tuple[tuple[WidthDifference, ...], int]:
    """Return the transistors that differ, in the first netlist's order, and how many do not."""
    _, here, there = np.intersect1d(old.keys, new.keys, assume_unique=False, return_indices=True)
    a, b = _comparable(old.devices, new.devices, here, there)
    differs = np.abs(b / a - 1) > 1e-9
    found = [
        (int(device), old.named(int(device), float(x), float(y)))
        for device, x, y in zip(here[differs], a[differs], b[differs], strict=True)
    ]
    found += [
        (device, old.named(device, float(old.devices.width[device]), None))
        for device in np.setdiff1d(np.arange(len(old.devices)), here).tolist()
    ]
    found += [
        (len(old.devices) + device, new.named(device, None, float(new.devices.width[device])))
        for device in np.setdiff1d(np.arange(len(new.devices)), there).tolist()
    ]
    found.sort(key=lambda pair: pair[0])
    return tuple(difference for _, difference in found), int((~differs).sum())


def _comparable(
    old: Devices, new: Devices, here: IntArray, there: IntArray
) -> tuple[FloatArray, FloatArray]:
    """Return the widths of matched transistors, m: of one copy, or of all where copies differ."""
    same = old.multiplier[here] == new.multiplier[there]
    a = old.width[here] * np.where(same, 1.0, old.multiplier[here])
    b = new.width[there] * np.where(same, 1.0, new.multiplier[there])
    return a, b


def _only(one: _Side, other: _Side) -> tuple[str, ...]:
    """Return the instances, then the nets, that the other netlist lacks."""
    known = {path.lower() for path in other.paths}
    nets = {name.lower() for name in other.devices.net_names}
    return (
        *(path for path in one.paths if path.lower() not in known),
        *(name for name in one.devices.net_names if name.lower() not in nets),
    )


def _same_path(path: Path, timing: Timing) -> Path | None:
    """Return the path through the same edges of the same nets, or None where there is none."""
    edges = [(path.start, path.start_edge), *((s.output, s.edge) for s in path.stages)]
    nets = [timing.circuit.net_id(name) for name, _ in edges]
    wanted = [
        -1 if net is None else 2 * net + (edge == "rise")
        for net, (_, edge) in zip(nets, edges, strict=True)
    ]
    graph, arcs = timing.graph, leading_arcs(timing)
    edge_of = 2 * graph.net + graph.rising
    # Where the brief ignores paths, one edge of a net may be several nodes: follow all of them.
    ways: dict[int, ArcPath] = {
        node: () for node in graph.start.tolist() if edge_of[node] == wanted[0]
    }
    for edge in wanted[1:]:
        arriving = arcs[edge_of[graph.target[arcs]] == edge].tolist()
        ways = {
            int(graph.target[arc]): (*ways[source], arc)
            for arc in reversed(arriving)
            if (source := int(graph.source[arc])) in ways
        }
    last = next((node for node in graph.end.tolist() if node in ways), None)
    return None if last is None else describe(timing, ways[last])
