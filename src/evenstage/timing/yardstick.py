r"""The unit inverter of a process as a measure of delay.

In an endless chain of equal stages transitions repeat, rise and fall in turn. With the squares of
the transitions as unknowns the chain closes linearly,

    T_f^2 = (shape_n E_f)^2 + (carry_n T_r)^2,      T_r^2 = (shape_p E_r)^2 + (carry_p T_f)^2,

where E is the Elmore delay of a stage and n, p name the transistor that makes the edge. A slow edge
is paid for by the stage that receives it but caused by the stage that drives it; charged to the
driver,

    q_rise E_r = E_r + slope_n T_r^a E_f^(1 - a),   q_fall E_f = E_f + slope_p T_f^a E_r^(1 - a),

with the power ``a`` of the receiving type. For ``a = 1`` and no carry this is ``q_rise = 1 +
slope_n shape_p`` and ``q_fall = 1 + slope_p shape_n``. Delay per unit effort tau, parasitic delay
p_inv and FO4 follow as in Sutherland, Sproull and Harris, Logical Effort, 1999, chapter 1 (from
memory), in charged delays.

A stage whose edges are rounder or sharper than the inverter's, as of devices in series, is charged
what its own edge costs an inverter behind it. Its transition is ``s`` times as long as far as it is
its own, ``T_s^2 = T^2 + (s^2 - 1) (shape E)^2`` with ``s`` its shape over that of the inverter at
the same Elmore delay, so that

    q_s = 1 + (q - 1) (T_s / T)^a.

It stays one number for each arc, and the charged delay linear in the load.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from scipy.optimize import brentq

from evenstage.timing.results import Yardstick

if TYPE_CHECKING:
    from evenstage.circuit.arcs import Arcs
    from evenstage.netlist.devices import FloatArray
    from evenstage.process.process import Process, Transistor

_FANOUT = 4


@dataclass(frozen=True, slots=True)
class _Inverter:
    """The unit inverter: resistances (ohm), input and own capacitance (F)."""

    r_fall: float
    r_rise: float
    c_in: float
    c_own: float

    def elmore(self, fanout: float) -> tuple[float, float]:
        """Return the Elmore delays of fall and rise, s, when driving copies of itself."""
        load = self.c_own + fanout * self.c_in
        return self.r_fall * load, self.r_rise * load


@dataclass(frozen=True, slots=True)
class Chain:
    """A stage of an endless chain of unit inverters, each driving so many copies of itself.

    ``rise`` and ``fall`` are the transitions that repeat, ``delay`` the mean of both edges; s.
    """

    delay: float
    rise: float
    fall: float


def chain(process: Process, fanout: float) -> Chain:
    """Return delay and transitions along an endless chain of unit inverters.

    Parameters
    ----------
    process : Process
        With ``unit_width`` and ``unit_ratio`` filled in.
    fanout : float
        How many copies of itself each stage drives.
    """
    n, p = process.first("n"), process.first("p")
    e_fall, e_rise = _unit(process).elmore(fanout)
    t_fall, t_rise = _transitions(n, p, e_fall, e_rise)
    rise = e_rise + p.slope * t_fall**p.slope_power * e_rise ** (1 - p.slope_power)
    fall = e_fall + n.slope * t_rise**n.slope_power * e_fall ** (1 - n.slope_power)
    return Chain((rise + fall) / 2, t_rise, t_fall)


def yardstick(process: Process) -> Yardstick:
    """Measure the unit inverter of a process.

    Parameters
    ----------
    process : Process
        With ``unit_width`` and ``unit_ratio`` filled in.
    """
    n, p = process.first("n"), process.first("p")
    unit = _unit(process)
    e_fall, e_rise = unit.elmore(_FANOUT)
    t_fall, t_rise = _transitions(n, p, e_fall, e_rise)
    q_rise = 1 + n.slope * (t_rise / e_rise) ** n.slope_power * (e_fall / e_rise) ** (
        1 - n.slope_power
    )
    q_fall = 1 + p.slope * (t_fall / e_fall) ** p.slope_power * (e_rise / e_fall) ** (
        1 - p.slope_power
    )
    resistance = (q_rise * unit.r_rise + q_fall * unit.r_fall) / 2
    tau = resistance * unit.c_in
    return Yardstick(
        process=process.name,
        tau=tau,
        p_inv=unit.c_own / unit.c_in,
        fo4=tau * (_FANOUT + unit.c_own / unit.c_in),
        input_cap=unit.c_in,
        charge_rise=q_rise,
        charge_fall=q_fall,
        transition_rise=t_rise,
        transition_fall=t_fall,
    )


def arc_charges(arcs: Arcs, process: Process, unit: Yardstick) -> FloatArray:
    """Return charged over Elmore delay of each arc, shape (arcs,).

    Parameters
    ----------
    arcs : Arcs
    process : Process
    unit : Yardstick
        Of that process.
    """
    n, p = process.first("n"), process.first("p")
    rise = unit.charge_rise, p, unit.transition_rise, unit.transition_fall, n.slope_power
    fall = unit.charge_fall, n, unit.transition_fall, unit.transition_rise, p.slope_power
    found = np.where(arcs.rising, unit.charge_rise, unit.charge_fall)
    for rising, edge in ((True, rise), (False, fall)):
        own = edge[1].shape
        other = np.flatnonzero((arcs.rising == rising) & (arcs.shape != own))
        if own and len(other):
            found[other] = _charged(arcs.shape[other] / own, *edge)
    return found


def _charged(
    longer: FloatArray, charge: float, own: Transistor, made: float, before: float, power: float
) -> FloatArray:
    """Return the charge of edges whose own part is some times as long as the inverter's."""
    carried = (own.shape_carry * before / made) ** 2
    transition = np.sqrt(carried + (1 - carried) * longer**2)
    result: FloatArray = 1 + (charge - 1) * transition**power
    return result


