"""Random chains of inverters in a hierarchy of subcircuits, with widths given in many ways."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from random import Random

#: Leaves by how they say their widths, each with the parameters a call may pass.
_LEAVES: Final = (
    ("{0} a y|w=1u l=0.1u|w=2u l=0.1u ad=0.4p pd=4u", ()),
    ("{0} a y wn=1u wp=2u|w=wn l=0.1u|w='wp' l=0.1u ad='wp*0.2u'", ("wn", "wp")),
    ("{0} a y|w=wg l=0.1u ad='wg*0.2u'|w='2*wg' l=0.1u", ()),
    ("{0} a y\n.param wi=0.8u|w=wi l=0.1u|w='wi*2' l=0.1u", ()),
    ("{0} a y k=1|w='k*0.5u' l=0.1u|w='k*1u' l=0.1u", ("k",)),
    ("{0} a y wn=1u|w='half(4*wn)' l=0.1u|w='half(wg)' l=0.1u", ("wn",)),
)
_VALUES: Final = {"k": ("1.5", "2"), "wn": ("1u", "2u", "3u"), "wp": ("1u", "4u"), "wm": ("4u",)}


@dataclass(frozen=True)
class Hierarchy:
    """A netlist whose block is called top, and the leaves that a brief names."""

    text: str
    leaves: tuple[str, ...]


def random_hierarchy(pick: Random) -> Hierarchy:
    """Return a hierarchy of up to four levels; another block may stand beside the one meant."""
    text = "* t\n.global vdd vss\n.param wg=1.2u wt=3u half(x)='x/2'\n"
    known: list[tuple[str, tuple[str, ...]]] = []
    for index in range(pick.choice([1, 2, 3])):
        form, parameters = pick.choice(_LEAVES)
        head, n, p = form.format(f"l{index}").split("|")
        text += f".subckt {head}\nmn y a vss vss nx {n}\nmp y a vdd vdd px {p}\n.ends\n"
        known.append((f"l{index}", parameters))
    between = [f"d{index}" for index in range(pick.choice([0, 1, 2, 3]))]
    for name in between:
        own = ("wm",) if pick.random() < 0.4 else ()
        text += f".subckt {name} a y{' wm=2u' if own else ''}\n"
        text += _chain(pick, known, pick.choice([1, 2, 3]), own)
        if pick.random() < 0.2:
            text += "mq q a vss vss nx w=1u l=0.1u\nmr q a vdd vdd px w=1u l=0.1u\n"
        text += ".ends\n"
        known.append((name, own))
    text += f".subckt top a y\n{_chain(pick, known[-3:], pick.choice([1, 2, 3, 4, 6]), ())}.ends\n"
    if pick.random() < 0.2:
        text += f".subckt other a y\nxo a y {known[0][0]}\n.ends\n"
    return Hierarchy(text, tuple(name for name in ("l0", *between) if pick.random() < 0.5))


def _chain(
    pick: Random, known: list[tuple[str, tuple[str, ...]]], count: int, own: tuple[str, ...]
) -> str:
    """Return calls one behind the other that pass this or that."""
    nets = ["a", *(f"n{index}" for index in range(1, count)), "y"]
    text = ""
    for index in range(count):
        callee, parameters = pick.choice(known)
        passed = "".join(_passed(pick, name, own) for name in parameters)
        text += f"x{index} {nets[index]} {nets[index + 1]} {callee}{passed}\n"
    return text


def _passed(pick: Random, name: str, own: tuple[str, ...]) -> str:
    kind = pick.random()
    if kind < 0.3:
        return f" {name}={pick.choice(_VALUES[name])}"
    if kind < 0.5 and own:
        return f" {name}='wm*1e6'" if name == "k" else f" {name}='wm*2'"
    return f" {name}=wt" if kind < 0.6 and name != "k" else ""
