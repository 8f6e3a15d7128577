"""Copper of an abstract board as shapely polygons, and whether its nets hang together. In: Board; out: polygons per layer in mm, faults
as text. Shares no code with impcheck."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Iterator

import numpy as np
import shapely
from shapely import LineString, Point, Polygon, STRtree
from shapely.affinity import rotate, translate
from shapely.geometry.base import BaseGeometry

from tests.boards.model import Board, Cut, Pad, Plane, Via

QUADRANT = 16  # segments per quarter circle


def pad_shape(pad: Pad, grow: float = 0.0) -> Polygon:
    """Outline of a pad, grown by `grow` mm."""
    w, h = pad.size
    if pad.shape == "circle":
        found: BaseGeometry = Point(0, 0).buffer(w / 2, quad_segs=QUADRANT)
    elif pad.shape == "obround":
        r, half = min(w, h) / 2, abs(w - h) / 2
        found = LineString([(-half, 0), (half, 0)] if w > h else [(0, -half), (0, half)]).buffer(r, quad_segs=QUADRANT)
    else:
        found = shapely.box(-w / 2, -h / 2, w / 2, h / 2)
        if pad.shape == "rounded":
            r = min(w, h) / 4
            found = found.buffer(-r).buffer(r, quad_segs=QUADRANT)
    if grow:
        found = found.buffer(grow, quad_segs=QUADRANT)
    return translate(rotate(found, pad.rotation, origin=(0, 0)), *pad.at)


def cut_shape(cut: Cut) -> Polygon:
    """Outline of a cut."""
    if cut.diameter == 0:
        return Polygon(cut.points)
    line = LineString(cut.points) if len(cut.points) > 1 else Point(cut.points[0])
    return line.buffer(cut.diameter / 2, quad_segs=QUADRANT)


def spokes(via: Via, plane: Plane) -> list[tuple[tuple[float, float], tuple[float, float]]]:
    """Centrelines of the four spokes that join a via to a plane of its own net."""
    reach = via.pad / 2 + plane.clearance + 0.1
    x, y = via.at
    d = reach / math.sqrt(2)
    return [((x, y), (x + sx * d, y + sy * d)) for sx in (-1, 1) for sy in (-1, 1)]


SPOKE = 0.3  # width of a thermal spoke, mm


def clearances(board: Board, plane: Plane) -> Iterator[Cut]:
    """Everything other nets (and thermal reliefs) take out of a plane, the plane's own cuts first."""
    yield from plane.cuts
    c = plane.clearance
    for via in board.vias:
        if plane.layer in board.barrel_layers(via):
            if via.net != plane.net:
                yield Cut((via.at,), max(via.antipad, via.pad + 2 * c if plane.layer in board.via_layers(via) else 0))
            elif via.thermal:
                yield Cut((via.at,), via.pad + 2 * c)
        elif via.backdrill is not None:
            yield Cut((via.at,), max(via.antipad, via.backdrill[2] + 0.3))
    for hole in board.holes:
        yield Cut((hole.at,) if hole.end is None else (hole.at, hole.end), hole.drill + 0.6)
    for trace in board.traces:
        if trace.layer == plane.layer and trace.net != plane.net:
            yield Cut(trace.points, trace.width + 2 * c)
    for arc in board.arcs:
        if arc.layer == plane.layer and arc.net != plane.net:
            yield Cut(arc.chopped(), arc.width + 2 * c)
    for pad in board.pads:
        if pad.layer == plane.layer and pad.net != plane.net:
            yield Cut(tuple(pad_shape(pad, c).exterior.coords[:-1]))
    for fill in board.fills:
        if fill.layer == plane.layer and fill.net != plane.net:
            yield Cut(tuple(Polygon(fill.points).buffer(c, join_style="mitre").exterior.coords[:-1]))


def anchors(board: Board, net: str, layer: int) -> list[BaseGeometry]:
    """Copper of a net on a layer other than planes: what a piece of a pour must touch to be kept."""
    found: list[BaseGeometry] = [Point(v.at).buffer(v.pad / 2) for v in board.vias if v.net == net and layer in board.barrel_layers(v)]
    found += [pad_shape(p) for p in board.pads if p.net == net and p.layer == layer]
    return found


