"""Widths, lengths, areas and edges in metres, whatever the cards' habits.

A number with a suffix, one without and the result of an expression can each mean metres, microns or
nanometres: ``0.65u``, ``650000u`` under an implied scale of a millionth, ``0.65``, ``8.2e-07``. For
each of the three spellings the unit is taken that makes its median channel length (else width, else
junction edge) a length that transistors have. An explicit ``.option scale`` or a ``width_unit`` of
the process leaves nothing to decide.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.errors import ElaborationError, Notice
from evenstage.netlist.elaboration.columns import Column, absent, value_span
from evenstage.netlist.elaboration.mistakes import MOST, Mistakes
from evenstage.netlist.values import Style
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping

    from numpy.typing import NDArray

    from evenstage.netlist.devices import FloatArray, IntArray, Model
    from evenstage.netlist.elaboration.columns import Styles
    from evenstage.netlist.netlist import Netlist
    from evenstage.process.process import Process, Transistor

#: A median from here on is no length in metres (common practice, no source).
_NOT_METRES: Final = 2e-3
#: A median length, or width, from here on is not in microns but in nanometres.
_NOT_MICRONS: Final = {"l": 8.0, "w": 80.0}
#: No width or length of a transistor lies beyond (an atom; what textbooks scale to).
_THINKABLE: Final = (2e-10, 1000.0)
_MICRON: Final = 1e-6
_NANOMETRE: Final = 1e-9
_SPELT: Final = {
    Style.BARE: "numbers without a suffix",
    Style.SUFFIXED: "numbers with a suffix",
    Style.COMPUTED: "results of expressions",
}
_UNIT_NAMES: Final = {_MICRON: "microns", _NANOMETRE: "nanometres"}


@dataclass(frozen=True, slots=True, kw_only=True)
class Geometry:
    """Drawn sizes of distinct transistors, SI units, shape ``(n,)`` each; see ``Devices``."""

    width: FloatArray
    length: FloatArray
    multiplier: FloatArray
    fingers: FloatArray
    drain_area: FloatArray
    source_area: FloatArray
    drain_edge: FloatArray
    source_edge: FloatArray
    notices: tuple[Notice, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Drawn:
    """Transistors as their cards say: parameters by name, card, model and its type."""

    columns: Mapping[str, Column]
    card: IntArray
    model: IntArray
    models: tuple[Model, ...]

    def column(self, name: str) -> Column:
        """Return a parameter; absent where no card has it."""
        return self.columns.get(name) or absent(len(self.card))


def geometry(drawn: Drawn, netlist: Netlist, process: Process) -> Geometry:
    """Return the sizes of transistors in SI units.

    Parameters
    ----------
    drawn : Drawn
        What the cards say.
    netlist : Netlist
        For its options (``scale``, ``defw``, ``defl``) and messages.
    process : Process
        What the parameters of each type mean.

    Raises
    ------
    ElaborationError
        If a width is missing, or a width, length or multiplier is not positive.
    """
    return _Sizes(drawn, netlist, process).geometry()


class _Sizes:
    """Works out the sizes of some transistors."""

    def __init__(self, drawn: Drawn, netlist: Netlist, process: Process) -> None:
        self._drawn = drawn
        self._netlist = netlist
        self._process = process
        types = np.array([model.type_index for model in drawn.models], np.int32)
        self._type = types[drawn.model] if len(types) else np.zeros(0, np.int32)
        self._met = np.unique(self._type).tolist()
        self._notices: list[Notice] = []
        self._mistakes = Mistakes(netlist.sources)
        self._width = self._by_type(lambda t: t.width_parameter.lower())
        self._length = drawn.column("l")
        self._units = self._units_by_style()

    def _by_type(self, name_of: Callable[[Transistor], str]) -> Column:
        """Return a parameter whose name depends on the transistor type."""
        result = absent(len(self._type))
        for index in self._met:
            column = self._drawn.column(name_of(self._process.transistors[index]))
            rows = self._type == index
            result.numbers[rows] = column.numbers[rows]
            result.styles[rows] = column.styles[rows]
        return result

    # The unit of each spelling.

    def _units_by_style(self) -> FloatArray:
        """Return metres per unit for each style."""
        units = np.ones(len(Style))
        scale = self._netlist.options.get("scale")
        if scale is not None and scale > 0:
            return units * scale
        for style in (Style.BARE, Style.SUFFIXED, Style.COMPUTED):
            unit, example = self._likely_unit(style)
            units[style] = unit
            if unit != 1:
                self._note_unit(style, unit, example)
        return units

    def _likely_unit(self, style: Style) -> tuple[float, float]:
        """Return metres per unit of one spelling and the median it was decided by."""
        in_fins = self._rows_where(lambda t: t.width_is == "fins")
        candidates = (
            ("l", self._length, slice(None)),
            ("w", self._width, ~in_fins),
            ("w", self._drawn.column("pd"), slice(None)),
            ("w", self._drawn.column("ps"), slice(None)),
        )
        for kind, column, rows in candidates:
            numbers = column.numbers[rows][column.styles[rows] == style]
            numbers = numbers[numbers > 0]
            if len(numbers):
                return _unit_of_median(float(np.median(numbers)), kind)
        return 1.0, 0.0

    def _rows_where(self, condition: Callable[[Transistor], bool]) -> NDArray[np.bool_]:
        types = [i for i in self._met if condition(self._process.transistors[i])]
        return np.isin(self._type, types)

    def _note_unit(self, style: Style, unit: float, example: float) -> None:
        explicit = style == Style.BARE and all(
            self._process.transistors[i].width_unit is not None for i in self._met
        )
        if explicit:
            return
        message = (
            f"sizes of transistors given as {_SPELT[style]} are read in {_UNIT_NAMES[unit]}, "
            f"so that {example:g} is {engineering(example * unit, 'm')}; "
            "width_unit in the process file overrules this"
        )
        self._notices.append(Notice("size-unit", message))

    def _unit(self, styles: Styles) -> FloatArray:
        """Return metres per unit of some values, a type's own unit for bare numbers first."""
        unit = self._units[styles]
        for index in self._met:
            own = self._process.transistors[index].width_unit
            if own is not None:
                rows = (self._type == index) & (styles == Style.BARE)
                unit[rows] = own
                computed = (self._type == index) & (styles == Style.COMPUTED)
                unit[computed & (unit != 1)] = own
        return unit

    def _metres(self, column: Column, power: int = 1) -> FloatArray:
        values = column.numbers * self._unit(column.styles) ** power
        return np.where(column.styles == Style.ABSENT, np.nan, values)

    # The sizes.

    def geometry(self) -> Geometry:
        """Return all of them."""
        fingers = self._fingers()
        sizes = Geometry(
            width=self._widths(fingers),
            length=self._lengths(),
            multiplier=self._multipliers(),
            fingers=fingers,
            drain_area=self._metres(self._drawn.column("ad"), 2),
            source_area=self._metres(self._drawn.column("as"), 2),
            drain_edge=self._metres(self._drawn.column("pd")),
            source_edge=self._metres(self._drawn.column("ps")),
            notices=tuple(self._notices),
        )
        self._mistakes.check()
        return sizes

    def _widths(self, fingers: FloatArray) -> FloatArray:
        width = self._metres(self._width)
        in_fins = self._rows_where(lambda t: t.width_is == "fins")
        width[in_fins] = self._width.numbers[in_fins] * self._fin_width()[in_fins]
        missing = np.isnan(width)
        width[missing] = self._netlist.options.get("defw", np.nan)
        # A width that is given and has no value is a mistake told already.
        unsaid = self._width.styles == Style.ABSENT
        self._refuse(np.isnan(width) & unsaid, self._missing_width)
        self._refuse(width <= 0, self._bad_width)
        self._refuse(_unthinkable(width), lambda row: self._unthinkable(row, width, "width"))
        each = self._rows_where(lambda t: t.width_is == "finger")
        return np.where(each, width * fingers, width)

    def _fin_width(self) -> FloatArray:
        """Return the width of one fin, m."""
        each = np.array([_fin(t) for t in self._process.transistors])
        return each[self._type] if len(self._type) else np.zeros(0)

    def _lengths(self) -> FloatArray:
        length = self._metres(self._length)
        missing = np.isnan(length)
        if missing.any():
            defaults = np.array([t.length for t in self._process.transistors])
            length[missing] = self._netlist.options.get("defl", np.nan)
            unsaid = np.isnan(length)
            if unsaid.any():
                length[unsaid] = defaults[self._type[unsaid]]
                message = (
                    "cards without a channel length are taken to have that of their transistor type"
                )
                self._notices.append(Notice("length-assumed", message, self._place(unsaid)))
        self._refuse(~(length > 0), self._bad_length)
        self._refuse(_unthinkable(length), lambda row: self._unthinkable(row, length, "length"))
        return length

    def _place(self, rows: NDArray[np.bool_]) -> str:
        return self._netlist.card(int(self._drawn.card[np.argmax(rows)])).span.place

    def _fingers(self) -> FloatArray:
        named = self._by_type(lambda t: (t.fingers_parameter or "").lower()).numbers
        for name in ("nf", "ng"):
            named = np.where(np.isnan(named), self._drawn.column(name).numbers, named)
        fingers = np.where(np.isnan(named), 1.0, named)
        self._refuse(~(fingers > 0), self._bad_fingers)
        self._note_fingers(fingers)
        return fingers

    def _note_fingers(self, fingers: FloatArray) -> None:
        """Take a notice of what widths mean on cards with several fingers, if nobody said it."""
        rows = self._rows_where(lambda t: not t.width_is_said) & (fingers != 1)
        if rows.any():
            message = (
                "the width of cards with several fingers is taken as that of all fingers together; "
                "width_is in the process file overrules this"
            )
            self._notices.append(Notice("finger-width", message, self._place(rows)))

    def _multipliers(self) -> FloatArray:
        """Return the copies of each card; ``m`` and ``mult`` on one card both count."""
        m, mult = self._counts("m"), self._counts("mult")
        both = (m != 1) & (mult != 1)
        if both.any():
            message = "cards that give both m and mult stand for the product of both"
            self._notices.append(Notice("both-multipliers", message, self._place(both)))
        return m * mult

    def _counts(self, name: str) -> FloatArray:
        counts = self._drawn.column(name).numbers
        counts = np.where(np.isnan(counts), 1.0, counts)
        self._refuse(
            ~(counts > 0), lambda row: self._not_positive(row, name, "a multiplier", "multiplier")
        )
        return counts

    # What is refused.

    def _refuse(self, rows: NDArray[np.bool_], error: Callable[[int], ElaborationError]) -> None:
        if rows.any():
            bad = np.flatnonzero(rows)
            _, firsts = np.unique(self._drawn.card[bad], return_index=True)
            for row in bad[firsts[:MOST]].tolist():
                self._mistakes.add(error(row))

    def _transistor(self, row: int) -> Transistor:
        return self._process.transistors[int(self._type[row])]

    def _missing_width(self, row: int) -> ElaborationError:
        card = self._netlist.card(int(self._drawn.card[row]))
        name = self._transistor(row).width_parameter
        message = f"'{card.name}' has no width; expected {name}=value on its card"
        if name.lower() != "nfin" and card.parameter("nfin") is not None:
            message += (
                "; it counts fins: in the process file, give its type width_parameter = 'nfin', "
                "width_is = 'fins' and the width of one fin as width_unit"
            )
        return ElaborationError(message, code="missing-width", span=card.span)

    def _bad_width(self, row: int) -> ElaborationError:
        name = self._transistor(row).width_parameter.lower()
        return self._not_positive(row, name, "width", "width", "a positive length")

    def _bad_length(self, row: int) -> ElaborationError:
        return self._not_positive(row, "l", "channel length", "length")

    def _unthinkable(self, row: int, metres: FloatArray, noun: str) -> ElaborationError:
        number = int(self._drawn.card[row])
        name = self._transistor(row).width_parameter.lower() if noun == "width" else "l"
        parameter = self._netlist.card(number).parameter(name)
        shown = "a default" if parameter is None else f"'{parameter.text}'"
        message = (
            f"a {noun} must be between 0.2 nm and 1 km, got {shown}, which is read as "
            f"{metres[row]:.3g} m; width_unit in the process file says what a number without a "
            "suffix is worth"
        )
        return ElaborationError(
            message, code=f"bad-{noun}", span=value_span(self._netlist, number, name)
        )

    def _bad_fingers(self, row: int) -> ElaborationError:
        own = (self._transistor(row).fingers_parameter or "").lower()
        card = self._netlist.card(int(self._drawn.card[row]))
        name = next(n for n in (own, "nf", "ng") if n and card.parameter(n) is not None)
        return self._not_positive(row, name, "the number of fingers", "fingers")

    def _not_positive(
        self, row: int, name: str, noun: str, code: str, wanted: str = "positive"
    ) -> ElaborationError:
        number = int(self._drawn.card[row])
        parameter = self._netlist.card(number).parameter(name)
        shown = "" if parameter is None else parameter.text
        value = float(self._drawn.column(name).numbers[row])
        plain = shown[:1].isdigit() or shown[:1] in "+-."
        got = f"'{shown}'" if plain else f"{shown} = {value:g}"
        message = f"{noun} must be {wanted}, got {got}"
        span = value_span(self._netlist, number, name)
        return ElaborationError(message, code=f"bad-{code}", span=span)


def _fin(transistor: Transistor) -> float:
    if transistor.width_is != "fins":
        return float("nan")
    return transistor.width_unit or transistor.width_min or _MICRON


def _unthinkable(metres: FloatArray) -> NDArray[np.bool_]:
    """Tell which sizes are positive and yet none of a transistor."""
    least, most = _THINKABLE
    found: NDArray[np.bool_] = (metres > 0) & ((metres < least) | (metres > most))
    return found


def _unit_of_median(median: float, kind: str) -> tuple[float, float]:
    """Return metres per unit and the median itself."""
    if median < _NOT_METRES:
        return 1.0, median
    return (_MICRON if median < _NOT_MICRONS[kind] else _NANOMETRE), median
