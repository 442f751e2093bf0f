"""Whole netlists in the styles of kits nobody designed for: analysed, resized, resized again.

All invented, names and numbers too. Each is written back so that it reads as before but for its
widths, and a second run with the same wishes changes nothing.
"""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Final

import pytest

from evenstage import flow

if TYPE_CHECKING:
    from pathlib import Path

EXTRACTED: Final = r"""* Extracted view, invented kit A
.SUBCKT NAND2_E A B Y VDD VSS
*.PININFO A:I B:I Y:O VDD:P VSS:G
MM1 net1:1 A:3 VSS:1 VSS:b NCH L=6e-08 W=4e-07 AD=4.8e-14 AS=6.4e-14 PD=6.4e-07
+ PS=1.12e-06 NRD=0.3 NRS=0.4 SA=1.6e-07 SB=4.2e-07 $X=0.32 $Y=1.2 $D=1
MM2 Y:2 B:2 net1:2 VSS:b NCH L=6e-08 W=4e-07 AD=6.4e-14 AS=4.8e-14 PD=1.12e-06
+ PS=6.4e-07 $X=0.5 $Y=1.2 $D=1
MM3 Y:1 A:2 VDD:1 VDD:b PCH L=6e-08 W=5.2e-07 AD=6e-14 AS=8e-14 PD=7e-07 PS=1.3e-06 $D=0
MM4 VDD:2 B:1 Y:3 VDD:b PCH L=6e-08 W=5.2e-07 AD=8e-14 AS=6e-14 PD=1.3e-06 PS=7e-07
R1 A A:2 12.1
R2 A:2 A:3 8.4 $[poly]
R3 B B:1 9
R4 B:1 B:2 7
R5 Y Y:1 2
R6 Y:1 Y:2 3
R7 Y:1 Y:3 1
R8 VDD VDD:1 0.5
R9 VDD VDD:2 0.7
R10 VDD VDD:b 30
R11 VSS VSS:1 0.5
R12 VSS VSS:b 30
R13 net1:1 net1:2 1.1
C1 A:2 VSS:1 1.2e-16
C2 Y:1 A:2 8e-17
C3 Y:1 VSS:1 3.1e-16
.ENDS $ NAND2_E
.SUBCKT chain_e IN OUT VDD VSS
XI1 IN VDD n1 VDD VSS / NAND2_E $T=0 0 0 0 $X=0 $Y=0
XI2 n1 VDD n2 VDD VSS / NAND2_E $T=320 0 0 0
XI3 n2 VDD OUT VDD VSS / NAND2_E $T=-640 -12800 0 1
C9 OUT VSS 20f
.ENDS
"""
EXPORTED: Final = r"""************************************************************************
* schematic export, invented
* Library Name: demo
************************************************************************
*.SCALE METER
*.GLOBAL vdd!
+        gnd!
.PARAM
*.BIPOLAR
.GLOBAL vdd! gnd!
.SUBCKT inv_x1 A Y
*.PININFO A:I Y:O
MN0 Y A gnd! gnd! nch w=420.00n l=60.00n m=1 nf=1
MP0 Y A vdd! vdd! pch w=640.00n l=60.00n m=1 nf=1
.ENDS

.SUBCKT bufchain<0> A<1> Y<1>
XI0 A<1> net<0> / inv_x1
XI1<0> net<0> net<1> / inv_x1
XI1<1> net<0> net<1> / inv_x1
XI2 net<1> Y<1> / inv_x1
.ENDS
"""
SUBSTRATE_PINS: Final = r"""* SOI invented
.subckt inv a y vdd gnd sub
m1 y a gnd sub gnd nsoi w=1u l=0.13u nbc=1
m2 y a vdd sub vdd psoi w=2u l=0.13u nbc=1
.ends
x1 i n1 vdd! gnd! gnd! inv
x2 n1 n2 vdd! gnd! gnd! inv
x3 n2 o vdd! gnd! gnd! inv
c1 o gnd! 30f
"""
WRAPPED: Final = r"""* wrappers, ports permuted, params
.subckt nfet_03v3 d s g b w=1u l=0.3u nf=1
m0 d g s b nmod w=w l=l
.model nmod nmos level=1 vto=0.6 kp=120u tox=7n
.ends
.subckt pfet_03v3 d s g b w=1u l=0.3u nf=1
m0 d g s b pmod w=w l=l
.model pmod pmos level=1 vto=-0.7 kp=40u tox=7n
.ends
.subckt inv a y vdd vss
x0 y vss a vss nfet_03v3 w=1.5u
x1 y vdd a vdd pfet_03v3 w=3u
.ends
x1 a b vcc gnd inv
x2 b c vcc gnd inv
x3 c d vcc gnd inv
c0 d gnd 50f
"""
ESCAPED: Final = r"""* escaped names
.subckt \inv$1 a y vdd vss
m\n1 y a vss vss n w=1u l=.1u
m\p1 y a vdd vdd p w=2u l=.1u
.ends
.subckt top \in[3]\ out vdd vss
x\u1/a \in[3]\ \n@1 vdd vss \inv$1
x\u2/b \n@1 a/b/c#2 vdd vss \inv$1
x%3 a/b/c#2 out vdd vss \inv$1
.ends
"""
ACCENTS: Final = (
    "* caf\u00e9, \u00b5m\r\n.subckt\tinv\ta\ty\tvdd\tvss\r\n"
    "mn\ty\ta\tvss\tvss\tnch\tw=1u\tl=0.1u\t$ \u00b5\r\n+\tm=1\r\n"
    "mp\ty\ta\tvdd\tvdd\tpch\tw=2u\tl=0.1u\r\n.ends\r\n.subckt top a y vdd vss\r\n"
    "x1 a b vdd vss inv\r\nx2 b c vdd vss inv\r\nx3 c y vdd vss inv\r\n.ends"
)
KITS: Final = {
    "extracted": EXTRACTED,
    "exported from a schematic": EXPORTED,
    "substrate pins": SUBSTRATE_PINS,
    "wrapped transistors with models of their own": WRAPPED,
    "escaped names": ESCAPED,
    "tabs, accents, no last line end": ACCENTS,
}


@pytest.fixture(params=KITS)
def kit(request: pytest.FixtureRequest, tmp_path: Path) -> Path:
    path = tmp_path / "kit.sp"
    path.write_bytes(KITS[request.param].encode("latin-1"))
    return path


def without_ours(data: bytes) -> bytes:
    """Return a written netlist without our comments, copies, widths and calls of copies."""
    lines = [line for line in data.splitlines(keepends=True) if not line.startswith(b"* evenstage")]
    text = re.sub(rb"(?ims)^\.subckt\s+\S+_s\d+\s.*?^\.ends[^\n]*\n", b"", b"".join(lines))
    return re.sub(rb"(?i)(?<=inv_x1|and2_e)_s\d+|(?<=inv|v\$1)_s\d+", b"", text)


def test_a_kit_is_resized_and_then_left_alone(kit: Path) -> None:
    first, second = kit.with_name("first.sp"), kit.with_name("second.sp")
    sizing = flow.resize(kit, flow.Question(), None, first)
    assert sizing.changes
    assert sizing.after.paths[0].delay < sizing.before.paths[0].delay
    assert flow.resize(first, flow.Question(), None, second).already_done
    assert first.read_bytes() == second.read_bytes()


def test_nothing_else_moves(kit: Path) -> None:
    output = kit.with_name("first.sp")
    flow.resize(kit, flow.Question(), None, output)
    assert without_ours(output.read_bytes()) == kit.read_bytes()
