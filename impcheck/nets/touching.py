"""Which pieces of copper touch. In: layers of pieces and barrels; out: one label for each connected component, without any union."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import shapely
from numpy.typing import NDArray
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from impcheck.artwork.image import Floats, Ints, Kind
from impcheck.copper.copper import Barrels, LayerCopper

TOUCH = 0.001  # mm: copper that comes this near is joined


def label_copper(layers: tuple[LayerCopper, ...], barrels: Barrels) -> tuple[tuple[Ints, ...], Ints, int]:
    """Labels of the pieces of each layer, labels of the barrels, and the number of labels."""
    offsets = np.concatenate([[0], np.cumsum([len(layer.shape) for layer in layers])])
    pieces, count = int(offsets[-1]), len(barrels.diameter)
    edges = [np.empty((0, 2), np.int64)]
    for layer, offset in zip(layers, offsets, strict=False):
        edges.append(touching(layer) + offset)
        edges.append(_barrel_edges(layer, barrels, offset, pieces))
    number, labels = _components(np.concatenate(edges), pieces + count)
    per_layer = tuple(labels[a:b].astype(np.int32) for a, b in pairwise(offsets))
    return per_layer, labels[pieces:].astype(np.int32), number


def _components(edges: NDArray[np.int64], nodes: int) -> tuple[int, NDArray[np.int32]]:
    if len(edges) == 0:
        return nodes, np.arange(nodes, dtype=np.int32)
    graph = coo_array((np.ones(len(edges), bool), (edges[:, 0], edges[:, 1])), shape=(nodes, nodes))
    number, labels = connected_components(graph, directed=False)
    return int(number), labels


def touching(layer: LayerCopper) -> NDArray[np.int64]:
    """(m, 2) pairs of pieces of one layer enough to join everything that touches."""
    shape = layer.shape
    if len(shape) < 2:
        return np.empty((0, 2), np.int64)
    a, b = _box_pairs(shape)
    start, end, radius = _capsules(layer)
    round_pair = np.isfinite(radius[a]) & np.isfinite(radius[b])
    ra, rb = a[round_pair], b[round_pair]
    near = segment_distance(start[ra], end[ra], start[rb], end[rb]) <= radius[ra] + radius[rb] + TOUCH
    sure = np.column_stack([ra[near], rb[near]])
    _, labels = _components(sure, len(shape))
    a, b = a[~round_pair], b[~round_pair]
    apart = labels[a] != labels[b]
    a, b = a[apart], b[apart]
    size = shapely.get_num_coordinates(shape)
    order = np.argsort(-np.maximum(size[a], size[b]), kind="stable")  # big shapes first: what they join needs no second look
    a, b = a[order], b[order]
    found = [sure]
    for chunk in np.array_split(np.arange(len(a)), max(1, len(a) // 4096)):
        ca, cb = a[chunk], b[chunk]
        open_pair = labels[ca] != labels[cb]
        ca, cb = ca[open_pair], cb[open_pair]
        if len(ca) == 0:
            continue
        big = np.where(size[ca] >= size[cb], ca, cb)
        small = np.where(size[ca] >= size[cb], cb, ca)
        shapely.prepare(shape[np.unique(big)])
        hit = shapely.dwithin(shape[big], shape[small], TOUCH)
        joined = np.column_stack([ca[hit], cb[hit]])
        if len(joined):
            found.append(joined)
            _, labels = _components(np.concatenate(found), len(shape))
    return np.concatenate(found)


def _box_pairs(shape: NDArray[np.object_]) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    bounds = shapely.bounds(shape)
    boxes = shapely.box(bounds[:, 0] - TOUCH, bounds[:, 1] - TOUCH, bounds[:, 2] + TOUCH, bounds[:, 3] + TOUCH)
    a, b = shapely.STRtree(shape).query(boxes)
    first = a < b
    return a[first], b[first]


def _capsules(layer: LayerCopper) -> tuple[Floats, Floats, Floats]:
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
        np.minimum(_point_segment(a0, b0, b1), _point_segment(a1, b0, b1)),
        np.minimum(_point_segment(b0, a0, a1), _point_segment(b1, a0, a1)),
    )
    crossing = (_side(a0, a1, b0) * _side(a0, a1, b1) < 0) & (_side(b0, b1, a0) * _side(b0, b1, a1) < 0)
    return np.where(crossing, 0.0, best)


def _side(a: Floats, b: Floats, p: Floats) -> Floats:
    return np.sign((b[:, 0] - a[:, 0]) * (p[:, 1] - a[:, 1]) - (b[:, 1] - a[:, 1]) * (p[:, 0] - a[:, 0]))


def _point_segment(p: Floats, a: Floats, b: Floats) -> Floats:
    d = b - a
    square = np.einsum("ij,ij->i", d, d)
    t = np.clip(np.einsum("ij,ij->i", p - a, d) / np.where(square > 0, square, 1.0), 0.0, 1.0)
    away: Floats = p - a - t[:, None] * d
    return np.asarray(np.hypot(away[:, 0], away[:, 1]), np.float64)


def _barrel_edges(layer: LayerCopper, barrels: Barrels, offset: int, pieces: int) -> NDArray[np.int64]:
    here = np.flatnonzero((barrels.first <= layer.index) & (barrels.last >= layer.index))
    if len(here) == 0 or len(layer.shape) == 0:
        return np.empty((0, 2), np.int64)
    middle = (barrels.start[here] + barrels.end[here]) / 2
    round_hole = (barrels.start[here] == barrels.end[here]).all(axis=1)
    probe = np.asarray(shapely.points(middle), object)
    for index in np.flatnonzero(~round_hole).tolist():
        probe[index] = shapely.linestrings([barrels.start[here[index]], barrels.end[here[index]]])
    reach = barrels.diameter[here] / 2 + TOUCH
    low, high = (
        np.minimum(barrels.start[here], barrels.end[here]) - reach[:, None],
        np.maximum(barrels.start[here], barrels.end[here]) + reach[:, None],
    )
    which, piece = shapely.STRtree(layer.shape).query(shapely.box(low[:, 0], low[:, 1], high[:, 0], high[:, 1]))
    shapely.prepare(layer.shape[np.unique(piece)])
    hit = shapely.dwithin(layer.shape[piece], probe[which], reach[which])
    which, piece = which[hit], piece[hit]
    return np.column_stack([here[which] + pieces, piece + offset])
