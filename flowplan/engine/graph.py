"""The alignment graph: which chain of readings connects two layers."""

from dataclasses import dataclass
from typing import Any

import networkx as nx

from flowplan.model.base import AXES, WAFER, Axis
from flowplan.model.flow import Flow
from flowplan.model.masks import SelfAligned


@dataclass(frozen=True, slots=True)
class Chain:
    """The way from one layer to another through the alignment graph.

    Attributes
    ----------
    layers : tuple of str
        From the first layer up to the common reference and down to the second.
    through : str
        The common reference, or ``wafer``.
    one_of_several : bool
        Whether averaged references leave more than one way; the heaviest is given.
    """

    layers: tuple[str, ...]
    through: str
    one_of_several: bool

    def hops(self) -> tuple[tuple[str, str], ...]:
        """Return the hops as (child, reference), along the chain."""
        turn = self.layers.index(self.through)
        up = zip(self.layers[:turn], self.layers[1 : turn + 1], strict=True)
        down = zip(self.layers[turn + 1 :], self.layers[turn:-1], strict=True)
        return (*up, *down)


class AlignmentGraph:
    """Questions about who inherits from whom, each axis on its own."""

    def __init__(self, flow: Flow) -> None:
        self._order = {WAFER: 0} | {name: i + 1 for i, name in enumerate(flow.layers)}
        self._graphs: dict[Axis, nx.DiGraph[Any]] = {axis: _graph(flow, axis) for axis in AXES}
        self._names = tuple(self._order)
        self._references = {axis: _references(graph) for axis, graph in self._graphs.items()}
        self._inherited = {axis: self._ancestor_sets(axis) for axis in AXES}

    def references(self, layer: str, *, axis: Axis) -> tuple[tuple[str, float], ...]:
        """Return the layer's references with their weights, in the order of the file."""
        return self._references[axis][layer]

    def readers(self, layer: str, *, axis: Axis) -> tuple[str, ...]:
        """Return the layers that read or follow this one, in process order."""
        found: list[str] = list(self._graphs[axis].predecessors(layer))
        return tuple(sorted(found, key=self._order.__getitem__))

    def is_averaged(self, layer: str, *, axis: Axis) -> bool:
        """Whether the layer reads more than one reference."""
        return len(self._references[axis][layer]) > 1

    def common_reference(self, *, first: str, second: str, axis: Axis) -> str:
        """Return the latest layer that both derive from; either may be it itself."""
        inherited = self._inherited[axis]
        return self._names[(inherited[first] & inherited[second]).bit_length() - 1]

    def chain(self, *, first: str, second: str, axis: Axis) -> Chain:
        """Return the chain between two layers.

        Parameters
        ----------
        first, second : str
            Layers, or ``wafer``.
        axis : {'x', 'y'}
            Axis of the references.

        Returns
        -------
        Chain
            Up from the first to the common reference and down to the second; with averaged
            references the way of the largest product of weights, the first named on a tie.
        """
        through = self.common_reference(first=first, second=second, axis=axis)
        up = self._heaviest(first, through, axis)
        down = self._heaviest(second, through, axis)
        several = any(self.is_averaged(layer, axis=axis) for layer in (*up[:-1], *down[:-1]))
        return Chain((*up, *reversed(down[:-1])), through, several)

    def _ancestor_sets(self, axis: Axis) -> dict[str, int]:
        """Return for each layer itself and all it inherits from, one bit a layer in process order."""
        found: dict[str, int] = {}
        for name, place in self._order.items():
            found[name] = 1 << place
            for reference in self._graphs[axis].successors(name):
                found[name] |= found[reference]
        return found

    def _heaviest(self, layer: str, top: str, axis: Axis) -> tuple[str, ...]:
        """Return the heaviest way up from a layer to one that it inherits from."""
        way = [layer]
        while way[-1] != top and not self.is_averaged(way[-1], axis=axis):
            way.append(self.references(way[-1], axis=axis)[0][0])
        if way[-1] == top:
            return tuple(way)
        return (*way[:-1], *self._heaviest_of_several(way[-1], top, axis))

    def _heaviest_of_several(self, layer: str, top: str, axis: Axis) -> tuple[str, ...]:
        inherited = self._inherited[axis]
        best: dict[str, tuple[float, tuple[str, ...]]] = {top: (1.0, (top,))}
        for node in self._names[self._order[top] + 1 : self._order[layer] + 1]:
            if not inherited[layer] >> self._order[node] & 1:
                continue
            ways = [
                (weight * best[reference][0], (node, *best[reference][1]))
                for reference, weight in self.references(node, axis=axis)
                if reference in best
            ]
            if ways:
                best[node] = max(ways, key=lambda way: way[0])
        return best[layer][1]


def _references(graph: "nx.DiGraph[Any]") -> dict[str, tuple[tuple[str, float], ...]]:
    return {
        layer: tuple((reference, float(data["weight"])) for reference, data in targets.items())
        for layer, targets in graph.adj.items()
    }


def _graph(flow: Flow, axis: Axis) -> "nx.DiGraph[Any]":
    graph: nx.DiGraph[Any] = nx.DiGraph()
    graph.add_node(WAFER)
    for name, layer in flow.layers.items():
        if isinstance(layer, SelfAligned):
            graph.add_edge(name, layer.follows.on(axis), weight=1.0)
            continue
        for reading, weight in layer.aligns_to.weighted(axis):
            graph.add_edge(name, reading.mask, weight=weight)
    return graph
