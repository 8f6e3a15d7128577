"""Apertures as polygons. In: an aperture and its transform; out: a shapely geometry around the origin, mm."""

from __future__ import annotations

import math

import numpy as np
import shapely
from shapely import affinity

from impcheck.artwork.image import Aperture, Primitive, Transform
from impcheck.copper.shapes import box, circle, regular


def aperture_shape(aperture: Aperture, transform: Transform, chord_error: float) -> shapely.Geometry:
    """The aperture at the origin, mirrored, rotated and scaled. Empty where nothing of it is dark."""
    chord = chord_error / max(transform.scale, 1e-6)
    shape = _solid(aperture, chord)
    if aperture.hole:
        cut = circle(0, 0, aperture.hole[0], chord) if len(aperture.hole) == 1 else box(0, 0, *aperture.hole)
        shape = shapely.difference(shape, cut)
    if transform.mirror_x or transform.mirror_y:
        shape = affinity.scale(shape, -1 if transform.mirror_x else 1, -1 if transform.mirror_y else 1, origin=(0, 0))
    if transform.rotation:
        shape = affinity.rotate(shape, transform.rotation, origin=(0, 0))
    if transform.scale != 1.0:
        shape = affinity.scale(shape, transform.scale, transform.scale, origin=(0, 0))
    return shape


def _solid(aperture: Aperture, chord: float) -> shapely.Geometry:
    p = aperture.parameters
    if aperture.shape == "circle":
        return circle(0, 0, p[0], chord) if p[0] > 0 else shapely.Polygon()
    if aperture.shape == "rectangle":
        return box(0, 0, p[0], p[1])
    if aperture.shape == "obround":
        return obround(p[0], p[1], chord)
    if aperture.shape == "polygon":
        return regular(0, 0, p[0], int(p[1]), p[2] if len(p) > 2 else 0.0)
    shape: shapely.Geometry = shapely.Polygon()
    for primitive in aperture.primitives:
        piece = primitive_shape(primitive, chord)
        shape = shapely.union(shape, piece) if primitive.dark else shapely.difference(shape, piece)
    return shape


def obround(width: float, height: float, chord: float) -> shapely.Polygon:
    """A rectangle whose shorter sides are half circles."""
    from impcheck.copper.shapes import stadiums

    reach = abs(width - height) / 2
    along = np.array([[reach, 0.0]]) if width >= height else np.array([[0.0, reach]])
    return stadiums(-along, along, min(width, height), chord)[0]


def primitive_shape(primitive: Primitive, chord: float) -> shapely.Geometry:
    """One macro primitive."""
    n = primitive.numbers
    code = primitive.code
    if code == 1:
        shape = circle(n[1], n[2], n[0], chord) if n[0] > 0 else shapely.Polygon()
        turn = n[3] if len(n) > 3 else 0.0
    elif code == 20:
        width, x0, y0, x1, y1, turn = n
        length = math.hypot(x1 - x0, y1 - y0)
        if length == 0 or width == 0:
            return shapely.Polygon()
        dx, dy = -(y1 - y0) / length * width / 2, (x1 - x0) / length * width / 2
        shape = shapely.Polygon([(x0 - dx, y0 - dy), (x1 - dx, y1 - dy), (x1 + dx, y1 + dy), (x0 + dx, y0 + dy)])
    elif code == 21:
        width, height, x, y, turn = n
        shape = box(x, y, width, height)
    elif code == 4:
        turn = n[-1]
        shape = shapely.make_valid(shapely.Polygon(np.array(n[:-1]).reshape(-1, 2)), method="structure")
    elif code == 5:
        vertices, x, y, diameter, turn = n
        shape = regular(x, y, diameter, int(vertices), 0.0)
    else:
        x, y, outer, inner, gap, turn = n
        shape = circle(x, y, outer, chord)
        if inner > 0:
            shape = shapely.difference(shape, circle(x, y, inner, chord))
        cross = shapely.union(box(x, y, outer * 2, gap), box(x, y, gap, outer * 2))
        shape = shapely.difference(shape, cross)
    return affinity.rotate(shape, turn, origin=(0, 0)) if turn else shape
