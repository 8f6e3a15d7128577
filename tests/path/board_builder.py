"""Draws small boards for tests of the walk, without the reader: strokes, flashes, regions and barrels in mm."""

from __future__ import annotations

from dataclasses import dataclass, field
from itertools import pairwise

import numpy as np
import shapely

from impcheck.artwork.board import Board, NetClass, NetRequest
from impcheck.artwork.image import Contours, Image, Kind
from impcheck.artwork.parts import Artwork
from impcheck.artwork.stackup import CopperItem, Dielectric, Stackup
from impcheck.copper.copper import Barrels, Copper, LayerCopper
from impcheck.nets.nets import BoardPin, DeclaredNet, Join, Nets
from impcheck.path.build import walk_nets
from impcheck.path.walk import Walk

QUAD_SEGS = 16


@dataclass
class Item:
    layer: int
    kind: Kind
    start: tuple[float, float]
    end: tuple[float, float]
    centre: tuple[float, float]
    sweep: float
    width: float
    shape: shapely.Polygon


@dataclass
class Drawing:
    """A board being drawn."""

    layers: int = 2
    items: list[Item] = field(default_factory=list)
    barrels: list[tuple[float, float, float, int, int]] = field(default_factory=list)
    dielectric: float = 0.1

    def stroke(self, layer: int, points: list[tuple[float, float]], width: float) -> Drawing:
        for a, b in pairwise(points):
            shape = shapely.LineString([a, b]).buffer(width / 2, quad_segs=QUAD_SEGS)
            self.items.append(Item(layer, Kind.DRAW, a, b, (np.nan, np.nan), 0.0, width, shape))
        return self

    def arc(self, layer: int, start: tuple[float, float], centre: tuple[float, float], sweep: float, width: float) -> Drawing:
        spoke = np.array(start) - centre
        angles = np.linspace(0, sweep, 200)
        points = np.array(centre) + np.stack(
            [np.cos(angles) * spoke[0] - np.sin(angles) * spoke[1], np.sin(angles) * spoke[0] + np.cos(angles) * spoke[1]], axis=1
        )
        shape = shapely.LineString(points).buffer(width / 2, quad_segs=QUAD_SEGS)
        self.items.append(Item(layer, Kind.ARC, start, tuple(points[-1]), centre, sweep, width, shape))
        return self

    def flash(self, layer: int, at: tuple[float, float], size: tuple[float, float]) -> Drawing:
        shape = shapely.box(at[0] - size[0] / 2, at[1] - size[1] / 2, at[0] + size[0] / 2, at[1] + size[1] / 2)
        self.items.append(Item(layer, Kind.FLASH, at, at, (np.nan, np.nan), 0.0, np.nan, shape))
        return self

    def disc(self, layer: int, at: tuple[float, float], diameter: float) -> Drawing:
        shape = shapely.Point(at).buffer(diameter / 2, quad_segs=QUAD_SEGS)
        self.items.append(Item(layer, Kind.FLASH, at, at, (np.nan, np.nan), 0.0, np.nan, shape))
        return self

    def region(self, layer: int, shape: shapely.Polygon) -> Drawing:
        for part in shapely.get_parts(shape).tolist():
            first = tuple(part.exterior.coords[0])
            self.items.append(Item(layer, Kind.REGION, first, first, (np.nan, np.nan), 0.0, np.nan, part))
        return self

    def via(self, at: tuple[float, float], drill: float, pad: float, first: int = 0, last: int | None = None) -> Drawing:
        last = self.layers - 1 if last is None else last
        self.barrels.append((at[0], at[1], drill, first, last))
        for layer in range(first, last + 1):
            if pad:
                self.disc(layer, at, pad)
        return self

    def moved(self, turn: float = 0.0, mirror: bool = False, order: list[int] | None = None) -> Drawing:
        """The same board mirrored in x, turned by `turn` degrees, drawn in another order."""
        result = Drawing(self.layers, [], [], self.dielectric)
        cos, sin = np.cos(np.radians(turn)), np.sin(np.radians(turn))
        flip = -1.0 if mirror else 1.0
        matrix = (cos * flip, -sin, sin * flip, cos, 0.0, 0.0)

        def place(p: tuple[float, float]) -> tuple[float, float]:
            return matrix[0] * p[0] + matrix[1] * p[1], matrix[2] * p[0] + matrix[3] * p[1]

        for index in order if order is not None else range(len(self.items)):
            item = self.items[index]
            shape = shapely.affinity.affine_transform(item.shape, matrix)
            result.items.append(
                Item(item.layer, item.kind, place(item.start), place(item.end), place(item.centre), flip * item.sweep, item.width, shape)
            )
        result.barrels = [(*place((b[0], b[1])), *b[2:]) for b in self.barrels]
        return result

    def place(self, point: tuple[float, float], turn: float, mirror: bool) -> tuple[float, float]:
        cos, sin = np.cos(np.radians(turn)), np.sin(np.radians(turn))
        x, y = (-point[0] if mirror else point[0]), point[1]
        return cos * x - sin * y, sin * x + cos * y

    def as_regions(self, layers: set[int], merged: bool) -> Drawing:
        """The same board with the strokes of some layers drawn as regions: one for each stroke, or one for all that touch."""
        result = Drawing(self.layers, [], list(self.barrels), self.dielectric)
        strokes = [i for i in self.items if i.layer in layers and i.kind in (Kind.DRAW, Kind.ARC)]
        for item in self.items:
            if item not in strokes:
                result.items.append(item)
            elif not merged:
                result.region(item.layer, item.shape)
        if merged:
            for layer in sorted(layers):
                result.region(layer, shapely.union_all([i.shape for i in strokes if i.layer == layer]))
        return result

    def copper(self) -> Copper:
        found = []
        for index in range(self.layers):
            items = [i for i in self.items if i.layer == index]
            found.append(
                LayerCopper(
                    f"L{index + 1}",
                    index,
                    _image(items),
                    np.array([shapely.orient_polygons(i.shape) for i in items] + [None], dtype=object)[:-1],
                    np.arange(len(items), dtype=np.int32),
                    np.ones(len(items), dtype=np.bool_),
                    np.array([i.width for i in items], dtype=np.float64),
                )
            )
        rows = np.array(self.barrels, dtype=np.float64).reshape(-1, 5)
        first, last = rows[:, 3].astype(np.int32), rows[:, 4].astype(np.int32)
        barrels = Barrels(
            rows[:, :2], rows[:, :2], rows[:, 2], first, last, np.zeros(len(rows)), np.zeros(len(rows)), ("d",) * len(rows), first
        )  # fmt: skip
        return Copper(tuple(found), barrels, (0.0, 0.0, 50.0, 50.0), (np.empty(0, dtype=object), np.empty(0, dtype=object)))

    def stackup(self) -> Stackup:
        items: list[CopperItem | Dielectric] = []
        for index in range(self.layers):
            items.append(CopperItem(f"L{index + 1}", 0.035))
            if index + 1 < self.layers:
                items.append(Dielectric(self.dielectric, 4.0))
        return Stackup(tuple(items))

    def labels(self, copper: Copper) -> tuple[list[np.ndarray], np.ndarray, int]:
        """Connected components by brute force."""
        layers = copper.layers
        offsets = np.cumsum([0] + [len(layer.shape) for layer in layers])
        count = int(offsets[-1]) + len(self.barrels)
        parent = list(range(count))

        def root(i: int) -> int:
            while parent[i] != i:
                i = parent[i]
            return i

        for layer in layers:
            a, b = shapely.STRtree(layer.shape).query(layer.shape, predicate="intersects")
            for i, j in zip(a.tolist(), b.tolist(), strict=True):
                parent[root(i + int(offsets[layer.index]))] = root(j + int(offsets[layer.index]))
        for k, (x, y, d, first, last) in enumerate(self.barrels):
            disc = shapely.Point(x, y).buffer(d / 2)
            for layer in layers[int(first) : int(last) + 1]:
                for j in np.flatnonzero(shapely.intersects(layer.shape, disc)).tolist():
                    parent[root(j + int(offsets[layer.index]))] = root(int(offsets[-1]) + k)
        roots = np.array([root(i) for i in range(count)])
        _, label = np.unique(roots, return_inverse=True)
        return (
            [label[offsets[i] : offsets[i + 1]].astype(np.int32) for i in range(len(layers))],
            label[offsets[-1] :].astype(np.int32),
            int(label.max()) + 1,
        )

    def walk(
        self,
        ends: list[tuple[float, float, int | None]],
        returns: list[tuple[float, float, int]] = (),  # type: ignore[assignment]
        joins: list[tuple[str, tuple[float, float, int], tuple[float, float, int]]] = (),  # type: ignore[assignment]
        pins: list[tuple[str, float, float, int | None]] = (),  # type: ignore[assignment]
    ) -> Walk:
        """Walks the net between `ends` (x, y, layer); `returns` are places on return copper."""
        copper = self.copper()
        piece_label, barrel_label, count = self.labels(copper)

        def label_at(x: float, y: float, layer: int | None) -> int:
            for index in range(self.layers) if layer is None else (layer,):
                hit = np.flatnonzero(shapely.dwithin(copper.layers[index].shape, shapely.Point(x, y), 1e-6))
                if len(hit):
                    return int(piece_label[index][hit[0]])
            raise AssertionError(f"no copper at {x}, {y}, {layer}")

        def pin(component: str, number: str, x: float, y: float, layer: int | None) -> BoardPin:
            return BoardPin(component, number, (x, y), layer, label_at(x, y, layer), "S")

        found = [pin(f"U{i + 1}", "1", *end) for i, end in enumerate(ends)]
        bridges = tuple(Join(name, (pin(name, "1", *a), pin(name, "2", *b))) for name, a, b in joins)
        labels = tuple(dict.fromkeys([p.label for p in found] + [p.label for j in bridges for p in j.pins]))
        grounds = frozenset(label_at(*place) for place in returns)
        net = DeclaredNet("S", NetRequest("S", "c"), NetClass("c"), labels, (found[0],), tuple(found[1:]), bridges)
        others = tuple(pin(name, "1", x, y, layer) for name, x, y, layer in pins)
        nets = Nets(tuple(piece_label), barrel_label, count, {}, (*found, *others), grounds, (), (net,), ())
        artwork = Artwork(
            Board("b", "b.yaml"), self.stackup(), tuple(layer.image for layer in copper.layers), None, None, None, (), None, ()
        )  # fmt: skip
        return walk_nets(artwork, copper, nets)[0]


def _image(items: list[Item]) -> Image:
    n = len(items)
    minus, empty = np.full(n, -1, dtype=np.int32), np.empty(0)
    contours = Contours(np.empty(0, np.int32), np.zeros(1, np.int32), np.empty((0, 2)), np.empty((0, 2)), empty)
    points = {name: np.array([getattr(i, name) for i in items], dtype=np.float64).reshape(-1, 2) for name in ("start", "end", "centre")}
    kind, sweep = np.array([int(i.kind) for i in items], dtype=np.uint8), np.array([i.sweep for i in items], dtype=np.float64)
    return Image(
        "f.gbr", {}, False, (), (), kind, np.ones(n, dtype=np.bool_), minus, minus, points["start"], points["end"], points["centre"], sweep,
        contours, np.arange(1, n + 1, dtype=np.int32), minus, minus, minus, (), (), (),
    )  # fmt: skip
