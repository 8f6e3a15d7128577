"""Apertures and strokes as polygons. In: sizes and places in mm; out: shapely polygons whose chords stay within a stated error."""

from __future__ import annotations

import math

import numpy as np
import shapely
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Shapes = NDArray[np.object_]


def segments_of(radius: float, angle: float, chord_error: float) -> int:
    """Number of chords for an arc of `angle` radians and `radius` mm so that no chord lies more than `chord_error` mm inside the arc."""
    if radius <= chord_error:
        return max(1, math.ceil(abs(angle) / (math.pi / 4)))
    step = 2.0 * math.acos(1.0 - chord_error / radius)
    return max(1, math.ceil(abs(angle) / step - 1e-9))


def stadiums(start: Floats, end: Floats, width: float, chord_error: float) -> Shapes:
    """(n,) strokes of a round aperture of one width: stadium polygons, counter-clockwise, with vertices where the straight flanks begin, so
    that the width between the flanks is exactly `width`. start, end: (n, 2) mm."""
    half = segments_of(width / 2, math.pi, chord_error)
    theta = np.linspace(-math.pi / 2, math.pi / 2, half + 1)
    cap = (width / 2) * np.column_stack([np.cos(theta), np.sin(theta)])
    heading = end - start
    length = np.hypot(heading[:, 0], heading[:, 1])
    unit = np.where(length[:, None] > 0, heading / np.where(length > 0, length, 1.0)[:, None], (1.0, 0.0))
    rotation = np.stack([np.stack([unit[:, 0], -unit[:, 1]], -1), np.stack([unit[:, 1], unit[:, 0]], -1)], 1)  # (n, 2, 2)
    front = np.einsum("nij,kj->nki", rotation, cap) + end[:, None, :]
    back = np.einsum("nij,kj->nki", rotation, -cap) + start[:, None, :]
    ring = np.concatenate([front, back, front[:, :1]], axis=1)
    dot = length == 0
    shapes = shapely.polygons(ring)
    if dot.any():
        shapes[dot] = shapely.polygons(_drop_double(ring[dot], half))
    return shapes


def _drop_double(ring: Floats, half: int) -> Floats:
    keep = np.ones(ring.shape[1], bool)
    keep[half + 1] = False  # a dot's two half circles share their ends
    keep[2 * half + 1] = False
    return ring[:, keep]


def arcs_to_points(start: Floats, centre: Floats, sweep: Floats, end: Floats, chord_error: float) -> list[Floats]:
    """Each circular arc as points from start to end, both included. start, centre, end: (n, 2) mm; sweep: (n,) radians."""
    found = []
    for (sx, sy), (cx, cy), angle, (ex, ey) in zip(start.tolist(), centre.tolist(), sweep.tolist(), end.tolist(), strict=True):
        r0, r1 = math.hypot(sx - cx, sy - cy), math.hypot(ex - cx, ey - cy)
        count = segments_of(max(r0, r1), angle, chord_error)
        t = np.linspace(0.0, 1.0, count + 1)
        phi = math.atan2(sy - cy, sx - cx) + angle * t
        radius = r0 + (r1 - r0) * t
        points = np.column_stack([cx + radius * np.cos(phi), cy + radius * np.sin(phi)])
        points[0], points[-1] = (sx, sy), (ex, ey)
        found.append(points)
    return found


def circle(x: float, y: float, diameter: float, chord_error: float) -> shapely.Polygon:
    """A disc."""
    count = max(8, segments_of(diameter / 2, 2 * math.pi, chord_error))
    phi = np.linspace(0, 2 * math.pi, count, endpoint=False)
    return shapely.polygons(np.column_stack([x + diameter / 2 * np.cos(phi), y + diameter / 2 * np.sin(phi)]))


def box(x: float, y: float, width: float, height: float) -> shapely.Polygon:
    """A rectangle around (x, y)."""
    return shapely.box(x - width / 2, y - height / 2, x + width / 2, y + height / 2)


def regular(x: float, y: float, diameter: float, vertices: int, rotation: float) -> shapely.Polygon:
    """A regular polygon in a circle of `diameter`, its first vertex at `rotation` degrees."""
    phi = math.radians(rotation) + np.arange(vertices) * (2 * math.pi / vertices)
    return shapely.polygons(np.column_stack([x + diameter / 2 * np.cos(phi), y + diameter / 2 * np.sin(phi)]))
