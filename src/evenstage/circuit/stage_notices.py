"""What is said about stages: assumptions without proof, and levels short of the supply."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from evenstage.errors import Notice

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from evenstage.circuit.stage_tables import AlikeStages
    from evenstage.netlist.devices import Devices, IntArray

_ASSUMED = (
    "transmission gates whose two controls are taken for complements, though nothing in the block "
    "makes them so"
)
_WEAK = (
    "single pass transistors leave levels a threshold short of the supply; that edge is timed with "
    "twice their resistance, and gates that listen there may draw current"
)
_BOUNDED = (
    "so many settings of other drivers may tie further nodes to a signal that all those nodes are "
    "taken to move with it at once, an upper bound"
)
_LINES = (
    "of the passes or pull networks that meet on one line one at a time is taken to conduct, as "
    "word lines and decoded selects do"
)
_BOTH_WAYS = "signals may pass in both directions; each is timed"


def stage_notices(devices: Devices, stages: Sequence[AlikeStages]) -> list[Notice]:
    """Return one notice per kind of assumption, naming its nets."""
    found: dict[tuple[str, str], list[IntArray]] = {}
    for some in stages:
        for code, message, nets in _assumptions(some):
            found.setdefault((code, message), []).append(nets)
    notices = []
    for (code, message), parts in found.items():
        nets = np.unique(np.concatenate([part.ravel() for part in parts]))
        names = tuple(devices.net_names[net] for net in nets.tolist())
        more = f" and {len(names) - 1} more nets" if len(names) > 1 else ""
        notices.append(Notice(code, f"{message}: '{names[0]}'{more}", names=names))
    return notices


def _assumptions(some: AlikeStages) -> Iterator[tuple[str, str, IntArray]]:
    """Yield code, message and nets of what a stage was taken for, or does badly."""
    form = some.form
    assumed = [net for pair in form.assumed for net in pair]
    weak = [sink.node for sink in form.sinks if sink.weak_high or sink.weak_low]
    most = max((number for _, _, number in form.lines), default=0)
    both_ways = [form.parts[part].output for part in form.both_ways]
    for code, message, nets in (
        ("assumed-complement", _ASSUMED, assumed),
        ("weak-level", _WEAK, weak),
        ("both-ways", _BOTH_WAYS, both_ways),
        ("upper-bound", _BOUNDED, list(form.bounded)),
        (
            "one-at-a-time",
            f"{_LINES} (at most {most} of them)",
            [node for node, _, _ in form.lines],
        ),
    ):
        if nets:
            yield code, message, some.nets[:, nets]
