"""What a region is: pad, pour, teardrop or trace. In: polygons of one net on one layer, pins, mm; out: pads, pours, centrelines, mm."""

from __future__ import annotations

import numpy as np
import shapely
from numpy.typing import NDArray

from impcheck.artwork.image import Floats
from impcheck.path.medial import medial_axis

PAD_ELONGATION = 6.0  # a region longer than this many widths is no pad, even with a pin in it
BARREL_PAD_ELONGATION = 3.0
BLOB_ELONGATION = 4.0  # copper shorter than this many widths has no centreline worth following
BLOB_WIDTH = 2.5  # mm, mean width from which copper is a pour rather than a trace
THINNEST = 0.01  # mm, mean width below which copper is a flaw of the drawing and no trace
SLIVER = 0.25  # mm, what stays this close to strokes and pads is a teardrop or a slip of the tool, not a trace


def elongation(shape: shapely.Polygon) -> float:
    """Length over width of the rectangle of the same area and perimeter; 1 for anything rounder."""
    half, area = shape.length / 2, shape.area
    root = half * half - 4 * area
    if root <= 0 or area <= 0:
        return 1.0
    width = (half - np.sqrt(root)) / 2
    return float((half - width) / width)


def pad_regions(shapes: NDArray[np.object_], pins: list[tuple[float, float]], holes: Floats) -> dict[int, tuple[float, float]]:
    """Regions that are pads, with their centres: the most compact one around each pin that no flash claims, and compact ones at barrels."""
    found: dict[int, tuple[float, float]] = {}
    stretch = np.array([elongation(shape) for shape in shapes])
    width = 2 * shapely.area(shapes) / np.maximum(shapely.length(shapes), 1e-12)
    for limit, points in ((PAD_ELONGATION, np.array(pins).reshape(-1, 2)), (BARREL_PAD_ELONGATION, holes.reshape(-1, 2))):
        for point in points:
            around = np.flatnonzero(shapely.intersects_xy(shapes, *point) & (stretch <= limit) & (width <= BLOB_WIDTH))
            if len(around):
                best = int(around[np.argmin(stretch[around])])
                centre = shapes[best].centroid
                inside = limit == PAD_ELONGATION and shapes[best].intersects(centre)
                found.setdefault(best, (centre.x, centre.y) if inside else (float(point[0]), float(point[1])))
    return found


def centrelines(
    regions: NDArray[np.object_], solid: list[shapely.Polygon], strokes: bool
) -> tuple[list[tuple[Floats, Floats, Floats]], list[shapely.Polygon]]:
    """Start, end and width of the pieces of centreline of each region that is long and narrow, and the regions that are pours.

    `solid` are the strokes and pads of the same net and layer; where there are `strokes`, regions that lie close to them and join nothing
    new are left out: teardrops, slips of the tool, and the same trace drawn again.
    """
    lines: list[tuple[Floats, Floats, Floats]] = []
    pours: list[shapely.Polygon] = []
    if not len(regions):
        return lines, pours
    cover = shapely.union_all(shapely.buffer(solid, 0.001, quad_segs=4)) if solid else shapely.Polygon()
    near = cover.buffer(SLIVER, quad_segs=4) if strokes else cover
    for shape in shapely.get_parts(shapely.union_all(regions)).tolist():
        if shape.geom_type != "Polygon" or shape.area <= 0:
            continue
        if strokes and shapely.difference(shape, near).is_empty and len(shapely.get_parts(shapely.intersection(cover, shape))) <= 1:
            continue
        mean_width = 2 * shape.area / shape.length
        if mean_width < THINNEST:
            continue
        if mean_width > BLOB_WIDTH or (mean_width > BLOB_WIDTH / 4 and elongation(shape) < BLOB_ELONGATION):
            pours.append(shape)
            continue
        axis = medial_axis(shape)
        if len(axis[0]):
            lines.append(axis)
        else:
            pours.append(shape)
    return lines, pours
