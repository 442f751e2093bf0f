"""The level-1 laws against published figures.

Sources: "Rabaey" is Rabaey, Chandrakasan, Nikolic, "Digital Integrated Circuits", 2nd ed. 2003,
from memory and recomputed; "companion" is an openly published set of worked textbook examples;
figures without a source were integrated numerically from the transistor equations.
"""

from __future__ import annotations

import math

import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad

from evenstage.process import level1


class TestOxide:
    @pytest.mark.parametrize(
        ("t_ox", "per_area"),
        [(1e-7, 3.45313e-4), (4e-9, 8.63283e-3)],  # 3.9 eps0 / TOX
    )
    def test_capacitance_per_area(self, t_ox: float, per_area: float) -> None:
        assert_allclose(level1.oxide_capacitance(t_ox), per_area, rtol=2e-6, atol=0)

    def test_capacitance_per_micron_of_width(self) -> None:
        assert_allclose(level1.oxide_capacitance(4e-9) * 0.18e-6, 1.554e-9, rtol=4e-4, atol=0)

    def test_transconductance_of_the_manuals_default_card(self) -> None:
        # UO 600 cm^2/Vs and TOX 1e-7 m are documented defaults of an open SPICE manual.
        assert_allclose(level1.transconductance(600, 1e-7), 2.0719e-5, rtol=2e-5, atol=0)


class TestSaturationCurrent:
    def test_inverter_in_a_1200_nm_process(self) -> None:
        # Companion, example 3.7: 19.6 and 5.4 uA/V^2, |V_T| 0.74 V, 5 V, lambda 0.06 and 0.19.
        n = level1.saturation_current(19.6e-6, 1.8 / 0.9, 5 - 0.74) * (1 + 0.06 * 5)
        p = level1.saturation_current(5.4e-6, 5.4 / 0.9, 5 - 0.74) * (1 + 0.19 * 5)
        assert_allclose([n, p], [0.46240e-3, 0.57328e-3], rtol=2e-5, atol=0)


class TestEffectiveResistance:
    def test_first_order_formula(self) -> None:
        # Rabaey, equations 3.42 and 3.43.
        assert_allclose(level1.effective_resistance(1.0, 1.0, 0.15), 0.66250, rtol=1e-9, atol=0)

    @pytest.mark.parametrize("modulation", [0.0, 0.06, 0.15])
    def test_close_to_the_integral(self, modulation: float) -> None:
        mean, _ = quad(lambda v: v / (1 + modulation * v) / 0.5, 0.5, 1)
        assert_allclose(level1.effective_resistance(1.0, 1.0, modulation), mean, rtol=0.015, atol=0)

    @pytest.mark.parametrize(
        ("k", "threshold", "v_sat", "modulation", "supply", "kilohm"),
        [
            # Rabaey, table 3.3 (W/L = 1, 0.25 um) and the unified model's constants.
            (115e-6, 0.43, 0.63, 0.06, 2.5, 13),
            (115e-6, 0.43, 0.63, 0.06, 2.0, 15),
            (115e-6, 0.43, 0.63, 0.06, 1.5, 19),
            (30e-6, 0.40, 1.00, 0.10, 2.5, 31),
            (30e-6, 0.40, 1.00, 0.10, 2.0, 38),
            (30e-6, 0.40, 1.00, 0.10, 1.5, 55),
        ],
    )
    def test_published_table(
        self,
        k: float,
        threshold: float,
        v_sat: float,
        modulation: float,
        supply: float,
        kilohm: int,
    ) -> None:
        overdrive = supply - threshold
        i_sat = k * (overdrive * v_sat - v_sat**2 / 2)
        resistance = level1.effective_resistance(i_sat, supply, modulation)
        assert abs(resistance / 1e3 - kilohm) < 0.55

    @pytest.mark.parametrize("v", [0.1, 0.2, 0.3, 0.4])
    def test_times_ln_2_it_is_the_step_delay(self, v: float) -> None:
        i_sat = level1.saturation_current(1.0, 1.0, 1 - v)
        delay = math.log(2) * level1.effective_resistance(i_sat, 1.0)
        assert_allclose(delay, level1.step_delay_factor(v), rtol=0.04, atol=0)


