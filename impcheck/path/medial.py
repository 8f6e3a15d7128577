"""Centreline of a long narrow polygon. In: a polygon, mm; out: straight pieces of its medial axis with widths, mm.

The medial axis comes from the Voronoi diagram of points on the boundary (Brandt and Algazi 1992, CVGIP: Image Understanding 55). Where
two straight edges face each other it is replaced by their bisector, and at bends and T-junctions those bisectors are led on until they
meet: that is the centreline a person would have drawn.
"""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
import shapely
from numpy.typing import NDArray
from scipy.spatial import Voronoi, cKDTree

from impcheck.artwork.image import Floats

SAMPLES_PER_WIDTH = 4
DETOUR = 2.0  # boundary length over chord from which two boundary points face each other across copper; a corner of 90 degrees has 1.41
FACING = np.cos(np.radians(20.0))  # edges turned less than this against each other have a bisector worth using
SIMPLIFY = 0.002  # mm, of curved pieces of the axis
SAME_POINT = 1e-5  # mm
BEND_REACH = 1.5  # widths, how far a bisector may be led on to meet the next
MAX_SAMPLES = 400_000


@dataclass
class _Chain:
    """A piece of the axis between two nodes of degree other than 2, regularised."""

    nodes: tuple[int, int]
    points: Floats  # (k, 2)
    ruled: tuple[tuple[Floats, Floats] | None, tuple[Floats, Floats] | None]  # (point, direction) of the line it begins and ends with
    width: float


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
    diagram = Voronoi(points)
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
    regular = [_regular(place[nodes], faces, widths, (nodes[0], nodes[-1]), edge_start, edge_end) for nodes, faces, widths in chains]
    return _assemble(place, regular, shift)


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


def _bisector(e: int, f: int, start: Floats, end: Floats) -> tuple[Floats, Floats, float] | None:
    """Point, direction and width of the line midway between two facing edges; None where they do not face each other."""
    d, g = end[e] - start[e], end[f] - start[f]
    size_d, size_g = np.hypot(*d), np.hypot(*g)
    d, g = d / size_d, g / size_g
    if d @ g > -FACING:
        return None
    direction = (d - g) / np.hypot(*(d - g))
    normal = np.array([-direction[1], direction[0]])
    middle_e, middle_f = (start[e] + end[e]) / 2, (start[f] + end[f]) / 2
    # lines through both edges, y = c + m x along `direction`: the bisector has the mean of both
    origin = (middle_e + middle_f) / 2

    def line(point: Floats, heading: Floats) -> tuple[float, float]:
        slope = (heading @ normal) / (heading @ direction)
        return float((point - origin) @ normal - slope * ((point - origin) @ direction)), float(slope)

    (c, m), (k, n) = line(middle_e, d), line(middle_f, g)
    width = abs(c - k)
    if min(size_d, size_g) < 0.5 * width:
        return None
    heading = direction + (m + n) / 2 * normal
    return origin + (c + k) / 2 * normal, heading / np.hypot(*heading), width


def _regular(
    points: Floats, faces: list[tuple[int, int]], widths: list[float], ends: tuple[int, int], start: Floats, end: Floats
) -> _Chain:
    """A chain with its straight parts put on bisectors and the bends between them made corners."""
    runs: list[tuple[int, int, tuple[Floats, Floats] | None]] = []  # first and last point, line
    width = float(np.median(widths))
    position = 0
    while position < len(faces):
        stop = position + 1
        while stop < len(faces) and faces[stop] == faces[position]:
            stop += 1
        line = None
        span = float(np.hypot(*(points[stop] - points[position])))
        if stop - position >= 2 and span > 0.3 * width:
            found = _bisector(*faces[position], start, end)
            line = None if found is None else (found[0], found[1])
        runs.append((position, stop, line))
        position = stop
    lines = [run for run in runs if run[2] is not None]
    if lines:
        width = _ruled_width(points, faces, lines, start, end)
    result: list[Floats] = []
    if not lines:
        loose = shapely.get_coordinates(shapely.LineString(points).simplify(SIMPLIFY))
        return _Chain(ends, loose, (None, None), width)
    result += list(points[: lines[0][0]])
    for index, (first, last, line) in enumerate(lines):
        assert line is not None
        result.append(_foot(points[first], line))
        result.append(_foot(points[last], line))
        if index + 1 < len(lines):
            after = lines[index + 1]
            assert after[2] is not None
            corner = _meet(line, after[2])
            between = float(np.hypot(*(points[after[0]] - points[last])))
            reach = BEND_REACH * width
            if corner is not None and max(np.hypot(*(corner - points[last])), np.hypot(*(corner - points[after[0]]))) < reach:
                result[-1:] = [corner]
                lines[index + 1] = (after[0], after[1], after[2])
                points = points.copy()
                points[after[0]] = corner
            elif between > reach:
                result += list(points[last + 1 : after[0]])
    result += list(points[lines[-1][1] + 1 :])
    chain = np.array(result)
    ruled = (lines[0][2] if lines[0][0] * 1.0 <= 8 else None, lines[-1][2] if len(points) - 1 - lines[-1][1] <= 8 else None)
    simple = shapely.get_coordinates(shapely.LineString(chain).simplify(SIMPLIFY / 2)) if len(chain) > 1 else chain
    return _Chain(ends, simple, ruled, width)


