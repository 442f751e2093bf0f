"""Ignored paths against all paths, told one by one."""

from __future__ import annotations

from itertools import islice
from typing import TYPE_CHECKING

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.brief import Brief, IgnoreBrief
from evenstage.errors import NoPathError, SettingsError
from evenstage.pattern import Pattern
from evenstage.timing.analyse import time
from evenstage.timing.search import slowest_paths
from support.blocks import circuit_of, plain_process
from support.random_blocks import RandomBlock, random_blocks

if TYPE_CHECKING:
    from evenstage.timing.sweep import Timing

PROCESS = plain_process(slope=0.2, slope_power=0.8, shape=1.6, stack=0.7)
MANY = 3_000


def paths(timing: Timing) -> set[tuple[tuple[str, bool], ...]]:
    """Return every path as its nets and edges."""
    graph, names = timing.graph, timing.circuit.devices.net_names
    found = set()
    for arcs in islice(slowest_paths(timing), MANY):
        nodes = [int(graph.source[arcs[0]]), *(int(graph.target[arc]) for arc in arcs)]
        found.add(tuple((names[int(graph.net[n])], bool(graph.rising[n])) for n in nodes))
    return found


def is_ignored(path: tuple[tuple[str, bool], ...], ignore: IgnoreBrief) -> bool:
    def fits(patterns: tuple[Pattern, ...], net: str) -> bool:
        return not patterns or any(pattern.fits(net) for pattern in patterns)

    return (
        fits(ignore.start, path[0][0])
        and any(fits(ignore.through, net) for net, _ in path)
        and fits(ignore.end, path[-1][0])
    )


@st.composite
def ignores(draw: st.DrawFn, block: RandomBlock) -> IgnoreBrief:
    """Draw a rule whose patterns all fit something."""
    nets = [*block.inputs, *(gate[2] for gate in block.gates)]
    used = {net for _, inputs, _, _ in block.gates for net in inputs}
    starts = [net for net in block.inputs if net in used]

    def some(among: list[str]) -> tuple[Pattern, ...]:
        names = draw(st.lists(st.sampled_from(among), max_size=2, unique=True))
        return tuple(Pattern(name) for name in names)

    return IgnoreBrief(
        start=some(starts),
        through=some([net for net in nets if net in used]),
        end=some(list(block.outputs)),
    )


class TestExpand:
    @given(st.data(), random_blocks(most=8))
    @settings(max_examples=60, deadline=None)
    def test_exactly_the_named_paths_are_left_out(
        self, data: st.DataObject, block: RandomBlock
    ) -> None:
        rules = tuple(data.draw(st.lists(ignores(block), min_size=1, max_size=3)))
        circuit = circuit_of(block.text(), PROCESS)
        every = paths(time(circuit))
        expected = {path for path in every if not any(is_ignored(path, rule) for rule in rules)}
        assert len(every) < MANY
        if not expected:
            with pytest.raises(NoPathError):
                time(circuit, Brief(ignores=rules))
        else:
            assert paths(time(circuit, Brief(ignores=rules))) == expected

    @given(random_blocks(most=8))
    @settings(max_examples=20, deadline=None)
    def test_the_slowest_path_left_is_as_slow_as_before(self, block: RandomBlock) -> None:
        """Delays belong to arcs, so leaving paths out can only make an end earlier."""
        circuit = circuit_of(block.text(), PROCESS)
        rule = IgnoreBrief(start=(Pattern("i*"),), through=(Pattern("n0"),))
        try:
            left = time(circuit, Brief(ignores=(rule,)))
        except NoPathError:
            return
        assert left.worst <= time(circuit).worst * (1 + 1e-12)

    @pytest.mark.parametrize("place", ["start", "through", "end"])
    def test_a_pattern_that_fits_nothing(self, place: str) -> None:
        block = RandomBlock((("inv", ("i0",), "n0", 1.0),), (), ("i0",), ("n0",))
        rule = IgnoreBrief(**{place: (Pattern("zz"),)})
        with pytest.raises(SettingsError, match="net fits 'zz'"):
            time(circuit_of(block.text(), PROCESS), Brief(ignores=(rule,)))
