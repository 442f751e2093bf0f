"""Sizing through blocks of every kind: what ratios it keeps, and what it reads back."""

from __future__ import annotations

from collections import Counter
from typing import TYPE_CHECKING

import pytest

from evenstage.flow import Question, Sizing, Wishes, load, resize

if TYPE_CHECKING:
    from pathlib import Path

    from evenstage.circuit.circuit import Circuit

BLOCK = """\
An invented block: flip-flops, domino, pseudo-nMOS, a level shifter, dummies
.global vdd vss
.subckt inv a y wn=1u wp=2u
mn y a vss vss nx w=wn l=0.1u
mp y a vdd vdd px w=wp l=0.1u
.ends
.subckt ff d ck q
xc ck cb inv
xd d db inv
mt1n db cb m vss nx w=1u l=0.1u
mt1p db ck m vdd px w=1u l=0.1u
xm m mq inv
mf1a m ck f1 vss nx w=0.3u l=0.1u
mf1b f1 mq vss vss nx w=0.3u l=0.1u
mf1c m cb f2 vdd px w=0.4u l=0.1u
mf1d f2 mq vdd vdd px w=0.4u l=0.1u
mt2n mq ck s vss nx w=1u l=0.1u
mt2p mq cb s vdd px w=1u l=0.1u
xs s q inv
mf2a s cb f3 vss nx w=0.3u l=0.1u
mf2b f3 q vss vss nx w=0.3u l=0.1u
mf2c s ck f4 vdd px w=0.4u l=0.1u
mf2d f4 q vdd vdd px w=0.4u l=0.1u
.ends
.subckt dom a b ck y
md1 x a k vss nx w=2u l=0.1u
md2 k b e vss nx w=2u l=0.1u
md3 e ck vss vss nx w=2u l=0.1u
mp x ck vdd vdd px w=1u l=0.1u
mk x y vdd vdd px w=0.3u l=0.1u
mi y x vss vss nx w=1u l=0.1u
mj y x vdd vdd px w=4u l=0.1u
.ends
.subckt pnor a b y
mn1 y a vss vss nx w=2u l=0.1u
mn2 y b vss vss nx w=2u l=0.1u
ml y vss vdd vdd px w=0.8u l=0.1u
.ends
.subckt top d0 d1 ck e out2 out3 vddh hv
x0 d0 ck q0 ff
x1 d1 ck q1 ff
x2 q0 q1 ck z dom
x3 z z1 inv
x4 z1 e w pnor
x5 w w1 inv wn=2u wp=4u
x6 w1 ck out2 ff
x7 w1 out3 inv wn=3u wp=6u
x8 w1 wb inv
ml1 l w1 vss vss nx w=4u l=0.1u
ml2 r wb vss vss nx w=4u l=0.1u
ml3 l r vddh vddh px w=0.6u l=0.1u
ml4 r l vddh vddh px w=0.6u l=0.1u
mh1 hv r vss vss nx w=2u l=0.1u
mh2 hv r vddh vddh px w=4u l=0.1u
mdc1 vss vdd vss vss nx w=9u l=1u
mdm w1 vss e vss nx w=1u l=0.1u
.ends
"""


@pytest.fixture(scope="module")
def sized(tmp_path_factory: pytest.TempPathFactory) -> tuple[Circuit, Circuit, Sizing]:
    """The circuit as drawn, as written and read back, and its sizing."""
    folder = tmp_path_factory.mktemp("kinds")
    drawn, written = folder / "drawn.sp", folder / "written.sp"
    drawn.write_text(BLOCK)
    sizing = resize(drawn, Question(), Wishes(scope="block"), written)
    return circuit(drawn), circuit(written), sizing


def circuit(path: Path) -> Circuit:
    timing = load(path, Question()).analysis.timing
    assert timing is not None
    return timing.circuit


def kinds(found: Circuit) -> Counter[str]:
    return Counter(found.gate_kind(gate) for gate in range(len(found)))


def test_all_of_it_is_understood(sized: tuple[Circuit, Circuit, Sizing]) -> None:
    drawn = sized[0]
    assert not drawn.not_understood
    assert {one.kind for one in drawn.storage.elements} == {"flip-flop", "loop that never holds"}
    assert set(kinds(drawn)) == {
        "static gate", "transmission gate", "tri-state gate", "dynamic gate, footed, kept",
        "ratioed gate", "cross-coupled pull-up",
    }  # fmt: skip


def test_it_gets_faster_with_a_proof(sized: tuple[Circuit, Circuit, Sizing]) -> None:
    sizing = sized[2]
    assert sizing.after.paths[0].delay < 0.95 * sizing.before.paths[0].delay
    assert sizing.gap < 1e-3


def test_what_was_written_is_the_same_circuit(sized: tuple[Circuit, Circuit, Sizing]) -> None:
    before, after, sizing = sized
    assert kinds(after) == kinds(before)
    assert after.storage.elements == before.storage.elements
    assert after.total_width == pytest.approx(sizing.total_width_after, rel=1e-6)


def test_no_gate_changes_its_skew_or_ratio(sized: tuple[Circuit, Circuit, Sizing]) -> None:
    """All transistors of a gate grow alike, its keeper, load and foot among them."""
    before, after, _ = sized
    for gate in range(len(before)):
        factor = (after.devices.width / before.devices.width)[before.gate_devices(gate)]
        # The grid of the written widths is a nanometre.
        assert factor == pytest.approx([factor.mean()] * len(factor), rel=6e-3)


def test_what_is_outside_all_logic_stays(sized: tuple[Circuit, Circuit, Sizing]) -> None:
    before, after, _ = sized
    for part in before.apart:
        widths = [found.devices.width[part.devices] for found in (before, after)]
        assert (widths[0] == widths[1]).all()
