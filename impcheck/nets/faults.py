"""Opens and shorts of the whole board. In: labels and what each source names them; out: faults with a place in mm and a sentence."""

from __future__ import annotations

import math
from collections import Counter, defaultdict

import networkx as nx
import numpy as np
import shapely

from impcheck.artwork.image import Ints
from impcheck.artwork.names import natural
from impcheck.copper.copper import Copper
from impcheck.nets.evidence import ON_COPPER, Evidence
from impcheck.nets.nets import BoardPin, NetFault

Node = tuple[int, int]  # (layer, piece), or (-1, barrel)
LARGEST = 20_000  # pieces of one short that are searched for the place where the nets meet


def find_faults(copper: Copper, piece_label: tuple[Ints, ...], barrel_label: Ints, evidence: Evidence, declared: set[str]) -> list[NetFault]:
    """Every short and every open, those of declared nets first, then by name."""
    search = _Search(copper, piece_label, barrel_label, evidence)
    found = [*_shorts(search, declared), *_opens(search, declared)]
    return sorted(found, key=lambda fault: (not fault.declared, fault.kind, [natural(name) for name in fault.nets], fault.at))


class _Search:
    """What the search for places needs."""

    def __init__(self, copper: Copper, piece_label: tuple[Ints, ...], barrel_label: Ints, evidence: Evidence) -> None:
        self.copper, self.piece_label, self.barrel_label, self.evidence = copper, piece_label, barrel_label, evidence
        self.pins: dict[tuple[int, str], list[BoardPin]] = defaultdict(list)
        for pin in evidence.pins:
            self.pins[pin.label, pin.net].append(pin)

    def named_pieces(self, label: int, name: str) -> set[Node]:
        """Pieces of a label that an attribute, or a pin or netlist point on them, gives a name."""
        nodes: set[Node] = set()
        for layer, (labels, (net, names)) in enumerate(zip(self.piece_label, self.evidence.piece_names, strict=True)):
            wanted = [index for index, found in enumerate(names) if found == name]
            nodes.update((layer, piece) for piece in np.flatnonzero((labels == label) & np.isin(net, wanted)).tolist())
        for pin in self.pins[label, name]:
            for layer in range(len(self.piece_label)) if pin.layer is None else (pin.layer,):
                mine = np.flatnonzero(self.piece_label[layer] == label)
                near = shapely.dwithin(self.copper.layers[layer].shape[mine], shapely.Point(pin.at), ON_COPPER)
                nodes.update((layer, piece) for piece in mine[near].tolist())
        return nodes

    def graph(self, label: int) -> nx.Graph[Node]:
        """Which pieces and barrels of one label touch."""
        graph: nx.Graph[Node] = nx.Graph()
        barrels = np.flatnonzero(self.barrel_label == label)
        for layer, labels in enumerate(self.piece_label):
            mine = np.flatnonzero(labels == label)
            shape = self.copper.layers[layer].shape[mine]
            graph.add_nodes_from((layer, piece) for piece in mine.tolist())
            if len(mine) == 0:
                continue
            tree = shapely.STRtree(shape)
            a, b = tree.query(shape, predicate="dwithin", distance=ON_COPPER)
            graph.add_edges_from(((layer, x), (layer, y)) for x, y in zip(mine[a[a < b]].tolist(), mine[b[a < b]].tolist(), strict=True))
            for barrel in barrels.tolist():
                everything = self.copper.barrels
                if not everything.first[barrel] <= layer <= everything.last[barrel]:
                    continue
                axis = shapely.linestrings([everything.start[barrel], everything.end[barrel] + (0.0, 1e-9)])
                touched = tree.query(axis, predicate="dwithin", distance=everything.diameter[barrel] / 2 + ON_COPPER)
                graph.add_edges_from(((-1, barrel), (layer, piece)) for piece in mine[touched].tolist())
        return graph

    def meeting(self, label: int, one: str, other: str) -> tuple[tuple[float, float], int | None] | None:
        """Where two nets of one label meet: the touching pair of their pieces, else the one piece that alone joins them; None when it
        cannot be told."""
        first, second = self.named_pieces(label, one), self.named_pieces(label, other)
        size = sum(int(np.count_nonzero(labels == label)) for labels in self.piece_label)
        if not first or not second or size > LARGEST:
            return None
        both = first & second
        if both:
            return self.place(min(both))
        graph = self.graph(label)
        touching = sorted((a, b) for a, b in graph.edges if (a in first and b in second) or (a in second and b in first))
        if touching:
            return self.contact(*touching[0])
        bridge = [node for node in graph if node not in first and node not in second]
        for node in sorted(bridge):
            if node[0] < 0:
                continue
            rest = nx.restricted_view(graph, [node], [])
            reached: set[Node] = set()
            for start in first:
                if start not in reached:
                    reached |= nx.node_connected_component(rest, start)
            if not reached & second:
                return self.place(node)
        return None

    def place(self, node: Node) -> tuple[tuple[float, float], int | None]:
        """A point on a piece."""
        layer, piece = node
        if layer < 0:
            x, y = ((self.copper.barrels.start[piece] + self.copper.barrels.end[piece]) / 2).tolist()
            return (x, y), None
        shape = self.copper.layers[layer].shape[piece]
        middle = shape.centroid if shape.contains(shape.centroid) else shape.point_on_surface()
        return (middle.x, middle.y), layer

    def contact(self, one: Node, other: Node) -> tuple[tuple[float, float], int | None]:
        """The middle of where two pieces overlap or come nearest."""
        if one[0] < 0 or other[0] < 0:
            return self.place(one if one[0] < 0 else other)
        a, b = (self.copper.layers[layer].shape[piece] for layer, piece in (one, other))
        shared = shapely.intersection(a, b)
        middle = shared.centroid if not shared.is_empty else shapely.shortest_line(a, b).centroid
        return (middle.x, middle.y), one[0]


