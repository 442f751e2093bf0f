"""Nets of a flat block: their names, and which of them resistors make one."""

from __future__ import annotations

import re
from collections.abc import Sequence
from functools import cached_property
from typing import TYPE_CHECKING, Final, overload

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from evenstage.netlist.elaboration.flatten import starts_of

if TYPE_CHECKING:
    from collections.abc import Iterator

    from numpy.typing import NDArray

    from evenstage.netlist.elaboration.flatten import Flat, Indices
    from evenstage.netlist.elaboration.outline import LocalNets
    from evenstage.netlist.netlist import Netlist

#: Names made together.
_CHUNK: Final = 4096
_HIGH: Final = re.compile(r"(?:a|d|i|o)?v?(?:dd|cc)\w*!?|vpwr|vpb|sup", re.IGNORECASE)
_LOW: Final = re.compile(r"(?:a|d|i|o)?vss\w*!?|a?d?v?gnd\w*!?|vnb|ss|0", re.IGNORECASE)


class NetNames(Sequence[str]):
    """Full names of all nets, put together when somebody asks.

    Parameters
    ----------
    netlist : Netlist
        Holds the names as written.
    flat : Flat
        The layout.
    local : Sequence of LocalNets
        Of each template.
    global_names : Sequence of str
        Of the first nets.
    kept : Indices, shape (m,)
        For each net of the block its number in the layout.
    """

    def __init__(
        self,
        netlist: Netlist,
        flat: Flat,
        local: Sequence[LocalNets],
        global_names: Sequence[str],
        kept: Indices,
    ) -> None:
        self._netlist = netlist
        self._flat = flat
        self._local = local
        self._global_names = global_names
        self._kept = kept
        self._paths: dict[int, str] = {0: ""}

    def __len__(self) -> int:
        return len(self._kept)

    @overload
    def __getitem__(self, net: int) -> str: ...

    @overload
    def __getitem__(self, net: slice) -> tuple[str, ...]: ...

    def __getitem__(self, net: int | slice) -> str | tuple[str, ...]:
        """Return the name of a net."""
        if isinstance(net, slice):
            return tuple(map(self.of_layout, self._kept[net].tolist()))
        return self.of_layout(int(self._kept[net]))

    def __iter__(self) -> Iterator[str]:
        """Give all names in order, many times as fast as one by one."""
        for start in range(0, len(self), _CHUNK):
            yield from self._many(self._kept[start : start + _CHUNK])

    def _many(self, nets: Indices) -> list[str]:
        """Return the names of some nets of the layout."""
        names = [self._global_names[net] for net in nets[nets < len(self._global_names)].tolist()]
        instance, local = self._located(nets[nets >= len(self._global_names)])
        template = self._flat.template[instance]
        for i, t, k in zip(instance.tolist(), template.tolist(), local.tolist(), strict=True):
            names.append(self._path(i) + self._local_name(t, k))
        return names

    def _located(self, nets: Indices) -> tuple[Indices, Indices]:
        """Return instance and local net of nets of the layout that are not global."""
        slot = self._flat.slot_of_net[nets]
        instance = np.searchsorted(self._flat.slot_base, slot, "right") - 1
        return instance, slot - self._flat.slot_base[instance]

    def _words(self, instance: Indices, local: Indices) -> Indices:
        """Return the words of local nets of instances."""
        starts = starts_of([len(nets.words) for nets in self._local])
        words = np.concatenate([nets.words for nets in self._local])
        found: Indices = words[starts[self._flat.template[instance]] + local]
        return found

    def endings(self) -> tuple[list[str], Indices]:
        """Return the distinct last components in lower case, and for each net which it has."""
        fixed = len(self._global_names)
        kept = self._kept[self._kept >= fixed]
        distinct, index = np.unique(self._words(*self._located(kept)), return_inverse=True)
        texts = [_ending(_text(word)) for word in self._netlist.cards.words.some(distinct)]
        first = [_ending(self._global_names[net]) for net in self._kept[: -len(kept) or None]]
        place = np.concatenate([len(texts) + np.arange(len(self._kept) - len(kept)), index])
        return texts + first, place

    def shortened(self, nets: Indices) -> list[str]:
        """Return names of ascending nets of the layout in lower case, with ``.`` for a path.

        Where the path has a colon, ``:.`` stands for it.
        """
        fixed = len(self._global_names)
        names = [self._global_names[net].lower() for net in nets[nets < fixed].tolist()]
        instance, local = self._located(nets[nets >= fixed])
        words = map(_text, self._netlist.cards.words.some(self._words(instance, local)))
        distinct, index = np.unique(instance, return_inverse=True)
        paths = ["" if i == 0 else ":." if ":" in self._path(i) else "." for i in distinct.tolist()]
        return names + [paths[i] + word for i, word in zip(index.tolist(), words, strict=True)]

    def of_layout(self, net: int) -> str:
        """Return the name of a net of the layout."""
        if net < len(self._global_names):
            return self._global_names[net]
        slot = int(self._flat.slot_of_net[net])
        instance = int(np.searchsorted(self._flat.slot_base, slot, "right")) - 1
        local = slot - int(self._flat.slot_base[instance])
        name = self._local_name(int(self._flat.template[instance]), local)
        return f"{self._path(instance)}{name}"

    def _local_name(self, template: int, local: int) -> str:
        ports, _, firsts = self._local[template]
        if local < len(ports):
            return ports[local]
        card, position = firsts[:, local - len(ports)].tolist()
        return self._netlist.node_name(card, position)

    def _path(self, instance: int) -> str:
        """Return the path of an instance with a dot behind it."""
        inner = []
        while instance not in self._paths:
            inner.append(instance)
            instance = int(self._flat.parent[instance])
        path = self._paths[instance]
        for one in reversed(inner):
            path += self._netlist.card_name(int(self._flat.card[one])) + "."
            self._paths[one] = path
        return path


