"""Where names get their values, and what depends on them."""

from __future__ import annotations

from pathlib import Path

import pytest

from evenstage.netlist.reading.read import read_bytes
from evenstage.netlist.rewriting.bindings import Bindings, Place
from evenstage.netlist.rewriting.mentions import names_in
from evenstage.netlist.rewriting.tracing import Tracer

TEXT = b"""title
.param wg=1u k=2
.subckt leaf a y w=0.5u wx='2*w'
.param wi='wx+w'
m1 y a 0 0 nch w=w l=60n ad='wi*0.3u'
m2 y a 0 0 nch w='wg*k' l=60n
.ends
.subckt mid a y wm=3u
x1 a b leaf w='wm*k'
x2 b y leaf wx=9u
.ends
x3 a y mid
x4 a y mid wm=wg
"""


@pytest.fixture(scope="module")
def bindings() -> Bindings:
    return Bindings.of(read_bytes(TEXT, "a.sp", Path()))


def number(bindings: Bindings, name: str) -> int:
    netlist = bindings.netlist
    return next(n for n in range(len(netlist)) if netlist.card(n).name == name)


class TestNamesIn:
    @pytest.mark.parametrize(
        ("text", "names"),
        [
            ("0.6u", ()),
            ("'0.6u'", ()),
            ("wn", ("wn",)),
            ("{2*WN + max(wp, 1u)}", ("wn", "wp")),
            ("topography*", ()),
        ],
    )
    def test_of_a_value(self, text: str, names: tuple[str, ...]) -> None:
        assert names_in(text) == names


class TestBinding:
    def test_what_the_call_passes_comes_before_the_default(self, bindings: Bindings) -> None:
        x1, x2 = number(bindings, "x1"), number(bindings, "x2")
        passed = bindings.binding(Place("leaf", "w", x1))
        default = bindings.binding(Place("leaf", "w", x2))
        assert passed is not None
        assert default is not None
        assert (passed.kind, passed.parameter.text, passed.scope) == ("passed", "'wm*k'", "mid")
        assert passed.callers == (number(bindings, "x3"), number(bindings, "x4"))
        assert (default.kind, default.parameter.text) == ("default", "0.5u")

    def test_a_name_nobody_gives_is_the_top_levels(self, bindings: Bindings) -> None:
        binding = bindings.binding(Place("leaf", "wg", number(bindings, "x1")))
        assert binding is not None
        assert binding.place == Place("", "wg", None)
        assert bindings.binding(Place("leaf", "nothing", None)) is None


class TestUses:
    def uses(self, bindings: Bindings, place: Place) -> set[tuple[str, str, str]]:
        def name(card: int | None) -> str:
            return "" if card is None else bindings.netlist.card(card).name

        return {(name(u.card), u.name, name(u.caller)) for u in bindings.uses(place)}

    def test_on_one_call_only(self, bindings: Bindings) -> None:
        x1, x2 = number(bindings, "x1"), number(bindings, "x2")
        assert self.uses(bindings, Place("leaf", "w", x1)) == {
            ("m1", "w", "x1"),
            ("m1", "ad", "x1"),
        }
        # This call passes wx, so that default no longer depends on w; wi does.
        assert self.uses(bindings, Place("leaf", "wx", x2)) == {("m1", "ad", "x2")}

    def test_from_the_top_level_through_calls(self, bindings: Bindings) -> None:
        assert self.uses(bindings, Place("", "wg", None)) == {
            ("m2", "w", "x1"),
            ("m2", "w", "x2"),
            ("m1", "w", "x1"),
            ("m1", "ad", "x1"),
        }


class TestTracer:
    def test_roots_on_all_ways(self, bindings: Bindings) -> None:
        x1 = number(bindings, "x1")
        (both, *_) = Tracer(bindings).roots("w", "leaf", (x1,))
        assert {(root.parameter.name, root.parameter.text) for root in both} == {
            ("wm", "3u"),
            ("wg", "1u"),
        }

    def test_values(self, bindings: Bindings) -> None:
        x1, x2 = number(bindings, "x1"), number(bindings, "x2")
        tracer = Tracer(bindings)
        assert tracer.value(Place("leaf", "wi", x1)) == pytest.approx(18e-6, rel=1e-12)
        assert tracer.value(Place("leaf", "wi", x2)) == pytest.approx(9.5e-6, rel=1e-12)

    def test_circles_have_no_roots(self) -> None:
        text = b"t\n.param a='b' b='a'\nr1 x y 'a'\n"
        tracer = Tracer(Bindings.of(read_bytes(text, "a.sp", Path())))
        assert tracer.roots("a", "", (None,)) == []