def _shorts(search: _Search, declared: set[str]) -> list[NetFault]:
    found: list[NetFault] = []
    evidence = search.evidence
    told: set[tuple[int, frozenset[str]]] = set()
    for names_of in (evidence.attribute_names, evidence.netlist_names):
        for label, counted in sorted(names_of.items()):
            names = sorted(counted, key=lambda name: (-counted[name], natural(name)))
            for other in names[1:]:
                pair = frozenset((names[0], other))
                if (label, pair) not in told:
                    told.add((label, pair))
                    found.append(_short(search, label, names[0], other, declared))
    found.extend(_renamed(search, declared, told))
    return found


def _short(search: _Search, label: int, one: str, other: str, declared: set[str]) -> NetFault:
    tie = frozenset((one, other)) in search.evidence.ties or _tied_by_a_part(search, label, one, other)
    where = search.meeting(label, one, other)
    names = tuple(sorted((one, other), key=natural))
    if where is None:
        pins = search.pins[label, other] or search.pins[label, one]
        at, layer = (pins[0].at, pins[0].layer) if pins else ((0.0, 0.0), None)
        told = f"nets {names[0]} and {names[1]} are one piece of copper; where they meet cannot be told, this is a pin of one of them"
    else:
        at, layer = where
        told = f"nets {names[0]} and {names[1]} are one piece of copper: they meet here"
    if tie:
        told += ", at a net tie (one part whose pads of the two nets are one copper)"
    return NetFault("short", names, bool(declared & set(names)), tie, at, layer, told)


def _tied_by_a_part(search: _Search, label: int, one: str, other: str) -> bool:
    """True where one two-pin part has a pin of each net on this copper and those two pads touch."""
    pins = [pin for pin in search.evidence.pins if pin.component]
    count = Counter(component for component, _ in {(pin.component, pin.number) for pin in pins})
    firsts = {pin.component: pin for pin in search.pins[label, one]}
    seconds = {pin.component: pin for pin in search.pins[label, other]}
    for component in firsts.keys() & seconds.keys():
        if count[component] != 2:
            continue
        a, b = firsts[component], seconds[component]
        if a.layer is None or a.layer != b.layer:
            continue
        layer = search.copper.layers[a.layer]
        mine = np.flatnonzero(search.piece_label[a.layer] == label)
        at_a, at_b = (mine[shapely.dwithin(layer.shape[mine], shapely.Point(pin.at), ON_COPPER)] for pin in (a, b))
        if len(at_a) and len(at_b) and np.any(shapely.dwithin(layer.shape[at_a][:, None], layer.shape[at_b][None, :], ON_COPPER)):
            return True
    return False


