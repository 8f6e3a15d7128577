"""The path of one declared net. In: the centreline graph; out: legs between breaks, vias, bridges, side branches, all in mm."""

from __future__ import annotations

import heapq
from collections import defaultdict
from dataclasses import dataclass, field

import numpy as np

from impcheck.artwork.image import Floats
from impcheck.nets.nets import BoardPin, DeclaredNet
from impcheck.path.graph import Graph
from impcheck.path.walk import Bridge, Via

BARREL_STEP = 1e-4  # mm a layer change weighs in the choice of the shortest path; it does not count in `along`
STRAIGHT = 1e-4  # mm, vertices that leave a straight line by less are dropped


@dataclass(frozen=True)
class Leg:
    """Centreline of a run to be: k points on one layer."""

    layer: int
    nodes: tuple[int, int]  # graph nodes at both ends
    line: Floats  # (k, 2)
    width: Floats  # (k - 1,) drawn or mean width of each segment
    link: Floats  # (k - 1,) 1 where the segment was not drawn
    along: float  # path coordinate of the first point


@dataclass
class Route:
    """What was found between the ends of a net."""

    status: str
    reason: str = ""
    legs: list[Leg] = field(default_factory=list)
    vias: list[Via] = field(default_factory=list)
    bridges: list[Bridge] = field(default_factory=list)
    begin: BoardPin | None = None
    ends: list[BoardPin] = field(default_factory=list)
    along: dict[int, float] = field(default_factory=dict)  # tree node -> path coordinate
    parent: dict[int, tuple[int, int]] = field(default_factory=dict)  # tree node -> (node before, edge; barrel < 0)


JOIN_EDGE = 1 << 40  # edges from here on are joins


def find_route(graph: Graph, net: DeclaredNet) -> Route:
    """Shortest paths from the first declared end to all others, as one tree."""
    if not net.begin or not net.ends:
        return Route("unresolved", "the files name no two ends for this net; declare `from` and `to`")
    begin = net.begin[0]
    roots = graph.pin_nodes.get(begin, ())
    if not roots:
        return Route("unresolved", f"no trace leads away from {begin}", begin=begin)
    joins = _join_steps(graph, net)
    along, parent = _shortest(graph, roots, joins)
    reached: list[tuple[BoardPin, int]] = []
    lost: list[BoardPin] = []
    for end in net.ends:
        nodes = [node for node in graph.pin_nodes.get(end, ()) if node in along]
        if nodes:
            reached.append((end, min(nodes, key=lambda node: (along[node], node))))
        else:
            lost.append(end)
    route = Route("walked", begin=begin, ends=[end for end, _ in reached])
    if lost:
        same = [end for end in lost if end.label == begin.label]
        names = ", ".join(map(str, lost))
        if same and len(same) == len(lost):
            route.status, route.reason = "unresolved", f"the copper between {begin} and {names} has no centreline to follow"
        else:
            route.status, route.reason = "open", f"no copper joins {begin} to {names}"
    for _, last in reached:
        node = last
        while node not in route.along:
            route.along[node] = along[node]
            if node not in parent:
                break
            before, edge = parent[node]
            route.parent[node] = (before, edge)
            node = before
    return route


def _join_steps(graph: Graph, net: DeclaredNet) -> dict[int, list[tuple[int, int, float]]]:
    """Steps across two-pin parts: node -> (node, index of the join, distance)."""
    steps: dict[int, list[tuple[int, int, float]]] = defaultdict(list)
    for index, join in enumerate(net.joins):
        one, two = join.pins
        distance = float(np.hypot(one.at[0] - two.at[0], one.at[1] - two.at[1]))
        for a in graph.pin_nodes.get(one, ()):
            for b in graph.pin_nodes.get(two, ()):
                steps[a].append((b, index, distance))
                steps[b].append((a, index, distance))
    return steps


