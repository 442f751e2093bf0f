"""What a resizing says: plain frozen values in SI units, for people and reports."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Literal

from evenstage.tabular import Row, Tabular, row
from evenstage.units import engineering

if TYPE_CHECKING:
    from evenstage.errors import Notice
    from evenstage.logic.same import StructureCheck
    from evenstage.netlist.rewriting.edits import Edit
    from evenstage.sizing.wishes import Original
    from evenstage.timing.corners import Corners
    from evenstage.timing.results import Analysis, Path

Hold = Literal["", "lower", "upper", "fixed", "ceiling", "transition", "same size", "skew"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Change:
    """One width that changes.

    Parameters
    ----------
    card : str
        Name of the transistor card.
    file, line : str and int
        Where the value that changes is written.
    instance : str
        Instance path of the gate's card (the call of a leaf, or the transistor card), of its first
        occurrence; ``occurrences`` says how many there are.
    occurrences : int
        How many instances share the change.
    parameter : str
        Which parameter is written.
    old, new : float
        m, drawn width of one copy.
    alone : float
        s; change of the block's worst delay if only this gate's widths changed (negative: faster).
    last : float
        s; change of the worst delay by this gate's widths when all others have changed already.
    why : str
        One short reason for the comment in the netlist.
    """

    card: str
    file: str
    line: int
    instance: str
    occurrences: int
    parameter: str
    old: float
    new: float
    alone: float
    last: float
    why: str

    @property
    def factor(self) -> float:
        """New over old width."""
        return self.new / self.old


@dataclass(frozen=True, slots=True, kw_only=True)
class StageHold:
    """What holds a stage of the new slowest path at its size; empty where nothing does.

    ``instance`` is the stage's; ``hold`` says which limit is active.
    """

    instance: str
    hold: Hold


@dataclass(frozen=True, slots=True, kw_only=True)
class TradeOffPoint:
    """The least spend for one delay.

    Parameters
    ----------
    charged_delay : float
        s; worst charged delay, which the bound is about.
    delay : float
        s; worst arrival of the same sizes.
    spend : float
        m of total width, or F of switched capacitance.
    bound : float
        No sizes within the limits do with less spend at this charged delay.
    gap : float
        Relative distance of ``spend`` to it, confirmed by the checker.
    one_percent_buys : float or None
        s; how much less charged delay one percent more spend buys, to first order; None where the
        delay holds nothing back.
    """

    charged_delay: float
    delay: float
    spend: float
    bound: float
    gap: float
    one_percent_buys: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class TradeOff:
    """The least spend for each delay from today's to the least possible, off the grid.

    Parameters
    ----------
    spend : {"width", "energy"}
    today_charged_delay, today_spend : float
        s, and m or F; the block as drawn.
    points : tuple of TradeOffPoint
        The slowest first.
    knee : int or None
        The point beyond which speed becomes dear; None where there is no such point.
    """

    spend: Literal["width", "energy"]
    today_charged_delay: float
    today_spend: float
    points: tuple[TradeOffPoint, ...]
    knee: int | None


@dataclass(frozen=True, slots=True, kw_only=True)
class FewChangesPoint:
    """The least worst charged delay found, s, with so many cards changed, the others as drawn."""

    cards: int
    charged_delay: float


@dataclass(frozen=True, slots=True, kw_only=True)
class FewChanges:
    """How much delay each number of changed cards buys, off the grid.

    Parameters
    ----------
    asked : int
        How many cards may change.
    today_charged_delay : float
        s.
    bound : float
        s; no sizes within the limits have a smaller worst charged delay, however many change.
    points : tuple of FewChangesPoint
        The fewest cards first; delays never rise.
    every_set_tried : bool
        Whether no other set of at most so many cards as asked for can be faster.
    """

    asked: int
    today_charged_delay: float
    bound: float
    points: tuple[FewChangesPoint, ...]
    every_set_tried: bool = False


PricedLimit = Literal[
    "input", "transition", "greatest width", "least width", "fixed", "budget", "skew"
]


@dataclass(frozen=True, slots=True, kw_only=True)
class LimitPrice:
    """What ten percent more room at a limit would buy at most.

    Parameters
    ----------
    limit : str
        Which kind.
    name : str
        The input, or the gate; empty where the limit is the block's.
    buys : float
        s of the worst charged delay; m or F where the least width or energy was asked for.
    """

    limit: PricedLimit
    name: str
    buys: float


@dataclass(frozen=True, slots=True, kw_only=True)
class SizedCorners:
    """A block sized for several corners at once: how it does in each.

    Parameters
    ----------
    before, after : Corners
        With the old and with the written widths.
    shares : tuple of float
        Which part of what limits the optimum lies in each corner, from the multipliers; they add up
        to 1. Empty where nothing was optimised.
    """

    before: Corners
    after: Corners
    shares: tuple[float, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Sizing(Tabular):
    """New widths and what they buy.

    Parameters
    ----------
    before, after : Analysis
        The whole block analysed with the old and with the written widths; of several corners in the
        one that limits it afterwards.
    goal : str
        What was asked, in words: ``fastest``, ``least width for 450 ps``, ...
    bound : float
        s, m or F; no sizes within the limits can do better than this: a bound on the worst charged
        delay (fastest, budget) or on what is kept small (least width or energy for a delay).
    bound_on : {"delay", "width", "energy"}
        What the bound is about.
    gap : float
        Relative distance of the continuous optimum to the bound, confirmed by the checker.
    rounding_loss : float
        Relative cost of the written widths beyond that of the continuous optimum.
    least_delay : float
        s; the least worst charged delay possible within the limits.
    total_width_before, total_width_after : float
        m.
    free_cards, fixed_cards : int
        How many sizes could move and how many could not.
    changes : tuple of Change
        Gate by gate, in the order of the text.
    holds : tuple of StageHold
        One per stage of ``after.paths[0]``.
    already_done : bool
        The netlist was written by an earlier run with these wishes; nothing changes.
    notices : tuple of Notice
    kept : tuple of Original
        The limits the sizes were found within, for later runs to keep, corner by corner.
    edits : tuple of Edit
        What writes the new widths into the text.
    structure : StructureCheck, optional
        How the written netlist, read back, compares with the old one; None where none was written.
    trade_off : TradeOff, optional
        Spend against delay, where it was asked for.
    prices : tuple of LimitPrice
        What limits would buy in what the bound is about, the dearest first.
    few : FewChanges, optional
        Delay against the number of changes, where that was limited; ``bound`` is then that of the
        cards chosen.
    asked_delay : float, optional
        s, where the least width or energy for a delay was wanted.
    sharing_loss : float
        The part of the gap that is there because copies of a leaf share sizes; the bound is that of
        sizes of their own.
    corners : SizedCorners, optional
        Every corner, where the block was sized for several. Delays that are asked for, bounded or
        told of a change are then the worst over corners.
    """

    before: Analysis
    after: Analysis
    goal: str
    bound: float
    bound_on: Literal["delay", "width", "energy"]
    gap: float
    rounding_loss: float
    least_delay: float
    total_width_before: float
    total_width_after: float
    free_cards: int
    fixed_cards: int
    changes: tuple[Change, ...]
    holds: tuple[StageHold, ...]
    already_done: bool
    notices: tuple[Notice, ...]
    kept: tuple[Original, ...] = ()
    edits: tuple[Edit, ...] = field(default=(), repr=False)
    structure: StructureCheck | None = None
    trade_off: TradeOff | None = None
    few: FewChanges | None = None
    prices: tuple[LimitPrice, ...] = ()
    sharing_loss: float = 0.0
    asked_delay: float | None = None
    corners: SizedCorners | None = None

    @property
    def every_before(self) -> tuple[Analysis, ...]:
        """The block with the old widths in each corner."""
        return self.corners.before.analyses if self.corners else (self.before,)

    @property
    def every_after(self) -> tuple[Analysis, ...]:
        """The block with the written widths in each corner."""
        return self.corners.after.analyses if self.corners else (self.after,)

    @property
    def slowest_before(self) -> Path:
        """The slowest path before, over all corners."""
        return self.corners.before.paths[0] if self.corners else self.before.paths[0]

    @property
    def block_notices(self) -> tuple[Notice, ...]:
        """What was assumed of the block, in any corner."""
        return self.corners.before.notices if self.corners else self.before.notices

    @property
    def headline(self) -> str:
        """What the widths buy, in one line."""
        old, new = self.slowest_before.delay, self.after.paths[0].delay
        growth = self.total_width_after / self.total_width_before - 1
        return (
            f"{self.goal}: {engineering(old, 's')} before, {engineering(new, 's')} after; "
            f"{len(self.changes)} widths change, total width {100 * growth:+.0f} %"
        )

    def tables(self) -> dict[str, list[Row]]:
        """Return the changes, the stages before and after with what holds them, the curves.

        SI units; stages are numbered from 1.
        """
        before = enumerate(self.before.paths[0].stages, 1)
        after = enumerate(self.after.paths[0].stages, 1)
        holds = [hold.hold for hold in self.holds] or [""] * len(self.after.paths[0].stages)
        curve = self.trade_off.points if self.trade_off else ()
        few = self.few.points if self.few else ()
        return {
            "changes": [row(change, factor=change.factor) for change in self.changes],
            "stages_before": [row(stage, stage=place) for place, stage in before],
            "stages_after": [
                row(stage, stage=place, hold=hold)
                for (place, stage), hold in zip(after, holds, strict=True)
            ],
            "trade_off": [row(point) for point in curve],
            "few_changes": [row(point) for point in few],
        }
