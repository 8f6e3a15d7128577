"""Regions as polygons. In: the contours of an image; out: one or more valid polygons a contour, mm."""

from __future__ import annotations

import numpy as np
import shapely

from impcheck.artwork.image import Floats, Image, Ints
from impcheck.copper.shapes import Rows, Shapes, arc_points, chords, radius_of, solid_parts


def region_shapes(image: Image, chord_error: float) -> tuple[Shapes, Ints]:
    """(m,) polygons of all regions and the object each belongs to.

    Every contour is filled by itself, as the Gerber specification says of regions with several. A contour that touches or crosses itself
    (cut-ins) is repaired by its structure: the other method of shapely loses copper on planes with many cut-ins.
    """
    contours = image.contours
    if len(contours.object) == 0:
        return np.empty(0, object), np.empty(0, np.int32)
    points, of_contour = contour_points(image, chord_error)
    usable = np.bincount(of_contour, minlength=len(contours.object)) >= 3
    keep = usable[of_contour]
    number = np.cumsum(usable) - 1
    shape = np.asarray(shapely.polygons(shapely.linearrings(points[keep], indices=number[of_contour[keep]])), object)
    owner = contours.object[usable].astype(np.int32)
    broken = ~shapely.is_valid(shape)
    if broken.any():
        mended, part_of = solid_parts(shapely.make_valid(shape[broken], method="structure", keep_collapsed=False))
        shape = np.concatenate([shape[~broken], mended])
        owner = np.concatenate([owner[~broken], owner[broken][part_of]])
    solid = shapely.area(shape) > 0
    return shape[solid], owner[solid]


def contour_points(image: Image, chord_error: float) -> tuple[Floats, Rows]:
    """(m, 2) vertices of all contours, arcs chopped, and (m,) the contour each belongs to."""
    contours = image.contours
    length = np.diff(contours.first)
    of_contour = np.repeat(np.arange(len(length)), length)
    arcs = np.flatnonzero(contours.sweep != 0)
    if len(arcs) == 0:
        return contours.start, of_contour
    following = np.arange(len(contours.start)) + 1
    following[contours.first[1:][length > 0] - 1] = contours.first[:-1][length > 0]  # a contour's last segment ends where its first begins
    start, end, centre, sweep = contours.start[arcs], contours.start[following[arcs]], contours.centre[arcs], contours.sweep[arcs]
    count = chords(radius_of(start, centre, end), sweep, chord_error)
    chopped, arc = arc_points(start, centre, sweep, end, count)
    last = np.append(arc[1:] != arc[:-1], True)  # the end of an arc is the start of the next segment
    times = np.ones(len(contours.start), np.int64)
    times[arcs] = count
    points = np.repeat(contours.start, times, axis=0)
    points[np.repeat(contours.sweep != 0, times)] = chopped[~last]
    return points, np.repeat(of_contour, times)
