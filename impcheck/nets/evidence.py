"""What the files say of each piece of copper. In: artwork, copper and labels; out: names per label by source, pins, places, in mm."""

from __future__ import annotations

from collections import Counter, defaultdict
from dataclasses import dataclass, field
from functools import cache

import numpy as np
import shapely
from numpy.typing import NDArray

from impcheck.artwork.image import Floats, Ints, Kind
from impcheck.artwork.names import natural
from impcheck.artwork.parts import Artwork
from impcheck.copper.copper import Copper
from impcheck.errors import Remark, RemarkKind
from impcheck.nets.nets import BoardPin
from impcheck.nets.touching import point_segment

ON_COPPER = 0.001  # mm, a point this near lies on the copper
NEAR_COPPER = 0.05  # mm, and this near where none is nearer: netlists round their places to 2.5 um and to pad centres
UNCONNECTED = ("", "N/C")  # names that mean no net


@dataclass
class Evidence:
    """Names by source and pins, collected while the files are gone through."""

    attribute_names: dict[int, Counter[str]] = field(default_factory=lambda: defaultdict(Counter))  # label -> names of .N attributes
    netlist_names: dict[int, Counter[str]] = field(default_factory=lambda: defaultdict(Counter))
    ties: set[frozenset[str]] = field(default_factory=set)  # names given to one pad together
    pins: list[BoardPin] = field(default_factory=list)
    piece_names: list[tuple[Ints, tuple[tuple[str, ...], ...]]] = field(
        default_factory=list
    )  # per layer: index into names a piece, -1 none
    places: dict[tuple[int, str], list[tuple[tuple[float, float], int | None]]] = field(default_factory=lambda: defaultdict(list))
    anchored: set[tuple[str, int]] = field(default_factory=set)  # (name, label) with a pin, a netlist point or a named pad
    remarks: list[Remark] = field(default_factory=list)

    def names(self) -> dict[int, tuple[str, ...]]:
        """Label -> names, the most frequent first."""
        found: dict[int, Counter[str]] = defaultdict(Counter)
        for source in (self.attribute_names, self.netlist_names):
            for label, names in source.items():
                found[label].update(names)
        return {label: tuple(by_count(names)) for label, names in sorted(found.items())}


def by_count(counted: Counter[str]) -> list[str]:
    """Names, the most frequent first."""
    return sorted(counted, key=lambda name: (-counted[name], natural(name))) if len(counted) > 1 else list(counted)


class Finder:
    """Finds the copper at a place."""

    def __init__(self, copper: Copper, piece_label: tuple[Ints, ...], barrel_label: Ints) -> None:
        self.copper, self.piece_label, self.barrel_label = copper, piece_label, barrel_label
        self._trees: dict[int, shapely.STRtree] = {}
        middle = (copper.barrels.start + copper.barrels.end) / 2
        self._barrels = shapely.STRtree(np.asarray(shapely.points(middle), object)) if len(middle) else None

    def tree(self, layer: int) -> shapely.STRtree:
        """The spatial index of a layer's pieces."""
        if layer not in self._trees:
            self._trees[layer] = shapely.STRtree(self.copper.layers[layer].shape)
        return self._trees[layer]

    def on_layer(self, layer: int, points: Floats, reach: float) -> Ints:
        """(n,) label of the copper within `reach` of each point on a layer, the nearest; -1 none."""
        found = np.full(len(points), -1, np.int32)
        shape = self.copper.layers[layer].shape
        if len(points) and len(shape):
            places = np.asarray(shapely.points(points), object)
            which, piece = self.tree(layer).query(places, predicate="dwithin", distance=reach)
            away = shapely.distance(shape[piece], places[which]) if reach > ON_COPPER else np.zeros(len(which))
            order = np.lexsort((piece, away, which))[::-1]
            found[which[order]] = self.piece_label[layer][piece[order]]
        return found

    def barrel_at(self, points: Floats, reach: float = NEAR_COPPER) -> Ints:
        """(n,) index of the barrel whose axis lies within its radius or `reach` of each point; -1 none."""
        found = np.full(len(points), -1, np.int32)
        if self._barrels is None or len(points) == 0:
            return found
        barrels = self.copper.barrels
        widest = float(np.max(np.maximum(barrels.diameter / 2, reach) + np.hypot(*(barrels.end - barrels.start).T) / 2))
        which, barrel = self._barrels.query(shapely.points(points), predicate="dwithin", distance=widest)
        distance = point_segment(points[which], barrels.start[barrel], barrels.end[barrel])
        near = distance <= np.maximum(barrels.diameter[barrel] / 2, reach)
        which, barrel, distance = which[near], barrel[near], distance[near]
        order = np.lexsort((barrel, distance, which))[::-1]
        found[which[order]] = barrel[order]
        return found


def inner_points(shape: NDArray[np.object_]) -> Floats:
    """(n, 2) a point in each polygon: its centroid where that lies in it."""
    middle = np.asarray(shapely.centroid(shape), object)
    outside = ~shapely.intersects(shape, middle)
    middle[outside] = shapely.point_on_surface(shape[outside])
    return np.asarray(shapely.get_coordinates(middle), np.float64).reshape(-1, 2)


def gather(artwork: Artwork, copper: Copper, finder: Finder) -> Evidence:
    """Goes through attributes, drills and netlist."""
    evidence = Evidence()
    _attributes(copper, finder, evidence)
    _drills(artwork, finder, evidence)
    _netlist(artwork, finder, evidence)
    unique: dict[tuple[str, str, int], BoardPin] = {}
    for pin in evidence.pins:
        unique.setdefault((pin.component, pin.number, pin.label), pin)
    key = cache(natural)  # parts and numbers come again and again
    evidence.pins = sorted(unique.values(), key=lambda pin: (key(pin.component), key(pin.number), pin.label))
    return evidence