def _ruled_width(
    points: Floats, faces: list[tuple[int, int]], lines: list[tuple[int, int, tuple[Floats, Floats] | None]], start: Floats, end: Floats
) -> float:
    """Width between facing edges that at least half of the straight length of a chain has."""
    widths: list[float] = []
    sizes: list[float] = []
    for first, last, _ in lines:
        found = _bisector(*faces[first], start, end)
        widths.append(found[2] if found is not None else 0.0)
        sizes.append(float(np.hypot(*(points[last] - points[first]))))
    order = np.argsort(widths, kind="stable")
    total = np.cumsum(np.array(sizes)[order])
    return widths[int(order[min(int(np.searchsorted(total, total[-1] / 2)), len(order) - 1)])]


def _foot(point: Floats, line: tuple[Floats, Floats]) -> Floats:
    foot: Floats = line[0] + ((point - line[0]) @ line[1]) * line[1]
    return foot


def _meet(a: tuple[Floats, Floats], b: tuple[Floats, Floats]) -> Floats | None:
    """Where two lines cross; None where they are almost parallel."""
    cross = a[1][0] * b[1][1] - a[1][1] * b[1][0]
    if abs(cross) < 0.03:
        return None
    gap = b[0] - a[0]
    meeting: Floats = a[0] + (gap[0] * b[1][1] - gap[1] * b[1][0]) / cross * a[1]
    return meeting


def _assemble(place: Floats, chains: list[_Chain], shift: Floats) -> tuple[Floats, Floats, Floats]:
    """Straight pieces of all chains; where chains meet, their lines are led on to a common point."""
    at: dict[int, list[tuple[int, int]]] = defaultdict(list)
    for index, chain in enumerate(chains):
        at[chain.nodes[0]].append((index, 0))
        at[chain.nodes[1]].append((index, -1))
    for node, members in at.items():
        if len(members) < 2:
            continue
        joint = _joint(place[node], [(chains[i].ruled[side], chains[i].width) for i, side in members])
        for index, side in members:
            chain = chains[index]
            points = chain.points if side == 0 else chain.points[::-1]
            near = np.hypot(*(points - joint).T) < (BEND_REACH * chain.width if chain.ruled[side] is not None else SAME_POINT)
            drop = int(np.argmin(near)) if not near.all() else len(points) - 1
            points = np.concatenate([joint[None, :], points[drop:]])
            chain.points = points if side == 0 else points[::-1]
    start = np.concatenate([chain.points[:-1] for chain in chains])
    end = np.concatenate([chain.points[1:] for chain in chains])
    width = np.concatenate([np.full(len(chain.points) - 1, chain.width) for chain in chains])
    long = np.hypot(*(end - start).T) > 1e-6
    return start[long] + shift, end[long] + shift, width[long]


def _joint(node: Floats, members: list[tuple[tuple[Floats, Floats] | None, float]]) -> Floats:
    """Where the chains at a branch point would meet as drawn: a straight one goes through, the others end on it."""
    lines = [line for line, _ in members if line is not None]
    reach = BEND_REACH * max(width for _, width in members)
    best: Floats | None = None
    for i, a in enumerate(lines):
        for b in lines[i + 1 :]:
            meeting = _meet(a, b)
            if (
                meeting is not None
                and np.hypot(*(meeting - node)) < reach
                and (best is None or np.hypot(*(meeting - node)) < np.hypot(*(best - node)))
            ):
                best = meeting
    if best is not None:
        return best
    return _foot(node, lines[0]) if len(lines) == len(members) else node
