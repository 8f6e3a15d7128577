"""Apertures as polygons. In: an aperture and its transform; out: a shapely geometry around the origin, mm."""

from __future__ import annotations

import math

import numpy as np
import shapely
from shapely import affinity
from shapely.geometry.base import BaseGeometry

from impcheck.artwork.image import Aperture, Primitive, Transform
from impcheck.copper.shapes import disc, obround, rectangle, regular


def aperture_shape(aperture: Aperture, transform: Transform, chord_error: float) -> BaseGeometry:
    """The aperture at the origin, mirrored, rotated and scaled. A hole in it is a hole. Empty where nothing of it is dark."""
    chord = chord_error / max(transform.scale, 1e-6)
    shape = _solid(aperture, chord)
    if aperture.hole:
        cut = disc(0, 0, aperture.hole[0], chord) if len(aperture.hole) == 1 else rectangle(0, 0, *aperture.hole)
        shape = shapely.difference(shape, cut)
    if transform.mirror_x or transform.mirror_y:
        shape = affinity.scale(shape, -1 if transform.mirror_x else 1, -1 if transform.mirror_y else 1, origin=(0, 0))
    if transform.rotation:
        shape = affinity.rotate(shape, transform.rotation, origin=(0, 0))
    if transform.scale != 1.0:
        shape = affinity.scale(shape, transform.scale, transform.scale, origin=(0, 0))
    return shape


def _solid(aperture: Aperture, chord: float) -> BaseGeometry:
    p = aperture.parameters
    if aperture.shape == "circle":
        return disc(0, 0, p[0], chord)
    if aperture.shape == "rectangle":
        return rectangle(0, 0, p[0], p[1])
    if aperture.shape == "obround":
        return obround(p[0], p[1], chord)
    if aperture.shape == "polygon":
        return regular(0, 0, p[0], int(p[1]), p[2] if len(p) > 2 else 0.0)
    shape: BaseGeometry = shapely.Polygon()
    for dark, run in _runs(aperture.primitives):
        pieces = shapely.union_all([primitive_shape(primitive, chord) for primitive in run])
        shape = shapely.union(shape, pieces) if dark else shapely.difference(shape, pieces)
    return shape


def _runs(primitives: tuple[Primitive, ...]) -> list[tuple[bool, list[Primitive]]]:
    """Primitives grouped while the exposure stays the same: one with exposure off cuts only what stands before it."""
    runs: list[tuple[bool, list[Primitive]]] = []
    for primitive in primitives:
        if not runs or runs[-1][0] != primitive.dark:
            runs.append((primitive.dark, []))
        runs[-1][1].append(primitive)
    return runs


def primitive_shape(primitive: Primitive, chord: float) -> BaseGeometry:
    """One macro primitive, whatever its exposure; its rotation is about the origin of the macro."""
    n = primitive.numbers
    shape: BaseGeometry
    match primitive.code:
        case 1:
            shape, turn = disc(n[1], n[2], n[0], chord), n[3] if len(n) > 3 else 0.0
        case 20:
            shape, turn = _vector_line(*n[:5]), n[5]
        case 21:
            shape, turn = rectangle(n[2], n[3], n[0], n[1]), n[4]
        case 4:
            points = np.array(n[:-1]).reshape(-1, 2)
            shape = (
                shapely.make_valid(shapely.Polygon(points), method="structure", keep_collapsed=False)
                if len(points) > 2
                else shapely.Polygon()
            )
            turn = n[-1]
        case 5:
            shape, turn = regular(n[1], n[2], n[3], int(n[0]), 0.0), n[4]
        case _:
            x, y, outer, inner, gap, turn = n
            cross = shapely.union(rectangle(x, y, outer * 2, gap), rectangle(x, y, gap, outer * 2))
            shape = shapely.difference(shapely.difference(disc(x, y, outer, chord), disc(x, y, inner, chord)), cross)
    return affinity.rotate(shape, turn, origin=(0, 0)) if turn else shape


def _vector_line(width: float, x0: float, y0: float, x1: float, y1: float) -> BaseGeometry:
    length = math.hypot(x1 - x0, y1 - y0)
    if length == 0 or width <= 0:
        return shapely.Polygon()
    dx, dy = -(y1 - y0) / length * width / 2, (x1 - x0) / length * width / 2
    return shapely.Polygon([(x0 - dx, y0 - dy), (x1 - dx, y1 - dy), (x1 + dx, y1 + dy), (x0 + dx, y0 + dy)])
