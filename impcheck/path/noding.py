"""Strands split where they meet. In: strands and marked points, mm; out: nodes and edges as index arrays."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components
from scipy.spatial import cKDTree

from impcheck.artwork.image import Bools, Floats, Ints
from impcheck.path.strands import Strands

TOLERANCE = 0.0015  # mm: ends on a 1 um grid may differ by one step on each axis


@dataclass(frozen=True)
class Noded:
    """n nodes, m edges without repeats or loops."""

    place: Floats  # (n, 2)
    layer: Ints  # (n,)
    net: Ints  # (n,)
    ends: NDArray[np.int64]  # (m, 2)
    length: Floats  # (m,)
    width: Floats  # (m,)
    link: Bools  # (m,)
    marks: NDArray[np.int64]  # node of each marked point

    def components(self) -> NDArray[np.int64]:
        """(n,) number of the connected piece each node belongs to, barrels left out."""
        count = len(self.place)
        graph = coo_array((np.ones(len(self.ends)), (self.ends[:, 0], self.ends[:, 1])), shape=(count, count))
        return np.asarray(connected_components(graph, directed=False)[1], dtype=np.int64)


def node_strands(strands: Strands, mark_at: Floats, mark_net: Ints, mark_layer: Ints) -> Noded:
    """Splits every strand where another one ends on it or crosses it, and at every mark (k, 2) on it; ends that agree become one node."""
    count = len(strands)
    vector = strands.end - strands.start
    size = np.hypot(*vector.T)
    strand, share = _splits(strands, vector, size, (mark_at, mark_net, mark_layer))
    split_at = strands.start[strand] + share[:, None] * vector[strand]
    places = np.concatenate([mark_at.reshape(-1, 2), strands.start, strands.end, split_at])
    nets = np.concatenate([mark_net, strands.net, strands.net, strands.net[strand]])
    layers = np.concatenate([mark_layer, strands.layer, strands.layer, strands.layer[strand]])
    node, first = _cluster(places, nets, layers)
    offset = len(mark_at)
    owner = np.concatenate([np.arange(count), np.arange(count), strand])
    position = np.concatenate([np.zeros(count), np.ones(count), share])
    which = np.concatenate([node[offset : offset + count], node[offset + count : offset + 2 * count], node[offset + 2 * count :]])
    order = np.lexsort((position, owner))
    owner, which = owner[order], which[order]
    follow = (owner[:-1] == owner[1:]) & (which[:-1] != which[1:])
    ends = np.sort(np.stack([which[:-1][follow], which[1:][follow]], axis=1), axis=1)
    source = owner[:-1][follow]
    order = np.lexsort((-strands.width[source], strands.link[source], ends[:, 1], ends[:, 0]))
    ends, source = ends[order], source[order]
    fresh = np.ones(len(ends), dtype=np.bool_)
    fresh[1:] = (ends[1:] != ends[:-1]).any(axis=1)
    ends, source = ends[fresh], source[fresh]
    place = places[first]
    length = np.hypot(*(place[ends[:, 1]] - place[ends[:, 0]]).T)
    return Noded(place, layers[first], nets[first], ends, length, strands.width[source], strands.link[source], node[:offset])


def _splits(strands: Strands, vector: Floats, size: Floats, marks: tuple[Floats, Ints, Ints]) -> tuple[NDArray[np.int64], Floats]:
    """Strand and share (0..1) of every split; `marks` are places, nets and layers."""
    mark_at, mark_net, mark_layer = marks
    found_strand: list[NDArray[np.int64]] = [np.empty(0, dtype=np.int64)]
    found_share: list[Floats] = [np.empty(0)]

    def project(strand: NDArray[np.int64], point: Floats) -> None:
        offset = point - strands.start[strand]
        along = np.einsum("ij,ij->i", offset, vector[strand]) / np.maximum(size[strand], 1e-12)
        across = np.abs(offset[:, 0] * vector[strand, 1] - offset[:, 1] * vector[strand, 0]) / np.maximum(size[strand], 1e-12)
        keep = (across <= TOLERANCE) & (along > TOLERANCE) & (along < size[strand] - TOLERANCE)
        found_strand.append(strand[keep])
        found_share.append(along[keep] / size[strand][keep])

    if not len(strands):
        return found_strand[0], found_share[0]
    lines = strands.lines()
    tree = shapely.STRtree(lines)
    a, b = tree.query(lines, predicate="dwithin", distance=TOLERANCE)
    keep = (a != b) & (strands.net[a] == strands.net[b]) & (strands.layer[a] == strands.layer[b])
    a, b = a[keep], b[keep]
    project(a, strands.start[b])
    project(a, strands.end[b])
    cross = vector[a, 0] * vector[b, 1] - vector[a, 1] * vector[b, 0]
    gap = strands.start[b] - strands.start[a]
    steep = np.abs(cross) > 1e-9 * size[a] * size[b]
    safe = np.where(steep, cross, 1.0)
    at_a = (gap[:, 0] * vector[b, 1] - gap[:, 1] * vector[b, 0]) / safe
    at_b = (gap[:, 0] * vector[a, 1] - gap[:, 1] * vector[a, 0]) / safe
    margin_a, margin_b = TOLERANCE / np.maximum(size[a], 1e-12), TOLERANCE / np.maximum(size[b], 1e-12)
    inside = steep & (at_a > margin_a) & (at_a < 1 - margin_a) & (at_b > margin_b) & (at_b < 1 - margin_b)
    found_strand.append(a[inside])
    found_share.append(at_a[inside])
    if len(mark_at):
        mark, strand = tree.query(shapely.points(mark_at), predicate="dwithin", distance=TOLERANCE)
        keep = (mark_net[mark] == strands.net[strand]) & (mark_layer[mark] == strands.layer[strand])
        project(strand[keep], mark_at[mark[keep]])
    return np.concatenate(found_strand), np.concatenate(found_share)


def _cluster(places: Floats, nets: Ints, layers: Ints) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Node of each place, and the first place of each node (marks come first, so a pad's centre wins)."""
    count = len(places)
    if not count:
        return np.empty(0, dtype=np.int64), np.empty(0, dtype=np.int64)
    _, key = np.unique(nets.astype(np.int64) * 1000 + layers, return_inverse=True)
    pairs = cKDTree(np.column_stack([places, key.astype(np.float64)])).query_pairs(TOLERANCE, output_type="ndarray")
    graph = coo_array((np.ones(len(pairs)), (pairs[:, 0], pairs[:, 1])), shape=(count, count))
    _, node = connected_components(graph, directed=False)
    _, first = np.unique(node, return_index=True)
    return node.astype(np.int64), first
