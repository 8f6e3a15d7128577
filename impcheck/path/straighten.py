"""A medial axis made straight where the copper is. In: chains of axis points and the edges beside them, mm; out: centreline, mm."""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass

import numpy as np
import shapely

from impcheck.artwork.image import Floats

FACING = np.cos(np.radians(20.0))  # edges turned less than this against each other have a bisector worth using
SIMPLIFY = 0.002  # mm, of curved pieces of the axis
SAME_POINT = 1e-5  # mm
BEND_REACH = 1.5  # widths, how far a bisector may be led on to meet the next


@dataclass
class Chain:
    """A piece of the axis between two nodes of degree other than 2, regularised."""

    nodes: tuple[int, int]
    points: Floats  # (k, 2)
    ruled: tuple[tuple[Floats, Floats] | None, tuple[Floats, Floats] | None]  # (point, direction) of the line it begins and ends with
    width: float


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


def regular_chain(
    points: Floats, faces: list[tuple[int, int]], widths: list[float], ends: tuple[int, int], edges: tuple[Floats, Floats]
) -> Chain:
    """A chain with its straight parts put on bisectors and the bends between them made corners."""
    start, end = edges
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
        return Chain(ends, loose, (None, None), width)
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
    return Chain(ends, simple, ruled, width)


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


def assemble(place: Floats, chains: list[Chain], shift: Floats) -> tuple[Floats, Floats, Floats]:
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
