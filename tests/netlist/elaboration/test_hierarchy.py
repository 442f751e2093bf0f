"""The flat layout against a naive one that walks the same hierarchy instance by instance."""

from __future__ import annotations

import random
from dataclasses import dataclass, field
from pathlib import Path

from hypothesis import given
from hypothesis import strategies as st

from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read_bytes

Row = tuple[str, str, str, str, str, float, float]


@dataclass
class Definition:
    """A subcircuit of the test's own: transistors and calls."""

    name: str
    ports: list[str]
    transistors: list[tuple[str, list[str], int, int]] = field(default_factory=list)
    calls: list[tuple[str, list[str], Definition, int | None, int]] = field(default_factory=list)

    def text(self) -> str:
        lines = [f".subckt {self.name} {' '.join(self.ports)} k=1"]
        lines += [
            f"{name} {' '.join(nets)} nch w='k*{width}n' l=100n m={copies}"
            for name, nets, width, copies in self.transistors
        ]
        for name, nets, callee, factor, copies in self.calls:
            passed = "" if factor is None else f" k='k*{factor}'"
            lines.append(f"{name} {' '.join(nets)} {callee.name}{passed} m={copies}")
        return "\n".join([*lines, ".ends\n"])

    def rows(self, path: str, outer: dict[str, str], k: int, copies: int) -> list[Row]:
        """Walk all instances below this one."""

        def full(net: str) -> str:
            return "g!" if net == "g!" and net not in outer else outer.get(net, f"{path}{net}")

        rows: list[Row] = [
            (f"{path}{name}", *map(full, nets), k * width * 1e-9, float(own * copies))  # type: ignore[misc]  # four nets by construction
            for name, nets, width, own in self.transistors
        ]
        for name, nets, callee, factor, own in self.calls:
            inner = dict(zip(callee.ports, map(full, nets), strict=True))
            passed = 1 if factor is None else k * factor
            rows += callee.rows(f"{path}{name}.", inner, passed, copies * own)
        return rows


def random_design(seed: int) -> list[Definition]:
    """Return definitions, callees first; the last is the block."""
    pick = random.Random(seed)
    definitions: list[Definition] = []
    for level in range(pick.randint(1, 6)):
        ports = [f"p{i}" for i in range(pick.randint(0, 4))] + ["g!"] * (pick.random() < 0.2)
        nets = ["n1", "n2", "g!", *ports]
        one = Definition(f"s{level}", ports)
        for i in range(pick.randint(0, 3)):
            chosen = [pick.choice(nets) for _ in range(4)]
            one.transistors.append((f"m{i}", chosen, pick.randint(50, 900), pick.randint(1, 3)))
        for i in range(pick.randint(0, 3) if definitions else 0):
            callee = pick.choice(definitions)
            chosen = [pick.choice(nets) for _ in callee.ports]
            factor = pick.choice([None, 2, 3])
            one.calls.append((f"x{i}", chosen, callee, factor, pick.randint(1, 2)))
        definitions.append(one)
    return definitions


@given(st.integers(0, 10**9))
def test_flat_columns_are_those_of_a_walk_through_the_hierarchy(seed: int) -> None:
    design = random_design(seed)
    block = design[-1]
    order = random.Random(seed + 1).sample(design, len(design))
    text = "* t\n.global g!\n" + "".join(one.text() for one in order)
    devices = elaborate(read_bytes(text.encode(), "t.sp", Path()), block.name)
    names = devices.net_names
    found = [
        (
            devices.card_path(int(devices.card[i]), int(devices.instance[i])),
            names[int(devices.drain[i])],
            names[int(devices.gate[i])],
            names[int(devices.source[i])],
            names[int(devices.bulk[i])],
            round(float(devices.width[i]), 15),
            float(devices.multiplier[i]),
        )
        for i in range(len(devices))
    ]
    ports = {port: port for port in block.ports}
    expected = [(*row[:5], round(row[5], 15), row[6]) for row in block.rows("", ports, 1, 1)]
    # Not only the same rows: in the same order, instance by instance as the calls stand.
    assert found == expected
    assert len(set(names)) == len(names)
