"""Transistors drawn as calls, from file to file: analysed and resized like those on M cards."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np
import pytest

from evenstage import flow
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read

if TYPE_CHECKING:
    from pathlib import Path

    from evenstage.sizing.results import Sizing

PROCESS: Final = 'name = "invented"\nsupply = 1.1\n' + "".join(
    f'[[transistor]]\nmodels = "{models}"\npolarity = "{polarity}"\nlength = "0.1u"\n'
    f'r_w = "{r_w}"\nc_gate = "1.2n"\nc_drain = "1n"\nwidth_step = "10n"\n'
    for models, polarity, r_w in (("n*", "n", "2m"), ("p*", "p", "4m"))
)
BRIEF: Final = 'top = "top"\n[[output]]\nnets = ["y"]\nload = "200f"\n'

PLAIN: Final = "m{0} {d} {g} {s} {b} {1}ch w={w} l=0.1u"

#: By name: the definitions, and a card of a transistor of type {1} between the nets d, g, s, b.
FORMS: Final = {
    "nobody defines it": ("", "x{0} {d} {g} {s} {b} {1}fet_01v8 w={w} l=0.1u"),
    "a wrapper": (
        ".subckt {1}wrap d g s b w=1u l=0.1u\nm0 d g s b {1}ch w=w l=l\n.ends\n",
        "x{0} {d} {g} {s} {b} {1}wrap w={w} l=0.1u",
    ),
    "ports in another order": (
        ".subckt {1}wrap b s d g w=1u\nm0 d g s b {1}ch w=w l=0.1u ad='w*0.2u'\n.ends\n",
        "x{0} {b} {s} {d} {g} {1}wrap w={w}",
    ),
    "the model has the wrapper's name": (
        ".subckt {1}mos d g s b w=1u l=0.1u\nM1 d g s b {1}mos w=w l=l\n.ends\n",
        "x{0} {d} {g} {s} {b} {1}mos w={w} l=0.1u",
    ),
    "a call of its own name inside": (
        ".subckt {1}mos d g s b w=1u l=0.1u\nx1 d g s b {1}mos w=w l=l\n.ends\n",
        "x{0} {d} {g} {s} {b} {1}mos w={w} l=0.1u",
    ),
    "a wrapper in a wrapper": (
        (
            ".subckt {1}in s g d b w=1u\nm0 d g s b {1}ch w=w l=0.1u\n.ends\n"
            ".subckt {1}out g d s b wd=1u w=wd\nx0 s g d b {1}in w=w\n.ends\n"
        ),
        "x{0} {g} {d} {s} {b} {1}out w={w}",
    ),
    "fingers passed through": (
        ".subckt {1}wrap d g s b w=1u nf=1\nm0 d g s b {1}ch w=w l=0.1u nf=nf\n.ends\n",
        "x{0} {d} {g} {s} {b} {1}wrap w={w} nf=2",
    ),
}
#: How the leaf gets its widths, and the first two calls of it.
WAYS: Final = {
    "numbers": ("", "1u", "2u", ""),
    "parameters": (" wn=1u wp=2u", "wn", "'wp'", " wn=1u wp=2u"),
    "a number behind both": (" wd=1u", "wd", "'2*wd'", ""),
}


def netlist(form: tuple[str, str], way: tuple[str, str, str, str]) -> str:
    """Return a chain of inverters whose transistors have some form."""
    definitions, card = form
    parameters, n, p, passed = way
    wrappers = "".join(definitions.replace("{1}", kind) for kind in "np") if definitions else ""
    pins = {"d": "y", "g": "a"}
    cards = [
        card.format("n", "n", w=n, s="vss", b="vss", **pins),
        card.format("p", "p", w=p, s="vdd", b="vdd", **pins),
    ]
    nets = ["a", *"bcde", "y"]
    calls = [f"x{k} {nets[k]} {nets[k + 1]} inv{passed if k < 2 else ''}" for k in range(5)]
    lines = [f".subckt inv a y{parameters}", *cards, ".ends", ".subckt top a y", *calls, ".ends"]
    return "\n".join(["* t", ".global vdd vss", f"{wrappers}{lines[0]}", *lines[1:], ""])


def resized(folder: Path, text: str) -> Sizing:
    """Return the outcome of a resizing; what was written must be what was promised."""
    folder.mkdir()
    files = {"a.sp": text, "p.toml": PROCESS, "b.toml": BRIEF}
    for name, content in files.items():
        (folder / name).write_text(content)
    question = flow.Question(process=folder / "p.toml", brief=folder / "b.toml")
    wishes = flow.Wishes(margin=0.005, scope="block")
    sizing = flow.resize(folder / "a.sp", question, wishes, folder / "out.sp")
    assert sizing.after.timing is not None
    circuit = sizing.after.timing.circuit
    written = elaborate(read(folder / "out.sp"), "top", circuit.process)
    np.testing.assert_allclose(written.width, circuit.devices.width, rtol=1e-9, atol=0)
    return sizing


@pytest.mark.parametrize("way", WAYS)
def test_every_form_is_analysed_and_resized_like_the_plain_one(tmp_path: Path, way: str) -> None:
    plain = resized(tmp_path / "plain", netlist(("", PLAIN), WAYS[way]))
    assert plain.changes
    for index, (name, form) in enumerate(FORMS.items()):
        text = netlist(form, WAYS[way])
        sizing = resized(tmp_path / str(index), text)
        for mine, others in ((sizing.before, plain.before), (sizing.after, plain.after)):
            assert mine.paths[0].delay == pytest.approx(others.paths[0].delay, rel=1e-9), name
        assert sizing.total_width_after == pytest.approx(plain.total_width_after, rel=1e-9), name
        assert {n.code for n in sizing.notices} == {n.code for n in plain.notices}, name
        wrappers = text[text.index(".subckt") : text.index(".subckt inv")]
        assert wrappers in (tmp_path / str(index) / "out.sp").read_text(), name


def test_a_wrapper_that_has_more_inside_says_so_and_is_resized_inside(tmp_path: Path) -> None:
    """With a capacitor inside it is a subcircuit: its width follows the calls all the same."""
    form = (
        ".subckt {1}wrap d g s b w=1u\nm0 d g s b {1}ch w=w l=0.1u\nc0 d s 0.1f\n.ends\n",
        "x{0} {d} {g} {s} {b} {1}wrap w={w}",
    )
    sizing = resized(tmp_path / "inside", netlist(form, WAYS["parameters"]))
    assert sizing.changes
    assert "width-fixed" not in {notice.code for notice in sizing.notices}
