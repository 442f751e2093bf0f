"""Random acyclic blocks of static gates, as hypothesis strategies."""

from __future__ import annotations

from dataclasses import dataclass

from hypothesis import strategies as st

from support.blocks import block, inverter, nand, nor


@dataclass(frozen=True)
class RandomBlock:
    """A block: its cards one by one, its ports, and its widths scaled as asked."""

    gates: tuple[tuple[str, tuple[str, ...], str, float], ...]
    wires: tuple[tuple[str, float], ...]
    inputs: tuple[str, ...]
    outputs: tuple[str, ...]

    def cards(self, scale: float = 1.0) -> list[str]:
        """Return the cards with all widths and capacitors multiplied."""
        found = []
        for index, (kind, inputs, output, width) in enumerate(self.gates):
            w, name = width * scale, f"g{index}"
            if kind == "inv":
                text = inverter(name, inputs[0], output, w, 2 * w)
            elif kind == "nand":
                text = nand(name, list(inputs), output, w * len(inputs), 2 * w)
            else:
                text = nor(name, list(inputs), output, w, 2 * w * len(inputs))
            found += text.split("\n")
        found += [
            f"cw{index} {net} vss {cap * scale:.12g}f"
            for index, (net, cap) in enumerate(self.wires)
        ]
        return found

    def text(self, scale: float = 1.0) -> str:
        """Return the netlist."""
        ports = " ".join([*self.inputs, *self.outputs, "vdd", "vss"])
        return block("\n".join(self.cards(scale)), ports)


@st.composite
def random_blocks(draw: st.DrawFn, most: int = 14) -> RandomBlock:
    """Draw a block of up to ``most`` gates in which every later gate may use every earlier net."""
    inputs = tuple(f"i{k}" for k in range(draw(st.integers(1, 3))))
    nets, gates = list(inputs), []
    for index in range(draw(st.integers(1, most))):
        kind = draw(st.sampled_from(["inv", "nand", "nor"]))
        count = 1 if kind == "inv" else draw(st.integers(2, 3))
        chosen = tuple(dict.fromkeys(draw(st.sampled_from(nets[-6:])) for _ in range(count)))
        if len(chosen) == 1:
            kind = "inv"
        width = draw(st.sampled_from([0.5, 0.8, 1.0, 1.7, 2.5, 4.0]))
        gates.append((kind, chosen, f"n{index}", width))
        nets.append(f"n{index}")
    used = {net for _, chosen, _, _ in gates for net in chosen}
    outputs = tuple(net for _, _, net, _ in gates if net not in used)
    wires = tuple(
        (net, draw(st.sampled_from([0.3, 2.0, 9.0, 40.0]))) for net in nets if net in outputs
    )
    return RandomBlock(tuple(gates), wires, inputs, outputs)
