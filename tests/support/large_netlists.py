"""Invented netlists of any size: flat, extracted with parasitics, hierarchical."""

from __future__ import annotations

import random
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from collections.abc import Iterator

_WIDTHS: Final = ("0.42u", "0.84u", "1.26u", "1.68u", "2.1u", "3.36u")
#: Gates between a net and those that may read it.
_NEAR, _FAR = 40, 400


def flat(cards: int, *, unique: bool = False, seed: int = 7) -> bytes:
    """Return a flat block of inverters and NANDs in layers.

    A tenth of the cards goes on in a second line, a twentieth ends in a remark, a twentieth is in
    capitals, a few have values in quotes or braces.

    Parameters
    ----------
    cards : int
        Transistors, give or take three.
    unique : bool
        Whether the areas and edges of no two cards are alike.
    seed : int
        For the random choices.
    """
    pick = random.Random(seed)
    lines = ["* an invented block, flat"]
    written = gate = 0
    while written < cards:
        for nets, model in _gate(gate, pick):
            written += 1
            lines.append(_dressed(f"mm{written} {nets} {model}", _sizes(unique, pick), pick))
        gate += 1
    return "\n".join([*lines, ".end", ""]).encode()


def _gate(number: int, pick: random.Random) -> Iterator[tuple[str, str]]:
    """Yield nets and model of the transistors of an inverter or a NAND."""
    first, second = _input(number, pick), _input(number, pick)
    out = f"net_{number}"
    yield f"{out} {first} vdd vdd", "pch"
    if pick.random() < 0.5:
        yield f"{out} {first} vss vss", "nch"
        return
    yield f"{out} {second} vdd vdd", "pch"
    yield f"{out} {first} x_{number} vss", "nch"
    yield f"x_{number} {second} vss vss", "nch"


def _input(gate: int, pick: random.Random) -> str:
    if gate < _FAR:
        return f"in_{gate % 37}"
    return f"net_{pick.randrange(gate - _FAR, gate - _NEAR)}"


def _sizes(unique: bool, pick: random.Random) -> tuple[str, str]:  # noqa: FBT001
    """Return the parameters of a transistor: width and length, areas and edges."""
    k = pick.randrange(len(_WIDTHS))
    if unique:
        areas = f"ad={pick.random():.4f}p as={pick.random():.4f}p"
        edges = f"pd={pick.uniform(1, 9):.3f}u ps={pick.uniform(1, 9):.3f}u"
    else:
        areas, edges = f"ad={k + 1}.{k}2p as={k + 1}.1p", f"pd={k + 2}.4u ps={k + 2}.6u"
    return f"w={_WIDTHS[k]} l=0.06u", f"{areas} {edges}"


def _dressed(head: str, sizes: tuple[str, str], pick: random.Random) -> str:
    """Return a card as one of many hands writes it."""
    fate = pick.random()
    if fate < 0.1:
        return f"{head} {sizes[0]}\n+ {sizes[1]}"
    line = " ".join((head, *sizes))
    if fate < 0.15:
        return line + (" $ seen" if fate < 0.125 else " ; seen")
    if fate < 0.2:
        return line.upper()
    if fate < 0.23:
        return line.replace("l=0.06u", "l='0.06u'" if fate < 0.215 else "l={0.06u}")
    return line


def extracted(cards: int, seed: int = 7) -> bytes:
    """Return a block with six parasitic resistors and capacitors to each transistor."""
    pick = random.Random(seed)
    lines = ["* an invented block, extracted"]
    for number in range(cards // 7):
        net = f"net{number % (cards // 20)}"
        lines.append(f"mm{number} {net}:1 {net}:2 vss vss nch w=0.42u l=0.06u ad=0.1p pd=1.2u")
        for part in range(3):
            place = f"{number}_{part}"
            lines.append(f"r{place} {net}:{part + 1} {net}:{part + 2} {pick.uniform(1, 90):.4f}")
            lines.append(f"c{place} {net}:{part + 1} 0 {pick.uniform(0.01, 2):.5f}f")
    return "\n".join([*lines, ".end", ""]).encode()


def hierarchical(blocks: int, seed: int = 7) -> bytes:
    """Return a block of blocks, each of 240 calls of leaves with expressions and parameters."""
    pick = random.Random(seed)
    lines = ["* an invented block, in a hierarchy", ".param wn=0.42u lmin=0.06u"]
    inputs = [pick.randint(1, 8) for _ in range(200)]
    for leaf, count in enumerate(inputs):
        lines += _leaf(leaf, count)
    for block in range(blocks):
        lines.append(f".subckt block{block} a y vdd vss")
        for call in range(240):
            leaf = pick.randrange(len(inputs))
            nets = " ".join(f"n{pick.randrange(call + 1)}" for _ in range(inputs[leaf]))
            factor = f"k={pick.randint(1, 4)}"
            lines.append(f"x{call} {nets} n{call + 1} vdd vss leaf{leaf} {factor}")
        lines.append(f".ends block{block}")
    lines += [f"xb{block} a y{block} vdd vss block{block}" for block in range(blocks)]
    return "\n".join([*lines, ".end", ""]).encode()


def _leaf(number: int, inputs: int) -> Iterator[str]:
    """Yield the cards of a NAND with an output inverter."""
    pins = [f"i{k}" for k in range(inputs)]
    yield f".subckt leaf{number} {' '.join(pins)} y vdd vss k=1"
    below = [*(f"s{k}" for k in range(1, inputs)), "vss"]
    above = ["z", *below]
    for k, pin in enumerate(pins):
        yield f"mp{k} z {pin} vdd vdd pch w='2*wn*k' l=lmin ad='2*wn*k*0.2u'"
        yield f"mn{k} {above[k]} {pin} {below[k]} vss nch w='wn*k*{inputs}' l=lmin"
    yield "mpo y z vdd vdd pch w='wn*k*4' l=lmin"
    yield "mno y z vss vss nch w='wn*k*2' l=lmin"
    yield f".ends leaf{number}"


def layered(stages: int, depth: int, seed: int = 7) -> bytes:
    """Return a flat block of inverters and three times as many NANDs in layers, every net read.

    Each layer reads the one before; the last is the block's outputs. Three and a half transistors
    a stage.
    """
    pick = random.Random(seed)
    wide = stages // depth
    lines = ["* an invented block, in layers", ".global vdd vss"]
    outs = [f"o{k}" for k in range(wide)]
    lines.append(f".subckt layers {' '.join(f'i{k}' for k in range(wide))}")
    lines += [f"+ {' '.join(outs[k : k + 20])}" for k in range(0, wide, 20)]
    above = [f"i{k}" for k in range(wide)]
    for layer in range(depth):
        here = outs if layer == depth - 1 else [f"n{layer}_{k}" for k in range(wide)]
        first = pick.sample(above, wide)
        second = pick.sample(above, wide)
        for k, out in enumerate(here):
            w = pick.choice(_WIDTHS)
            name = f"{layer}_{k}"
            lines.append(f"mp{name} {out} {first[k]} vdd vdd pch w={w} l=0.06u")
            if k % 4 == 0:
                lines.append(f"mn{name} {out} {first[k]} vss vss nch w={w} l=0.06u")
                continue
            lines.append(f"mq{name} {out} {second[k]} vdd vdd pch w={w} l=0.06u")
            lines.append(f"mn{name} {out} {first[k]} x{name} vss nch w={w} l=0.06u")
            lines.append(f"ms{name} x{name} {second[k]} vss vss nch w={w} l=0.06u")
        above = here
    return "\n".join([*lines, ".ends", ".end", ""]).encode()
