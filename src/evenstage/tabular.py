"""Results as plain tables: lists of dictionaries for scripts, and small HTML for notebooks."""

from __future__ import annotations

from abc import ABC, abstractmethod
from dataclasses import fields, is_dataclass
from html import escape
from typing import TYPE_CHECKING, Final, TypeAlias

from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Sequence

#: One row: plain values in SI units by name.
Row: TypeAlias = "dict[str, str | float | int | bool | None]"

#: Rows that a notebook shows of a table.
_SHOWN: Final = 20
#: The unit of a quantity by the last word of its name.
_UNITS: Final = {
    **dict.fromkeys(("delay", "arrival", "transition", "required", "alone", "simulated"), "s"),
    **dict.fromkeys(("cap", "capacitance"), "F"),
    **dict.fromkeys(("width", "old", "new", "before", "after"), "m"),
}
_PLAIN: Final = (str, float, int, bool, type(None))


class Tabular(ABC):
    """A result that turns into tables, and that a notebook shows."""

    __slots__ = ()

    @property
    @abstractmethod
    def headline(self) -> str:
        """One line for people."""

    @abstractmethod
    def tables(self) -> dict[str, list[Row]]:
        """Return the result as tables by name: plain values in SI units, for any data frame."""

    def _repr_html_(self) -> str:
        """Return what a notebook shows: the headline, and the head of each table."""
        parts = [f"<p><strong>{escape(_shown(self.headline))}</strong></p>"]
        parts += [_html(name, rows) for name, rows in self.tables().items() if rows]
        return f"<div>{''.join(parts)}</div>"


def row(thing: object, **more: str | float | None) -> Row:
    """Return the plain values of a dataclass by name, after some others.

    Examples
    --------
    >>> from evenstage.timing.results import Counts
    >>> row(Counts(devices=4, nets=5, gates=2, stages=2), block="pair")
    {'block': 'pair', 'devices': 4, 'nets': 5, 'gates': 2, 'stages': 2}
    """
    assert is_dataclass(thing)
    values = {field.name: getattr(thing, field.name) for field in fields(thing)}
    return {**more, **{name: value for name, value in values.items() if isinstance(value, _PLAIN)}}


def _html(name: str, rows: Sequence[Row]) -> str:
    """Return the head of a table; numbers stand to the right, with their units."""
    heads = "".join(f"<th>{escape(key.replace('_', ' '))}</th>" for key in rows[0])
    body = "".join(
        f"<tr>{''.join(_cell(key, value) for key, value in some.items())}</tr>"
        for some in rows[:_SHOWN]
    )
    left = len(rows) - _SHOWN
    rest = f", {left} more rows in <code>tables()</code>" if left > 0 else ""
    caption = f"<caption>{escape(name.replace('_', ' '))}{rest}</caption>"
    return f"<table>{caption}<thead><tr>{heads}</tr></thead><tbody>{body}</tbody></table>"


def _cell(key: str, value: object) -> str:
    if isinstance(value, float):
        unit = _UNITS.get(key.rpartition("_")[2], "")
        text = engineering(value, unit) if unit else f"{value:.4g}"
    else:
        text = "" if value is None else str(value)
    side = "left" if isinstance(value, str) else "right"
    return f'<td style="text-align: {side}">{escape(_shown(text))}</td>'


def _shown(text: str) -> str:
    """Return a text with ``?`` for bytes of names that were not UTF-8."""
    return text.encode("utf-8", "replace").decode()
