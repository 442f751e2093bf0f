"""One engineering unit for a whole column, so that its numbers compare at a glance."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from collections.abc import Iterable

_PREFIXES: Final = ((1.0, ""), (1e-3, "m"), (1e-6, "u"), (1e-9, "n"), (1e-12, "p"), (1e-15, "f"))

#: From here on a number is written with an exponent.
_LONG: Final = 1e6


@dataclass(frozen=True, slots=True)
class Scale:
    """A unit with a prefix and a number of decimals.

    Parameters
    ----------
    factor : float
        SI units in one of the unit shown.
    unit : str
        As printed, with its prefix.
    decimals : int
    """

    factor: float
    unit: str
    decimals: int

    @classmethod
    def of(cls, values: Iterable[float], unit: str = "", digits: int = 4, least: int = 0) -> Scale:
        """Return the scale in which the largest magnitude has one to three integer digits.

        Parameters
        ----------
        values : iterable of float
            In SI units.
        unit : str
            Without a prefix; a number without a unit gets no prefix either.
        digits : int
            Significant digits of the largest magnitude.
        least : int
            Decimals at least.
        """
        largest = max((abs(value) for value in values), default=0.0)
        factor, prefix = _prefix(largest, digits) if unit else (1.0, "")
        _, power = f"{largest / factor:.{digits - 1}e}".split("e")
        return cls(factor, prefix + unit, max(digits - 1 - max(int(power), 0), least))

    def trimmed(self, values: Iterable[float]) -> Scale:
        """Return the scale without the last decimals that are zero in all values."""
        texts = [f"{value / self.factor:.{self.decimals}f}" for value in values]
        spare = min((len(text) - len(text.rstrip("0")) for text in texts), default=0)
        return replace(self, decimals=max(self.decimals - spare, 0))

    def number(self, value: float) -> str:
        """Return a value without its unit."""
        return plain(value / self.factor, self.decimals)

    def text(self, value: float) -> str:
        """Return a value with its unit."""
        return f"{self.number(value)} {self.unit}".rstrip()


def _prefix(largest: float, digits: int) -> tuple[float, str]:
    """Return the largest prefix that leaves an integer digit after rounding."""
    rounded = float(f"{largest:.{digits - 1}e}")
    return next((p for p in _PREFIXES if rounded >= p[0] * (1 - 1e-9)), _smallest(largest))


def _smallest(largest: float) -> tuple[float, str]:
    return _PREFIXES[-1] if largest else _PREFIXES[0]


def plain(value: float, decimals: int) -> str:
    """Return a number with so many decimals, never as minus zero, never endless."""
    if abs(value) >= _LONG:
        return f"{value:.2e}"
    text = f"{value:.{decimals}f}"
    return text.removeprefix("-") if float(text) == 0 else text


def percent(before: float, after: float) -> str:
    """Return a relative change as in ``-26 %``; words where there is no ratio to tell."""
    if before == after:
        return "no change"
    if before == 0:
        return "from nothing"
    change = 100 * (after - before) / abs(before)
    return f"{change:+.{_percent_decimals(change)}f} %"


def _percent_decimals(change: float) -> int:
    """Return the decimals that leave two digits to a small change."""
    magnitude = abs(change)
    if magnitude >= 9.95:
        return 0
    return 1 if magnitude >= 0.95 else 2


def figure(value: float) -> str:
    """Return a number without a unit in three digits."""
    return plain(value, Scale.of([value], digits=3).decimals)