def _attributes(copper: Copper, finder: Finder, evidence: Evidence) -> None:
    for layer, labels in zip(copper.layers, finder.piece_label, strict=True):
        image = layer.image
        drawn = layer.object >= 0
        owner = layer.object[drawn]
        net = np.full(len(layer.object), -1, np.int32)
        net[drawn] = image.net[owner]
        usable = np.array([bool(set(names) - set(UNCONNECTED)) for names in image.nets] or [False])
        net = np.where((net >= 0) & usable[net], net, -1)
        evidence.piece_names.append((net, image.nets))
        named = np.flatnonzero(net >= 0)
        flash = np.zeros(len(net), bool)
        flash[drawn] = image.kind[owner] == Kind.FLASH
        pairs, times = np.unique(np.column_stack([labels[named], net[named], flash[named]]), axis=0, return_counts=True)
        for (label, index, pad), count in zip(pairs.tolist(), times.tolist(), strict=True):
            names = [name for name in image.nets[index] if name not in UNCONNECTED]
            for name in names:
                evidence.attribute_names[label][name] += count
                if pad:
                    evidence.anchored.add((name, label))
            if len(names) > 1:
                evidence.ties.add(frozenset(names))
        pinned = np.flatnonzero(drawn)[image.pin[owner] >= 0]
        places = image.start[layer.object[pinned]].copy()
        drawn_pad = image.kind[layer.object[pinned]] == Kind.REGION  # such a pad has no place of its own
        places[drawn_pad] = inner_points(layer.shape[pinned[drawn_pad]])
        barrel = finder.barrel_at(places)
        for piece, (x, y), hole in zip(pinned.tolist(), places.tolist(), barrel.tolist(), strict=True):
            pin = image.pins[image.pin[layer.object[piece]]]
            label = int(labels[piece])
            through = hole >= 0 and finder.barrel_label[hole] == label
            name = image.nets[net[piece]][0] if net[piece] >= 0 else ""
            evidence.pins.append(BoardPin(pin.component, pin.number, (x, y), None if through else layer.index, label, name))
            if name:
                evidence.anchored.add((name, label))


def _drills(artwork: Artwork, finder: Finder, evidence: Evidence) -> None:
    for drill in artwork.drills:
        holes = drill.holes
        tagged = np.flatnonzero((holes.net >= 0) | (holes.pin >= 0))
        middle = (holes.start[tagged] + holes.end[tagged]) / 2
        for hole, place, barrel in zip(tagged.tolist(), middle.tolist(), finder.barrel_at(middle).tolist(), strict=True):
            if barrel < 0:
                continue
            label = int(finder.barrel_label[barrel])
            names = [name for name in holes.nets[holes.net[hole]] if name not in UNCONNECTED] if holes.net[hole] >= 0 else []
            for name in names:
                evidence.attribute_names[label][name] += 1
                evidence.anchored.add((name, label))
                evidence.places[label, name].append(((place[0], place[1]), None))
            if holes.pin[hole] >= 0:
                pin = holes.pins[holes.pin[hole]]
                evidence.pins.append(BoardPin(pin.component, pin.number, (place[0], place[1]), None, label, names[0] if names else ""))


def _netlist(artwork: Artwork, finder: Finder, evidence: Evidence) -> None:
    points = artwork.netlist
    if points is None or len(points.net) == 0:
        return
    label, layer = netlist_labels(points.at, points.access, points.plated, np.isfinite(points.drill), finder)
    lost = np.flatnonzero(label < 0)
    for index in range(len(points.net)):
        mine, name = int(label[index]), points.net[index]
        if mine < 0:
            continue
        x, y = points.at[index].tolist()
        where = None if layer[index] < 0 else int(layer[index])
        if name not in UNCONNECTED:
            evidence.netlist_names[mine][name] += 1
            evidence.anchored.add((name, mine))
            evidence.places[mine, name].append(((x, y), where))
        component = points.component[index]
        if component and component != "VIA":
            evidence.pins.append(BoardPin(component, points.pin[index], (x, y), where, mine, "" if name in UNCONNECTED else name))
    if len(lost):
        first = lost[0]
        x, y = points.at[first].tolist()
        text = (
            f"{len(lost)} of {len(points.net)} netlist points lie on no copper, the first of net {points.net[first]} at ({x:.3f}, {y:.3f})"
        )
        evidence.remarks.append(Remark(RemarkKind.DISAGREEMENT, text, points.file, int(points.line[first])))


def netlist_labels(at: Floats, access: Ints, plated: NDArray[np.bool_], drilled: NDArray[np.bool_], finder: Finder) -> tuple[Ints, Ints]:
    """Label and copper layer (-1: a barrel) of each netlist point; label -1 where there is no copper."""
    count = len(finder.copper.layers)
    label = np.full(len(at), -1, np.int32)
    layer = np.full(len(at), -1, np.int32)
    through = np.flatnonzero(drilled & plated)
    barrel = finder.barrel_at(at[through])
    label[through[barrel >= 0]] = finder.barrel_label[barrel[barrel >= 0]]
    for reach in (ON_COPPER, NEAR_COPPER):
        for index in range(count):
            wanted = np.flatnonzero((label < 0) & ((access == index + 1) | (access == 0)))
            found = finder.on_layer(index, at[wanted], reach)
            hit = wanted[found >= 0]
            label[hit], layer[hit] = found[found >= 0], index
    rest = np.flatnonzero(label < 0)  # the side named holds no copper there: a barrel may
    barrel = finder.barrel_at(at[rest])
    label[rest[barrel >= 0]] = finder.barrel_label[barrel[barrel >= 0]]
    return label, layer
