"""The integrator against closed forms of one transistor and a capacitor.

Level 1: integrals through saturation and triode region (standard; recomputed by quadrature); ramps:
Hedenstierna and Jeppson, IEEE Transactions on CAD 6(2), 1987 (from memory, recomputed). Alpha
power: Sakurai and Newton, IEEE Journal of Solid-State Circuits 25(2), 1990 (from memory,
recomputed).
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np
import pytest
from numpy.testing import assert_allclose

from evenstage.process import level1
from evenstage.process.currents import alpha_power_ramp
from evenstage.simulation.crossings import last_crossing, transition
from evenstage.simulation.integrate import Accuracy, integrate
from evenstage.simulation.ramps import constant, switching
from support.nonlinear import Bench

if TYPE_CHECKING:
    from evenstage.simulation.integrate import Waveforms

SHARP = Accuracy(relative=1e-8, absolute=1e-10)


def discharge(
    *, supply: float = 1.0, cap: float = 1.0, ramp: float = 0.0, unit: float = 1.0, **law: float
) -> Waveforms:
    """Let one n channel discharge a capacitor, its gate stepping or on a ramp from time 0."""
    bench = Bench(["out"], ["0", "vdd", "in"], rounding=1e-4 * supply)
    bench.mos(1.0, "out", "in", "0", **law)
    bench.capacitors.append(("out", "0", cap))
    high = np.array([0.0, supply, supply])
    ramps = switching(np.array([0.0, supply, 0.0]), high, 0.0, ramp) if ramp else constant(high)
    return integrate(
        bench.equations(),
        ramps,
        np.array([supply]),
        (0.0, 50 * unit + ramp),
        unit=unit,
        supply=supply,
        accuracy=SHARP,
    )


def delay(waves: Waveforms, supply: float = 1.0, ramp: float = 0.0) -> float:
    found = last_crossing(waves, 0, supply / 2, rising=False)
    assert found is not None
    return found - ramp / 2


class TestLevel1:
    @pytest.mark.parametrize(
        ("v", "printed"),
        # Delay in units of C/(k V_DD): recomputed to six digits from the closed form.
        [(0.1, 1.30859), (0.2, 1.61057), (0.3, 2.06419), (0.4, 2.78301), (0.45, 3.30670)],
    )
    def test_step_delay(self, v: float, printed: float) -> None:
        found = delay(discharge(threshold=v))
        assert_allclose(found, printed, rtol=2e-5, atol=0)
        assert_allclose(level1.step_delay_factor(v), printed, rtol=5e-6, atol=0)

    @pytest.mark.parametrize(("v", "printed"), [(0.2, 3.69756), (0.25, 4.05208)])
    def test_fall_time(self, v: float, printed: float) -> None:
        found = transition(discharge(threshold=v), 0, 1.0, rising=False)
        assert found is not None
        assert_allclose(0.8 * found, printed, rtol=2e-5, atol=0)

    def test_absolute_example(self) -> None:
        # V_DD 1.8 V, V_T 0.45 V, k 1 mA/V^2, C 50 fF: 50.363 ps and 112.558 ps (recomputed).
        waves = discharge(supply=1.8, cap=50e-15, threshold=0.45, gain=0.5e-3, unit=50e-12)
        assert_allclose(delay(waves, 1.8), 50.363e-12, rtol=2e-5, atol=0)
        fall = transition(waves, 0, 1.8, rising=False)
        assert fall is not None
        assert_allclose(0.8 * fall, 112.558e-12, rtol=2e-5, atol=0)

    @pytest.mark.parametrize(("ramp", "printed"), [(0.2, 1.65724), (1.0, 1.84391), (2.0, 2.07724)])
    def test_fast_ramp_adds_its_share(self, ramp: float, printed: float) -> None:
        # t_in (1 + 2 v)/6 for v 0.2 is added to the step's 1.61057.
        found = delay(discharge(ramp=ramp, threshold=0.2), ramp=ramp)
        assert_allclose(found, printed, rtol=2e-5, atol=0)
        assert_allclose(1.61057 + ramp * level1.ramp_delay_share(0.2), printed, rtol=1e-5, atol=0)

    def test_effective_resistance(self) -> None:
        # Rabaey et al., 2nd ed. 2003, equation 3.42 (from memory): the mean of V/I from V_DD to
        # V_DD/2; for lambda V_DD 0.15 the exact integral is 0.671886 V_DD/I_DSAT (recomputed).
        bench = Bench(["out"], ["0", "vdd", "in"], rounding=1e-4)
        bench.mos(1.0, "out", "in", "0", threshold=0.5, modulation=0.15)
        equations = bench.equations()
        levels = np.linspace(0.5, 1.0, 20_001)
        ratio = [v / equations.currents(np.array([v, 0.0, 1.0, 1.0]))[0] for v in levels]
        mean = np.trapezoid(ratio, levels) / 0.5
        assert_allclose(mean * 0.5 * 0.25, 0.671886, rtol=1e-4, atol=0)

    @pytest.mark.parametrize("v", [0.1, 0.25, 0.45])
    def test_effective_current_is_half_the_on_current(self, v: float) -> None:
        # Na et al., IEDM 2002: I_eff = (I_H + I_L)/2; for level 1 exactly I_ON/2.
        bench = Bench(["out"], ["0", "vdd", "in"], rounding=1e-4)
        bench.mos(1.0, "out", "in", "0", threshold=v)
        equations = bench.equations()
        on, high, low = (
            equations.currents(np.array([d, 0.0, 1.0, g]))[0]
            for d, g in ((1.0, 1.0), (0.5, 1.0), (1.0, 0.5))
        )
        assert_allclose((high + low) / 2, on / 2, rtol=1e-9, atol=0)

    @pytest.mark.parametrize("count", [2, 3, 4])
    @pytest.mark.parametrize("across", [0.1, 0.5, 1.0])
    def test_stack_is_one_device_of_all_lengths(self, count: int, across: float) -> None:
        # n equal devices in series carry 1/n of one device's current at every bias.
        inner = [f"n{i}" for i in range(count - 1)]
        bench = Bench(inner, ["0", "vdd", "in", "out"], rounding=1e-4)
        for above, below in zip(["out", *inner], [*inner, "0"], strict=True):
            bench.mos(1.0, above, "in", below, threshold=0.2)
        bench.capacitors += [(name, "0", 1.0) for name in inner]
        equations, given = bench.equations(), np.array([0.0, 1.0, 1.0, across])
        waves = integrate(
            equations,
            constant(given),
            np.zeros(count - 1),
            (0.0, 1000.0),
            unit=1.0,
            supply=1.0,
            accuracy=SHARP,
        )
        settled = equations.currents(np.concatenate([waves.voltage[:, -1], given]))
        single = Bench([], ["0", "vdd", "in", "out"], rounding=1e-4)
        single.mos(1.0, "out", "in", "0", threshold=0.2)
        alone = single.equations().currents(given)[0]
        assert_allclose(settled, alone / count, rtol=1e-5, atol=0)


class TestAlphaPower:
    @pytest.mark.parametrize(
        ("ramp", "printed"), [(0.0, 90.000), (36.0, 96.261), (90.0, 105.65), (180.0, 121.30)]
    )
    def test_delay(self, ramp: float, printed: float) -> None:
        # V_DD 1.8 V, V_T 0.45 V, alpha 1.3, V_D0 0.8 V, I_D0 1 mA, C 0.1 pF; ps (recomputed).
        waves = discharge(
            supply=1.8,
            cap=0.1e-12,
            ramp=ramp * 1e-12,
            unit=90e-12,
            threshold=0.45,
            gain=1e-3 / 1.35**1.3,
            alpha=1.3,
            knee=0.8 / 1.35**0.65,
        )
        assert_allclose(delay(waves, 1.8, ramp * 1e-12), printed * 1e-12, rtol=1e-4, atol=0)

    @pytest.mark.parametrize("alpha", [1.0, 1.2, 1.5, 2.0])
    def test_slope_coefficient(self, alpha: float) -> None:
        # 1/2 - (1 - v_T)/(1 + alpha), as long as the ramp ends before the triode region.
        law = {
            "threshold": 0.2,
            "gain": 0.8**-alpha,
            "alpha": alpha,
            "knee": 0.5 / 0.8 ** (alpha / 2),
        }
        step, ramp = delay(discharge(**law)), delay(discharge(ramp=0.3, **law), ramp=0.3)
        assert_allclose((ramp - step) / 0.3, 0.5 - 0.8 / (1 + alpha), rtol=5e-4, atol=0)

    def test_late_half_is_slower_than_the_saturated_current_says(self) -> None:
        # With V_D0 = V_DD - V_T above V_DD/2 the plain C V/(2 I) is 3.0 % low at v 0.2.
        assert_allclose(delay(discharge(threshold=0.2)) * 0.64, 1.6106 / 1.5625, rtol=1e-4, atol=0)

    @pytest.mark.parametrize(
        ("supply", "saturation", "alpha", "cap", "printed"),
        # V_DD 1.8 V, V_D0 0.8 V, alpha 1.3, C 0.1 pF, in units of C/I_D0: 251.665 ps (recomputed).
        [(1.8, 0.8, 1.3, 0.1e-12, 251.665), (1.0, 0.5, 1.0, 0.1e-12, None)],
    )
    def test_output_transition(
        self, supply: float, saturation: float, alpha: float, cap: float, printed: float | None
    ) -> None:
        # The published transition takes the triode region for a resistor V_D0/I_D0. Here it is one:
        # in series with a channel that saturates at a hundredth of V_D0, so I = min(I_D0, V/R).
        current, drive = 1e-3, supply - 0.25 * supply
        bench = Bench(["out", "mid"], ["0", "vdd", "in"], rounding=1e-4 * supply)
        law = {"alpha": alpha, "gain": current / drive**alpha, "threshold": 0.25 * supply}
        bench.mos(1.0, "mid", "in", "0", knee=0.002 * saturation / drive ** (alpha / 2), **law)
        bench.resistors.append(("out", "mid", saturation / current))
        bench.capacitors += [("out", "0", cap), ("mid", "0", 1e-5 * cap)]
        waves = integrate(
            bench.equations(),
            constant(np.array([0.0, supply, supply])),
            np.array([supply, supply - saturation]),
            (0.0, 50 * cap * supply / current),
            unit=cap * supply / current,
            supply=supply,
            accuracy=SHARP,
        )
        found = transition(waves, 0, supply, rising=False)
        assert found is not None
        expected = alpha_power_ramp(saturation / supply) * cap * supply / current
        assert_allclose(found, expected, rtol=2e-3, atol=0)
        if printed is not None:
            assert_allclose(expected, printed * 1e-12, rtol=5e-6, atol=0)

    def test_triode_region_swings_faster_than_a_resistor(self) -> None:
        # The law's own current there is (2 - r) r, up to twice a resistor's r, so that equality
        # with the published transition cannot hold: the swing is faster, by its closed form.
        waves = discharge(threshold=0.2, gain=0.8**-1.3, alpha=1.3, knee=0.5 / 0.8**0.65)
        found = transition(waves, 0, 1.0, rising=False)
        assert found is not None
        # 0.9 to 0.5 at full current, then dv/dt = -(2 - r) r with r = v/0.5, to r = 0.2.
        exact = 0.4 + 0.25 * math.log((2 - 0.2) / 0.2)
        assert_allclose(0.8 * found, exact, rtol=1e-4, atol=0)
        assert found < 0.9 * alpha_power_ramp(0.5)
