"""What a fit found: constants with their errors, residuals, and what the data cannot tell."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from evenstage.tabular import Row, Tabular, row

if TYPE_CHECKING:
    from pathlib import Path

    from evenstage.errors import Notice
    from evenstage.process.process import Process


@dataclass(frozen=True, slots=True, kw_only=True)
class FittedConstant:
    """One constant.

    Parameters
    ----------
    models : str
        Model names of the transistor type, or ``all`` where all types share it.
    polarity : str
        ``n``, ``p`` or ``np``.
    key : str
        As in the process file.
    value : float
        SI units, as there.
    error : float, optional
        Standard error; None where the constant stands at a bound or nothing measured depends on it.
    told : str
        ``measured``, ``at its bound``, or ``not measured`` (it is where it was before the fit).
    """

    models: str
    polarity: str
    key: str
    value: float
    error: float | None
    told: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Residuals:
    """How far some predictions lie from the measurements, as parts of one.

    Parameters
    ----------
    name : str
        The gate.
    stages : int
        Most stages along any of its arcs.
    count : int
        Measurements.
    bias, median, high : float
        Mean of (predicted - measured) over the larger of the measured delay and that of an inverter
        driving one; median and 95th percentile of its size.
    transition : float, optional
        Median size for output transitions; None where not measured.
    """

    name: str
    stages: int
    count: int
    bias: float
    median: float
    high: float
    transition: float | None


@dataclass(frozen=True, slots=True)
class Confusion:
    """Constants that the measurements do not tell apart.

    Parameters
    ----------
    constants : tuple of (str, str)
        Polarity and key of each.
    spread : float
        How far they can move together, each in parts of its own scale, before the fit becomes worse
        by what chance would make it.
    """

    constants: tuple[tuple[str, str], ...]
    spread: float


@dataclass(frozen=True, kw_only=True)
class Fit(Tabular):
    """A process fitted to measurements.

    Parameters
    ----------
    source, cells : str
        Files of the measurements and of the netlist.
    process : Process
    constants : tuple of FittedConstant
    single, several : Residuals, optional
        Over the rows used, of one stage and of several; None where there are none.
    gates : tuple of Residuals
        By gate, in the order measured.
    confusions : tuple of Confusion
    measured, used : int
        Rows in all, and rows within the window.
    transition_least, transition_most : float
        s; the window: transitions from those of a chain of inverters driving one copy, with a fifth
        to spare, to those of one driving sixteen.
    fo4 : float
        s, of the fitted process.
    notices : tuple of Notice
    output : Path, optional
        Where the process file was written.
    """

    source: str
    cells: str
    process: Process
    constants: tuple[FittedConstant, ...]
    single: Residuals | None
    several: Residuals | None
    gates: tuple[Residuals, ...]
    confusions: tuple[Confusion, ...]
    measured: int
    used: int
    transition_least: float
    transition_most: float
    fo4: float
    notices: tuple[Notice, ...]
    output: Path | None = field(default=None)

    @property
    def head(self) -> tuple[str, ...]:
        """Where the process comes from, as the process file says it."""
        return (
            f"Fitted to {self.used} of {self.measured} measurements in {self.source},",
            f"cells of {self.cells}. An estimate, not sign-off.",
        )

    @property
    def headline(self) -> str:
        """How much was fitted, in one line."""
        return f"{self.process.name}: fitted to {self.used} of {self.measured} measurements"

    def tables(self) -> dict[str, list[Row]]:
        """Return the constants in the units of the process file, and the residuals by gate."""
        return {
            "constants": [row(one) for one in self.constants],
            "gates": [row(one) for one in self.gates],
        }


@dataclass(frozen=True, kw_only=True)
class Deck:
    """A measuring deck with the table its results go into.

    Parameters
    ----------
    cells : tuple of str
        Cells measured.
    arcs, measurements : int
    text, table : str
        The deck; comma-separated text with names where results belong.
    notices : tuple of Notice
    """

    cells: tuple[str, ...]
    arcs: int
    measurements: int
    text: str = field(repr=False)
    table: str = field(repr=False)
    notices: tuple[Notice, ...]
    output: Path | None = None
    table_output: Path | None = None