def _renamed(search: _Search, declared: set[str], told: set[tuple[int, frozenset[str]]]) -> list[NetFault]:
    """Copper that the artwork and the netlist call by different names, where it is more than a renaming: one of the names stands elsewhere too."""
    attributes, netlist = search.evidence.attribute_names, search.evidence.netlist_names
    elsewhere: dict[str, set[int]] = defaultdict(set)
    for source in (attributes, netlist):
        for label, names in source.items():
            for name in names:
                elsewhere[name].add(label)
    found = []
    for label in sorted(attributes.keys() & netlist.keys()):
        one, other = (min(names, key=lambda n, c=names: (-c[n], natural(n))) for names in (attributes[label], netlist[label]))
        if one in netlist[label] or other in attributes[label] or (label, frozenset((one, other))) in told:
            continue
        if len(elsewhere[one]) > 1 or len(elsewhere[other]) > 1:
            pins = search.pins[label, other] or search.pins[label, one]
            at, layer = (pins[0].at, pins[0].layer) if pins else ((0.0, 0.0), None)
            names = tuple(sorted((one, other), key=natural))
            text = f"the netlist calls this copper {other}, the artwork's attributes call it {one}, and one of the two names stands on other copper as well"
            found.append(NetFault("short", names, bool(declared & set(names)), False, at, layer, text))
    return found


def _opens(search: _Search, declared: set[str]) -> list[NetFault]:
    labels_of: dict[str, list[int]] = defaultdict(list)
    for name, label in sorted(search.evidence.anchored, key=lambda found: (natural(found[0]), found[1])):
        labels_of[name].append(label)
    found = []
    for name, labels in labels_of.items():
        if len(labels) < 2:
            continue
        weight = {label: search.evidence.attribute_names[label][name] + search.evidence.netlist_names[label][name] for label in labels}
        main = max(labels, key=lambda label: (weight[label], -label))
        places = [(label, *_place_of(search, label, name)) for label in labels if label != main]
        _, at, layer, what = min(places, key=lambda place: (place[1], place[0]))
        more = "" if len(places) == 1 else f" ({len(places) + 1} separate pieces in all)"
        gap = _nearest(search, main, name, at)
        apart = "" if gap is None else f"; the nearest pin of the rest, {gap[0]}, is {gap[1]:.2f} mm away"
        found.append(NetFault("open", (name,), name in declared, False, at, layer, f"net {name} is not one piece of copper: {what} stands alone{more}{apart}"))
    return found


def _place_of(search: _Search, label: int, name: str) -> tuple[tuple[float, float], int | None, str]:
    pins = sorted(search.pins[label, name], key=lambda pin: (natural(pin.component), natural(pin.number)))
    if pins:
        return pins[0].at, pins[0].layer, ", ".join(str(pin) for pin in pins[:4]) + (", ..." if len(pins) > 4 else "")
    nodes = search.named_pieces(label, name)
    if nodes:
        at, layer = search.place(min(nodes))
        return at, layer, f"copper at ({at[0]:.3f}, {at[1]:.3f})"
    barrels = np.flatnonzero(search.barrel_label == label)
    for layer, labels in enumerate(search.piece_label):
        pieces = np.flatnonzero(labels == label)
        if len(pieces):
            at, _ = search.place((layer, int(pieces[0])))
            return at, layer, f"copper at ({at[0]:.3f}, {at[1]:.3f})"
    at, _ = search.place((-1, int(barrels[0])))
    return at, None, f"a barrel at ({at[0]:.3f}, {at[1]:.3f})"


def _nearest(search: _Search, label: int, name: str, at: tuple[float, float]) -> tuple[str, float] | None:
    pins = search.pins[label, name]
    if not pins:
        return None
    pin = min(pins, key=lambda p: math.dist(p.at, at))
    return str(pin), math.dist(pin.at, at)
