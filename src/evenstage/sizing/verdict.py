"""Whether drawn widths are worth writing, and whether they keep what was asked."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.errors import InfeasibleError
from evenstage.sizing.limits import broken_today
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Iterator

    from evenstage.sizing.engine import Engine
    from evenstage.sizing.joint import Corner
    from evenstage.sizing.rounding import Drawn
    from evenstage.sizing.timed import Timed
    from evenstage.timing.sweep import Timing

_NOISE = 1e-6
"""Relative room for rounding when an answer is held against what was asked."""
_EQUAL = 1e-9
"""Relative difference below which two delays are one."""
_GAINS = 1e-4
"""Relative gain below which a netlist counts as already there."""


def worth_writing(written: Drawn, engine: Engine) -> bool:
    """Tell whether written widths are worth writing.

    For a wished delay or a limit that the block breaks as drawn they are. Otherwise they must be
    faster by more than rounding noise, or as fast and cheaper.

    Parameters
    ----------
    written : Drawn
        As it will be read back.
    engine : Engine
        With the block as drawn, the wishes and limits.
    """
    before, after, wanted = engine.today, written.timed, engine.wishes.delay
    if broken_today(before, engine.limits):
        return True
    cheaper = written.cost < engine.cost_drawn * (1 - _GAINS)
    if wanted is not None:
        return cheaper or before.lateness > wanted
    if _slower_edges(before, after, engine) or after.lateness > before.lateness * (1 + _EQUAL):
        return False
    ratio = after.charged / before.charged
    return ratio <= 1 + _EQUAL and (ratio < 1 - _GAINS or cheaper)


def _slower_edges(before: Timed, after: Timed, engine: Engine) -> bool:
    """Tell whether some corner has an edge slower than its limit and than the slowest of today."""
    every = zip(engine.limits, before.corners, after.corners, strict=True)
    return any(
        new.worst_transition > max(limits.transition, old.worst_transition) * (1 + _NOISE)
        for limits, old, new in every
    )


def refuse_broken(after: Timed, engine: Engine) -> None:
    """Refuse widths that break what was asked for, because the grid is too coarse for it.

    Raises
    ------
    InfeasibleError
        ``grid-too-coarse``.
    """
    wishes, late = engine.wishes, after.lateness
    broken = []
    if wishes.delay is not None and late > wishes.delay * (1 + _NOISE):
        broken.append(f"the delay is {engineering(late, 's', 4)}")
    for corner, timing in zip(engine.corners, after.corners, strict=True):
        where = f" in {timing.circuit.process.name}" if len(after.corners) > 1 else ""
        broken += [f"{what}{where}" for what in _broken_limits(corner, timing)]
    if broken:
        raise InfeasibleError(
            "widths exist that meet what was asked, but none on the grid was found that does: "
            f"{', and '.join(broken)}; allow a finer width_step or a little more",
            code="grid-too-coarse",
        )


def _broken_limits(corner: Corner, after: Timing) -> Iterator[str]:
    """Say which limits of a corner are broken."""
    limits, names = corner.limits, after.circuit.devices.net_names
    if limits.strict and after.worst_transition > limits.transition * (1 + _NOISE):
        slowest = engineering(after.worst_transition, "s", 4)
        yield f"the slowest transition is {slowest}"
    use = after.circuit.net_cap[limits.ceiling_net] / limits.ceiling
    if (use > 1 + _NOISE).any():
        name = names[int(limits.ceiling_net[int(use.argmax())])]
        yield f"input '{name}' shows {100 * float(use.max()) - 100:.2g} % too much"
