"""Which pieces of copper touch. In: layers of pieces and barrels; out: one label for each connected component, without any union."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import pairwise

import numpy as np
import shapely
from numpy.typing import NDArray
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from impcheck.artwork.image import Floats, Ints, Kind
from impcheck.copper.copper import Barrels, LayerCopper

Capsules = tuple[Floats, Floats, Floats]  # (n, 2) start, (n, 2) end, (n,) radius

CHUNK = 2048  # pieces or pairs looked at together
TOUCH = 0.001  # mm: copper that comes this near is joined


def label_copper(layers: tuple[LayerCopper, ...], barrels: Barrels) -> tuple[tuple[Ints, ...], Ints, int]:
    """Labels of the pieces of each layer, labels of the barrels, and the number of labels."""
    offsets = np.concatenate([[0], np.cumsum([len(layer.shape) for layer in layers])])
    pieces, count = int(offsets[-1]), len(barrels.diameter)
    edges = [np.empty((0, 2), np.int64)]
    for layer, offset in zip(layers, offsets, strict=False):
        capsules = _capsules(layer)
        edges.append(_touching(layer, capsules) + offset)
        edges.append(_barrel_edges(layer, capsules, barrels, offset, pieces))
    number, labels = _components(np.concatenate(edges), pieces + count)
    per_layer = tuple(labels[a:b].astype(np.int32) for a, b in pairwise(offsets))
    return per_layer, labels[pieces:].astype(np.int32), number


def _components(edges: NDArray[np.int64], nodes: int) -> tuple[int, NDArray[np.int32]]:
    if len(edges) == 0:
        return nodes, np.arange(nodes, dtype=np.int32)
    graph = coo_array((np.ones(len(edges), bool), (edges[:, 0], edges[:, 1])), shape=(nodes, nodes))
    number, labels = connected_components(graph, directed=False)
    return int(number), labels


class _Joined:
    """Pieces of one layer joined so far."""

    def __init__(self, count: int) -> None:
        self.count = count
        self.pairs = [np.empty((0, 2), np.int64)]
        self.labels: NDArray[np.int32] = np.arange(count, dtype=np.int32)

    def apart(self, a: NDArray[np.int64], b: NDArray[np.int64]) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
        """Those of the pairs that nothing joins yet."""
        still = self.labels[a] != self.labels[b]
        return a[still], b[still]

    def join(self, a: NDArray[np.int64], b: NDArray[np.int64]) -> None:
        """Joins pairs."""
        if len(a):
            self.pairs.append(np.column_stack([a, b]))
            self.labels = _components(np.concatenate(self.pairs), self.count)[1]


def _touching(layer: LayerCopper, capsules: Capsules) -> NDArray[np.int64]:
    """(m, 2) pairs of pieces of one layer enough to join everything that touches."""
    shape = layer.shape
    joined = _Joined(len(shape))
    start, end, radius = capsules
    others = [np.empty((2, 0), np.int64)]
    for number, pairs in enumerate(_box_pairs(shape)):
        a, b = joined.apart(*pairs)
        round_pair = np.isfinite(radius[a]) & np.isfinite(radius[b])
        ra, rb = a[round_pair], b[round_pair]
        near = segment_distance(start[ra], end[ra], start[rb], end[rb]) <= radius[ra] + radius[rb] + TOUCH
        joined.join(ra[near], rb[near])
        rest = np.stack([a[~round_pair], b[~round_pair]])
        if number == 0:
            _join_polygons(shape, joined, rest)
        else:
            others.append(rest)
    _join_polygons(shape, joined, np.concatenate(others, axis=1))
    return np.concatenate(joined.pairs)


def _join_polygons(shape: NDArray[np.object_], joined: _Joined, pairs: NDArray[np.int64]) -> None:
    a, b = joined.apart(*pairs)
    size = shapely.get_num_coordinates(shape)
    order = np.argsort(-np.maximum(size[a], size[b]), kind="stable")  # big shapes first: what they join needs no second look
    a, b = a[order], b[order]
    for first in range(0, len(a), CHUNK):
        ca, cb = joined.apart(a[first : first + CHUNK], b[first : first + CHUNK])
        big, small = np.where(size[ca] >= size[cb], (ca, cb), (cb, ca))
        shapely.prepare(shape[np.unique(big)])
        hit = shapely.dwithin(shape[big], shape[small], TOUCH)
        joined.join(ca[hit], cb[hit])


def _box_pairs(shape: NDArray[np.object_]) -> Iterator[tuple[NDArray[np.int64], NDArray[np.int64]]]:
    """Pairs of pieces whose boxes meet, in parcels: first those drawn one after the other (strokes that paint an area or make a line mostly
    touch, and what is joined needs no second look), then all."""
    bounds = shapely.bounds(shape).reshape(-1, 4)
    low, high = bounds[:, :2] - TOUCH, bounds[:, 2:] + TOUCH
    one = np.flatnonzero((low[1:] <= high[:-1]).all(axis=1) & (low[:-1] <= high[1:]).all(axis=1))
    yield one, one + 1
    tree, boxes = shapely.STRtree(shape), _diagonals(low, high)
    for first in range(0, len(shape), CHUNK):
        a, b = tree.query(boxes[first : first + CHUNK])
        a = a + first
        yield a[a < b], b[a < b]


def _diagonals(low: Floats, high: Floats) -> NDArray[np.object_]:
    """(n,) lines whose bounding boxes are the given ones: cheaper to make than boxes, and an index looks at nothing else."""
    return np.asarray(shapely.linestrings(np.stack([low, high], axis=1)), object)


def _capsules(layer: LayerCopper) -> Capsules:
    """Start, end and radius of pieces that are exactly a round stroke or a round flash; radius nan for all others."""
    image, owner = layer.image, layer.object
    known = owner >= 0
    index = np.where(known, owner, 0)
    if len(image) == 0:
        empty = np.zeros((len(owner), 2))
        return empty, empty, np.full(len(owner), np.nan)
    start, end = image.start[index], image.end[index]
    diameter = np.array([a.parameters[0] if a.shape == "circle" and not a.hole else np.nan for a in image.apertures] or [np.nan])
    scale = np.array([t.scale for t in image.transforms])
    kind = image.kind[index]
    usable = known & layer.whole & ((kind == Kind.DRAW) | (kind == Kind.FLASH))
    radius = np.where(usable, diameter[image.aperture[index]] * scale[image.transform[index]] / 2, np.nan)
    return start, end, radius


def segment_distance(a0: Floats, a1: Floats, b0: Floats, b1: Floats) -> Floats:
    """Distance between segments a0-a1 and b0-b1, each (n, 2): 0 where they cross, else the least end-to-segment distance."""
    best = np.minimum(
        np.minimum(point_segment(a0, b0, b1), point_segment(a1, b0, b1)),
        np.minimum(point_segment(b0, a0, a1), point_segment(b1, a0, a1)),
    )
    crossing = (_side(a0, a1, b0) * _side(a0, a1, b1) < 0) & (_side(b0, b1, a0) * _side(b0, b1, a1) < 0)
    return np.where(crossing, 0.0, best)


def _side(a: Floats, b: Floats, p: Floats) -> Floats:
    return np.sign((b[:, 0] - a[:, 0]) * (p[:, 1] - a[:, 1]) - (b[:, 1] - a[:, 1]) * (p[:, 0] - a[:, 0]))


def point_segment(p: Floats, a: Floats, b: Floats) -> Floats:
    """Distance of points from segments a-b, each (n, 2)."""
    d = b - a
    square = np.einsum("ij,ij->i", d, d)
    t = np.clip(np.einsum("ij,ij->i", p - a, d) / np.where(square > 0, square, 1.0), 0.0, 1.0)
    away: Floats = p - a - t[:, None] * d
    return np.asarray(np.hypot(away[:, 0], away[:, 1]), np.float64)


def _barrel_edges(layer: LayerCopper, capsules: Capsules, barrels: Barrels, offset: int, pieces: int) -> NDArray[np.int64]:
    """(m, 2) pairs of a barrel and a piece of this layer that its drilled disc (of a slot: stadium) touches, as graph nodes."""
    here = np.flatnonzero((barrels.first <= layer.index) & (barrels.last >= layer.index))
    if len(here) == 0 or len(layer.shape) == 0:
        return np.empty((0, 2), np.int64)
    start, end, reach = barrels.start[here], barrels.end[here], barrels.diameter[here] / 2 + TOUCH
    low, high = np.minimum(start, end) - reach[:, None], np.maximum(start, end) + reach[:, None]
    which, piece = shapely.STRtree(layer.shape).query(_diagonals(low, high))
    first, last, radius = capsules
    simple = np.isfinite(radius[piece])
    hit = np.zeros(len(piece), bool)
    a, b = which[simple], piece[simple]
    hit[simple] = segment_distance(start[a], end[a], first[b], last[b]) <= reach[a] + radius[b]
    a, b = which[~simple], piece[~simple]
    probe = np.asarray(shapely.points(start), object)
    slot = (start != end).any(axis=1)
    probe[slot] = shapely.linestrings(np.stack([start[slot], end[slot]], axis=1))
    shapely.prepare(layer.shape[np.unique(b)])
    hit[~simple] = shapely.dwithin(layer.shape[b], probe[a], reach[a])
    return np.column_stack([here[which[hit]] + pieces, piece[hit] + offset])
