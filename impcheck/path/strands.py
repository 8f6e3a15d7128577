"""Straight pieces of centreline and pads of the declared nets. In: copper and labels; out: strands and pads as arrays, mm."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from itertools import pairwise

import numpy as np
import shapely
from numpy.typing import NDArray

from impcheck.artwork.image import Bools, Floats, Ints, Kind
from impcheck.copper.copper import Copper, LayerCopper
from impcheck.nets.nets import BoardPin, Nets
from impcheck.path.regions import centrelines, pad_regions

CHORD_ERROR = 0.001  # mm, of chopped arcs, as everywhere in the house
FLANK = 0.005  # mm beside a stroke where the free-flank test looks
PAINT_LENGTH = 2.0  # widths: a stroke shorter than this is never taken for paint
REGISTRATION = 0.02  # mm between the centre of a pad and that of its hole in files that mean the same place


@dataclass(frozen=True)
class Strands:
    """n straight pieces of centreline."""

    net: Ints  # (n,) group of declared nets (see groups_of)
    layer: Ints  # (n,)
    start: Floats  # (n, 2)
    end: Floats  # (n, 2)
    width: Floats  # (n,) drawn or mean width
    link: Bools  # (n,) True for a piece that was not drawn: within a pad, or across an overlap

    def __len__(self) -> int:
        return len(self.net)

    def lines(self) -> NDArray[np.object_]:
        """(n,) shapely LineStrings."""
        return np.asarray(shapely.linestrings(np.stack([self.start, self.end], axis=1)), dtype=object)

    @staticmethod
    def join(parts: Sequence[Strands]) -> Strands:
        """All strands of `parts`, one after the other."""
        return Strands(
            *(np.concatenate([getattr(part, name) for part in parts]) for name in ("net", "layer", "start", "end", "width", "link")),
        )

    def take(self, keep: NDArray[np.bool_] | NDArray[np.int64]) -> Strands:
        """The strands at `keep` (mask or indices)."""
        return Strands(self.net[keep], self.layer[keep], self.start[keep], self.end[keep], self.width[keep], self.link[keep])


def strands_of(net: int, layer: int, start: Floats, end: Floats, width: Floats | float, *, link: bool = False) -> Strands:
    """Strands of one net on one layer; start, end (n, 2)."""
    count = len(start)
    return Strands(
        np.full(count, net, dtype=np.int32),
        np.full(count, layer, dtype=np.int32),
        np.asarray(start, dtype=np.float64).reshape(count, 2),
        np.asarray(end, dtype=np.float64).reshape(count, 2),
        np.broadcast_to(np.asarray(width, dtype=np.float64), (count,)).copy(),
        np.full(count, link, dtype=np.bool_),
    )


@dataclass
class Pads:
    """Copper of the declared nets where traces end: flashes, dots, small regions, pours and the discs of barrels."""

    net: list[int] = field(default_factory=list)
    layer: list[int] = field(default_factory=list)
    shape: list[shapely.Polygon] = field(default_factory=list)
    centre: list[tuple[float, float]] = field(default_factory=list)
    barrel: list[int] = field(default_factory=list)  # index of the barrel whose disc it is, -1 for a pad
    blob: list[bool] = field(default_factory=list)  # a pour: copper without a centreline

    def add(
        self, net: int, layer: int, shape: shapely.Polygon, centre: tuple[float, float], *, barrel: int = -1, blob: bool = False
    ) -> None:
        """Adds one."""
        self.net.append(net)
        self.layer.append(layer)
        self.shape.append(shape)
        self.centre.append((float(centre[0]), float(centre[1])))
        self.barrel.append(barrel)
        self.blob.append(blob)

    def __len__(self) -> int:
        return len(self.net)


def gather(copper: Copper, nets: Nets) -> tuple[Strands, Pads]:
    """Strands and pads of all declared nets, pads in order of net and layer, barrels last."""
    parts = [strands_of(0, 0, np.empty((0, 2)), np.empty((0, 2)), 0.0)]
    pads = Pads()
    net_of_label = groups_of(nets)[1]
    barrel_net = net_of_label[nets.barrel_label] if len(nets.barrel_label) else np.empty(0, dtype=np.int64)
    barrels = copper.barrels
    pin_points: dict[tuple[int, int], list[tuple[float, float]]] = {}
    for pin in _pins(nets):
        net = int(net_of_label[pin.label]) if 0 <= pin.label < len(net_of_label) else -1
        if net >= 0:
            for layer in range(len(copper.layers)) if pin.layer is None else (pin.layer,):
                known = pin_points.setdefault((net, layer), [])
                if pin.at not in known:
                    known.append(pin.at)
    for sheet in copper.layers:
        owner = net_of_label[nets.piece_label[sheet.index]] if len(sheet.shape) else np.empty(0, dtype=np.int64)
        mine = np.flatnonzero(owner >= 0)
        mine = mine[np.argsort(owner[mine], kind="stable")]
        flashed = _flashes(sheet, mine)
        bounds = [0, *(np.flatnonzero(np.diff(owner[mine])) + 1).tolist(), len(mine)]
        for low, high in pairwise(bounds):
            if low == high:
                continue
            pieces, net = mine[low:high], int(owner[mine[low]])
            _add_flashes(net, sheet, pieces[flashed[low:high]], pads)
            if not flashed[low:high].all():
                reached = (barrel_net == net) & (barrels.first <= sheet.index) & (barrels.last >= sheet.index)
                holes = (barrels.start[reached] + barrels.end[reached]) / 2
                parts.append(_on_layer(net, sheet, pieces, pin_points.get((net, sheet.index), []), holes, pads=pads))
    pad_net = np.array(pads.net, dtype=np.int64)
    by_net = np.argsort(pad_net, kind="stable")
    all_centres, pad_net = np.array(pads.centre).reshape(-1, 2)[by_net], pad_net[by_net]
    for barrel in np.flatnonzero(barrel_net >= 0).tolist():
        middle = (barrels.start[barrel] + barrels.end[barrel]) / 2
        # a drill file of few digits rounds its places: the barrel of a pad stands in its middle
        centres = all_centres[slice(*np.searchsorted(pad_net, [barrel_net[barrel], barrel_net[barrel] + 1]))]
        away = np.hypot(*(centres - middle).T)
        place = centres[np.argmin(away)] if len(away) and away.min() <= REGISTRATION else middle
        disc = shapely.LineString([barrels.start[barrel], barrels.end[barrel]]).buffer(barrels.diameter[barrel] / 2)
        if (barrels.start[barrel] == barrels.end[barrel]).all():
            disc = shapely.Point(middle).buffer(barrels.diameter[barrel] / 2)
        for level in range(int(barrels.first[barrel]), int(barrels.last[barrel]) + 1):
            pads.add(int(barrel_net[barrel]), level, disc, (float(place[0]), float(place[1])), barrel=barrel)
    return Strands.join(parts), pads


def groups_of(nets: Nets) -> tuple[list[int], NDArray[np.int64]]:
    """Declared nets that share copper (a short, or joins) form one group and one graph.

    Returns the group of each declared net, and (labels + 1,) the group that carries each label, -1 none.
    """
    group = list(range(len(nets.declared)))
    owner = np.full(nets.count + 1, -1, dtype=np.int64)
    for index, net in enumerate(nets.declared):
        met = sorted({int(owner[label]) for label in net.labels if owner[label] >= 0})
        if met:
            group = [met[0] if other in met else other for other in group]
            owner[np.isin(owner, met)] = met[0]
            group[index] = met[0]
        owner[list(net.labels)] = group[index]
    return group, owner


def _pins(nets: Nets) -> list[BoardPin]:
    found = list(nets.pins)
    for net in nets.declared:
        found += [*net.begin, *net.ends]
    return found


def _flashes(layer: LayerCopper, pieces: NDArray[np.int64]) -> Bools:
    """(pieces,) True for flashes and for strokes of no length, which are flashes too."""
    drawn = layer.object[pieces] >= 0
    item = np.maximum(layer.object[pieces], 0)
    if not len(layer.image.kind):
        return drawn
    dot = (layer.image.kind[item] == Kind.DRAW) & (np.hypot(*(layer.image.end[item] - layer.image.start[item]).T) <= 1e-9)
    result: Bools = drawn & ((layer.image.kind[item] == Kind.FLASH) | dot)
    return result


def _add_flashes(net: int, layer: LayerCopper, pieces: NDArray[np.int64], pads: Pads) -> None:
    """Adds the flashes `pieces` to `pads`, each at its place, or inside what clear copper left of it."""
    centres = layer.image.start[layer.object[pieces]]
    for piece, drawn_at in zip(pieces.tolist(), centres.tolist(), strict=True):
        shape = layer.shape[piece]
        hollow = not layer.whole[piece] and not shapely.intersects_xy(shape, *drawn_at)
        place = shape.representative_point().coords[0] if hollow else drawn_at
        pads.add(net, layer.index, shape, (place[0], place[1]))


def _on_layer(
    net: int, layer: LayerCopper, pieces: NDArray[np.int64], pins: list[tuple[float, float]], holes: Floats, *, pads: Pads
) -> Strands:
    """Strands of one net on one layer; its pads beside the flashes are added to `pads`."""
    image, objects = layer.image, layer.object[pieces]
    kind = np.where(objects >= 0, image.kind[np.maximum(objects, 0)], int(Kind.REGION)).astype(np.int64)
    flashes = _flashes(layer, pieces)
    draws, arcs = (kind == Kind.DRAW) & ~flashes, kind == Kind.ARC
    shapes = layer.shape[pieces]
    strokes, piece_of = _stroke_lines(net, layer, pieces, draws, arcs)
    painted = np.zeros(len(pieces), dtype=np.bool_)
    if np.count_nonzero(~flashes) > 1 and len(strokes):
        painted = _painted(strokes, piece_of, shapes, flashes)
        strokes = strokes.take(~painted[piece_of])
    others = np.flatnonzero(((kind == Kind.REGION) & ~arcs) | painted)
    if not len(others):
        return strokes
    regions = others[~painted[others]]
    unclaimed = [pin for pin in pins if not shapely.intersects_xy(shapes[flashes], *pin).any()]
    compact = pad_regions(shapes[regions], unclaimed, holes)
    for position, centre in compact.items():
        pads.add(net, layer.index, shapes[regions[position]], centre)
    kept = np.setdiff1d(others, regions[list(compact)])
    solid = [*shapes[(draws | arcs) & ~painted], *shapes[flashes]]
    lines, pours = centrelines(shapes[kept], solid, len(strokes) > 0)
    for shape in pours:
        middle = shape.centroid if shape.intersects(shape.centroid) else shape.representative_point()
        pads.add(net, layer.index, shape, (middle.x, middle.y), blob=True)
    return Strands.join([strokes, *(strands_of(net, layer.index, *line) for line in lines)])


def _stroke_lines(net: int, layer: LayerCopper, pieces: NDArray[np.int64], draws: Bools, arcs: Bools) -> tuple[Strands, NDArray[np.int64]]:
    """Strands of straight and circular strokes, and for each the position in `pieces` it comes from."""
    image, objects = layer.image, layer.object[pieces]
    plain = np.flatnonzero(draws & layer.whole[pieces])
    width = layer.width[pieces].copy()
    for position in np.flatnonzero(np.isnan(width) & (draws | arcs)).tolist():
        shape = layer.shape[pieces[position]]
        width[position] = (
            2 * shape.area / shape.length
            if arcs[position]
            else _extent_across(layer.shape[pieces[position]], image.start[objects[position]], image.end[objects[position]])
        )
    parts = [strands_of(net, layer.index, image.start[objects[plain]], image.end[objects[plain]], width[plain])]
    owners = [plain]
    for position in np.flatnonzero((draws | arcs) & ~(draws & layer.whole[pieces])).tolist():
        item = objects[position]
        points = np.stack([image.start[item], image.end[item]])
        if arcs[position]:
            points = chop(image.start[item], image.centre[item], float(image.sweep[item]))
            points[-1] = image.end[item]
        chains = [points]
        if not layer.whole[pieces[position]]:
            cut = shapely.intersection(shapely.LineString(points), layer.shape[pieces[position]])
            chains = [
                shapely.get_coordinates(part) for part in shapely.get_parts(cut) if part.geom_type == "LineString" and part.length > 1e-6
            ]
        for chain in chains:
            parts.append(strands_of(net, layer.index, chain[:-1], chain[1:], width[position]))
            owners.append(np.full(len(chain) - 1, position))
    return Strands.join(parts), np.concatenate(owners)


def chop(start: Floats, centre: Floats, sweep: float) -> Floats:
    """Points (k, 2) on an arc with at most CHORD_ERROR between chord and arc; `sweep` in radians, counter-clockwise positive."""
    spoke = start - centre
    radius = float(np.hypot(*spoke))
    if radius <= CHORD_ERROR:
        return np.stack([start, start])
    count = max(1, int(np.ceil(abs(sweep) / (2 * np.arccos(1 - CHORD_ERROR / radius)))))
    angle = np.linspace(0.0, sweep, count + 1)
    cos, sin = np.cos(angle), np.sin(angle)
    return np.stack([centre[0] + cos * spoke[0] - sin * spoke[1], centre[1] + sin * spoke[0] + cos * spoke[1]], axis=1)


def _extent_across(shape: shapely.Polygon, start: Floats, end: Floats) -> float:
    """Extent of a stroke's copper across its direction, mm (exact for a straight stroke of any aperture)."""
    along = end - start
    length = np.hypot(*along)
    if length < 1e-9:
        return float(2 * shape.area / shape.length)
    across = (shapely.get_coordinates(shape) - start) @ np.array([-along[1], along[0]]) / length
    return float(across.max() - across.min())


