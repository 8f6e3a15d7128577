"""Connects the surroundings of a sample board. In: a board with pads and reserved places; out: thin traces and vias added so that every
net hangs together. Shares no code with impcheck."""

from __future__ import annotations

import heapq
from collections import defaultdict
from collections.abc import Iterable

import numpy as np
import shapely
from shapely import LineString, Polygon
from shapely.geometry.base import BaseGeometry

from tests.boards.model import Board, Point, Trace, Via
from tests.boards.shapes import pad_shape

STEP = 0.2  # grid, mm
CLEARANCE = 0.15


class Router:
    """A maze router on two layers with a grid of 0.2 mm. Nets in `plane_nets` go to their plane by a via beside each pad."""

    def __init__(
        self,
        board: Board,
        layers: tuple[int, ...],
        plane_nets: Iterable[str],
        width: float = 0.15,
        via: tuple[float, float, float] = (0.25, 0.5, 0.75),
    ) -> None:
        self.board, self.layers, self.width, self.via = board, layers, width, via
        self.plane_nets = set(plane_nets)
        self.x0, self.y0, x1, y1 = board.extent()
        self.shape = (round((x1 - self.x0) / STEP) + 1, round((y1 - self.y0) / STEP) + 1)
        ii, jj = np.meshgrid(np.arange(self.shape[0]), np.arange(self.shape[1]), indexing="ij")
        self.px, self.py = self.x0 + ii * STEP, self.y0 + jj * STEP
        self.keep: dict[int, list[BaseGeometry]] = {layer: [] for layer in layers}  # no foreign trace
        self.keep_vias: list[BaseGeometry] = []
        self.owner: dict[tuple[int, bool], np.ndarray] = {}
        self.nets: dict[str, int] = {}
        self.inside = shapely.contains_xy(Polygon(board.outline).buffer(-0.5), self.px, self.py)

    def number(self, net: str) -> int:
        return self.nets.setdefault(net, len(self.nets) + 1)

    def block(self, layer: int, for_via: bool, shape: BaseGeometry, net: str, grow: float) -> None:
        """Marks grid points too close to a shape: by its net's number, or -1 where two nets are near."""
        owner = self.owner[layer, for_via]
        grown = shape.buffer(grow, quad_segs=4)
        a, b, c, d = grown.bounds
        i0, i1 = max(int((a - self.x0) / STEP), 0), min(int((c - self.x0) / STEP) + 2, self.shape[0])
        j0, j1 = max(int((b - self.y0) / STEP), 0), min(int((d - self.y0) / STEP) + 2, self.shape[1])
        if i0 >= i1 or j0 >= j1:
            return
        near = shapely.contains_xy(grown, self.px[i0:i1, j0:j1], self.py[i0:i1, j0:j1])
        window, number = owner[i0:i1, j0:j1], self.number(net) if net else -1
        window[near & (window != 0) & (window != number)] = -1
        window[near & (window == 0)] = number

    def prepare(self) -> None:
        for layer in self.layers:
            for for_via in (False, True):
                self.owner[layer, for_via] = np.where(self.inside, 0, -1)
        for pad in self.board.pads:
            self.occupy(pad.layer, pad_shape(pad), pad.net)
        for trace in self.board.traces:
            self.occupy(trace.layer, LineString(trace.points).buffer(trace.width / 2, quad_segs=4), trace.net)
        for arc in self.board.arcs:
            self.occupy(arc.layer, LineString(arc.chopped(0.01)).buffer(arc.width / 2, quad_segs=4), arc.net)
        for fill in self.board.fills:
            self.occupy(fill.layer, Polygon(fill.points), fill.net)
        for via in self.board.vias:
            self.occupy_via(via)
        for hole in self.board.holes:
            shape = LineString([hole.at, hole.end or (hole.at[0] + 1e-6, hole.at[1])]).buffer(hole.drill / 2 + 0.2)
            for layer in self.layers:
                self.occupy(layer, shape, "")
        for layer, shapes in self.keep.items():
            for shape in shapes:
                self.block(layer, False, shape, "", 0.0)
        for shape in self.keep_vias:
            for layer in self.layers:
                self.block(layer, True, shape, "", 0.0)

    def occupy(self, layer: int, shape: BaseGeometry, net: str) -> None:
        if layer in self.layers:
            self.block(layer, False, shape, net, CLEARANCE + self.width / 2)
            self.block(layer, True, shape, net, CLEARANCE + self.via[1] / 2)

    def occupy_via(self, via: Via) -> None:
        for layer in self.layers:
            if layer in self.board.barrel_layers(via):
                self.occupy(layer, shapely.Point(via.at).buffer(via.pad / 2), via.net)
                self.block(layer, True, shapely.Point(via.at).buffer(via.pad / 2), "", 0.25 + self.via[1] / 2)

    def index(self, at: Point) -> tuple[int, int]:
        return round((at[0] - self.x0) / STEP), round((at[1] - self.y0) / STEP)

    def point(self, cell: tuple[int, int]) -> Point:
        return round(self.x0 + cell[0] * STEP, 6), round(self.y0 + cell[1] * STEP, 6)

    def search(
        self, net: str, starts: list[tuple[int, int, int]], goals: set[tuple[int, int, int]], any_via: bool = False
    ) -> list[tuple[int, int, int]] | None:
        """Cheapest way from the starts to a goal; with `any_via` to any place where a via of the net may stand."""
        own = self.number(net)
        free = {layer: (self.owner[layer, False] == 0) | (self.owner[layer, False] == own) for layer in self.layers}
        via_free = np.logical_and.reduce([(self.owner[layer, True] == 0) | (self.owner[layer, True] == own) for layer in self.layers])
        gx = [g[1] for g in goals]
        gy = [g[2] for g in goals]
        box = (min(gx), max(gx), min(gy), max(gy)) if goals else (0, 10**6, 0, 10**6)

        def ahead(i: int, j: int) -> float:
            dx, dy = max(box[0] - i, 0, i - box[1]), max(box[2] - j, 0, j - box[3])
            return max(dx, dy) + 0.4142 * min(dx, dy)

        cost: dict[tuple[int, int, int], float] = {}
        came: dict[tuple[int, int, int], tuple[int, int, int]] = {}
        heap: list[tuple[float, float, tuple[int, int, int]]] = []
        for cell in starts:
            cost[cell] = 0.0
            heapq.heappush(heap, (ahead(*cell[1:]), 0.0, cell))
        while heap:
            _, spent, cell = heapq.heappop(heap)
            if spent > cost[cell]:
                continue
            layer, i, j = cell
            if cell in goals or (any_via and via_free[i, j] and spent > 2):
                way = [cell]
                while cell in came:
                    cell = came[cell]
                    way.append(cell)
                return way[::-1]
            moves = [((layer, i + di, j + dj), 1.4142 if di and dj else 1.0) for di in (-1, 0, 1) for dj in (-1, 0, 1) if di or dj]
            if via_free[i, j] and not any_via:
                moves += [((other, i, j), 12.0) for other in self.layers if other != layer]
            for to, price in moves:
                if not (0 <= to[1] < self.shape[0] and 0 <= to[2] < self.shape[1]) or not free[to[0]][to[1], to[2]]:
                    continue
                total = spent + price
                if total < cost.get(to, 1e18) - 1e-9:
                    cost[to] = total
                    came[to] = cell
                    heapq.heappush(heap, (total + ahead(to[1], to[2]), total, to))
        return None

    def lay(self, net: str, way: list[tuple[int, int, int]], end_via: bool = False) -> None:
        """Turns a way into traces and vias and marks them."""
        runs: list[tuple[int, list[Point]]] = []
        for cell in way:
            if runs and runs[-1][0] == cell[0]:
                runs[-1][1].append(self.point(cell[1:]))
            else:
                runs.append((cell[0], [self.point(cell[1:])]))
        places = [points[0] for _, points in runs[1:]] + ([runs[-1][1][-1]] if end_via else [])
        for layer, points in runs:
            if len(points) > 1:
                trace = Trace(net, layer, self.width, straightened(points))
                self.board.traces.append(trace)
                self.occupy(layer, LineString(trace.points).buffer(self.width / 2, quad_segs=4), net)
        for at in places:
            via = Via(net, at, *self.via)
            self.board.vias.append(via)
            self.occupy_via(via)

    def cells(self, net: str) -> dict[tuple[str, str, int], list[tuple[int, int, int]]]:
        """Grid points on each pin of a net."""
        found: dict[tuple[str, str, int], list[tuple[int, int, int]]] = defaultdict(list)
        for n, pad in enumerate(self.board.pads):
            if pad.net == net and pad.layer in self.layers:
                found[pad.component, pad.pin, n] = self.cells_in(pad.layer, pad_shape(pad))
        for n, via in enumerate(self.board.vias):
            if via.net == net and via.component:
                disc = shapely.Point(via.at).buffer(via.pad / 2)
                found[via.component, via.pin, -n - 1] = [cell for layer in self.layers for cell in self.cells_in(layer, disc)]
        return found

    def cells_in(self, layer: int, shape: BaseGeometry) -> list[tuple[int, int, int]]:
        i0, j0 = self.index((shape.bounds[0], shape.bounds[1]))
        i1, j1 = self.index((shape.bounds[2], shape.bounds[3]))
        cells = [
            (layer, i, j) for i in range(max(i0, 0), min(i1 + 1, self.shape[0])) for j in range(max(j0, 0), min(j1 + 1, self.shape[1]))
        ]
        inner = shape.buffer(-0.02)
        good = [cell for cell in cells if inner.covers(shapely.Point(self.point(cell[1:])))]
        centre = shape.centroid
        return good or [(layer, *self.index((centre.x, centre.y)))]

    def run(self, skip: Iterable[str] = ()) -> list[str]:
        """Routes everything but `skip`; returns what could not be joined."""
        self.prepare()
        failed: list[str] = []
        done = set(skip)
        nets = sorted({p.net for p in self.board.pads} | {v.net for v in self.board.vias if v.component})
        for net in nets:
            if net in self.plane_nets:
                for (component, pin, n), cells in self.cells(net).items():
                    if n < 0:
                        continue  # a hole reaches the plane by itself
                    way = self.search(net, cells[: len(cells)], set(), any_via=True)
                    if way is None:
                        failed.append(f"{net} {component}.{pin}")
                    else:
                        self.lay(net, way, end_via=True)
        order = [net for net in nets if net not in self.plane_nets and net not in done]

        def reach(net: str) -> float:
            spots = [cells[0] for cells in self.cells(net).values()]
            return max((abs(a[1] - b[1]) + abs(a[2] - b[2]) for a in spots for b in spots), default=0)

        for net in sorted(order, key=lambda name: (reach(name), name)):
            pins = list(self.cells(net).values())
            if len(pins) < 2:
                continue
            tree = list(pins[0])
            rest = pins[1:]
            while rest:
                goals = {cell for cells in rest for cell in cells}
                way = self.search(net, tree, goals)
                if way is None:
                    failed.append(net)
                    break
                self.lay(net, way)
                tree += way
                hit = next(cells for cells in rest if way[-1] in cells)
                tree += hit
                rest.remove(hit)
        return failed


def straightened(points: list[Point]) -> tuple[Point, ...]:
    """A polyline without the corners on straight pieces."""
    kept = [points[0]]
    for before, here, after in zip(points, points[1:], points[2:], strict=False):
        cross = (here[0] - before[0]) * (after[1] - here[1]) - (here[1] - before[1]) * (after[0] - here[0])
        if abs(cross) > 1e-9:
            kept.append(here)
    return (*kept, points[-1])
