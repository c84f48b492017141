"""What hangs on what in a site: circuits on busbars, loads whose figure is not known on the branches above them."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Iterator, Mapping, Sequence
from functools import cached_property

from rules.calc.forest import Integers
from rules.index import Index
from rules.record import Source
from rules.wiring import Wiring


class Hanging:
    """Circuits, sources and boards by the nodes that they hang on, each put together when it is first asked for."""

    def __init__(self, wiring: Wiring, root: Integers) -> None:
        self._wiring, self._root = wiring, root

    @cached_property
    def circuits_at(self) -> Mapping[int, list[str]]:
        """Ids of the circuits whose ``bus`` each node is."""
        found: dict[int, list[str]] = defaultdict(list)
        for circuit_id, nodes in self._wiring.nodes_of.items():
            found[nodes["bus"]].append(circuit_id)
        return dict(found)

    @cached_property
    def rows_at(self) -> Mapping[int, list[tuple[str, str]]]:
        """Table and id of the sources and boards whose busbar each node is."""
        found: dict[int, list[tuple[str, str]]] = defaultdict(list)
        for row, node in self._wiring.node_of.items():
            found[node].append(row)
        return dict(found)

    @cached_property
    def circuits_below(self) -> Mapping[int, list[str]]:
        """Ids of the circuits that hang on each held node, whatever lies between."""
        found: dict[int, list[str]] = defaultdict(list)
        for circuit_id, nodes in self._wiring.nodes_of.items():
            found[int(self._root[nodes["bus"]])].append(circuit_id)
        return dict(found)


def unknown_converters(wiring: Wiring, index: Index) -> None:
    """Mark as unknown what a converter draws where its efficiency, or a load behind it, is not known."""
    takes, unknown = wiring.takes, wiring.unknown
    converters = [source for source in index.site.sources if source.id in takes]
    behind = {source.id for node in unknown for source in _above(wiring, node)} if converters else set()
    for _ in range(len(takes)):
        for source in converters:
            if takes[source.id] in unknown:
                continue
            if source.efficiency_percent is None or source.working_or_nominal_v is None or source.id in behind:
                unknown[takes[source.id]] = source.tag
                behind |= {one.id for one in _above(wiring, takes[source.id])}
                break
        else:
            return


def _above(wiring: Wiring, node: int) -> Sequence[Source]:
    """The sources that hold the busbar which a node hangs on."""
    *_, held = _up(wiring, node)
    return wiring.sources.get(held, ())


def unknown_below(wiring: Wiring, meshes: Iterable[tuple[list[int], list[int]]]) -> dict[int, str]:
    """By branch: one load beneath it whose figure is not known; in a mesh, beneath any of its branches."""
    below: dict[int, str] = {}
    for node, name in wiring.unknown.items():
        for branch in _up(wiring, node):
            if branch in below:
                break
            below[branch] = name
    for branches, _ in meshes:
        name = next((below[branch] for branch in branches if branch in below), "")
        for branch in branches if name else ():
            below.setdefault(branch, name)
    return below


def _up(wiring: Wiring, node: int) -> Iterator[int]:
    """A node and those above it, up to the one that is held."""
    while node >= 0:
        yield node
        node = wiring.parent[node]
