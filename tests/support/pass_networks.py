"""Cards of transmission gates, trees of them, rotators and buses, invented for tests."""

from __future__ import annotations

from support.blocks import block, inverter, transistor


def transmission_gate(name: str, a: str, b: str, on: str, off: str, width: float = 1) -> str:
    """Return the two cards that join ``a`` and ``b`` while ``on`` is high."""
    return "\n".join([
        f"m{name}n {a} {on} {b} vss nx w={width}u l=0.1u",
        f"m{name}p {a} {off} {b} vdd px w={width}u l=0.1u",
    ])  # fmt: skip


def tree(levels: int, *, driven: bool = True) -> str:
    """Return a multiplexer of 2**levels inputs; bit 0 of the select decides first."""
    count = 1 << levels
    cards = [inverter(f"d{j}", f"d{j}", f"m0_{j}", 1, 2) for j in range(count) if driven]
    for level in range(levels):
        cards.append(inverter(f"s{level}", f"s{level}", f"b{level}", 1, 2))
        for j in range(count >> level):
            on, off = (f"s{level}", f"b{level}") if j & 1 else (f"b{level}", f"s{level}")
            near = f"m{level}_{j}" if level or driven else f"d{j}"
            cards.append(
                transmission_gate(f"t{level}_{j}", near, f"m{level + 1}_{j >> 1}", on, off)
            )
    cards.append(inverter("o", f"m{levels}_0", "y", 1, 2))
    ports = [*(f"d{j}" for j in range(count)), *(f"s{k}" for k in range(levels)), "y"]
    return block("\n".join(cards), " ".join([*ports, "vdd", "vss"]))


def rotator(levels: int) -> str:
    """Return a rotator of 2**levels lanes: y_j = d_(j + select)."""
    count = 1 << levels
    cards = [inverter(f"d{j}", f"d{j}", f"m0_{j}", 1, 2) for j in range(count)]
    for k in range(levels):
        cards.append(inverter(f"s{k}", f"s{k}", f"b{k}", 1, 2))
        for j in range(count):
            ends = f"m{k}_{j}", f"m{k}_{(j + (1 << k)) % count}"
            cards.append(
                transmission_gate(f"t{k}_{j}a", ends[0], f"m{k + 1}_{j}", f"b{k}", f"s{k}")
            )
            cards.append(
                transmission_gate(f"t{k}_{j}b", ends[1], f"m{k + 1}_{j}", f"s{k}", f"b{k}")
            )
    cards += [inverter(f"o{j}", f"m{levels}_{j}", f"y{j}", 1, 2) for j in range(count)]
    ports = [*(f"d{j} y{j}" for j in range(count)), *(f"s{k}" for k in range(levels))]
    return block("\n".join(cards), " ".join([*ports, "vdd", "vss"]))


def crossbar(lanes: int) -> str:
    """Return a rotator of one rank, its select lines one-hot and not decoded inside."""
    cards = []
    for j in range(lanes):
        cards.append(inverter(f"d{j}", f"d{j}", f"m{j}", 1, 2))
        cards.append(inverter(f"h{j}", f"h{j}", f"g{j}", 1, 2))
        cards.append(inverter(f"o{j}", f"e{j}", f"y{j}", 1, 2))
        for i in range(lanes):
            k = (j - i) % lanes
            cards.append(transmission_gate(f"t{i}_{j}", f"m{j}", f"e{i}", f"h{k}", f"g{k}"))
    ports = [f"d{j} h{j} y{j}" for j in range(lanes)]
    return block("\n".join(cards), " ".join([*ports, "vdd", "vss"]))


def tri_state(name: str, data: str, on: str, off: str, bus: str) -> str:
    """Return an inverter that drives a bus while ``on`` is high."""
    return "\n".join([
        transistor("n", bus, data, f"{name}x", 2, f"{name}a"),
        transistor("n", f"{name}x", on, "vss", 2, f"{name}b"),
        transistor("p", bus, data, f"{name}z", 4, f"{name}c"),
        transistor("p", f"{name}z", off, "vdd", 4, f"{name}d"),
    ])  # fmt: skip


def bus(drivers: int) -> str:
    """Return tri-state inverters on one bus and a gate that listens."""
    cards = [inverter("o", "w", "y", 1, 2)]
    for j in range(drivers):
        cards.append(inverter(f"e{j}", f"e{j}", f"f{j}", 1, 2))
        cards.append(tri_state(f"u{j}", f"d{j}", f"e{j}", f"f{j}", "w"))
    ports = [f"d{j} e{j}" for j in range(drivers)]
    return block("\n".join(cards), " ".join([*ports, "y", "vdd", "vss"]))