def endings(names: Sequence[str]) -> tuple[list[str], Indices]:
    """Return the distinct last components of net names, and for each name which it has.

    Case is not kept.
    """
    if isinstance(names, NetNames):
        return names.endings()
    index: dict[str, int] = {}
    place = [index.setdefault(_ending(name), len(index)) for name in names]
    return list(index), np.array(place, np.intp)


def _ending(name: str) -> str:
    return name.rpartition(".")[2].lower()


def _text(word: bytes) -> str:
    return word.decode("utf-8", "surrogateescape")


class Joints:
    """Nets made one by resistors.

    Parameters
    ----------
    pairs : Indices, shape (2, r)
        Nets of the layout at the ends of each resistor.
    nets : int
        How many nets the layout has.
    fixed : int
        The first so many keep their names before all others (global nets).
    ports : frozenset of int
        Nets of the block's ports.
    names : NetNames
        Their names.
    """

    def __init__(
        self,
        pairs: Indices,
        nets: int,
        fixed: int,
        ports: frozenset[int],
        names: NetNames,
    ) -> None:
        self._nets = nets
        self._fixed = fixed
        self._ports = ports
        self._names = names
        self.joined, self._members, self._labels = self._components(pairs)

    def _components(self, pairs: Indices) -> tuple[NDArray[np.bool_], Indices, Indices]:
        """Return which resistors join, the nets concerned, and the component of each.

        A component that would make a high and a low supply one net is left apart.
        """
        members, ends = np.unique(pairs, return_inverse=True)
        ends = ends.reshape(pairs.shape)
        size = (len(members), len(members))
        matrix = coo_array((np.ones(len(ends[0]), np.int8), (ends[0], ends[1])), shape=size)
        _, labels = connected_components(matrix, directed=False)
        shorted = np.intersect1d(
            labels[self._supplies(members, _HIGH)], labels[self._supplies(members, _LOW)]
        )
        joined = ~np.isin(labels[ends[0]], shorted)
        inside = ~np.isin(labels, shorted)
        return joined, members[inside], labels[inside]

    def _supplies(self, members: Indices, pattern: re.Pattern[str]) -> NDArray[np.bool_]:
        names = self._names.shortened(members)
        return np.array([pattern.fullmatch(name) is not None for name in names], np.bool_)

    @cached_property
    def representative(self) -> Indices:
        """For each net of the layout the net whose name it takes."""
        result = np.arange(self._nets)
        names = self._names.shortened(self._members)
        members = self._members.tolist()
        ranks = np.array(list(map(self._rank, members, names)), np.int64)
        order = np.lexsort((self._members, ranks, self._labels))
        labels = self._labels[order]
        first = np.flatnonzero(np.diff(labels, prepend=-1))
        chosen = np.repeat(self._members[order][first], np.diff([*first, len(labels)]))
        result[self._members[order]] = chosen
        return result

    def _rank(self, net: int, name: str) -> int:
        """Order names: global nets, supplies, ports, plain names, parts of a net (``net:1``)."""
        if net < self._fixed:
            return 0
        if _HIGH.fullmatch(name) or _LOW.fullmatch(name):
            return 1
        if net in self._ports:
            return 2
        return 4 if ":" in name else 3
