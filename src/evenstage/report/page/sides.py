"""One path, or two whose stages are put in pairs: what all drawings of stages start from."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

from evenstage.report.pair_text import paired
from evenstage.report.words import switching

if TYPE_CHECKING:
    from collections.abc import Mapping

    from evenstage.timing.results import Path, Stage

When = Literal["", "before", "after"]


@dataclass(frozen=True, slots=True)
class Seen:
    """A stage of one of the paths, and from when to when it switches, s."""

    stage: Stage
    when: When
    start: float
    end: float


@dataclass(frozen=True, slots=True)
class Pair:
    """A stage before and after; one is None where only the other path has it."""

    number: int
    before: Seen | None
    after: Seen | None

    @property
    def seen(self) -> tuple[Seen, ...]:
        """Those that there are."""
        return tuple(one for one in (self.before, self.after) if one is not None)

    @property
    def name(self) -> str:
        """The gate's name, or both."""
        return " / ".join(dict.fromkeys(one.stage.instance for one in self.seen))


@dataclass(frozen=True, slots=True)
class Sides:
    """Stages of one path (all ``after``), or of two.

    Parameters
    ----------
    pairs : tuple of Pair
    before : Path, optional
    after : Path
    holds : mapping
        What holds the stages of ``after``, by instance.
    """

    pairs: tuple[Pair, ...]
    before: Path | None
    after: Path
    holds: Mapping[str, str]

    @property
    def seen(self) -> tuple[Seen, ...]:
        """All stages of both."""
        return tuple(one for pair in self.pairs for one in pair.seen)


def sides(before: Path | None, after: Path, holds: Mapping[str, str] | None = None) -> Sides:
    """Put the stages of two paths in pairs, or take those of one."""
    if before is None:
        new = _seen(after, "")
        pairs = tuple(Pair(i, None, one) for i, one in enumerate(new, 1))
        return Sides(pairs, None, after, holds or {})
    old, new = _seen(before, "before"), _seen(after, "after")
    pairs = tuple(
        Pair(number, None if i is None else old[i], None if j is None else new[j])
        for number, (i, j) in enumerate(paired(before.stages, after.stages), 1)
    )
    return Sides(pairs, before, after, holds or {})


def _seen(path: Path, when: When) -> list[Seen]:
    return [
        Seen(stage, when, *span) for stage, span in zip(path.stages, switching(path), strict=True)
    ]
