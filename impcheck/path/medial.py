"""Centreline of a long narrow polygon. In: a polygon, mm; out: straight pieces of its medial axis with widths, mm.

The medial axis comes from the Voronoi diagram of points on the boundary (Brandt and Algazi 1992, CVGIP: Image Understanding 55,
cited from memory). Where
two straight edges face each other it is replaced by their bisector, and at bends and T-junctions those bisectors are led on until they
meet: that is the centreline a person would have drawn.
"""

from __future__ import annotations

from collections import defaultdict
from itertools import pairwise

import numpy as np
import shapely
from numpy.typing import NDArray
from scipy.spatial import QhullError, Voronoi, cKDTree

from impcheck.artwork.image import Floats
from impcheck.path.straighten import SAME_POINT, assemble, regular_chain

SAMPLES_PER_WIDTH = 4
DETOUR = 2.0  # boundary length over chord from which two boundary points face each other across copper; a corner of 90 degrees has 1.41
MAX_SAMPLES = 200_000


def medial_axis(polygon: shapely.Polygon) -> tuple[Floats, Floats, Floats]:
    """Start (n, 2), end (n, 2) and width (n,) of the straight pieces of the centreline; n is 0 where the polygon is no longer than wide."""
    shift = np.array(polygon.bounds[:2])
    moved = shapely.transform(polygon, lambda xy: xy - shift)
    simple = moved.simplify(1e-4)
    shape = simple if isinstance(simple, shapely.Polygon) and not simple.is_empty else moved
    nothing = np.empty((0, 2)), np.empty((0, 2)), np.empty(0)
    width = 2 * shape.area / shape.length
    step = max(width / SAMPLES_PER_WIDTH, shape.length / MAX_SAMPLES)
    points, edge, along, ring = _samples(shape, step)
    edge_start, edge_end = _edges(shape)
    if len(points) < 6:
        return nothing
    try:
        diagram = Voronoi(points)
    except QhullError:  # all points on one line: nothing between two sides
        return nothing
    pairs, ends = np.asarray(diagram.ridge_points), np.asarray(diagram.ridge_vertices)
    lengths = np.array([shapely.LinearRing(r).length for r in (shape.exterior, *shape.interiors)])
    apart = np.abs(along[pairs[:, 0]] - along[pairs[:, 1]])
    same = ring[pairs[:, 0]] == ring[pairs[:, 1]]
    round_trip = lengths[ring[pairs[:, 0]]]
    chord = np.hypot(*(points[pairs[:, 0]] - points[pairs[:, 1]]).T)
    facing = ~same | (np.minimum(apart, round_trip - apart) > DETOUR * chord)
    keep = facing & (ends >= 0).all(axis=1)
    pairs, ends, chord = pairs[keep], ends[keep], chord[keep]
    shapely.prepare(shape)
    vertices = diagram.vertices
    used = np.unique(ends)
    inside = np.zeros(len(vertices), dtype=np.bool_)
    inside[used] = shapely.contains_xy(shape, vertices[used, 0], vertices[used, 1])
    keep = inside[ends].all(axis=1)
    pairs, ends, chord = pairs[keep], ends[keep], chord[keep]
    if not len(ends):
        return nothing
    place, ends = _merge(vertices, ends)
    keep = ends[:, 0] != ends[:, 1]
    pairs, ends, chord = pairs[keep], ends[keep], chord[keep]
    if not len(ends):
        return nothing
    place = _centred(place, ends, edge[pairs], edge_start, edge_end)
    chains = _chains(place, ends, edge[pairs], chord)
    regular = [regular_chain(place[nodes], faces, widths, (nodes[0], nodes[-1]), (edge_start, edge_end)) for nodes, faces, widths in chains]
    return assemble(place, regular, shift)


def _edges(shape: shapely.Polygon) -> tuple[Floats, Floats]:
    rings = [np.asarray(r.coords) for r in (shape.exterior, *shape.interiors)]
    return np.concatenate([r[:-1] for r in rings]), np.concatenate([r[1:] for r in rings])


def _samples(shape: shapely.Polygon, step: float) -> tuple[Floats, NDArray[np.int64], Floats, NDArray[np.int64]]:
    """Points on the boundary, the edge each lies on, its distance along its ring, its ring."""
    start, end = _edges(shape)
    sizes = [len(r.coords) - 1 for r in (shape.exterior, *shape.interiors)]
    ring_of = np.repeat(np.arange(len(sizes)), sizes)
    length = np.hypot(*(end - start).T)
    count = np.maximum(1, np.ceil(length / step).astype(np.int64))
    edge = np.repeat(np.arange(len(start)), count)
    rank = np.arange(len(edge)) - np.repeat(np.cumsum(count) - count, count)
    share = rank / count[edge]
    before = np.cumsum(length) - length
    first = np.concatenate([[0], np.cumsum(sizes)[:-1]])
    before = before - before[first][ring_of]
    return start[edge] + share[:, None] * (end - start)[edge], edge, before[edge] + share * length[edge], ring_of[edge]