class TestStepResponse:
    @pytest.mark.parametrize(
        ("v", "delay"),
        [(0.1, 1.30859), (0.2, 1.61057), (0.25, 1.81309), (0.3, 2.06419), (0.45, 3.30670)],
    )
    def test_delay(self, v: float, delay: float) -> None:
        assert_allclose(level1.step_delay_factor(v), delay, rtol=0, atol=6e-6)

    @pytest.mark.parametrize(
        ("v", "fall"),
        [(0.2, 3.69756), (0.25, 4.05208), (0.6 / 3.3, 3.58356), (0.43 / 2.5, 3.52490)],
    )
    def test_fall_time(self, v: float, fall: float) -> None:
        assert_allclose(level1.fall_time_factor(v), fall, rtol=0, atol=6e-6)

    def test_absolute_example(self) -> None:
        # 1.8 V, 0.45 V, 1 mA/V^2, 50 fF, recomputed.
        unit = 50e-15 / (1e-3 * 1.8)
        times = [level1.step_delay_factor(0.25) * unit, level1.fall_time_factor(0.25) * unit]
        assert_allclose(times, [50.363e-12, 112.558e-12], rtol=1e-5, atol=0)

    @pytest.mark.parametrize(
        ("ramp", "delay"), [(0.2, 1.65724), (0.625, 1.75641), (1, 1.84391), (2, 2.07724)]
    )
    def test_input_ramp(self, ramp: float, delay: float) -> None:
        # Hedenstierna and Jeppson 1987, from memory; an integrated ramp agrees to 1e-5.
        got = level1.step_delay_factor(0.2) + ramp * level1.ramp_delay_share(0.2)
        assert_allclose(got, delay, rtol=0, atol=1e-5)


class TestJunctionFactor:
    @pytest.mark.parametrize(
        ("phi", "m", "least", "most", "factor", "within"),
        [
            (0.64, 0.5, 0, 5, 0.50396, 5e-6),  # companion, example 2.4
            (0.6, 0.5, 2.5, 5, 0.375370, 1e-6),  # companion, example 3.5
            (0.6, 0.5, 0, 2.5, 0.611055, 1e-6),
            (0.9, 0.5, 1.25, 2.5, 0.57, 5e-3),  # Rabaey, K_eq of the 0.25 um process
            (0.9, 0.5, 0, 1.25, 0.79, 5e-3),
            (0.9, 0.44, 1.25, 2.5, 0.61, 5e-3),
            (0.9, 0.44, 0, 1.25, 0.81, 5e-3),
            (0.9, 0.48, 0, 1.25, 0.79, 5e-3),
            (0.9, 0.48, 1.25, 2.5, 0.59, 5e-3),
            (0.9, 0.32, 0, 1.25, 0.86, 5e-3),
            (0.9, 0.32, 1.25, 2.5, 0.70, 5e-3),
            (0.8, 0.5, 0, 1.8, 0.713578, 1e-6),
        ],
    )
    def test_published(
        self, phi: float, m: float, least: float, most: float, factor: float, within: float
    ) -> None:
        assert abs(level1.junction_factor(phi, m, least, most) - factor) <= within

    def test_a_range_is_the_mean_of_its_halves(self) -> None:
        halves = [level1.junction_factor(0.8, 0.5, *span) for span in ((0, 0.9), (0.9, 1.8))]
        assert_allclose(
            sum(halves) / 2, level1.junction_factor(0.8, 0.5, 0, 1.8), rtol=1e-12, atol=0
        )

    @pytest.mark.parametrize("m", [0.0, 0.33, 0.5, 1.0])
    def test_against_quadrature(self, m: float) -> None:
        mean, _ = quad(lambda v: (1 + v / 0.8) ** -m / 3.3, 0, 3.3)
        assert_allclose(level1.junction_factor(0.8, m, 0, 3.3), mean, rtol=1e-9, atol=0)
