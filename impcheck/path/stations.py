"""Cross-sections along legs. In: legs of all walks, copper, nets, stackup; out: one Stations for each leg, in mm."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
import shapely
from numpy.typing import NDArray

from impcheck.artwork.image import Bools, Floats
from impcheck.artwork.stackup import Stackup
from impcheck.copper.copper import Copper, LayerCopper
from impcheck.nets.nets import Nets
from impcheck.path import events, zones
from impcheck.path.cuts import HAIRLINE, coverage, cut, union_length
from impcheck.path.edges import LayerEdges, LocalEdges
from impcheck.path.frame import Frame, make_frame, usual_width
from impcheck.path.intervals import clean_own, own_interval, part_of, spread
from impcheck.path.reference import reaches, references
from impcheck.path.route import Leg
from impcheck.path.strands import Pads
from impcheck.path.walk import Intervals, Stations, Zone

CLOSED = 1e-6  # mm of the reach that may stay open
ANTIPAD_SEARCH = 3.0  # mm around a barrel where its antipad's edge is looked for


@dataclass(frozen=True)
class LegFacts:
    """What the walk knows of a leg beside its line."""

    group: int  # of declared nets
    stay: int  # legs of one walk that follow each other on one layer share a number
    open_ends: tuple[bool, bool]  # the walk begins or ends there
    barrels: tuple[int, int]  # barrel at each end, -1 none


class Measure:
    """Measures all legs of a board."""

    def __init__(self, copper: Copper, nets: Nets, stackup: Stackup, owner: NDArray[np.int64], pads: Pads) -> None:
        """`owner` (labels + 1,): group of declared nets that carries each label, -1 none."""
        self.copper, self.nets, self.stackup, self.owner = copper, nets, stackup, owner
        self.wanted = np.zeros(nets.count + 1, dtype=np.bool_)
        self.wanted[list(nets.returns)] = True
        self.pads = _pads_by_layer(pads, len(copper.layers))
        self._edges: dict[int, LayerEdges] = {}
        self._near = np.empty(0, dtype=object)

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
        frame = make_frame(legs, np.zeros(len(legs)))
        middle = frame.windows.origin + frame.windows.heading * (frame.windows.length / 2)[:, None]
        group = np.array([fact.group for fact in facts], dtype=np.int64)
        judged = np.zeros(len(middle), dtype=np.bool_)
        for layer in range(len(self.copper.layers)):
            here = np.flatnonzero(layers[frame.leg] == layer)
            judged[here] = zones.pad_zones(middle[here], group[frame.leg[here]], self.pads[layer])[0] == Zone.TRACE
        above, below = references(frame, np.array([fact.stay for fact in facts]), judged, self.copper, self.nets)
        reach, height = reaches(layers.tolist(), above, below, usual, self.stackup)
        self._near = make_frame(legs, reach).windows.boxes(0.01)
        result: dict[int, Stations] = {}
        for layer in np.unique(layers).tolist():
            here = np.flatnonzero(layers == layer)
            chosen: list[int] = here.tolist()
            part = _Part(
                make_frame([legs[i] for i in chosen], reach[here]),
                [facts[i] for i in chosen],
                group[here],
                above[here],
                below[here],
                height[here],
                reach[here],
                layer,
            )
            for index, stations in zip(chosen, self._layer(part, leaving), strict=True):
                result[index] = stations
        return [result[index] for index in range(len(legs))]

    def _layer(self, part: _Part, leaving: Mapping[int, Sequence[tuple[float, float, float]]]) -> list[Stations]:
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
        lost = entry < 0
        measured[lost] = frame.width[window[lost]]
        zone, pad_size = zones.pad_zones(at, part.group[leg], self.pads[layer])
        plain = zone == Zone.TRACE
        zone[plain & zones.within(leg, middle, bends)] = int(Zone.BEND)
        zone[plain & zones.within(leg, middle, joints)] = int(Zone.JUNCTION)
        first = np.searchsorted(leg, np.arange(len(frame.legs) + 1))
        width = measured.copy()
        for index, fact in enumerate(part.facts):
            own = slice(int(first[index]), int(first[index + 1]))
            drawn = usual_width(frame.legs[index])
            usual = zones.usual_of(zone[own], measured[own], begin[own], end[own], drawn)
            zones.spread_teardrops(zone[own], begin[own], end[own], measured[own], usual, open_ends=fact.open_ends)
            width[own] = zones.carried_width(zone[own], measured[own], drawn)
        width = np.minimum(width, pad_size)
        narrowed = width < measured - 1e-9
        centre[narrowed] = 0.0
        cuts = clean_own(cuts, entry, narrowed, width, centre, zone=zone, owner=self.owner, group=part.group[leg])
        others = self._outwards(part, leg, window, s)
        cover = {
            other: coverage(found, centre - width / 2, centre + width / 2, self.wanted, where) for other, (where, found) in others.items()
        }
        covered = [np.zeros(len(leg)), np.zeros(len(leg))]
        for side, reference in enumerate((part.above, part.below)):
            for other, values in cover.items():
                mine = reference[leg] == other
                covered[side][mine] = values[mine]
        self._spread_vias(part, first, zone, begin, end, covered=covered)
        normal = np.stack([-heading[:, 1], heading[:, 0]], axis=1)
        result = []
        for index in range(len(frame.legs)):
            own = slice(int(first[index]), int(first[index + 1]))
            along = frame.legs[index].along
            met = {layer: part_of(cuts, own)}
            for other, (where, found) in others.items():
                if where[own].any():
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
        part: _Part,
        edges: LayerEdges,
        local: LocalEdges,
        bends: tuple[NDArray[np.int64], Floats, Floats],
        joints: tuple[NDArray[np.int64], Floats, Floats],
    ) -> tuple[NDArray[np.int64], Floats, Floats]:
        frame = part.frame
        sure: events.Places = []
        loose: events.Places = []
        weak: events.Places = []
        own = self.owner[edges.labels[local.piece]] == part.group[frame.leg[local.window]]
        stroke = _strokes(self.copper.layers[part.layer])
        hidden = self._hidden(part, edges, local, own & ~stroke[local.piece])
        events.own_layer(frame, local, own, stroke[local.piece], hidden, sure=sure, loose=loose, weak=weak)
        for other in range(len(self.copper.layers)):
            between = part.between(other)
            windows = np.flatnonzero(between[frame.leg])
            if other == part.layer or not len(windows):
                continue
            there = self.edges(other)
            found = there.local(frame.windows.take(windows))
            found = _renumber(found, windows)
            part.kept[other] = (windows, found)
            events.plane_layer(frame, found, self.wanted[there.labels[found.piece]], part.height[frame.leg], sure=sure, weak=weak)
        exact = (
            np.concatenate([bends[0], bends[0], joints[0], joints[0]]),
            np.concatenate([bends[1], bends[2], joints[1], joints[2]]),
        )
        return events.boundaries(frame, sure, loose, weak, exact)

    def _hidden(self, part: _Part, edges: LayerEdges, local: LocalEdges, asked: Bools) -> Bools:
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

    def _outwards(self, part: _Part, leg: NDArray[np.int64], window: NDArray[np.int64], s: Floats) -> dict[int, tuple[Bools, Intervals]]:
        """Cuts on the layers above and below, going outwards to the leg's reference and then on where return copper met so far does not
        close the whole reach of a station: layer -> (stations cut there, intervals of all stations)."""
        result: dict[int, tuple[Bools, Intervals]] = {}
        frame, count = part.frame, len(leg)
        for step in (-1, 1):
            going = np.ones(count, dtype=np.bool_)
            met: list[tuple[NDArray[np.int64], Floats, Floats]] = []
            other = part.layer + step
            while going.any() and 0 <= other < len(self.copper.layers):
                there = self.edges(other)
                mine = np.flatnonzero(going)
                needed = np.unique(window[mine])
                windows, found = part.kept.get(other, (np.empty(0, np.int64), None))
                if found is None or len(np.setdiff1d(needed, windows, assume_unique=True)):
                    found = _renumber(there.local(frame.windows.take(needed)), needed)
                few = cut(there, found, frame.windows, window[mine], s[mine], reach=part.reach[leg[mine]], hairline=HAIRLINE)
                result[other] = (going, spread(few, mine, count))
                station = np.repeat(mine, np.diff(few.first))
                kept = self.wanted[few.label]
                met.append((station[kept], few.low[kept], few.high[kept] + HAIRLINE / 2))
                where, low, high = (np.concatenate([entry[k] for entry in met]) for k in range(3))
                closed = union_length(where, low, high, count)
                going = going & ((closed < 2 * part.reach[leg] - HAIRLINE - CLOSED) | part.between(other + step)[leg])
                other += step
        return result

    def _spread_vias(
        self, part: _Part, first: NDArray[np.int64], zone: NDArray[np.uint8], begin: Floats, end: Floats, *, covered: list[Floats]
    ) -> None:
        for index, fact in enumerate(part.facts):
            if max(fact.barrels) < 0:
                continue
            own = slice(int(first[index]), int(first[index + 1]))
            for reference, values in zip((part.above, part.below), covered, strict=True):
                if reference[index] < 0:
                    continue
                missing = values[own] < 1 - 1e-6
                caps = [
                    0.0 if barrel < 0 else self._antipad_reach(barrel, int(reference[index]), usual_width(part.frame.legs[index]))
                    for barrel in fact.barrels
                ]
                zones.spread_antipads(zone[own], begin[own], end[own], missing, (caps[0], caps[1]))

    def _antipad_reach(self, barrel: int, layer: int, width: float) -> float:
        """How far along a trace a barrel's own antipad may reach: twice the distance to the nearest return copper, plus the width."""
        barrels = self.copper.barrels
        place = shapely.Point((barrels.start[barrel] + barrels.end[barrel]) / 2)
        edges = self.edges(layer)
        near = edges.used[edges.tree.query(place.buffer(ANTIPAD_SEARCH))] if len(edges.used) else np.empty(0, np.int64)
        near = near[self.wanted[edges.labels[near]]]
        if not len(near):
            return ANTIPAD_SEARCH
        return float(2 * min(shapely.distance(edges.shape[near], place).min(), ANTIPAD_SEARCH / 2) + width)


@dataclass
class _Part:
    """The legs of one layer."""

    frame: Frame
    facts: list[LegFacts]
    group: NDArray[np.int64]
    above: NDArray[np.int64]
    below: NDArray[np.int64]
    height: Floats
    reach: Floats
    layer: int

    def __post_init__(self) -> None:
        self.kept: dict[int, tuple[NDArray[np.int64], LocalEdges]] = {}

    def between(self, other: int) -> Bools:
        """(legs,) True where `other` lies between the leg and its reference, the reference included (next to it where there is none)."""
        if other < self.layer:
            return (other >= self.above) & ((self.above >= 0) | (other == self.layer - 1))
        result: Bools = ((other <= self.below) & (self.below >= 0)) | ((self.below < 0) & (other == self.layer + 1))
        return result


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
        size = 2 * shapely.minimum_bounding_radius(shape[here]) + 1e-6
        result.append(zones.PadShapes(shape[here], net[here], via, size))
    return result


def _renumber(local: LocalEdges, windows: NDArray[np.int64]) -> LocalEdges:
    """Edges of a choice of windows with the numbers the windows have in the whole."""
    return replace(local, window=windows[local.window], solid_window=windows[local.solid_window])