def _merge(vertices: Floats, ends: NDArray[np.int64]) -> tuple[Floats, NDArray[np.int64]]:
    """Vertices that coincide made one."""
    used, ends = np.unique(ends, return_inverse=True)
    ends = ends.reshape(-1, 2)
    place = vertices[used]
    representative = np.arange(len(used))
    for low, high in sorted(cKDTree(place).query_pairs(SAME_POINT)):
        representative[high] = min(representative[high], representative[low])
    while (representative != representative[representative]).any():
        representative = representative[representative]
    return place, representative[ends]


def _centred(place: Floats, ends: NDArray[np.int64], faces: NDArray[np.int64], start: Floats, end: Floats) -> Floats:
    """Each point of the axis moved midway between the two edges it separates (the diagram of sampled points is off by some um)."""
    node = np.concatenate([ends[:, 0], ends[:, 1]])
    face = np.concatenate([faces, faces])
    moved = place.copy()
    for _ in range(2):
        feet = []
        for side in (0, 1):
            vector = end[face[:, side]] - start[face[:, side]]
            share = np.einsum("ij,ij->i", moved[node] - start[face[:, side]], vector) / np.maximum(
                np.einsum("ij,ij->i", vector, vector), 1e-24
            )
            feet.append(start[face[:, side]] + np.clip(share, 0.0, 1.0)[:, None] * vector)
        middle = (feet[0] + feet[1]) / 2
        count = np.maximum(np.bincount(node, minlength=len(place)), 1)
        mean = np.stack([np.bincount(node, middle[:, axis], len(place)) / count for axis in (0, 1)], axis=1)
        touched = np.bincount(node, minlength=len(place)) == 2  # branch points and tips stay
        moved[touched] = mean[touched]
    return moved


def _chains(
    place: Floats, ends: NDArray[np.int64], faces: NDArray[np.int64], chord: Floats
) -> list[tuple[list[int], list[tuple[int, int]], list[float]]]:
    """The axis as chains of nodes between branch points and tips, short spurs cut off: (nodes, edge pair of each step, width of each)."""
    links: dict[int, dict[int, int]] = defaultdict(dict)
    for index, (a, b) in enumerate(ends.tolist()):
        links[a][b] = index
        links[b][a] = index
    for _ in range(3):
        spurs = [chain for chain in _trace(links) if _is_spur(chain, links, place, chord)]
        if not spurs:
            break
        for chain in spurs:
            for a, b in pairwise(chain):
                links[a].pop(b, None)
                links[b].pop(a, None)
    result = []
    for chain in _trace(links):
        steps = [links[a][b] for a, b in pairwise(chain)]
        pairs = [(int(min(faces[s])), int(max(faces[s]))) for s in steps]
        result.append((chain, pairs, [float(chord[s]) for s in steps]))
    return result


def _is_spur(chain: list[int], links: dict[int, dict[int, int]], place: Floats, chord: Floats) -> bool:
    degree = len(links[chain[0]]), len(links[chain[-1]])
    if min(degree) != 1 or max(degree) < 3:
        return False
    at = chain[:2] if degree[0] > 1 else chain[:-3:-1]
    root = at[0]
    widest = max(float(chord[index]) for index in links[root].values())
    return bool(np.hypot(*np.diff(place[chain], axis=0).T).sum() < 0.6 * widest)


def _trace(links: dict[int, dict[int, int]]) -> list[list[int]]:
    """Chains between nodes whose degree is not 2; closed loops without such a node are cut at their first node."""
    chains: list[list[int]] = []
    done: set[tuple[int, int]] = set()
    starts = [node for node in sorted(links) if len(links[node]) not in (0, 2)]
    for node in (*starts, *sorted(links)):
        for step in sorted(links[node]):
            if (node, step) in done:
                continue
            chain = [node, step]
            while len(links[chain[-1]]) == 2 and chain[-1] != node:
                chain.append(next(other for other in links[chain[-1]] if other != chain[-2]))
            for a, b in pairwise(chain):
                done.add((a, b))
                done.add((b, a))
            chains.append(chain)
    return chains