def _unit(process: Process) -> _Inverter:
    n, p = process.first("n"), process.first("p")
    width_n = process.unit_width or 0.0
    width_p = width_n * (process.unit_ratio or 0.0)
    return _Inverter(
        r_fall=n.r_w / width_n + n.r_fixed,
        r_rise=p.r_w / width_p + p.r_fixed,
        c_in=n.c_gate * width_n + p.c_gate * width_p + n.c_gate_fixed + p.c_gate_fixed,
        c_own=n.c_drain * width_n + p.c_drain * width_p + n.c_drain_fixed + p.c_drain_fixed,
    )


def _transitions(n: Transistor, p: Transistor, e_fall: float, e_rise: float) -> tuple[float, float]:
    """Return the transitions that repeat along the endless chain, fall and rise, s."""
    own_fall, own_rise = (n.shape * e_fall) ** 2, (p.shape * e_rise) ** 2
    carry_n, carry_p = n.shape_carry**2, p.shape_carry**2
    fall = (own_fall + carry_n * own_rise) / (1 - carry_n * carry_p)
    rise = own_rise + carry_p * fall
    return math.sqrt(fall), math.sqrt(rise)


def best_stage_effort(p_inv: float) -> float:
    """Return the stage effort of the best number of stages.

    It solves ``p_inv + rho (1 - ln rho) = 0`` (Sutherland, Sproull and Harris, Logical Effort,
    1999, section 3.3, from memory).

    Examples
    --------
    >>> round(best_stage_effort(1.0), 4)
    3.5911
    """
    # The root lies below: beyond e^2 the left side is less than p_inv - rho.
    upper = math.exp(2) + p_inv
    return float(brentq(lambda rho: p_inv + rho * (1 - math.log(rho)), math.e, upper, xtol=1e-13))


def best_stage_count(log_effort: float, stages: int, parasitic: float, p_inv: float) -> int:
    """Return how many stages, at least today's and of the same parity, are fastest.

    Minimises ``n F^(1/n) + P + (n - N) p_inv`` over ``n = N, N + 2, ...``; convex in ``n``, so the
    first rise ends the search.

    Parameters
    ----------
    log_effort : float
        Natural logarithm of the path effort F, which itself may exceed the range of floats.
    stages : int
        N, today's number of stages.
    parasitic, p_inv : float
        P of today's stages and of one added inverter, in tau.
    """

    def delay(count: int) -> float:
        return count * math.exp(log_effort / count) + parasitic + (count - stages) * p_inv

    best = stages
    while delay(best + 2) < delay(best):
        best += 2
    return best
