"""What a resizing is asked for."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING, Literal

if TYPE_CHECKING:
    from collections.abc import Mapping


@dataclass(frozen=True, slots=True, kw_only=True)
class Wishes:
    """The question and how far the answer may reach.

    Parameters
    ----------
    delay : float, optional
        s; least spend whose slowest path takes at most this.
    width : float, optional
        Fastest with at most this many times today's total spend.
    margin : float
        The fastest is looked for; of all answers within this share of its delay the cheapest is
        taken. 0: the fastest itself.
    scope : {"path", "block"}
        What may move: the gates on the slowest paths, grown until no other path limits the block;
        or every gate.
    reclaim : bool
        Whether gates off the limiting paths may get smaller.
    spend : {"width", "energy"}
        What is kept small: total width or switched capacitance.
    changes : int, optional
        How many cards may change.
    apart : bool
        Whether pull-up and pull-down of a gate have a size each.
    """

    delay: float | None = None
    width: float | None = None
    margin: float = 0.01
    scope: Literal["path", "block"] = "path"
    reclaim: bool = False
    spend: Literal["width", "energy"] = "width"
    changes: int | None = None
    apart: bool = False

    @property
    def words(self) -> str:
        """The question in words."""
        if self.apart:
            return f"{replace(self, apart=False).words}, pull-up and pull-down apart"
        if self.changes is not None:
            some = "1 changed card" if self.changes == 1 else f"{self.changes} changed cards"
            return f"{replace(self, changes=None).words}, with at most {some}"
        if self.delay is not None:
            return f"least {self.spend} for a delay of {self.delay * 1e12:.4g} ps"
        if self.width is not None:
            return f"fastest within {self.width:.4g} times today's {self.spend}"
        return "fastest"


@dataclass(frozen=True, slots=True, kw_only=True)
class Original:
    """Limits of the netlist as first drawn, where an earlier run recorded them.

    Parameters
    ----------
    ceilings : Mapping of str to float
        F, per block input.
    transition : float, optional
        s, the slowest edge.
    smallest : Mapping of str to float
        m, smallest width per model, by lower-case name.
    spend : float, optional
        Total width (m) or switched capacitance (F), whichever was kept small.
    """

    ceilings: Mapping[str, float] = field(default_factory=dict)
    transition: float | None = None
    smallest: Mapping[str, float] = field(default_factory=dict)
    spend: float | None = None
