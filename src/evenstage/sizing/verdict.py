"""Whether drawn widths are worth writing, and whether they keep what was asked."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.errors import InfeasibleError
from evenstage.sizing.limiting import worst_charged
from evenstage.sizing.limits import broken_today
from evenstage.units import engineering

if TYPE_CHECKING:
    from evenstage.sizing.engine import Engine
    from evenstage.sizing.rounding import Drawn
    from evenstage.timing.sweep import Timing

_NOISE = 1e-6
"""Relative room for rounding when an answer is held against what was asked."""
_EQUAL = 1e-9
"""Relative difference below which two delays are one."""
_GAINS = 1e-4
"""Relative gain below which a netlist counts as already there."""


def worth_writing(before: Timing, written: Drawn, engine: Engine) -> bool:
    """Tell whether written widths are worth writing.

    For a wished delay or a limit that the block breaks as drawn they are. Otherwise they must be
    faster by more than rounding noise, or as fast and cheaper.

    Parameters
    ----------
    before : Timing
        The block as drawn.
    written : Drawn
        As it will be read back.
    engine : Engine
        With the wishes and limits.
    """
    wanted, after = engine.wishes.delay, written.timing
    if broken_today(before, engine.limits):
        return True
    cheaper = written.cost < engine.cost_drawn * (1 - _GAINS)
    if wanted is not None:
        return cheaper or bool(before.lateness.max() > wanted)
    slowest = max(engine.limits.transition, before.worst_transition)
    if after.worst_transition > slowest * (1 + _NOISE):
        return False
    if after.lateness.max() > before.lateness.max() * (1 + _EQUAL):
        return False
    ratio = worst_charged(after) / worst_charged(before)
    return ratio <= 1 + _EQUAL and (ratio < 1 - _GAINS or cheaper)


def refuse_broken(after: Timing, engine: Engine) -> None:
    """Refuse widths that break what was asked for, because the grid is too coarse for it.

    Raises
    ------
    InfeasibleError
        ``grid-too-coarse``.
    """
    limits, wishes, names = engine.limits, engine.wishes, after.circuit.devices.net_names
    use = after.circuit.net_cap[limits.ceiling_net] / limits.ceiling
    late = float(after.lateness.max())
    broken = []
    if wishes.delay is not None and late > wishes.delay * (1 + _NOISE):
        broken.append(f"the delay is {engineering(late, 's', 4)}")
    if limits.strict and after.worst_transition > limits.transition * (1 + _NOISE):
        slowest = engineering(after.worst_transition, "s", 4)
        broken.append(f"the slowest transition is {slowest}")
    if (use > 1 + _NOISE).any():
        name = names[int(limits.ceiling_net[int(use.argmax())])]
        broken.append(f"input '{name}' shows {100 * float(use.max()) - 100:.2g} % too much")
    if broken:
        raise InfeasibleError(
            "widths exist that meet what was asked, but none on the grid was found that does: "
            f"{', and '.join(broken)}; allow a finer width_step or a little more",
            code="grid-too-coarse",
        )
