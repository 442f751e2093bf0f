"""Side inputs that let one path switch, and the paths that none let."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest

from evenstage.brief import Brief
from evenstage.errors import SimulationError
from evenstage.simulation.choices import choices
from evenstage.simulation.excerpt import route_of
from evenstage.simulation.groups import Groups
from evenstage.simulation.sensitise import side_inputs
from evenstage.timing.analyse import analyse
from support.blocks import circuit_of, plain_process

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit

CELLS = """* cells
.global vdd vss
.subckt inv a y
mn y a vss vss nx w=1u l=0.1u
mp y a vdd vdd px w=2u l=0.1u
.ends
.subckt nand2 a b y
ma y a m vss nx w=2u l=0.1u
mb m b vss vss nx w=2u l=0.1u
mpa y a vdd vdd px w=2u l=0.1u
mpb y b vdd vdd px w=2u l=0.1u
.ends
.subckt aoi22 a b c d y
ma y a m vss nx w=2u l=0.1u
mb m b vss vss nx w=2u l=0.1u
mc y c n vss nx w=2u l=0.1u
md n d vss vss nx w=2u l=0.1u
mpa t a vdd vdd px w=4u l=0.1u
mpb t b vdd vdd px w=4u l=0.1u
mpc y c t vdd px w=4u l=0.1u
mpd y d t vdd px w=4u l=0.1u
.ends
"""


def circuit(body: str) -> Circuit:
    return circuit_of(f"{CELLS}{body}", plain_process(), Brief(top="top"))


def held(some: Circuit, start: str) -> dict[str, bool]:
    """Return the side inputs of the slowest path by name."""
    groups = Groups(some)
    route = route_of(groups, analyse(some, start=start).paths[0])
    found = side_inputs(groups, list(dict.fromkeys(route.groups)), route.edges)
    return {some.devices.net_names[net]: level for net, level in found.items()}


class TestSideInputs:
    def test_do_not_control_their_gates(self) -> None:
        some = circuit(".subckt top a b y\nx1 a b p nand2\nx2 p y inv\n.ends\n")
        assert held(some, start="a") == {"b": True}

    def test_leave_the_fewest_devices_to_pull(self) -> None:
        # With a falling, one of c and d is low: were both, two pMOS would pull the output up.
        some = circuit(".subckt top a b c d y\nx1 a b c d y aoi22\nx2 y z inv\n.ends\n")
        a, output = some.net_id("a"), some.net_id("y")
        assert a is not None
        assert output is not None
        groups = Groups(some)
        found = choices(groups, int(groups.of_net[output]), {a: (True, False)})
        first = {some.devices.net_names[net]: level for net, level in found[0].levels.items()}
        assert first["b"]
        assert first["c"] != first["d"]
        last = {some.devices.net_names[net]: level for net, level in found[-1].levels.items()}
        assert not last["c"]
        assert not last["d"]
        assert found[0].slowness > found[-1].slowness

    def test_one_net_has_one_value_for_all_gates(self) -> None:
        # The slowest values of x1 alone are taken back where x2 needs others of the same net.
        some = circuit(
            ".subckt top a s t y\nx1 a s t t p aoi22\nx2 p t q nand2\nx3 q y inv\n.ends\n"
        )
        with pytest.raises(SimulationError, match="different ones of the same net"):
            held(some, start="a")

    def test_a_gate_held_by_the_path_itself_is_named(self) -> None:
        # y = !(a & !a) never moves: seen from a through x1, its other input holds it.
        some = circuit(".subckt top a y\nx1 a p inv\nx2 p a q nand2\nx3 q y inv\n.ends\n")
        with pytest.raises(SimulationError, match=r"cannot switch at 'x2' \(!\(a & b\)\)"):
            held(some, start="a")

    def test_a_transmission_gate_opens_for_one_of_its_data(self) -> None:
        # z takes x where s is low; the drivers of x and y belong to the selector's group.
        text = (
            ".subckt top x y s z\nx1 x p inv\nx2 y q inv\nx3 s sb inv\n"
            "m1 p sb z vss nx w=1u l=0.1u\nm2 p s z vdd px w=1u l=0.1u\n"
            "m3 q s z vss nx w=1u l=0.1u\nm4 q sb z vdd px w=1u l=0.1u\nx4 z out inv\n.ends\n"
        )
        some = circuit(text)
        groups = Groups(some)
        x, z, p = (some.net_id(name) for name in ("x", "z", "p"))
        assert x is not None
        assert z is not None
        assert p is not None
        assert groups.of_net[p] == groups.of_net[z]
        found = choices(groups, int(groups.of_net[z]), {x: (False, True), z: (True, False)})
        level = {some.devices.net_names[net]: value for net, value in found[0].levels.items()}
        assert level["sb"]
        assert not level["s"]
