"""The voltages of a circuit over time, by an implicit method of variable order and step.

Between the corners of the given voltages the equations are smooth; there scipy's backward
differentiation formulas (Shampine and Reichelt, "The MATLAB ODE suite", SIAM Journal on Scientific
Computing 18(1), 1997, as scipy's documentation has it) run from corner to corner. Time is counted
in a unit of the circuit's own, so that numbers are near one.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np
from scipy.integrate import BDF, OdeSolution

from evenstage.errors import SimulationError
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Callable

    from scipy.integrate import DenseOutput

    from evenstage.netlist.devices import FloatArray
    from evenstage.simulation.equations import Equations
    from evenstage.simulation.ramps import Ramps


#: At least so many steps are taken along a ramp.
_STEPS_OF_RAMP = 10


@dataclass(frozen=True, slots=True, kw_only=True)
class Accuracy:
    """How closely the integrator follows the equations.

    Parameters
    ----------
    relative : float
        Error per step, of the voltage.
    absolute : float
        Error per step, of the supply.
    most_steps : int
        More mean that something is wrong.
    """

    relative: float = 1e-4
    absolute: float = 1e-5
    most_steps: int = 100_000


@dataclass(frozen=True)
class Waveforms:
    """The voltages of the unknown nodes over time.

    Parameters
    ----------
    time : FloatArray, s, shape (steps,)
        Ascending; where the integrator stopped to look.
    voltage : FloatArray, V, shape (unknown, steps)
    interpolant : OdeSolution
        Dense output, in ``unit``.
    unit : float
        s.
    """

    time: FloatArray
    voltage: FloatArray
    interpolant: OdeSolution
    unit: float

    def at(self, time: float | FloatArray) -> FloatArray:
        """Return the voltages at a time, V, shape (unknown,), or at several, (unknown, times)."""
        result: FloatArray = self.interpolant(np.asarray(time) / self.unit)
        return result


@dataclass
class _Run:
    """One integration in progress; times in units."""

    equations: Equations
    ramps: Ramps
    unit: float
    supply: float
    accuracy: Accuracy
    finished: Callable[[float, FloatArray], bool] | None

    def __post_init__(self) -> None:
        self.times: list[float] = []
        self.voltages: list[FloatArray] = []
        self.pieces: list[DenseOutput[np.float64]] = []

    def cover(self, begin: float, end: float) -> bool:
        """Integrate over a stretch without corners; tell whether enough is known."""
        first, last = self.ramps.at(begin * self.unit), self.ramps.at(end * self.unit)
        rate = (last - first) / (end - begin)
        unit, change = self.unit, rate / self.unit
        solver = BDF(
            lambda t, v: unit * self.equations.slope(v, first + rate * (t - begin), change),
            begin,
            self.voltages[-1],
            end,
            rtol=self.accuracy.relative,
            atol=self.accuracy.absolute * self.supply,
            # A transistor that is off shows no sign of the ramp that will switch it on.
            max_step=(end - begin) / _STEPS_OF_RAMP if rate.any() else np.inf,
            jac=lambda t, v: unit * self.equations.jacobian(v, first + rate * (t - begin)),
        )
        while solver.status == "running":
            try:
                problem = solver.step()
            except FloatingPointError as error:
                raise self._stopped(f"numbers left their range ({error})") from None
            if problem is not None or not np.isfinite(solver.y).all():
                raise self._stopped(problem or "a voltage is no finite number")
            self.times.append(solver.t)
            self.voltages.append(solver.y)
            self.pieces.append(solver.dense_output())
            if len(self.pieces) > self.accuracy.most_steps:
                raise self._stopped(f"it took more than {self.accuracy.most_steps} steps")
            if self.finished is not None and self.finished(solver.t * unit, solver.y):
                return True
        return False

    def _stopped(self, problem: str) -> SimulationError:
        reached = engineering(self.times[-1] * self.unit, "s")
        reason = f"{problem[:1].lower()}{problem[1:]}".rstrip(".")
        return SimulationError(
            f"the simulation stopped at {reached}: {reason}; look for a transistor or a resistor"
            " whose size is out of all proportion to the others",
            code="simulation-stopped",
        )


def integrate(
    equations: Equations,
    ramps: Ramps,
    initial: FloatArray,
    span: tuple[float, float],
    *,
    unit: float,
    supply: float,
    accuracy: Accuracy | None = None,
    finished: Callable[[float, FloatArray], bool] | None = None,
) -> Waveforms:
    """Integrate the equations of a circuit.

    Parameters
    ----------
    equations : Equations
    ramps : Ramps
        The given voltages.
    initial : FloatArray, V, shape (unknown,)
    span : tuple of float
        s; from and to.
    unit : float
        s; a time in which something of interest happens.
    supply : float
        V; a voltage that matters.
    accuracy : Accuracy, optional
    finished : callable, optional
        Told time (s) and voltages after each step behind the last corner; ends the run with True.

    Raises
    ------
    SimulationError
        ``simulation-stopped``, with the time reached.
    """
    begin, end = span
    corners = [corner / unit for corner in ramps.corners if begin < corner < end]
    run = _Run(equations, ramps, unit, supply, accuracy or Accuracy(), None)
    run.times.append(begin / unit)
    run.voltages.append(np.array(initial, float))
    marks = [begin / unit, *corners, end / unit]
    with np.errstate(under="ignore", over="raise", invalid="raise", divide="raise"):
        for here, there in pairwise(marks):
            if there == marks[-1]:
                run.finished = finished
            run.cover(here, there)
    return Waveforms(
        time=np.array(run.times) * unit,
        voltage=np.stack(run.voltages, axis=1),
        interpolant=OdeSolution(np.array(run.times), run.pieces),
        unit=unit,
    )
