r"""Weighted, robust least squares on the program's own arc model.

With predictions p and measurements m the residuals are

    (p - m)/max(m, d1)                delays,
    (p - m)/(2 max(m, t1))            output transitions,
    3 (p - m)/(4 m)                   input capacitances,

where d1 and t1 are delay and transition of an inverter driving one copy of itself. Their
soft-L1 loss ``2 s^2 (sqrt(1 + (r/s)^2) - 1)``, s a tenth, is made least within bounds by a trust
region method (Branch, Coleman and Li, SIAM Journal on Scientific Computing 21(1), 1999, from
memory; scipy's ``least_squares``).

Only measurements whose transitions occur in practice count: from those of an endless chain of
inverters driving one copy, with a fifth to spare, to those of one driving sixteen. As the chain is
known only after a fit, fit and window take turns.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final, NamedTuple

import numpy as np
from scipy.optimize import least_squares

from evenstage.errors import FitError
from evenstage.fitting.certainty import is_measured
from evenstage.fitting.constants import bounds, starts, with_constants
from evenstage.fitting.prediction import build_predictor
from evenstage.progress import tell
from evenstage.timing.yardstick import chain

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from evenstage.circuit.network import BoolArray
    from evenstage.fitting.bench import Bench
    from evenstage.fitting.constants import Unknown
    from evenstage.fitting.measurements import Measurements
    from evenstage.fitting.prediction import ArcGraph, Predicted, Predictor
    from evenstage.netlist.devices import FloatArray
    from evenstage.process.process import Process

    _Function = Callable[[FloatArray], FloatArray]

_LIGHT_FANOUT: Final = 1.0
_HEAVY_FANOUT: Final = 16.0
_SPARE: Final = 1.2

#: Weights of an output transition and of an input capacitance; a delay has 1.
_OF_TRANSITION: Final = 0.5
_OF_CAP: Final = 0.75

#: Residuals well beyond this count by their size, not by its square.
_ROBUST: Final = 0.1

#: Before the first fit: inputs at most so many times slower than the delay they cause.
_SLOW_INPUT: Final = 4.0

#: Turns in which the window is sought, and evaluations of the Jacobian in each.
_TURNS: Final = 6
_STEPS: Final = 60

#: Nearer to zero than this an unknown is zero.
_NEAR_ZERO: Final = 1e-4

#: Step of the differences that make the Jacobian; unknowns are of the size of one.
_DIFFERENCE: Final = 1e-6

#: Relative change of the loss, and of the unknowns, at which a fit has come to rest.
_TOLERANCE: Final = 1e-6


@dataclass(frozen=True, slots=True)
class Window:
    """The transitions that count, and the floors that relative errors are taken against, s."""

    least: float
    most: float
    delay: float
    transition: float

    def holds(self, measured: Measurements) -> BoolArray:
        """Tell which rows lie inside."""
        leaving = np.nan_to_num(measured.output_transition)
        result: BoolArray = (
            (measured.transition >= self.least)
            & (measured.transition <= self.most)
            & (leaving <= self.most)
        )
        return result


def window_of(process: Process) -> Window:
    """Return the window that a process's own inverters make."""
    light, heavy = chain(process, _LIGHT_FANOUT), chain(process, _HEAVY_FANOUT)
    return Window(
        least=(light.rise + light.fall) / 2 / _SPARE,
        most=(heavy.rise + heavy.fall) / 2,
        delay=light.delay,
        transition=(light.rise + light.fall) / 2,
    )


class Errors(NamedTuple):
    """Relative errors, shape ``(n,)`` each; zero where nothing was measured."""

    delay: FloatArray
    output_transition: FloatArray
    input_cap: FloatArray


def errors(predicted: Predicted, rows: Measurements, window: Window) -> Errors:
    """Return how far predictions lie from measurements, as parts of one."""
    return Errors(
        (predicted.delay - rows.delay) / np.maximum(rows.delay, window.delay),
        np.nan_to_num(
            (predicted.output_transition - rows.output_transition)
            / np.maximum(rows.output_transition, window.transition)
        ),
        np.nan_to_num(predicted.input_cap / rows.input_cap - 1),
    )


@dataclass(frozen=True)
class Solution:
    """Where a fit came to rest.

    Parameters
    ----------
    process : Process
    at : FloatArray, shape (unknowns,)
    jacobian : FloatArray, shape (residuals, unknowns)
        Of the residuals, each scaled as the loss weighs it.
    variance : float
        Of a residual.
    window : Window
        That the rows lay in.
    settled : bool
        Whether the window of the fitted process holds the same rows.
    """

    process: Process
    at: FloatArray
    jacobian: FloatArray
    variance: float
    window: Window
    settled: bool = True


