"""A fit finds the constants that made the measurements, and says what they cannot tell."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pytest
from numpy.testing import assert_allclose

from evenstage.errors import FitError
from evenstage.fitting.fit import fit
from support.measured import CELLS, measure, truth

if TYPE_CHECKING:
    from pathlib import Path

    from evenstage.process.process import Process

KEYS = (
    *("r_w", "stack", "c_gate", "slope", "slope_power", "shape", "shape_carry"),
    *("slope_stack", "shape_stack", "weak_swing", "drain_shared", "drain_inner"),
)


@pytest.fixture
def netlist(tmp_path: Path) -> Path:
    path = tmp_path / "cells.sp"
    path.write_text(CELLS)
    return path


def elsewhere() -> Process:
    """Return the invented process with constants that are far off."""
    start = truth()
    return replace(
        start,
        transistors=tuple(
            replace(
                one,
                r_w=1.6 * one.r_w,
                r_fixed=0.0,
                stack=1.0,
                c_gate=0.8 * one.c_gate,
                c_gate_fixed=0.0,
                c_drain=1.5 * one.c_drain,
                c_drain_fixed=0.0,
                slope=0.0,
                slope_power=1.0,
                shape=0.0,
                shape_carry=0.0,
                slope_stack=1.0,
                shape_stack=1.0,
                weak_swing=1.0,
                drain_shared=1.0,
                drain_inner=1.0,
            )
            for one in start.transistors
        ),
    )


class TestFit:
    def test_the_constants_that_made_the_measurements_are_found(self, netlist: Path) -> None:
        measured, cells = measure(netlist, truth())
        found = fit(measured, cells, netlist, elsewhere())
        for one, true in zip(found.process.transistors, truth().transistors, strict=True):
            for key in KEYS:
                assert_allclose(getattr(one, key), getattr(true, key), rtol=0.02, atol=0)
        assert found.single is not None
        assert found.several is not None
        assert max(found.single.high, found.several.high) < 1e-3
        assert found.process.name == "invented"

    def test_noise_shows_in_the_errors_and_outliers_hardly_matter(self, netlist: Path) -> None:
        measured, cells = measure(netlist, truth())
        noise = np.random.default_rng(20260801)
        delay = measured.delay * (1 + 0.01 * noise.standard_normal(len(measured)))
        delay[::40] *= 2.0
        found = fit(replace(measured, delay=delay), cells, netlist, truth())
        for one in found.constants:
            if one.key in KEYS and one.error is not None:
                index = 0 if one.polarity[0] == "n" else 1
                true = getattr(truth().transistors[index], one.key)
                assert abs(one.value - true) < 6 * one.error
                assert one.error < 0.6 * true

    def test_what_nobody_measured_stays_and_is_named(self, netlist: Path) -> None:
        measured, cells = measure(netlist, truth(), names=("inv", "inv3", "buf"))
        found = fit(measured, cells, netlist, truth())
        told = {(one.polarity, one.key): one.told for one in found.constants}
        for polarity in "np":
            for key in ("stack", "slope_stack", "shape_stack", "weak_swing"):
                assert told[polarity, key] == "not measured"
        assert told["n", "r_w"] == "measured"
        for one, true in zip(found.process.transistors, truth().transistors, strict=True):
            for key in ("stack", "slope_stack", "shape_stack", "weak_swing"):
                assert getattr(one, key) == getattr(true, key)

    def test_what_nobody_measured_stays_where_the_fit_would_begin_elsewhere(
        self, netlist: Path
    ) -> None:
        measured, cells = measure(netlist, truth(), names=("inv", "inv3"))
        found = fit(measured, cells, netlist, elsewhere())
        given = elsewhere().transistors[0]
        told = {(one.polarity, one.key): one for one in found.constants}
        for key in ("slope_stack", "shape_stack", "weak_swing"):
            assert getattr(found.process.transistors[0], key) == getattr(given, key)
            assert told["n", key].value == getattr(given, key)

    def test_constants_that_act_together_are_named_together(self, netlist: Path) -> None:
        """Of one size, a part that scales and one that stays cannot be told apart."""
        measured, cells = measure(netlist, truth(), names=("inv",))
        nothing = np.full(len(measured), np.nan)
        rng = np.random.default_rng(20260802)
        noisy = measured.delay * (1 + 0.002 * rng.standard_normal(len(measured)))
        blind = replace(measured, delay=noisy, input_cap=nothing)
        found = fit(blind, cells, netlist, truth())
        together = [set(one.constants) for one in found.confusions]
        assert any({("n", "r_w"), ("n", "r_fixed")} <= some for some in together)

    def test_too_few_measurements_are_refused(self, netlist: Path) -> None:
        measured, cells = measure(
            netlist, truth(), names=("inv",), transitions=(50e-12,), loads=(6e-15, 12e-15)
        )
        with pytest.raises(FitError, match=r"4 measurements are within .* 18 constants"):
            fit(measured, cells, netlist, truth())
