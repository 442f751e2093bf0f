"""Junction constants as keys of the process file: one value for both edges, or one for each."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final, NamedTuple

from evenstage.process.process import Junction, Junctions
from evenstage.schema import Number

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping

    from evenstage.settings import Settings

_EDGES: Final = ("rise", "fall")

#: Key of each constant of a junction, its unit, and the most it can sensibly be.
_KEYS: Final = {
    "area": ("c_drain_area", "F/m^2", 1.0),
    "edge": ("c_drain_edge", "F/m", 1e-6),
    "overlap": ("c_drain_overlap", "F/m", 1e-6),
    "drain_fixed": ("c_drain_whole", "F", 1e-9),
    "source_fixed": ("c_source_whole", "F", 1e-9),
}

#: Constants that a file gives both of or neither.
_NEEDED: Final = ("area", "edge")

#: The keys, each alone and with the edge it is for.
JUNCTION_KEYS: Final[Mapping[str, Number]] = {
    f"{key}{edge}": Number(unit=unit, least=0, most=most)
    for key, unit, most in _KEYS.values()
    for edge in ("", *(f"_{edge}" for edge in _EDGES))
}


class _Given(NamedTuple):
    """A constant as a file gives it: the first key that does, and its value of each edge."""

    key: str
    rise: float
    fall: float


def read_junctions(table: Settings) -> Junctions | None:
    """Return the junction constants of a transistor table, None where it has none.

    Raises
    ------
    SettingsError
        ``half-given``, ``given-twice``.
    """
    given = {name: _given(table, key) for name, (key, _, _) in _KEYS.items()}
    first = next((one for one in given.values() if one is not None), None)
    if first is None:
        return None
    for name in _NEEDED:
        if given[name] is None:
            missing = _KEYS[name][0]
            raise table.error(
                first.key,
                f"{first.key} comes without {missing}; give both (0 where it counts for nothing), "
                "or neither",
                "half-given",
            )
    known = {name: one for name, one in given.items() if one is not None}
    return Junctions(
        rise=Junction(**{name: one.rise for name, one in known.items()}),
        fall=Junction(**{name: one.fall for name, one in known.items()}),
    )


def _given(table: Settings, key: str) -> _Given | None:
    """Return the value of a key for both edges, None where a file does not say it."""
    both = table.optional_number(key)
    apart = {f"{key}_{edge}": table.optional_number(f"{key}_{edge}") for edge in _EDGES}
    some = [name for name, value in apart.items() if value is not None]
    if both is not None and some:
        raise table.error(
            some[0], f"{some[0]} comes with {key}, which is for both edges", "given-twice"
        )
    rise, fall = apart.values()
    if rise is not None and fall is not None:
        return _Given(some[0], rise, fall)
    if some:
        other = next(name for name in apart if name not in some)
        raise table.error(some[0], f"{some[0]} comes without {other}; give both", "half-given")
    return None if both is None else _Given(key, both, both)


def junction_values(junctions: Junctions) -> Iterator[tuple[str, float]]:
    """Yield key and value of everything that `read_junctions` needs to make the same."""
    for name, (key, _, _) in _KEYS.items():
        rise, fall = (getattr(junctions, edge) for edge in _EDGES)
        if getattr(rise, name) == getattr(fall, name):
            if name in _NEEDED or getattr(rise, name):
                yield key, getattr(rise, name)
        else:
            yield from (
                (f"{key}_{edge}", getattr(one, name))
                for edge, one in zip(_EDGES, (rise, fall), strict=True)
            )