@dataclass(frozen=True)
class Problem:
    """Measurements of a bench, and what is to be found from them."""

    bench: Bench
    graphs: Sequence[ArcGraph | None]
    rows: Measurements
    unknowns: Sequence[Unknown]

    def solved(self) -> Solution:
        """Return the fitted process.

        Raises
        ------
        FitError
            ``too-few-measurements``.
        """
        rows = self.rows
        inside: BoolArray = (rows.delay > 0) & (rows.transition <= _SLOW_INPUT * rows.delay)
        window = self._first_window(inside)
        at, least = starts(self.unknowns), bounds(self.unknowns)[0]
        met: list[BoolArray] = []
        for turn in range(_TURNS):
            tell("fitting", turn / _TURNS)
            solution = self._solved(inside, at, window)
            window, at = window_of(solution.process), np.maximum(solution.at, least + _NEAR_ZERO)
            met.append(inside)
            inside = window.holds(rows)
            # Where a few rows go in and out in turn, more turns find nothing new.
            if any((inside == one).all() for one in met):
                break
        settled = bool((inside == met[-1]).all())
        return Solution(
            solution.process, solution.at, solution.jacobian, solution.variance, window, settled
        )

    def _first_window(self, inside: BoolArray) -> Window:
        """Return floors for the first turn: a low delay and transition among those measured."""
        rows = self.rows.only(inside)
        if not len(rows):
            raise _too_few(0, len(self.unknowns))
        leaving = rows.output_transition[~np.isnan(rows.output_transition)]
        delay = float(np.quantile(rows.delay, 0.1))
        transition = float(np.quantile(leaving, 0.1)) if len(leaving) else delay
        return Window(0.0, np.inf, delay, transition)

    def _solved(self, inside: BoolArray, at: FloatArray, window: Window) -> Solution:
        rows = self.rows.only(inside)
        if not len(rows):
            raise _too_few(len(rows), len(self.unknowns))
        predictor = build_predictor(self.bench, self.graphs, rows)
        least, most = bounds(self.unknowns)
        # What nothing depends on stays as it is given and is no part of the search.
        live = is_measured(
            _jacobian(self._residuals(self.unknowns, predictor, rows, window), most)(at)
        )
        found = [unknown for unknown, is_live in zip(self.unknowns, live, strict=True) if is_live]
        if len(rows) < len(found):
            raise _too_few(len(rows), len(found))
        residuals = self._residuals(found, predictor, rows, window)
        result = least_squares(
            residuals,
            at[live],
            jac=_jacobian(residuals, most[live]),
            bounds=(least[live], most[live]),
            loss="soft_l1",
            f_scale=_ROBUST,
            ftol=_TOLERANCE,
            xtol=_TOLERANCE,
            max_nfev=_STEPS,
        )
        landed = at.copy()
        landed[live] = _landed(result.x, least[live])
        gradients = np.zeros((len(result.fun), len(at)))
        gradients[:, live] = np.asarray(result.jac)
        return Solution(
            with_constants(self.bench.circuit.process, found, landed[live]),
            landed,
            gradients,
            2 * float(result.cost) / max(len(rows) - len(found), 1),
            window,
        )

    def _residuals(
        self, unknowns: Sequence[Unknown], predictor: Predictor, rows: Measurements, window: Window
    ) -> _Function:
        """Return the residuals as a function of some unknowns."""
        start = self.bench.circuit.process

        def residuals(at: FloatArray) -> FloatArray:
            process = with_constants(start, unknowns, at)
            found = errors(predictor(process), rows, window)
            parts = (
                found.delay,
                _OF_TRANSITION * found.output_transition,
                _OF_CAP * found.input_cap,
            )
            return np.concatenate(parts)

        return residuals


def _jacobian(residuals: _Function, most: FloatArray) -> _Function:
    """Return the Jacobian of residuals by differences, inside the bounds."""

    def jacobian(at: FloatArray) -> FloatArray:
        here = residuals(at)
        steps = np.where(at + _DIFFERENCE > most, -_DIFFERENCE, _DIFFERENCE)
        moved = [residuals(at + step) - here for step in np.diag(steps)]
        result: FloatArray = np.stack(moved, axis=1) / steps
        return result

    return jacobian


def _landed(at: FloatArray, least: FloatArray) -> FloatArray:
    """Put unknowns that stand at a bound of zero on it: the method stays a little inside."""
    result: FloatArray = np.where((least == 0) & (at < _NEAR_ZERO), 0.0, at)
    return result


def _too_few(rows: int, unknowns: int) -> FitError:
    return FitError(
        f"{rows} measurements are within the transitions that occur in practice, but a fit has "
        f"{unknowns} constants to find; measure more cells, or at more transitions and loads",
        code="too-few-measurements",
    )
