"""Cross-sections along legs. In: legs of all walks, copper, nets, stackup; out: one Stations for each leg, in mm."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
import shapely
from numpy.typing import NDArray

from impcheck.artwork.image import Bools, Floats
from impcheck.artwork.stackup import Stackup
from impcheck.copper.copper import Copper, LayerCopper
from impcheck.nets.nets import Nets
from impcheck.path import events, zones
from impcheck.path.cuts import coverage, cut
from impcheck.path.edges import LayerEdges, LocalEdges
from impcheck.path.frame import make_frame, usual_width
from impcheck.path.intervals import clean_own, own_interval, part_of
from impcheck.path.outwards import beyond, up_to_references
from impcheck.path.part import LegFacts, Part, Places
from impcheck.path.reference import reaches, references
from impcheck.path.route import Leg
from impcheck.path.strands import Pads
from impcheck.path.walk import Stations, Zone

ANTIPAD_SEARCH = 1.5  # mm around a barrel where its antipad's edge is looked for


class Measure:
    """Measures all legs of a board."""

    def __init__(self, copper: Copper, nets: Nets, stackup: Stackup, owner: NDArray[np.int64], pads: Pads) -> None:
        """`owner` (labels + 1,): group of declared nets that carries each label, -1 none."""
        self.copper, self.nets, self.stackup, self.owner = copper, nets, stackup, owner
        self.wanted = np.zeros(nets.count + 1, dtype=np.bool_)
        self.wanted[list(nets.returns)] = True
        self.pads = _pads_by_layer(pads, len(copper.layers))
        self._edges: dict[int, LayerEdges] = {}
        self._near = shapely.STRtree([])

    def edges(self, layer: int) -> LayerEdges:
        """Edges of one layer near the legs, built when first asked for."""
        if layer not in self._edges:
            self._edges[layer] = LayerEdges(self.copper.layers[layer], self.nets.piece_label[layer], self._near)
        return self._edges[layer]

    def all(
        self, legs: Sequence[Leg], facts: Sequence[LegFacts], leaving: Mapping[int, Sequence[tuple[float, float, float]]]
    ) -> list[Stations]:
        """Stations of every leg, in order."""
        if not legs:
            return []
        layers = np.array([leg.layer for leg in legs])
        usual = np.array([usual_width(leg) for leg in legs])
        frame = make_frame(legs, np.zeros(len(legs)), usual)
        middle = frame.windows.middle()
        group = np.array([fact.group for fact in facts], dtype=np.int64)
        judged = np.zeros(len(middle), dtype=np.bool_)
        for layer in np.unique(layers).tolist():
            here = np.flatnonzero(layers[frame.leg] == layer)
            zone, _ = zones.pad_zones(
                middle[here], np.arange(len(here)), group[frame.leg[here]], frame.windows.take(here), self.pads[layer]
            )
            judged[here] = zone == Zone.TRACE
        above, below = references(frame, np.array([fact.stay for fact in facts]), judged, self.copper, self.nets)
        reach, height = reaches(layers.tolist(), above, below, usual, self.stackup)
        self._near = shapely.STRtree(frame.reaching(reach).windows.boxes(0.01))
        result: dict[int, Stations] = {}
        for layer in np.unique(layers).tolist():
            here = np.flatnonzero(layers == layer)
            chosen: list[int] = here.tolist()
            part = Part(
                layer,
                make_frame([legs[i] for i in chosen], reach[here], usual[here]),
                [facts[i] for i in chosen],
                group[here],
                usual[here],
                above[here],
                below[here],
                height[here],
                reach[here],
            )
            for index, stations in zip(chosen, self._layer(part, leaving), strict=True):
                result[index] = stations
        return [result[index] for index in range(len(legs))]

    def _layer(self, part: Part, leaving: Mapping[int, Sequence[tuple[float, float, float]]]) -> list[Stations]:
        """Stations of the legs of one layer."""
        frame, layer = part.frame, part.layer
        edges = self.edges(layer)
        local = edges.local(frame.windows)
        bends, joints = zones.bend_spans(frame), zones.junction_spans(frame, leaving)
        leg, begin, end = self._boundaries(part, edges, local, bends, joints)
        middle = (begin + end) / 2
        window, s = frame.place(leg, middle)
        heading = frame.windows.heading[window]
        at = frame.windows.origin[window] + heading * s[:, None]
        cuts = cut(edges, local, frame.windows, window, s, reach=part.reach[leg])
        measured, centre, entry = own_interval(cuts, self.owner, part.group[leg])
        places = Places(leg, window, s)
        lost = entry < 0
        measured[lost] = frame.width[window[lost]]
        zone, pad_size = zones.pad_zones(at, window, part.group[frame.leg], frame.windows, self.pads[layer])
        plain = zone == Zone.TRACE
        zone[plain & zones.within(leg, middle, bends)] = int(Zone.BEND)
        zone[plain & zones.within(leg, middle, joints)] = int(Zone.JUNCTION)
        first = np.searchsorted(leg, np.arange(len(frame.legs) + 1))
        width = measured.copy()
        for index, fact in enumerate(part.facts):
            own = slice(int(first[index]), int(first[index + 1]))
            drawn = float(part.usual[index])
            usual = zones.usual_of(zone[own], measured[own], begin[own], end[own], drawn)
            zones.spread_teardrops(zone[own], begin[own], end[own], measured[own], usual, open_ends=fact.open_ends)
            width[own] = zones.carried_width(zone[own], measured[own], drawn)
        width = np.minimum(width, pad_size)
        narrowed = width < measured - 1e-9
        centre[narrowed] = 0.0
        cuts = clean_own(cuts, entry, narrowed, width, centre, zone=zone, owner=self.owner, group=part.group[leg])
        low, high = centre - width / 2, centre + width / 2
        others = up_to_references(part, self.edges, places)
        covered = [np.zeros(len(leg)), np.zeros(len(leg))]
        for other, (where, found) in others.items():
            values = coverage(found, low, high, self.wanted, where)
            for side, reference in enumerate((part.above, part.below)):
                mine = reference[leg] == other
                covered[side][mine] = values[mine]
        self._spread_vias(part, first, zone, begin, end, covered=covered)
        done = zone == Zone.VIA
        beyond(part, self.edges, len(self.copper.layers), places, others, trace=(low, high), done=done, wanted=self.wanted)
        normal = np.stack([-heading[:, 1], heading[:, 0]], axis=1)
        result = []
        for index in range(len(frame.legs)):
            own = slice(int(first[index]), int(first[index + 1]))
            along = frame.legs[index].along
            met = {layer: part_of(cuts, own)}
            for other, (seen, found) in others.items():
                if seen[own].any():
                    met[other] = part_of(found, own)
            count = own.stop - own.start
            result.append(
                Stations(
                    along + begin[own], along + end[own], at[own], normal[own], width[own], centre[own], zone[own],
                    float(part.reach[index]),
                    dict(sorted(met.items())), np.full(count, part.above[index], np.int32), np.full(count, part.below[index], np.int32),
                    covered[0][own], covered[1][own],
                )
            )  # fmt: skip
        return result

    def _boundaries(
        self,
        part: Part,
        edges: LayerEdges,
        local: LocalEdges,
        bends: tuple[NDArray[np.int64], Floats, Floats],
        joints: tuple[NDArray[np.int64], Floats, Floats],
    ) -> tuple[NDArray[np.int64], Floats, Floats]:
        frame = part.frame
        sure: events.Places = []
        loose: events.Places = []
        weak: events.Places = []
        owner, height = self.owner[edges.labels[local.piece]], part.height[frame.leg]
        own = owner == part.group[frame.leg[local.window]]
        stroke = _strokes(self.copper.layers[part.layer])
        hidden = self._hidden(part, edges, local, own & ~stroke[local.piece])
        events.own_layer(frame, local, own, owner >= 0, stroke[local.piece], hidden, height=height, sure=sure, loose=loose, weak=weak)
        for other in range(len(self.copper.layers)):
            between = part.between(other)
            windows = np.flatnonzero(between[frame.leg])
            if other == part.layer or not len(windows):
                continue
            there = self.edges(other)
            found = there.local(frame.windows.take(windows)).renumbered(windows)
            part.kept[other] = (windows, found)
            events.plane_layer(frame, found, self.wanted[there.labels[found.piece]], height, sure=sure, weak=weak)
        exact = (
            np.concatenate([bends[0], bends[0], joints[0], joints[0]]),
            np.concatenate([bends[1], bends[2], joints[1], joints[2]]),
        )
        return events.boundaries(frame, sure, loose, weak, exact)

    def _hidden(self, part: Part, edges: LayerEdges, local: LocalEdges, asked: Bools) -> Bools:
        """(edges,) True for edges at `asked` near the centreline whose far end lies inside another piece of the same label."""
        hidden = np.zeros(len(asked), dtype=np.bool_)
        which = np.flatnonzero(asked & (np.abs(local.t1) < part.frame.width[local.window]))
        heading = part.frame.windows.heading[local.window[which]]
        normal = np.stack([-heading[:, 1], heading[:, 0]], axis=1)
        point = part.frame.windows.origin[local.window[which]] + local.s1[which, None] * heading + local.t1[which, None] * normal
        asker, used = edges.tree.query(shapely.points(point)) if len(which) else (np.empty(0, np.int64), np.empty(0, np.int64))
        piece = edges.used[used]
        other = (piece != local.piece[which[asker]]) & (edges.labels[piece] == edges.labels[local.piece[which[asker]]])
        asker, piece = asker[other], piece[other]
        inside = shapely.contains_xy(edges.shape[piece], point[asker, 0], point[asker, 1])
        hidden[which[asker[inside]]] = True
        return hidden

    def _spread_vias(
        self, part: Part, first: NDArray[np.int64], zone: NDArray[np.uint8], begin: Floats, end: Floats, *, covered: list[Floats]
    ) -> None:
        """Widens the zones of the vias at the ends of legs over their antipads, at most to twice the distance from the barrel to the
        nearest return copper, plus the width."""
        barrels = np.array([fact.barrels for fact in part.facts]).reshape(-1, 2)
        middle = (self.copper.barrels.start + self.copper.barrels.end) / 2
        for reference, values in zip((part.above, part.below), covered, strict=True):
            asked = (barrels >= 0) & (reference >= 0)[:, None]
            caps = np.zeros(barrels.shape)
            for layer in np.unique(reference[asked.any(axis=1)]).tolist():
                leg, side = np.nonzero(asked & (reference == layer)[:, None])
                distance = self.edges(layer).distance(middle[barrels[leg, side]], self.wanted, ANTIPAD_SEARCH)
                caps[leg, side] = 2 * distance + part.usual[leg]
            for index in np.flatnonzero(asked.any(axis=1)).tolist():
                own = slice(int(first[index]), int(first[index + 1]))
                missing = values[own] < 1 - 1e-6
                zones.spread_antipads(zone[own], begin[own], end[own], missing, (float(caps[index, 0]), float(caps[index, 1])))


def _strokes(layer: LayerCopper) -> Bools:
    """(pieces,) True for whole round strokes longer than a dot."""
    moved = np.append((layer.image.start != layer.image.end).any(axis=1) | (layer.image.sweep != 0), False)
    result: Bools = layer.whole & ~np.isnan(layer.width) & moved[layer.object]
    return result


def _pads_by_layer(pads: Pads, layers: int) -> list[zones.PadShapes]:
    net, layer = np.array(pads.net, dtype=np.int64), np.array(pads.layer, dtype=np.int64)
    shape = np.array(pads.shape, dtype=object)
    barrel = np.array(pads.barrel, dtype=np.int64)
    result = []
    for index in range(layers):
        here = np.flatnonzero(layer == index)
        discs = here[barrel[here] >= 0]
        via = barrel[here] >= 0
        if len(discs):
            pad, disc = shapely.STRtree(shape[discs]).query(shape[here], predicate="intersects")
            same = net[here[pad]] == net[discs[disc]]
            via[pad[same]] = True
        result.append(zones.PadShapes(shape[here], net[here], via, _diameters(shape[here]) + 1e-6))
    return result


def _diameters(shapes: NDArray[np.object_]) -> Floats:
    """(n,) diameter of the smallest circle around the middle of each shape's box that holds all of it."""
    bounds = shapely.bounds(shapes).reshape(-1, 4)
    point, owner = shapely.get_coordinates(shapes, return_index=True)
    away = np.hypot(*(point - ((bounds[:, :2] + bounds[:, 2:]) / 2)[owner]).T)
    result: Floats = 2 * np.maximum.reduceat(away, np.searchsorted(owner, np.arange(len(shapes)))) if len(shapes) else np.empty(0)
    return result
