"""Where two nets of one piece of copper meet. In: copper, labels and what names its parts; out: a place in mm and a copper layer."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
import shapely
from numpy.typing import NDArray
from scipy.sparse import coo_array, csr_array
from scipy.sparse.csgraph import breadth_first_order, connected_components

from impcheck.copper.copper import Copper
from impcheck.nets.evidence import ON_COPPER, Evidence, Finder

Node = tuple[int, int]  # (layer, piece), or (-1, barrel)
Spot = tuple[tuple[float, float], int | None]  # place in mm, copper layer (None: a barrel)
LARGEST = 50_000  # pieces of one label that are searched
TRIALS = 3_000  # parts taken out on trial, over all searches of a board, to see whether the two nets then fall apart


@dataclass(frozen=True)
class Graph:
    """Which pieces and barrels of one label touch."""

    nodes: tuple[Node, ...]
    index: dict[Node, int]
    edges: NDArray[np.int64]  # (m, 2) indices into nodes, the lower first


class Meetings:
    """Finds where nets meet, with a bound on the work for one board."""

    def __init__(self, copper: Copper, finder: Finder, evidence: Evidence) -> None:
        self.copper, self.finder, self.evidence = copper, finder, evidence
        self._graphs: dict[int, Graph] = {}
        self._trials = TRIALS

    def named_nodes(self, label: int, name: str) -> set[Node]:
        """Pieces and barrels of a label that an attribute, or a pin or netlist point on them, gives a name."""
        nodes: set[Node] = set()
        for layer, (labels, (net, names)) in enumerate(zip(self.finder.piece_label, self.evidence.piece_names, strict=True)):
            wanted = [index for index, found in enumerate(names) if name in found]
            nodes.update((layer, piece) for piece in np.flatnonzero((labels == label) & np.isin(net, wanted)).tolist())
        for at, on in self.evidence.places.get((label, name), ()):
            nodes.update(self._nodes_at(label, at, on))
        return nodes

    def _nodes_at(self, label: int, at: tuple[float, float], layer: int | None) -> list[Node]:
        if layer is None:
            barrel = int(self.finder.barrel_at(np.array([at]))[0])
            return [(-1, barrel)] if barrel >= 0 and self.finder.barrel_label[barrel] == label else []
        pieces = self.finder.tree(layer).query(shapely.Point(at), predicate="dwithin", distance=ON_COPPER)
        return [(layer, piece) for piece in sorted(pieces.tolist()) if self.finder.piece_label[layer][piece] == label]

    def graph(self, label: int) -> Graph:
        """Which pieces and barrels of one label touch."""
        if label not in self._graphs:
            self._graphs[label] = self._build(label)
        return self._graphs[label]

    def _build(self, label: int) -> Graph:
        everything = self.copper.barrels
        barrels = np.flatnonzero(self.finder.barrel_label == label)
        nodes: list[Node] = [(-1, barrel) for barrel in barrels.tolist()]
        edges = [np.empty((0, 2), np.int64)]
        axes = np.array([_axis(everything.start[b], everything.end[b]) for b in barrels.tolist()], object)
        for layer, labels in enumerate(self.finder.piece_label):
            mine = np.flatnonzero(labels == label)
            if len(mine) == 0:
                continue
            offset = len(nodes)
            nodes.extend((layer, piece) for piece in mine.tolist())
            shape = self.copper.layers[layer].shape[mine]
            tree = shapely.STRtree(shape)
            pairs = tree.query(shape, predicate="dwithin", distance=ON_COPPER).T
            edges.append(pairs[pairs[:, 0] < pairs[:, 1]] + offset)
            here = np.flatnonzero((everything.first[barrels] <= layer) & (everything.last[barrels] >= layer))
            if len(here):
                reach = everything.diameter[barrels[here]] / 2 + ON_COPPER
                which, piece = tree.query(axes[here], predicate="dwithin", distance=reach)
                edges.append(np.column_stack([here[which], piece + offset]))
        return Graph(tuple(nodes), {node: index for index, node in enumerate(nodes)}, np.concatenate(edges))

    def meeting(self, label: int, one: str, other: str) -> Spot | None:
        """Where two nets of one label meet; None where it cannot be told.

        It is where a piece of the one touches a piece of the other; else the one piece, or the one contact, without which each net holds
        together by itself and the two are apart.
        """
        first, second = self.named_nodes(label, one), self.named_nodes(label, other)
        size = sum(int(np.count_nonzero(labels == label)) for labels in self.finder.piece_label)
        if not first or not second or size > LARGEST:
            return None
        if first & second:
            return self._shared(label, (one, other), min(first & second))
        graph = self.graph(label)
        sides = np.zeros(len(graph.nodes), np.int8)
        sides[[graph.index[node] for node in first]] = 1
        sides[[graph.index[node] for node in second]] = 2
        path = _shortest(graph, sides)
        if len(path) < 2:
            return None
        return self._contact(graph, path[0], path[1]) if len(path) == 2 else self._narrowest(graph, sides, path)

    def _shared(self, label: int, names: tuple[str, str], node: Node) -> Spot:
        for name in reversed(names):  # a point of one net on a plane of the other: there, not in the middle of the plane
            for at, layer in self.evidence.places.get((label, name), ()):
                if node in self._nodes_at(label, at, layer):
                    return at, layer
        return self.place(node)

    def _narrowest(self, graph: Graph, sides: NDArray[np.int8], path: list[int]) -> Spot | None:
        inner = path[1:-1]
        if len(path) + len(inner) > self._trials:
            return None
        self._trials -= len(path) + len(inner)
        nodes = [node for node in inner if _parts_nets(graph, sides, node=node)]
        if nodes:
            return self._bridge(graph, sides, nodes[len(nodes) // 2])
        edges = [pair for pair in pairwise(path) if _parts_nets(graph, sides, edge=pair)]
        if edges:
            return self._contact(graph, *edges[len(edges) // 2])
        return None

    def _bridge(self, graph: Graph, sides: NDArray[np.int8], node: int) -> Spot:
        at, layer = self.place(graph.nodes[node])
        if layer is not None:
            return at, layer
        beside = np.concatenate([graph.edges[graph.edges[:, 0] == node, 1], graph.edges[graph.edges[:, 1] == node, 0]])
        named = [beside[sides[beside] == side] for side in (1, 2)]
        fewer = min((group for group in named if len(group)), key=len, default=beside)
        return at, graph.nodes[int(fewer[0])][0]  # a barrel joins its own net on several layers, the other on the layer of the defect

    def place(self, node: Node) -> Spot:
        """A point on a piece or barrel."""
        layer, piece = node
        if layer < 0:
            x, y = ((self.copper.barrels.start[piece] + self.copper.barrels.end[piece]) / 2).tolist()
            return (x, y), None
        shape = self.copper.layers[layer].shape[piece]
        middle = shape.centroid if shape.contains(shape.centroid) else shape.point_on_surface()
        return (middle.x, middle.y), layer

    def _contact(self, graph: Graph, one: int, other: int) -> Spot:
        """The middle of where two pieces overlap, or come nearest."""
        (layer, piece), (other_layer, other_piece) = graph.nodes[one], graph.nodes[other]
        if layer < 0 or other_layer < 0:
            barrel = graph.nodes[one] if layer < 0 else graph.nodes[other]
            return self.place(barrel)[0], max(layer, other_layer)
        a, b = self.copper.layers[layer].shape[piece], self.copper.layers[other_layer].shape[other_piece]
        shared = shapely.intersection(a, b)
        middle = shapely.shortest_line(a, b).centroid if shared.is_empty else shared.centroid
        return (middle.x, middle.y), layer


def _axis(start: NDArray[np.float64], end: NDArray[np.float64]) -> shapely.Point | shapely.LineString:
    return shapely.Point(start) if (start == end).all() else shapely.LineString([start, end])


def _matrix(edges: NDArray[np.int64], count: int) -> csr_array:
    return csr_array(coo_array((np.ones(len(edges)), (edges[:, 0], edges[:, 1])), shape=(count, count)))


def _shortest(graph: Graph, sides: NDArray[np.int8]) -> list[int]:
    """Nodes from one of side 1 to one of side 2, the fewest; only the ends are of a side."""
    count = len(graph.nodes)
    start = np.flatnonzero(sides == 1)
    edges = np.concatenate([graph.edges, np.column_stack([np.full(len(start), count), start])])
    order, before = breadth_first_order(_matrix(edges, count + 1), count, directed=False)
    reached = order[np.flatnonzero(np.append(sides, 0)[order] == 2)[:1]]
    path: list[int] = []
    node = int(reached[0]) if len(reached) else count
    while node != count:
        path.append(node)
        node = int(before[node])
    return path[::-1]


def _parts_nets(graph: Graph, sides: NDArray[np.int8], node: int = -1, edge: tuple[int, int] = (-1, -1)) -> bool:
    """True where each side stays in one piece without a node, or without an edge, and the two sides are apart."""
    e = graph.edges
    keep = (e != node).all(axis=1) & ~((e[:, 0] == min(edge)) & (e[:, 1] == max(edge)))
    labels = connected_components(_matrix(e[keep], len(graph.nodes)), directed=False)[1]
    left = np.arange(len(sides)) != node
    one, other = np.unique(labels[(sides == 1) & left]), np.unique(labels[(sides == 2) & left])
    return len(one) == 1 and len(other) == 1 and one[0] != other[0]
