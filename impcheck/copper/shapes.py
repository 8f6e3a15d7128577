"""Discs, strokes and arcs as polygons. In: sizes and places in mm; out: shapely polygons whose chords stay within a stated error."""

from __future__ import annotations

import math

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely.geometry.base import BaseGeometry

from impcheck.artwork.image import Floats

Shapes = NDArray[np.object_]
Rows = NDArray[np.int64]

COARSEST = math.pi / 4  # radians an arc's chord spans at most, however small the arc
KEPT = 0.9  # share of the chord error that chords use up: the rest is for the rounding of places and for chords that meet caps


def segments_of(radius: float, angle: float, chord_error: float) -> int:
    """Number of chords for an arc of `angle` radians and `radius` mm so that none lies more than `chord_error` mm inside the arc."""
    return int(chords(np.array([radius]), np.array([angle]), chord_error)[0])


def chords(radius: Floats, angle: Floats, chord_error: float) -> Rows:
    """(n,) numbers of chords, as segments_of. The vertices lie on the arc, the chords inside it by radius (1 - cos(step/2)) at most."""
    ratio = np.minimum(KEPT * chord_error / np.maximum(radius, chord_error), 1.0)
    step = np.minimum(2.0 * np.arccos(1.0 - ratio), COARSEST)
    return np.maximum(1, np.ceil(np.abs(angle) / step - 1e-9)).astype(np.int64)


def stadiums(start: Floats, end: Floats, width: float, chord_error: float) -> Shapes:
    """(n,) strokes of a round aperture of one width, as polygons, counter-clockwise. start, end: (n, 2) mm.

    The caps have vertices where the straight flanks begin, so that the distance between the flanks is exactly `width`. A stroke without
    length is a dot.
    """
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
    shapes = polygons(ring)
    dot = length == 0
    if dot.any():
        once = np.ones(ring.shape[1], bool)
        once[[half + 1, 2 * half + 1]] = False  # a dot's two half circles share their ends
        shapes[dot] = polygons(ring[dot][:, once])
    return shapes


def polygons(rings: Floats) -> Shapes:
    """(n,) polygons of (n, k, 2) closed rings."""
    return np.asarray(shapely.polygons(rings), object)


def arc_points(start: Floats, centre: Floats, sweep: Floats, end: Floats, count: Rows) -> tuple[Floats, Rows]:
    """Circular arcs as points: (m, 2) points of all arcs, arc k owning count[k] + 1 of them from its start to its end, and (m,) the arc of
    each point. The radius goes evenly from that of the start to that of the end, where a file rounds them differently."""
    arc = np.repeat(np.arange(len(count)), count + 1)
    first = np.concatenate([[0], np.cumsum(count + 1)])[:-1]
    t = (np.arange(len(arc)) - first[arc]) / count[arc]
    spoke, last_spoke = start - centre, end - centre
    r0, r1 = np.hypot(*spoke.T), np.hypot(*last_spoke.T)
    phi = np.arctan2(spoke[:, 1], spoke[:, 0])[arc] + sweep[arc] * t
    radius = r0[arc] + (r1 - r0)[arc] * t
    points = centre[arc] + radius[:, None] * np.column_stack([np.cos(phi), np.sin(phi)])
    points[first] = start
    points[first + count] = end
    return points, arc


def radius_of(start: Floats, centre: Floats, end: Floats) -> Floats:
    """(n,) larger of the two radii an arc is given with."""
    first, last = start - centre, end - centre
    return np.asarray(np.maximum(np.hypot(first[:, 0], first[:, 1]), np.hypot(last[:, 0], last[:, 1])), np.float64)


def disc(x: float, y: float, diameter: float, chord_error: float) -> BaseGeometry:
    """A disc; empty where it has no size."""
    if diameter <= 0:
        return shapely.Polygon()
    count = segments_of(diameter / 2, 2 * math.pi, chord_error)
    phi = np.linspace(0, 2 * math.pi, count, endpoint=False)
    return shapely.Polygon(np.column_stack([x + diameter / 2 * np.cos(phi), y + diameter / 2 * np.sin(phi)]))


def rectangle(x: float, y: float, width: float, height: float) -> BaseGeometry:
    """A rectangle around (x, y); empty where it has no size."""
    if width <= 0 or height <= 0:
        return shapely.Polygon()
    return shapely.box(x - width / 2, y - height / 2, x + width / 2, y + height / 2)


def regular(x: float, y: float, diameter: float, vertices: int, rotation: float) -> BaseGeometry:
    """A regular polygon in a circle of `diameter`, its first vertex at `rotation` degrees."""
    if diameter <= 0:
        return shapely.Polygon()
    phi = math.radians(rotation) + np.arange(vertices) * (2 * math.pi / vertices)
    return shapely.Polygon(np.column_stack([x + diameter / 2 * np.cos(phi), y + diameter / 2 * np.sin(phi)]))


def obround(width: float, height: float, chord_error: float) -> BaseGeometry:
    """A rectangle around the origin whose shorter sides are half circles."""
    if width <= 0 or height <= 0:
        return shapely.Polygon()
    reach = abs(width - height) / 2
    along = np.array([[reach, 0.0]]) if width >= height else np.array([[0.0, reach]])
    shape: BaseGeometry = stadiums(-along, along, min(width, height), chord_error)[0]
    return shape


def solid_parts(shape: Shapes) -> tuple[Shapes, Rows]:
    """Polygons with an area among the parts of (n,) geometries, and (m,) the geometry each is a part of."""
    parts, owner = shapely.get_parts(shape, return_index=True)
    keep = (shapely.get_type_id(parts) == shapely.GeometryType.POLYGON) & (shapely.area(parts) > 0)
    return np.asarray(parts[keep], object), np.asarray(owner[keep], np.int64)