def _shortest(
    graph: Graph, roots: tuple[int, ...], joins: dict[int, list[tuple[int, int, float]]]
) -> tuple[dict[int, float], dict[int, tuple[int, int]]]:
    """Dijkstra's algorithm: path coordinate of every node reached, and the step that leads to it."""
    along: dict[int, float] = {}
    parent: dict[int, tuple[int, int]] = {}
    queue: list[tuple[float, float, int, int, int]] = [(0.0, 0.0, root, -1, 0) for root in sorted(roots)]
    heapq.heapify(queue)
    length = graph.noded.length
    while queue:
        weight, distance, node, before, edge = heapq.heappop(queue)
        if node in along:
            continue
        along[node] = distance
        if before >= 0:
            parent[node] = (before, edge)
        for other, step in graph.neighbours.get(node, ()):
            if other not in along:
                size = float(length[step]) if step >= 0 else 0.0
                heapq.heappush(queue, (weight + (size if step >= 0 else BARREL_STEP), distance + size, other, node, step))
        for other, index, size in joins.get(node, ()):
            if other not in along:
                heapq.heappush(queue, (weight + size, distance + size, other, node, JOIN_EDGE + index))
    return along, parent


def cut_route(graph: Graph, net: DeclaredNet, route: Route, hanging: set[int]) -> None:
    """Cuts the tree into legs, vias and bridges, added to `route`; legs end where nodes `hanging` off the path join it."""
    noded = graph.noded
    children: dict[int, list[tuple[int, int]]] = defaultdict(list)
    for node, (before, edge) in route.parent.items():
        children[before].append((node, edge))
    roots = [node for node in route.along if node not in route.parent]
    stack = [(root, child, edge) for root in reversed(roots) for child, edge in reversed(children.get(root, []))]
    while stack:
        node, child, edge = stack.pop()
        if edge >= JOIN_EDGE:
            route.bridges.append(Bridge(net.joins[edge - JOIN_EDGE].component, (route.along[node], route.along[child])))
        elif edge < 0:
            barrel, top = -1 - edge, node
            while len(children.get(child, [])) == 1 and children[child][0][1] == edge:
                child = children[child][0][0]
            if children.get(child) or not _ends_here(graph, route, child):
                at = noded.place[top]
                route.vias.append(
                    Via(barrel, (float(at[0]), float(at[1])), route.along[top], int(noded.layer[top]), int(noded.layer[child]))
                )
        else:
            path, edges = [node, child], [edge]
            while len(children.get(child, [])) == 1 and not _breaks(graph, hanging, child) and 0 <= children[child][0][1] < JOIN_EDGE:
                child, edge = children[child][0]
                path.append(child)
                edges.append(edge)
            route.legs.append(_leg(graph, path, edges, route.along[node]))
        stack += [(child, other, step) for other, step in reversed(children.get(child, []))]


def _ends_here(graph: Graph, route: Route, node: int) -> bool:
    """True where the node is one of the pins that were looked for: a barrel that is itself the pin is no layer change."""
    return any(pin in route.ends and pin.layer is None for pin in graph.pins_at.get(node, []))


def _breaks(graph: Graph, hanging: set[int], node: int) -> bool:
    """True where a run ends: at a pad, a barrel, or where copper branches off."""
    if graph.pads_at.get(node):
        return True
    return any(other in hanging for other, _ in graph.neighbours[node])


def _leg(graph: Graph, path: list[int], edges: list[int], along: float) -> Leg:
    noded = graph.noded
    points = noded.place[path]
    width, link = noded.width[edges], noded.link[edges].astype(np.float64)
    kept = [0]
    for index in range(1, len(path) - 1):
        chord = points[index + 1] - points[kept[-1]]
        offset = points[index] - points[kept[-1]]
        size = np.hypot(*chord)
        bend = abs(chord[0] * offset[1] - chord[1] * offset[0]) / size if size > 0 else 1.0
        if bend > STRAIGHT or chord @ offset < 0 or width[index] != width[index - 1] or link[index] != link[index - 1]:
            kept.append(index)
    steps = np.array(kept)
    return Leg(int(noded.layer[path[0]]), (path[0], path[-1]), points[[*kept, len(path) - 1]], width[steps], link[steps], along)
