"""CPU times that can be compared: least of several rounds, several actions in turns."""

from __future__ import annotations

import time
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from collections.abc import Callable

ROUNDS: Final = 3


def shortest(*actions: Callable[[], object], rounds: int = ROUNDS) -> list[float]:
    """Return the CPU seconds of some actions, taken in turns; the least of some rounds."""
    best = [float("inf")] * len(actions)
    for _ in range(rounds):
        for number, action in enumerate(actions):
            begun = time.process_time()
            action()
            best[number] = min(best[number], time.process_time() - begun)
    return best


def seconds(action: Callable[[], object]) -> float:
    """Return the CPU seconds of one action."""
    return shortest(action)[0]


def words(data: bytes) -> None:
    """Split a text into lines and each line into words: the measure of reading."""
    for line in data.split(b"\n"):
        line.split()