def plane_shapes(board: Board, plane: Plane) -> list[Polygon]:
    """The pieces of a plane that remain and are joined to its net by a via or a pad."""
    outline = Polygon(plane.outline)
    cuts = [shape for shape in map(cut_shape, clearances(board, plane)) if shape.intersects(outline)]
    rest = outline.difference(shapely.union_all(cuts)) if cuts else outline
    thermal = [
        LineString(ends).buffer(SPOKE / 2, cap_style="flat").intersection(outline)
        for via in board.vias
        if via.thermal and via.net == plane.net and plane.layer in board.barrel_layers(via)
        for ends in spokes(via, plane)
    ]
    if thermal:
        rest = shapely.union_all([rest, *thermal])
    rest = rest.buffer(-0.04, join_style="mitre").buffer(0.04, join_style="mitre")  # no slivers
    hold = STRtree(anchors(board, plane.net, plane.layer))
    pieces = [piece for piece in shapely.get_parts(rest) if piece.area > 0.05 and len(hold.query(piece, predicate="intersects"))]
    return [Polygon(p.exterior, [h for h in p.interiors if Polygon(h).area > 1e-4]) for p in pieces]


def copper(board: Board) -> list[list[tuple[str, BaseGeometry]]]:
    """(net, shape) of all copper, layer by layer."""
    layers: list[list[tuple[str, BaseGeometry]]] = [[] for _ in board.coppers]
    for plane in board.planes:
        layers[plane.layer] += [(plane.net, piece) for piece in plane_shapes(board, plane)]
    for trace in board.traces:
        layers[trace.layer].append((trace.net, LineString(trace.points).buffer(trace.width / 2, quad_segs=QUADRANT)))
    for arc in board.arcs:
        layers[arc.layer].append((arc.net, LineString(arc.chopped()).buffer(arc.width / 2, quad_segs=QUADRANT)))
    for pad in board.pads:
        layers[pad.layer].append((pad.net, pad_shape(pad)))
    for fill in board.fills:
        layers[fill.layer].append((fill.net, Polygon(fill.points)))
    for via in board.vias:
        for layer in board.via_layers(via):
            layers[layer].append((via.net, Point(via.at).buffer(via.pad / 2, quad_segs=QUADRANT)))
    return layers


def faults(board: Board, clearance: float = 0.09) -> list[str]:
    """Shorts, opens and gaps between nets below `clearance` mm, one sentence each; empty where the board is as its nets say."""
    found: list[str] = []
    layers = copper(board)
    offset = np.cumsum([0, *(len(items) for items in layers)])
    names = [net for items in layers for net, _ in items]
    parent = list(range(len(names) + len(board.vias)))

    def root(i: int) -> int:
        while parent[i] != i:
            parent[i] = parent[parent[i]]
            i = parent[i]
        return i

    trees = []
    for k, items in enumerate(layers):
        shapes = [shape for _, shape in items]
        tree = STRtree(shapes)
        trees.append(tree)
        for a, b in tree.query(shapes, predicate="dwithin", distance=clearance).T:
            if a < b:
                net_a, net_b = items[a][0], items[b][0]
                if net_a == net_b:
                    if shapes[a].intersects(shapes[b]):
                        parent[root(offset[k] + a)] = root(offset[k] + b)
                else:
                    at = shapes[a].centroid if shapes[a].area < shapes[b].area else shapes[b].centroid
                    gap = shapes[a].distance(shapes[b])
                    found.append(f"{board.coppers[k].name}: {net_a} and {net_b} are {gap:.3f} mm apart near ({at.x:.2f}, {at.y:.2f})")
    for v, via in enumerate(board.vias):
        disc = Point(via.at).buffer(via.drill / 2)
        for layer in board.barrel_layers(via):
            for a in trees[layer].query(disc, predicate="intersects"):
                if layers[layer][a][0] == via.net:
                    parent[root(len(names) + v)] = root(offset[layer] + a)
                else:
                    found.append(f"{board.coppers[layer].name}: via of {via.net} at {via.at} hits {layers[layer][a][0]}")
    pieces: dict[str, dict[int, int]] = defaultdict(dict)
    for i, net in enumerate(names):
        pieces[net].setdefault(root(i), i)
    for net, roots in pieces.items():
        if len(roots) > 1:
            places = []
            for i in list(roots.values())[:4]:
                k = int(np.searchsorted(offset, i, side="right")) - 1
                c = layers[k][i - offset[k]][1].centroid
                places.append(f"{board.coppers[k].name} ({c.x:.2f}, {c.y:.2f})")
            found.append(f"{net} is in {len(roots)} pieces: {', '.join(places)}")
    return found
