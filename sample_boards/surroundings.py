"""What the sample boards share: corridors kept free beside controlled traces, stitching vias, outlines. In: boards under construction;
out: shapes in mm added to them."""

from __future__ import annotations

from collections.abc import Iterable

import shapely
from shapely import LineString, Polygon

from tests.boards.model import Board, Plane, Point
from tests.boards.parts import via
from tests.boards.router import Router
from tests.boards.shapes import pad_shape


def rectangle(x0: float, y0: float, x1: float, y1: float) -> tuple[Point, ...]:
    return ((x0, y0), (x1, y0), (x1, y1), (x0, y1))


def keep_free(router: Router, board: Board, nets: Iterable[str], beside: float, vias: float) -> None:
    """Keeps foreign traces `beside` mm and foreign vias `vias` mm away from the middle of every trace of `nets`."""
    wanted = set(nets)
    for item, layer, points in [(t.net, t.layer, t.points) for t in board.traces] + [(a.net, a.layer, a.chopped(0.01)) for a in board.arcs]:
        if item in wanted:
            line = LineString(points)
            if layer in router.layers:
                router.keep[layer].append(line.buffer(beside))
            router.keep_vias.append(line.buffer(vias))


def stitch(board: Board, net: str, pitch: float, layers: Iterable[int], away: float, corridors: float, controlled: Iterable[str]) -> None:
    """Vias of a net on a raster wherever nothing else is near: `away` from foreign copper, `corridors` from the middle of controlled
    traces."""
    wanted = set(controlled)
    blocked = []
    for t in board.traces:
        blocked.append(LineString(t.points).buffer(corridors if t.net in wanted else t.width / 2 + away))
    for a in board.arcs:
        blocked.append(LineString(a.chopped(0.01)).buffer(corridors if a.net in wanted else a.width / 2 + away))
    blocked += [pad_shape(p, away) for p in board.pads]
    blocked += [shapely.Point(v.at).buffer(v.pad / 2 + 0.5) for v in board.vias]
    blocked += [LineString([h.at, h.end or (h.at[0], h.at[1] + 1e-6)]).buffer(h.drill / 2 + 0.8) for h in board.holes]
    blocked += [Polygon(f.points).buffer(away) for f in board.fills]
    for plane in board.planes:
        if plane.net == net:
            blocked += [
                Polygon(cut.points).buffer(0.5)
                if cut.diameter == 0
                else LineString([*cut.points, cut.points[-1]]).buffer(cut.diameter / 2 + 0.5)
                for cut in plane.cuts
            ]
    area = Polygon(board.outline).buffer(-1.0).difference(shapely.union_all(blocked))
    x0, y0, x1, y1 = board.extent()
    x = x0 + 1.1
    while x < x1:
        y = y0 + 1.1
        while y < y1:
            if area.covers(shapely.Point(x, y)):
                via(board, net, (round(x, 6), round(y, 6)))
            y += pitch
        x += pitch


def pour(board: Board, net: str, layer: int, inset: float = 0.4, clearance: float = 0.3, hatch: float = 0.0) -> None:
    """A pour over a whole layer, inside the outline."""
    inner = Polygon(board.outline).buffer(-inset, join_style="mitre")
    board.planes.append(Plane(net, layer, tuple(inner.exterior.coords[:-1]), clearance=clearance, hatch=hatch))
