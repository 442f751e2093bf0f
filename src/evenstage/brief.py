"""The brief: what the designer knows about a block and the netlist does not say."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final, Literal

from evenstage.schema import Entry, Integer, Names, Number, Text
from evenstage.settings import Settings, Table, Tables, read_settings

if TYPE_CHECKING:
    from collections.abc import Mapping
    from pathlib import Path

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
class ClockBrief:
    """Clocks, and how long each of their levels lasts, s; None: unsaid."""

    nets: tuple[Pattern, ...]
    high: float | None = None
    low: float | None = None


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
    inputs, outputs, clocks, ignores, limits : tuple
        See the classes.
    fixed : tuple of Pattern
        Cards that must not change.
    leaves : tuple of Pattern
        Subcircuits to be treated as leaves.
    same_size : tuple of tuple of Pattern
        Groups of cards that share one size.
    transition_max : float, optional
        s; None: today's worst.
    coupling : float
        What a capacitor between two signals counts on each of them: 0 where the other moves along,
        1 where it stands still, 2 where it moves against.
    copies_per_leaf : int
        How many sized copies of one leaf may be added; 0: all callers share one size.
    aim_delay, aim_width : float, optional
        s; factor of today's total width.
    aim_spend : {"width", "energy"}
        What is kept small.
    pulls : {"together", "apart"}
        Whether pull-up and pull-down of a gate have one size or one each.
    skew_least, skew_most : float
        Bounds of the strength of a gate's pull-up over that of its pull-down where they are sized
        apart; 1 is even.
    case : {"any", "exact"}, optional
        Whether case counts in the names of nets; None: only where two ports of one subcircuit
        differ by it alone.
    first_line : {"title", "card"}, optional
        What the netlist begins with; None: a title, unless it is plainly something else.
    source : SourceText, optional
        The file.
    """

    top: str | None = None
    supplies_high: tuple[Pattern, ...] = ()
    supplies_low: tuple[Pattern, ...] = ()
    inputs: tuple[InputBrief, ...] = ()
    outputs: tuple[OutputBrief, ...] = ()
    clocks: tuple[ClockBrief, ...] = ()
    ignores: tuple[IgnoreBrief, ...] = ()
    limits: tuple[LimitBrief, ...] = ()
    fixed: tuple[Pattern, ...] = ()
    leaves: tuple[Pattern, ...] = ()
    same_size: tuple[tuple[Pattern, ...], ...] = ()
    transition_max: float | None = None
    coupling: float = 1.0
    copies_per_leaf: int = 4
    aim_delay: float | None = None
    aim_width: float | None = None
    aim_spend: Literal["width", "energy"] = "width"
    pulls: Literal["together", "apart"] = "together"
    skew_least: float = 0.5
    skew_most: float = 2.0
    case: Literal["any", "exact"] | None = None
    first_line: Literal["title", "card"] | None = None
    source: SourceText | None = None


# Upper bounds only catch numbers written in the wrong unit: 50 where 50 fF is meant.
_TIME: Final = Number(unit="s", above=0, most=1e-3)
_CAPACITANCE_MOST: Final = 1e-6
_WIDTH: Final = Number(unit="m", above=0, most=1e-2)

#: The keys of a brief.
BRIEF_KEYS: Final[Mapping[str, Entry]] = {
    "top": Text(),
    "supplies": Table(keys={"high": Names(), "low": Names()}),
    "input": Tables(
        keys={
            "nets": Names(required=True),
            "arrival": Number(unit="s", least=-1e-3, most=1e-3, default=0.0),
            "transition": _TIME,
            "drive": Number(unit="ohm", least=0, default=0.0),
            "capacitance_max": Number(unit="F", above=0, most=_CAPACITANCE_MOST, word="as drawn"),
        }
    ),
    "output": Tables(
        keys={
            "nets": Names(required=True),
            "load": Number(unit="F", least=0, most=_CAPACITANCE_MOST),
            "required": _TIME,
        }
    ),
    "clock": Tables(keys={"nets": Names(required=True), "high": _TIME, "low": _TIME}),
    "ignore": Tables(keys={"from": Names(), "through": Names(), "to": Names()}),
    "fixed": Names(),
    "leaves": Names(),
    "same_size": Tables(keys={"cards": Names(required=True)}),
    "limit": Tables(keys={"cards": Names(required=True), "width_min": _WIDTH, "width_max": _WIDTH}),
    "transition_max": _TIME,
    "coupling": Number(least=0, most=2, default=1.0),
    "copies_per_leaf": Integer(least=0, default=4),
    "aim": Table(
        keys={
            "delay": _TIME,
            "width": Number(above=0),
            "spend": Text(choices=("width", "energy"), default="width"),
        }
    ),
    "pulls": Text(choices=("together", "apart"), default="together"),
    "skew": Table(
        keys={
            "least": Number(above=0, default=0.5),
            "most": Number(above=0, default=2.0),
        }
    ),
    "case": Text(choices=("any", "exact")),
    "first_line": Text(choices=("title", "card")),
}


