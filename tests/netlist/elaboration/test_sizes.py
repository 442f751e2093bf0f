"""Widths, lengths and areas in metres, in all the spellings designers use."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
import pytest

from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read_bytes
from evenstage.process.generic import generic

if TYPE_CHECKING:
    from evenstage.netlist.devices import Devices
    from evenstage.process.process import Process


def block(text: str, process: Process | None = None) -> Devices:
    return elaborate(read_bytes(f"* t\n{text}".encode(), "t.sp", Path()), process=process)


def process_with(**changes: Any) -> Process:  # noqa: ANN401 - any field of a transistor type
    process = generic()
    return replace(process, transistors=tuple(replace(t, **changes) for t in process.transistors))


@pytest.mark.parametrize(
    ("sizes", "width", "length", "told"),
    [
        # The spellings of dialects.md.
        ("w=650000u l=150000u", 0.65e-6, 0.15e-6, 1),
        ("w=1.12e+06u l=150000u", 1.12e-6, 0.15e-6, 1),
        ("w=0.65 l=0.15", 0.65e-6, 0.15e-6, 1),
        ("w=12 l=0.15", 12e-6, 0.15e-6, 1),
        ("w=650 l=130", 650e-9, 130e-9, 1),
        ("w=8.2e-07 l=1.5e-07", 0.82e-6, 0.15e-6, 0),
        ("w=81.0n l=20n", 81e-9, 20e-9, 0),
        ("w=640.00n l=130.00n", 640e-9, 130e-9, 0),
        ("w=0.21U l=0.15U", 0.21e-6, 0.15e-6, 0),
        ("w=3.93um l=0.15um", 3.93e-6, 0.15e-6, 0),
        ("w='0.65' l='0.15'", 0.65e-6, 0.15e-6, 1),
        ("w='650n' l={150n}", 0.65e-6, 0.15e-6, 0),
        ("w='2*0.3' l='0.1+0.05'", 0.6e-6, 0.15e-6, 1),
        ("w='2*0.3u' l=150n", 0.6e-6, 0.15e-6, 0),
        ("w=1 l=130n", 1e-6, 0.13e-6, 1),
    ],
)
def test_the_unit_that_makes_sense(sizes: str, width: float, length: float, told: int) -> None:
    devices = block(f"m1 a b c 0 nch {sizes}")
    np.testing.assert_allclose(devices.width, [width], rtol=1e-12, atol=0)
    np.testing.assert_allclose(devices.length, [length], rtol=1e-12, atol=0)
    assert len(devices.notices) == told


def test_the_notice_says_what_was_decided() -> None:
    message = block("m1 a b c 0 nch w=0.65 l=0.15").notices[0].message
    assert message == (
        "sizes of transistors given as numbers without a suffix are read in microns, "
        "so that 0.15 is 150 nm; width_unit in the process file overrules this"
    )


def test_option_scale_leaves_nothing_to_decide() -> None:
    devices = block(".option scale=5n\nm1 a b c 0 nch w=40 l=10 ad=100 pd=20")
    assert devices.width.tolist() == pytest.approx([200e-9])
    assert devices.length.tolist() == pytest.approx([50e-9])
    assert devices.drain_area.tolist() == pytest.approx([100 * 25e-18])
    assert devices.drain_edge.tolist() == pytest.approx([100e-9])
    assert devices.notices == ()


def test_a_width_unit_of_the_process_overrules() -> None:
    text = "m1 a b c 0 nch w=4 l=2\nm2 a b c 0 nch w=4u l=2u"
    devices = block(text, process_with(width_unit=1e-7))
    assert devices.width.tolist() == pytest.approx([4e-7, 4e-6])
    assert devices.notices == ()


def test_areas_and_edges_follow_the_unit_of_their_spelling() -> None:
    devices = block("m1 a b c 0 nch w=650000u l=150000u ad=1.6575e+11p as=0p pd=1.81e+06u")
    assert devices.drain_area.tolist() == pytest.approx([0.16575e-12])
    assert devices.source_area.tolist() == [0]
    assert devices.drain_edge.tolist() == pytest.approx([1.81e-6])
    assert np.isnan(devices.source_edge).all()


def test_suffixed_widths_beside_bare_areas_in_metres() -> None:
    devices = block("m1 a b c 0 nch w=640n l=130n ad=2.176e-13 pd=1.96e-06")
    assert devices.drain_area.tolist() == [2.176e-13]
    assert devices.drain_edge.tolist() == [1.96e-06]


@pytest.mark.parametrize(
    ("meaning", "card", "width", "fingers"),
    [
        ({}, "w=2u l=1u nf=4", 2e-6, 4),
        ({}, "w=2u l=1u ng=2", 2e-6, 2),
        ({"width_is": "finger"}, "w=2u l=1u nf=4", 8e-6, 4),
        ({"width_is": "finger", "fingers_parameter": "folds"}, "w=2u l=1u folds=3 nf=9", 6e-6, 3),
        (
            {"width_is": "fins", "width_parameter": "nfin", "width_unit": 5e-8},
            "nfin=6 l=20n",
            3e-7,
            1,
        ),
        ({"width_parameter": "wtot"}, "wtot=3u l=1u w=9u", 3e-6, 1),
    ],
)
def test_what_a_width_means(
    meaning: dict[str, Any], card: str, width: float, fingers: float
) -> None:
    devices = block(f"m1 a b c 0 nch {card}", process_with(**meaning))
    assert devices.width.tolist() == pytest.approx([width], rel=1e-12)
    assert devices.fingers.tolist() == [fingers]


def test_a_missing_length_is_that_of_the_type_with_a_notice() -> None:
    devices = block("m1 a b c 0 nch w=1u")
    assert devices.length.tolist() == [generic().first("n").length]
    assert [(n.code, n.place) for n in devices.notices] == [("length-assumed", "t.sp:2:1")]


def test_default_sizes_from_options() -> None:
    devices = block(".options defw=3u defl=0.2u post\nm1 a b c 0 nch")
    assert (devices.width[0], devices.length[0]) == (3e-6, 0.2e-6)
    assert devices.notices == ()
