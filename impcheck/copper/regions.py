"""Regions as polygons. In: the contours of an image; out: one or more valid polygons a contour, mm."""

from __future__ import annotations

import numpy as np
import shapely
from numpy.typing import NDArray

from impcheck.artwork.image import Image, Ints
from impcheck.copper.shapes import Shapes, arcs_to_points


def region_shapes(image: Image, chord_error: float) -> tuple[Shapes, Ints]:
    """Polygons of all regions and the object each belongs to. Every contour is filled by itself, as the specification says; a contour that
    touches or crosses itself (cut-ins) is repaired by its structure."""
    contours = image.contours
    count = len(contours.object)
    if count == 0:
        return np.empty(0, object), np.empty(0, np.int32)
    points, of_contour = contour_points(image, chord_error)
    size = np.bincount(of_contour, minlength=count)
    use = size >= 3
    keep = use[of_contour]
    number = np.cumsum(use) - 1
    rings = shapely.linearrings(points[keep], indices=number[of_contour[keep]])
    shape = shapely.polygons(rings)
    owner = contours.object[use].astype(np.int32)
    broken = ~shapely.is_valid(shape)
    if broken.any():
        mended = shapely.make_valid(shape[broken], method="structure", keep_collapsed=False)
        parts, of = shapely.get_parts(mended, return_index=True)
        flat = shapely.get_type_id(parts) == shapely.GeometryType.POLYGON
        shape = np.concatenate([shape[~broken], parts[flat]])
        owner = np.concatenate([owner[~broken], owner[broken][of[flat]]])
    solid = shapely.area(shape) > 0
    return shape[solid], owner[solid]


def contour_points(image: Image, chord_error: float) -> tuple[NDArray[np.float64], NDArray[np.int64]]:
    """Vertices of all contours with arcs chopped, and the contour each belongs to."""
    contours = image.contours
    length = np.diff(contours.first)
    of = np.repeat(np.arange(len(length)), length)
    arcs = np.flatnonzero(contours.sweep != 0)
    if len(arcs) == 0:
        return contours.start, of
    following = np.arange(len(contours.start)) + 1
    following[contours.first[1:] - 1] = contours.first[:-1]  # the last segment of a contour ends where its first begins
    chopped = arcs_to_points(contours.start[arcs], contours.centre[arcs], contours.sweep[arcs], contours.start[following[arcs]], chord_error)
    times = np.ones(len(contours.start), np.int64)
    times[arcs] = [len(p) - 1 for p in chopped]
    points = np.repeat(contours.start, times, axis=0)
    offset = np.concatenate([[0], np.cumsum(times)])
    for arc, found in zip(arcs.tolist(), chopped, strict=True):
        points[offset[arc] : offset[arc + 1]] = found[:-1]
    return points, np.repeat(of, times)