_CASES: Final[Mapping[str, Literal["any", "exact"]]] = {"any": "any", "exact": "exact"}
_FIRST_LINES: Final[Mapping[str, Literal["title", "card"]]] = {"title": "title", "card": "card"}


def read_brief(path: str | Path) -> Brief:
    """Read a brief.

    Parameters
    ----------
    path : str or Path
        A TOML file with the keys of ``BRIEF_KEYS``.

    Raises
    ------
    SettingsError
        If the file cannot be read or something in it is wrong.

    Examples
    --------
    >>> folder = "sample_netlists/pad_predriver"
    >>> brief = read_brief(f"{folder}/brief.toml")
    >>> [output.load for output in brief.outputs]
    [1.6e-12, 6.4e-13]
    """
    settings = read_settings(path, BRIEF_KEYS)
    supplies, aim, skew = (settings.table(key) for key in ("supplies", "aim", "skew"))
    skew.check_order("least", "most")
    return Brief(
        top=settings.optional_text("top"),
        supplies_high=supplies.names("high"),
        supplies_low=supplies.names("low"),
        inputs=tuple(map(_input, settings.tables("input"))),
        outputs=tuple(map(_output, settings.tables("output"))),
        clocks=tuple(map(_clock, settings.tables("clock"))),
        ignores=tuple(map(_ignore, settings.tables("ignore"))),
        limits=tuple(map(_limit, settings.tables("limit"))),
        fixed=settings.names("fixed"),
        leaves=settings.names("leaves"),
        same_size=tuple(group.names("cards") for group in settings.tables("same_size")),
        transition_max=settings.optional_number("transition_max"),
        coupling=settings.number("coupling"),
        copies_per_leaf=settings.integer("copies_per_leaf"),
        aim_delay=aim.optional_number("delay"),
        aim_width=aim.optional_number("width"),
        aim_spend="energy" if aim.text("spend") == "energy" else "width",
        pulls="apart" if settings.text("pulls") == "apart" else "together",
        skew_least=skew.number("least"),
        skew_most=skew.number("most"),
        case=_CASES.get(settings.optional_text("case") or ""),
        first_line=_FIRST_LINES.get(settings.optional_text("first_line") or ""),
        source=settings.where.places.source,
    )


def _input(table: Settings) -> InputBrief:
    return InputBrief(
        nets=table.names("nets"),
        arrival=table.number("arrival"),
        transition=table.optional_number("transition"),
        drive=table.number("drive"),
        capacitance_max=table.optional_number("capacitance_max"),
    )


def _output(table: Settings) -> OutputBrief:
    return OutputBrief(
        nets=table.names("nets"),
        load=table.optional_number("load"),
        required=table.optional_number("required"),
    )


def _clock(table: Settings) -> ClockBrief:
    return ClockBrief(
        nets=table.names("nets"),
        high=table.optional_number("high"),
        low=table.optional_number("low"),
    )


def _ignore(table: Settings) -> IgnoreBrief:
    start, through, end = (table.names(key) for key in ("from", "through", "to"))
    if not (start or through or end):
        raise table.header_error("[[ignore]] needs from, through or to", "empty-table")
    return IgnoreBrief(start=start, through=through, end=end)


def _limit(table: Settings) -> LimitBrief:
    least, most = table.optional_number("width_min"), table.optional_number("width_max")
    if least is None and most is None:
        raise table.header_error("[[limit]] needs width_min or width_max", "empty-table")
    table.check_order("width_min", "width_max")
    return LimitBrief(cards=table.names("cards"), width_min=least, width_max=most)