def _painted(strokes: Strands, piece_of: NDArray[np.int64], shapes: NDArray[np.object_], flashes: Bools) -> Bools:
    """(pieces,) True for strokes that fill an area: most of what lies just beside their edges is copper of the same net.

    Flashes do not count as such copper (a short stroke within a pad is a trace), nor does a stroke that crosses or leads on.
    """
    along = strokes.end - strokes.start
    length = np.hypot(*along.T)
    along = along / np.maximum(length, 1e-12)[:, None]
    normal = np.stack([-along[:, 1], along[:, 0]], axis=1)
    places = np.array([0.2, 0.4, 0.6, 0.8])
    middle = strokes.start[:, None, :] + places[None, :, None] * (along * length[:, None])[:, None, :]
    off = (strokes.width / 2 + FLANK)[:, None, None] * normal[:, None, :]
    points = np.concatenate([middle + off, middle - off], axis=1)  # (strokes, 8, 2)
    solid = np.flatnonzero(~flashes)
    tree = shapely.STRtree(shapes[solid])
    hit, _ = tree.query(shapely.points(points.reshape(-1, 2)), predicate="intersects")
    covered = np.zeros(points.shape[0] * points.shape[1], dtype=np.bool_)
    covered[hit] = True
    share = covered.reshape(points.shape[:2]).mean(axis=1)
    weight = np.bincount(piece_of, length, len(shapes))
    mean = np.bincount(piece_of, share * length, len(shapes)) / np.maximum(weight, 1e-12)
    longest = PAINT_LENGTH * np.bincount(piece_of, strokes.width * length, len(shapes)) / np.maximum(weight, 1e-12)
    result: Bools = (mean > 0.45) & (weight > longest)
    return result
