"""Copper that hangs off a path. In: graph and route; out: branches in mm, and the directions in which copper leaves the path."""

from __future__ import annotations

import heapq
from itertools import pairwise

import numpy as np
import shapely

from impcheck.artwork.image import Floats
from impcheck.copper.copper import Copper
from impcheck.nets.nets import Nets
from impcheck.path.graph import Graph
from impcheck.path.route import Route
from impcheck.path.walk import Branch


def find_branches(graph: Graph, route: Route, copper: Copper, nets: Nets) -> tuple[list[Branch], set[int]]:
    """Branches longer than their own width, in the order of the path, and the nodes they consist of. Pads, teardrops and pours are none."""
    found: list[Branch] = []
    hanging: set[int] = set()
    seen: set[int] = set(route.along)
    for root in sorted(route.along, key=lambda node: (route.along[node], node)):
        for first, step in sorted(graph.neighbours.get(root, ())):
            if first in seen or (step >= 0 and first in route.along):
                continue
            met: set[int] = set()
            branch = _explore(graph, route, (root, first, step), met, (copper, nets))
            seen |= met
            if branch is not None:
                found.append(branch)
                hanging |= met
    return sorted(found, key=lambda branch: (branch.along, branch.at, branch.tip)), hanging


def _explore(graph: Graph, route: Route, way: tuple[int, int, int], seen: set[int], board: tuple[Copper, Nets]) -> Branch | None:
    """The branch that leaves node way[0] to node way[1] along edge way[2]; all its nodes are added to `seen`."""
    root, first, step = way
    noded = graph.noded
    start = float(noded.length[step]) if step >= 0 else 0.0
    queue, before, distance = [(start, first)], {first: root}, {}
    cost = {first: start}
    while queue:
        so_far, node = heapq.heappop(queue)
        if node in distance:
            continue
        distance[node] = so_far
        seen.add(node)
        for other, edge in graph.neighbours.get(node, ()):
            if other in route.along or other in distance:
                continue
            reach = so_far + (float(noded.length[edge]) if edge >= 0 else 0.0)
            if reach < cost.get(other, np.inf):
                cost[other], before[other] = reach, node
                heapq.heappush(queue, (reach, other))
    pours = {int(graph.pad_node[pad]) for pad in range(len(graph.pads)) if graph.pads.blob[pad]} if any(graph.pads.blob) else set()
    tips = [node for node in distance if node not in pours]
    if not tips:
        return None
    tip = max(tips, key=lambda node: (round(distance[node], 6), -node))
    chain = [tip]
    while chain[-1] != root:
        chain.append(before[chain[-1]])
    chain.reverse()
    points, layers = noded.place[chain], noded.layer[chain]
    first_layer = next((int(layers[i]) for i in range(1, len(chain)) if layers[i] == layers[i - 1]), int(layers[-1]))
    covered = _covered(graph, route, root, points[layers == first_layer], first_layer)
    cap = 0.0 if graph.pads_at.get(tip) or len(tips) < len(distance) else _to_edge(graph, tip, points, *board)
    length = distance[tip] - covered + cap
    width = _own_width(graph, chain)
    if length <= max(width, 1e-3) or distance[tip] <= covered + 1e-6:
        return None
    end = points[-1]
    if cap and len(points) > 1:
        end = end + cap * _unit(points[-1] - points[-2])
    pin = next((str(p) for node in sorted(distance, key=lambda n: -distance[n]) for p in graph.pins_at.get(node, []) if p.component), "")
    at = noded.place[root]
    return Branch(first_layer, route.along[root], (float(at[0]), float(at[1])), (float(end[0]), float(end[1])), float(length), pin)


def _unit(vector: Floats) -> Floats:
    size = float(np.hypot(*vector))
    result: Floats = vector / size if size > 0 else vector
    return result


def _own_width(graph: Graph, chain: list[int]) -> float:
    for a, b in pairwise(chain):
        for other, edge in graph.neighbours[a]:
            if other == b and edge >= 0 and not graph.noded.link[edge]:
                return float(graph.noded.width[edge])
    return 0.0


def _covered(graph: Graph, route: Route, root: int, points: Floats, layer: int) -> float:
    """Length of the branch that lies in the path's own copper near where it leaves."""
    noded = graph.noded
    near = []
    stack, visited = [root], {root}
    while stack:  # the path's copper within a few steps of the branch is all that can cover its first part
        node = stack.pop()
        for pad in graph.pads_at.get(node, []):
            if graph.pads.layer[pad] == layer:
                near.append(graph.pads.shape[pad])
        for other, edge in graph.neighbours.get(node, ()):
            if edge < 0 and other not in visited:
                near += [graph.pads.shape[pad] for pad in graph.pads_at.get(other, []) if graph.pads.layer[pad] == layer]
            if edge >= 0 and other in route.along and noded.layer[node] == layer:
                near.append(shapely.LineString(noded.place[[node, other]]).buffer(noded.width[edge] / 2, quad_segs=16))
            if edge >= 0 and other in route.along and other not in visited and len(visited) < 12:
                visited.add(other)
                stack.append(other)
    if not near:
        return 0.0
    if len(points) < 2:
        return 0.0
    return float(shapely.intersection(shapely.LineString(points), shapely.union_all(near)).length)


def _to_edge(graph: Graph, tip: int, points: Floats, copper: Copper, nets: Nets) -> float:
    """Distance from the last point of the centreline on to the edge of the copper, mm."""
    noded = graph.noded
    edges = [edge for _, edge in graph.neighbours.get(tip, ()) if edge >= 0]
    if not edges or len(points) < 2:
        return 0.0
    reach = 2 * float(noded.width[edges[0]])
    layer = int(noded.layer[tip])
    pieces = copper.layers[layer].shape[graph.owner[nets.piece_label[layer]] == noded.net[tip]]
    ray = shapely.LineString([points[-1], points[-1] + reach * _unit(points[-1] - points[-2])])
    near = pieces[shapely.intersects(pieces, ray)]
    inside = shapely.intersection(shapely.union_all(near), ray) if len(near) else shapely.LineString()
    start = shapely.Point(points[-1])
    return float(sum(part.length for part in shapely.get_parts(inside) if part.distance(start) < 1e-6))
