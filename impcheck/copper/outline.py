"""The area of a board. In: the outline's image; out: a polygon in mm, cut-outs taken out."""

from __future__ import annotations

import numpy as np
import shapely
from shapely.geometry.base import BaseGeometry

from impcheck.artwork.image import Image, Kind
from impcheck.copper.regions import region_shapes
from impcheck.copper.shapes import arc_points, chords, radius_of

GRIDS = (0.001, 0.01, 0.05)  # mm: ends of outline strokes this near are one point, the finest grid on which the outline closes


def outline_shape(image: Image | None, chord_error: float) -> BaseGeometry | None:
    """The area inside the centrelines of the outline's strokes, else inside its regions; None where nothing closes.

    A closed line inside another is a cut-out, where it does not touch the outer one.
    """
    if image is None or len(image) == 0:
        return None
    faces = _stroked(image, chord_error)
    if not faces:
        faces = list(region_shapes(image, chord_error)[0])
    if not faces:
        return None
    rings = shapely.get_exterior_ring(np.array(faces, object))
    whole = shapely.union_all(shapely.polygons(rings))
    edge = shapely.boundary(whole)
    inner = [face for face, ring in zip(faces, rings, strict=True) if not shapely.intersects(ring, edge)]
    return shapely.difference(whole, shapely.union_all(inner)) if inner else whole


def _stroked(image: Image, chord_error: float) -> list[BaseGeometry]:
    draws = np.flatnonzero((image.kind == Kind.DRAW) & (image.start != image.end).any(axis=1))
    arcs = np.flatnonzero(image.kind == Kind.ARC)
    lines = [*np.asarray(shapely.linestrings(np.stack([image.start[draws], image.end[draws]], axis=1)), object)]
    if len(arcs):
        start, end, centre = image.start[arcs], image.end[arcs], image.centre[arcs]
        count = chords(radius_of(start, centre, end), image.sweep[arcs], chord_error)
        points, arc = arc_points(start, centre, image.sweep[arcs], end, count)
        lines += [*np.asarray(shapely.linestrings(points, indices=arc), object)]
    if not lines:
        return []
    for grid in GRIDS:
        drawn = shapely.union_all(shapely.set_precision(np.array(lines, object), grid))
        faces = list(shapely.get_parts(shapely.polygonize([drawn])))
        if faces:
            return faces
    return []
