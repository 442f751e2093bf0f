"""Whether a path has the right number of stages, in words.

With N' stages in place of N, the difference made up of inverters, the least delay in units of tau
is ``N' F^(1/N') + P + (N' - N) p_inv`` (Sutherland, Sproull and Harris, Logical Effort, 1999,
chapter 3, from memory). Stages come and go in pairs, so that the path keeps its polarity.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.report.scale import figure

if TYPE_CHECKING:
    from evenstage.timing.results import Path, Stage


def stage_count_text(path: Path, p_inv: float) -> str:
    """Return how many stages a path has and whether another number would be faster.

    Parameters
    ----------
    path : Path
        With at least one stage.
    p_inv : float
        Parasitic delay of the unit inverter, tau.
    """
    count, fewer = len(path.stages), fewer_stages(path, p_inv)
    rule = f"the best stage effort in this process is {figure(path.best_stage_effort)}"
    if path.best_stage_count > count:
        more = path.best_stage_count
        return f"{count}; with even efforts {more} would be faster; {rule}"
    if fewer < count:
        less = f"{fewer} would be faster, {count - fewer} inverters left out"
        return f"{count}; with even efforts {less}; {rule}"
    return f"{count}, and no other number would be faster; {rule}"


def fewer_stages(path: Path, p_inv: float) -> int:
    """Return the best number of stages, today's or fewer, that leaving out inverters can give.

    Parameters
    ----------
    path : Path
        With at least one stage.
    p_inv : float
        Parasitic delay of the unit inverter, tau.
    """
    count = len(path.stages)
    inverters = sum(_is_inverter(stage) for stage in path.stages)
    least = max(count - inverters, 1)
    return min(
        range(count, least - 1, -2),
        key=lambda stages: stages * path.path_effort ** (1 / stages) + stages * p_inv,
    )


def _is_inverter(stage: Stage) -> bool:
    return not any(sign in stage.function for sign in "&|")
