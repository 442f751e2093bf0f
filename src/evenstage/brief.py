"""The brief: what the designer knows about a block and the netlist does not say."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

if TYPE_CHECKING:
    from evenstage.pattern import Pattern
    from evenstage.source import SourceText


@dataclass(frozen=True, slots=True, kw_only=True)
class InputBrief:
    """How some inputs arrive.

    Parameters
    ----------
    nets : tuple of Pattern
        The inputs meant.
    arrival, transition : float
        s; transition None: that of a chain of fan-out-of-four inverters.
    drive : float
        Resistance of the outside driver, ohm; it adds its own delay.
    capacitance_max : float, optional
        Ceiling for the capacitance the block shows on each of these inputs, F; None: as drawn.
    """

    nets: tuple[Pattern, ...]
    arrival: float = 0.0
    transition: float | None = None
    drive: float = 0.0
    capacitance_max: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class OutputBrief:
    """What some outputs drive and when they are needed.

    Parameters
    ----------
    nets : tuple of Pattern
        The outputs meant.
    load : float, optional
        F; None: four unit inverters.
    required : float, optional
        s.
    """

    nets: tuple[Pattern, ...]
    load: float | None = None
    required: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class IgnoreBrief:
    """Paths to leave out: from, through and to nets that match; an empty tuple matches all."""

    start: tuple[Pattern, ...] = ()
    through: tuple[Pattern, ...] = ()
    end: tuple[Pattern, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class LimitBrief:
    """Width limits of some cards, m."""

    cards: tuple[Pattern, ...]
    width_min: float | None = None
    width_max: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Brief:
    """Everything the designer said about a block; all of it optional.

    Card patterns are matched against names with their instance path, as in ``xrow3.xnand``.

    Parameters
    ----------
    top : str, optional
        The subcircuit to work on.
    supplies_high, supplies_low : tuple of Pattern
        Supply nets; empty: found.
    inputs, outputs, ignores, limits : tuple
        See the classes.
    fixed : tuple of Pattern
        Cards that must not change.
    leaves : tuple of Pattern
        Subcircuits to be treated as leaves.
    same_size : tuple of tuple of Pattern
        Groups of cards that share one size.
    transition_max : float, optional
        s; None: today's worst.
    copies_per_leaf : int
        How many sized copies of one leaf may be added; 0: all callers share one size.
    aim_delay, aim_width : float, optional
        s; factor of today's total width.
    aim_spend : {"width", "energy"}
        What is kept small.
    source : SourceText, optional
        The file.
    """

    top: str | None = None
    supplies_high: tuple[Pattern, ...] = ()
    supplies_low: tuple[Pattern, ...] = ()
    inputs: tuple[InputBrief, ...] = ()
    outputs: tuple[OutputBrief, ...] = ()
    ignores: tuple[IgnoreBrief, ...] = ()
    limits: tuple[LimitBrief, ...] = ()
    fixed: tuple[Pattern, ...] = ()
    leaves: tuple[Pattern, ...] = ()
    same_size: tuple[tuple[Pattern, ...], ...] = ()
    transition_max: float | None = None
    copies_per_leaf: int = 4
    aim_delay: float | None = None
    aim_width: float | None = None
    aim_spend: Literal["width", "energy"] = "width"
    source: SourceText | None = None
