"""Draws and arcs as polygons. In: an image; out: the copper each stroke leaves, mm."""

from __future__ import annotations

import numpy as np
import shapely
from numpy.typing import NDArray

from impcheck.artwork.image import Floats, Image, Ints, Kind
from impcheck.copper.apertures import aperture_shape
from impcheck.copper.shapes import Shapes, arcs_to_points, stadiums


def stroke_shapes(image: Image, chord_error: float) -> tuple[Shapes, Ints]:
    """Polygons of all strokes and the object each belongs to."""
    strokes = np.flatnonzero((image.kind == Kind.DRAW) | (image.kind == Kind.ARC))
    shapes: list[Shapes] = []
    owners: list[NDArray[np.int32]] = []
    key = image.aperture[strokes].astype(np.int64) * (len(image.transforms) + 1) + image.transform[strokes]
    for value in np.unique(key):
        mine = strokes[key == value]
        aperture, transform = image.apertures[image.aperture[mine[0]]], image.transforms[image.transform[mine[0]]]
        draws, arcs = mine[image.kind[mine] == Kind.DRAW], mine[image.kind[mine] == Kind.ARC]
        paths = arcs_to_points(image.start[arcs], image.centre[arcs], image.sweep[arcs], image.end[arcs], chord_error)
        start = np.concatenate([image.start[draws], *(p[:-1] for p in paths)])
        end = np.concatenate([image.end[draws], *(p[1:] for p in paths)])
        owner = np.concatenate([draws, *(np.full(len(p) - 1, arc) for arc, p in zip(arcs, paths, strict=True))]).astype(np.int32)
        if aperture.shape == "circle" and not aperture.hole:
            width = aperture.parameters[0] * transform.scale
            if width <= 0:
                continue
            shape = stadiums(start, end, width, chord_error)
        else:
            template = aperture_shape(aperture, transform, chord_error)
            if template.is_empty:
                continue
            shape = swept(template, start, end)
        if len(arcs):
            shape, owner = _arcs_united(shape, owner, len(draws))
        shapes.append(shape)
        owners.append(owner)
    if not shapes:
        return np.empty(0, object), np.empty(0, np.int32)
    return np.concatenate(shapes), np.concatenate(owners)


def _arcs_united(shape: Shapes, owner: Ints, draws: int) -> tuple[Shapes, Ints]:
    """The chords of each arc united to one piece."""
    arcs, first = np.unique(owner[draws:], return_index=True)
    bounds = np.append(first, len(owner) - draws)
    united, owners = [], []
    for arc, begin, end in zip(arcs, bounds[:-1], bounds[1:], strict=True):
        parts = shapely.get_parts(shapely.union_all(shape[draws + begin : draws + end]))
        united.append(parts)
        owners.append(np.full(len(parts), arc, np.int32))
    return np.concatenate([shape[:draws], *united]), np.concatenate([owner[:draws], *owners])


def swept(template: shapely.Geometry, start: Floats, end: Floats) -> Shapes:
    """(n,) copper left by an aperture of any shape drawn from start to end: exact for convex parts (the hull of both end copies), the union over
    convex parts for others."""
    parts = [template] if _convex(template) else convex_parts(template)
    found = []
    for part in parts:
        points = shapely.get_coordinates(part)
        both = np.concatenate([points[None] + start[:, None, :], points[None] + end[:, None, :]], axis=1)
        count = both.shape[1]
        clouds = shapely.multipoints(both.reshape(-1, 2), indices=np.repeat(np.arange(len(start)), count))
        found.append(shapely.convex_hull(clouds))
    if len(found) == 1:
        return found[0]
    return shapely.union_all(np.stack(found), axis=0)


def _convex(shape: shapely.Geometry) -> bool:
    return bool(shape.geom_type == "Polygon" and shape.area > 0 and shape.convex_hull.area - shape.area < 1e-9 * shape.area + 1e-15)


def convex_parts(shape: shapely.Geometry) -> list[shapely.Geometry]:
    """A polygon as triangles."""
    triangles = shapely.get_parts(shapely.constrained_delaunay_triangles(shape))
    return [t for t in triangles if t.area > 0]
