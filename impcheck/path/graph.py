"""The centreline graph of all declared nets. In: copper and nets; out: nodes, edges, pads and pins joined to them, mm."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable
from dataclasses import dataclass, field

import numpy as np
import shapely
from numpy.typing import NDArray
from scipy.spatial import cKDTree

from impcheck.artwork.image import Floats, Ints
from impcheck.copper.copper import Copper
from impcheck.nets.nets import BoardPin, Nets
from impcheck.path.noding import TOLERANCE, Noded, node_strands
from impcheck.path.strands import Pads, Strands, gather, groups_of, strands_of

OVERLAP = 0.001  # mm, copper this close is one piece (as in the nets)
NEAR_COPPER = 0.05  # mm, a pin this far beside copper still means it


@dataclass(frozen=True)
class Graph:
    """Nodes and edges of all groups of declared nets; the groups are not connected with each other."""

    group: list[int]  # of each declared net
    owner: NDArray[np.int64]  # (labels + 1,) group that carries each label, -1 none
    noded: Noded
    pads: Pads
    pad_node: NDArray[np.int64]  # (pads,)
    pin_nodes: dict[BoardPin, tuple[int, ...]]
    neighbours: dict[int, list[tuple[int, int]]] = field(repr=False)  # node -> (node, edge); a barrel's step has edge -1 - barrel
    pads_at: dict[int, list[int]] = field(repr=False)  # node -> pads centred there
    pins_at: dict[int, list[BoardPin]] = field(repr=False)


def build_graph(copper: Copper, nets: Nets) -> Graph:
    """Centreline graph of all declared nets at once."""
    group, owner = groups_of(nets)
    strands, pads = gather(copper, nets)
    pins = [pin for pin in dict.fromkeys(_pins(nets)) if owner[pin.label] >= 0]
    strands = Strands.join([strands, _pad_links(strands, pads)])
    pad_marks = np.array(pads.centre).reshape(-1, 2), np.array(pads.net, dtype=np.int32), np.array(pads.layer, dtype=np.int32)
    pad_of_pin, extra = _place_pins(pins, owner, strands, pads, len(copper.layers))
    marks = (
        np.concatenate([pad_marks[0], np.array([e[0] for e in extra]).reshape(-1, 2)]),
        np.concatenate([pad_marks[1], np.array([e[1] for e in extra], dtype=np.int32)]),
        np.concatenate([pad_marks[2], np.array([e[2] for e in extra], dtype=np.int32)]),
    )
    noded = node_strands(strands, *marks)
    for _ in range(4):
        bridges = _bridges(strands, pads, noded)
        if not len(bridges):
            break
        strands = Strands.join([strands, bridges])
        noded = node_strands(strands, *marks)
    pad_node = noded.marks[: len(pads)]
    pin_nodes: dict[BoardPin, tuple[int, ...]] = {}
    for index, pin in enumerate(pins):
        nodes = [int(pad_node[p]) for p in pad_of_pin[index]]
        nodes += [int(noded.marks[len(pads) + k]) for k, entry in enumerate(extra) if entry[3] == index]
        pin_nodes[pin] = tuple(dict.fromkeys(nodes))
    return _finish((group, owner), noded, pads, pad_node, pin_nodes)


def _finish(
    groups: tuple[list[int], NDArray[np.int64]],
    noded: Noded,
    pads: Pads,
    pad_node: NDArray[np.int64],
    pin_nodes: dict[BoardPin, tuple[int, ...]],
) -> Graph:
    neighbours: dict[int, list[tuple[int, int]]] = defaultdict(list)
    for edge, (a, b) in enumerate(noded.ends.tolist()):
        neighbours[a].append((b, edge))
        neighbours[b].append((a, edge))
    pads_at: dict[int, list[int]] = defaultdict(list)
    for pad, node in enumerate(pad_node.tolist()):
        pads_at[node].append(pad)
    for pad in range(len(pads) - 1):
        if pads.barrel[pad] >= 0 and pads.barrel[pad] == pads.barrel[pad + 1]:
            a, b = int(pad_node[pad]), int(pad_node[pad + 1])
            neighbours[a].append((b, -1 - pads.barrel[pad]))
            neighbours[b].append((a, -1 - pads.barrel[pad]))
    pins_at: dict[int, list[BoardPin]] = defaultdict(list)
    for pin, nodes in pin_nodes.items():
        for node in nodes:
            pins_at[node].append(pin)
    return Graph(*groups, noded, pads, pad_node, pin_nodes, dict(neighbours), dict(pads_at), dict(pins_at))


def _pins(nets: Nets) -> Iterable[BoardPin]:
    for net in nets.declared:
        yield from net.begin
        yield from net.ends
        for join in net.joins:
            yield from join.pins
    yield from nets.pins


def _pad_links(strands: Strands, pads: Pads) -> Strands:
    """Links from the centre of each pad to every strand in it that no nearer strand already leads to."""
    nothing = strands_of(0, 0, np.empty((0, 2)), np.empty((0, 2)), 0.0)
    if not len(strands) or not len(pads):
        return nothing
    net, layer = np.array(pads.net), np.array(pads.layer)
    pad, strand = shapely.STRtree(strands.lines()).query(np.array(pads.shape, dtype=object), predicate="intersects")
    keep = (net[pad] == strands.net[strand]) & (layer[pad] == strands.layer[strand])
    pad, strand = pad[keep], strand[keep]
    centre = np.array(pads.centre)[pad]
    vector = strands.end[strand] - strands.start[strand]
    share = np.einsum("ij,ij->i", centre - strands.start[strand], vector) / np.maximum(np.einsum("ij,ij->i", vector, vector), 1e-18)
    foot = strands.start[strand] + np.clip(share, 0.0, 1.0)[:, None] * vector
    distance = np.hypot(*(foot - centre).T)
    order = np.lexsort((distance, pad))
    links: list[tuple[int, int, Floats, Floats, float]] = []
    for members in np.split(order, np.flatnonzero(np.diff(pad[order])) + 1):
        reached: list[Floats] = []
        for entry in members.tolist():
            ends = np.stack([strands.start[strand[entry]], strands.end[strand[entry]]])
            known = any(bool((np.abs(ends - other[:, None, :]).max(axis=2) <= TOLERANCE).any()) for other in reached)
            if distance[entry] > TOLERANCE and not known:
                index = int(pad[entry])
                links.append((pads.net[index], pads.layer[index], centre[entry], foot[entry], float(strands.width[strand[entry]])))
            reached.append(ends)
    if not links:
        return nothing
    return Strands(
        np.array([item[0] for item in links], dtype=np.int32),
        np.array([item[1] for item in links], dtype=np.int32),
        np.array([item[2] for item in links]),
        np.array([item[3] for item in links]),
        np.array([item[4] for item in links]),
        np.ones(len(links), dtype=np.bool_),
    )


def _place_pins(
    pins: list[BoardPin], owner: NDArray[np.int64], strands: Strands, pads: Pads, layers: int
) -> tuple[list[list[int]], list[tuple[tuple[float, float], int, int, int]]]:
    """For each pin the pads it lies on; and marks (place, net, layer, pin) on the nearest strand for those that lie on none."""
    net_of_pin = np.array([int(owner[pin.label]) if 0 <= pin.label < len(owner) else -1 for pin in pins], dtype=np.int64)
    pad_of_pin: list[list[int]] = [[] for _ in pins]
    if not pins:
        return pad_of_pin, []
    points = np.asarray(shapely.points(np.array([pin.at for pin in pins])), dtype=object)
    if len(pads):
        hit, pad = shapely.STRtree(np.array(pads.shape, dtype=object)).query(points, predicate="dwithin", distance=NEAR_COPPER)
        for index, member in zip(hit.tolist(), pad.tolist(), strict=True):
            pin = pins[index]
            if pads.net[member] == net_of_pin[index] and pin.layer in (None, pads.layer[member]):
                pad_of_pin[index].append(member)
    for index, members in enumerate(pad_of_pin):
        if len(members) > 1:
            at = np.array(pins[index].at)
            rank = {
                m: (pads.shape[m].distance(points[index]) > OVERLAP, float(np.hypot(*(np.array(pads.centre[m]) - at)))) for m in members
            }
            nearest = min(rank.values())
            pad_of_pin[index] = [m for m in members if (pins[index].layer is None and pads.barrel[m] >= 0) or rank[m] == nearest]
    extra: list[tuple[tuple[float, float], int, int, int]] = []
    lost = [i for i in range(len(pins)) if not pad_of_pin[i] and net_of_pin[i] >= 0]
    if lost and len(strands):
        reach = float(strands.width.max()) / 2 + NEAR_COPPER
        hit, strand = shapely.STRtree(strands.lines()).query(points[lost], predicate="dwithin", distance=reach)
        best: dict[int, tuple[float, int]] = {}
        for position, member in zip(hit.tolist(), strand.tolist(), strict=True):
            index = lost[position]
            pin = pins[index]
            if strands.net[member] != net_of_pin[index] or pin.layer not in (None, int(strands.layer[member])):
                continue
            away = shapely.LineString([strands.start[member], strands.end[member]]).distance(points[index])
            if away <= strands.width[member] / 2 + NEAR_COPPER:
                best[index] = min(best.get(index, (np.inf, -1)), (away, member))
        for index, (_, member) in sorted(best.items()):
            line = shapely.LineString([strands.start[member], strands.end[member]])
            foot = line.interpolate(line.project(points[index]))
            extra.append(((foot.x, foot.y), int(net_of_pin[index]), int(strands.layer[member]), index))
    return pad_of_pin, extra


def _bridges(strands: Strands, pads: Pads, noded: Noded) -> Strands:
    """Links between copper of one net and layer that overlaps but whose centrelines do not meet."""
    component = noded.components()
    item_net = np.concatenate([strands.net, np.array(pads.net, dtype=np.int32)])
    item_layer = np.concatenate([strands.layer, np.array(pads.layer, dtype=np.int32)])
    key = item_net.astype(np.int64) * 1000 + item_layer
    node_key = noded.net.astype(np.int64) * 1000 + noded.layer
    split = _split_keys(node_key, component)
    found: list[Strands] = [strands_of(0, 0, np.empty((0, 2)), np.empty((0, 2)), 0.0)]
    lines = strands.lines() if len(strands) else np.empty(0, dtype=object)
    shapes = np.concatenate([lines, np.array(pads.shape, dtype=object)])
    centrelines = np.concatenate([lines, shapely.points(np.array(pads.centre).reshape(-1, 2))])
    radius = np.concatenate([strands.width / 2, np.zeros(len(pads))])
    start_component = _component_of(strands, pads, noded, component)
    for k in sorted(split):
        members = np.flatnonzero(key == k)
        a, b = shapely.STRtree(shapes[members]).query(
            shapes[members], predicate="dwithin", distance=2 * float(radius[members].max()) + OVERLAP
        )
        a, b = members[a], members[b]
        keep = (a < b) & (start_component[a] != start_component[b])
        a, b = a[keep], b[keep]
        touching = shapely.distance(shapes[a], shapes[b]) <= radius[a] + radius[b] + OVERLAP
        a, b = a[touching], b[touching]
        distance = shapely.distance(centrelines[a], centrelines[b])
        joined: dict[int, int] = {}

        def root(c: int, joined: dict[int, int] = joined) -> int:
            while c in joined:
                c = joined[c]
            return c

        for index in np.argsort(distance, kind="stable").tolist():
            u, v = root(int(start_component[a[index]])), root(int(start_component[b[index]]))
            if u == v:
                continue
            joined[u] = v
            ends = shapely.get_coordinates(shapely.shortest_line(centrelines[a[index]], centrelines[b[index]]))
            widths = [strands.width[i] for i in (a[index], b[index]) if i < len(strands)]
            net, layer = divmod(k, 1000)
            found.append(strands_of(net, layer, ends[:1], ends[1:], float(min(widths)) if widths else 0.0, link=True))
    return Strands.join(found)


def _split_keys(node_key: Ints, component: NDArray[np.int64]) -> set[int]:
    pairs = np.unique(np.stack([node_key, component], axis=1), axis=0)
    keys, count = np.unique(pairs[:, 0], return_counts=True)
    return set(keys[count > 1].tolist())


def _component_of(strands: Strands, pads: Pads, noded: Noded, component: NDArray[np.int64]) -> NDArray[np.int64]:
    """Component of the copper each strand and pad stands for: that of the nearest node."""
    result = np.full(len(strands) + len(pads), -1, dtype=np.int64)
    key = noded.net.astype(np.float64) * 1000 + noded.layer
    tree = cKDTree(np.column_stack([noded.place, key * 1e3]))
    if len(strands):
        where = np.column_stack([strands.start, (strands.net.astype(np.float64) * 1000 + strands.layer) * 1e3])
        result[: len(strands)] = component[tree.query(where)[1]]
    result[len(strands) :] = component[noded.marks[: len(pads)]]
    return result
