"""Dark and clear in drawing order. In: polygons with polarity; out: the dark pieces that are left, mm."""

from __future__ import annotations

import numpy as np
import shapely
from numpy.typing import NDArray
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components
from shapely.geometry.base import BaseGeometry

from impcheck.artwork.image import Bools, Ints
from impcheck.copper.shapes import Rows, Shapes, solid_parts

SLIVER = 1e-12  # mm2: what a clear shape that only touches a piece takes away


def apply_polarity(shape: Shapes, owner: Ints, dark: Bools) -> tuple[Shapes, Ints, Bools]:
    """(n,) polygons in drawing order -> pieces left, their owners, and whether each is its polygon as drawn.

    A clear shape removes only what was drawn before it, so what is left of a dark shape is that shape without the clear ones that come
    later and meet it: no union of layers is needed, and the cost does not grow with the number of changes of polarity.
    """
    pieces, order = shape[dark], np.flatnonzero(dark)
    owner = owner[dark]
    whole = np.ones(len(pieces), bool)
    clear, clear_order = shape[~dark], np.flatnonzero(~dark)
    if len(clear) == 0 or len(pieces) == 0:
        return pieces, owner, whole
    which_clear, which_piece = shapely.STRtree(pieces).query(clear, predicate="intersects")
    later = clear_order[which_clear] > order[which_piece]
    which_clear, which_piece = which_clear[later], which_piece[later]
    if len(which_piece) == 0:
        return pieces, owner, whole
    made, made_from, kept = _cut(pieces, clear, which_piece, which_clear)
    whole[which_piece[np.isin(which_piece, kept, invert=True)]] = False
    untouched = whole.copy()
    position = np.concatenate([np.flatnonzero(untouched), made_from])
    result = np.concatenate([pieces[untouched], made])
    back = np.argsort(position, kind="stable")
    position = position[back]
    return result[back], owner[position], whole[position]


def _cut(pieces: Shapes, clear: Shapes, which_piece: Rows, which_clear: Rows) -> tuple[Shapes, Rows, Rows]:
    """What is left of the pieces that meet clear shapes: polygons, the piece each is left of, and the pieces that lose nothing."""
    sort = np.lexsort((which_clear, which_piece))
    which_piece, which_clear = which_piece[sort], which_clear[sort]
    touched, first, times = np.unique(which_piece, return_index=True, return_counts=True)
    results = np.empty(len(touched), object)
    single = times == 1
    cutter = clear[which_clear[first]]
    shapely.prepare(cutter[single])
    gone = np.zeros(len(touched), bool)
    gone[single] = shapely.covers(cutter[single], pieces[touched[single]])
    quick = single & ~gone
    quick[quick] = ~shapely.contains_properly(pieces[touched[quick]], cutter[quick])
    results[gone] = shapely.Polygon()
    results[quick] = shapely.difference(pieces[touched[quick]], cutter[quick])
    cluster = _clusters(clear)
    for index in np.flatnonzero(~gone & ~quick).tolist():
        mine = which_clear[first[index] : first[index] + times[index]]
        results[index] = _without(pieces[touched[index]], clear[mine], cluster[mine])
    lost = shapely.area(pieces[touched]) - shapely.area(results) > SLIVER
    made, part_of = solid_parts(results[lost])
    return made, touched[lost][part_of], touched[~lost]


def _clusters(shape: Shapes) -> Rows:
    """(n,) number of the cluster of shapes that meet, directly or through others, each belongs to."""
    a, b = shapely.STRtree(shape).query(shape, predicate="intersects")
    graph = coo_array((np.ones(len(a), bool), (a, b)), shape=(len(shape), len(shape)))
    return np.asarray(connected_components(graph, directed=False)[1], np.int64)


def _without(piece: BaseGeometry, clear: Shapes, cluster: Rows) -> BaseGeometry:
    """A piece without clear shapes. Those wholly inside become holes as they are; only those on its edge are subtracted by overlay."""
    _, number, size = np.unique(cluster, return_inverse=True, return_counts=True)
    together = size[number] > 1
    if together.any():
        united = shapely.get_parts(shapely.union_all(clear[together]))
        clear = np.concatenate([clear[~together], united[shapely.get_type_id(united) == shapely.GeometryType.POLYGON]])
    shapely.prepare(piece)
    inside = (shapely.get_num_interior_rings(clear) == 0) & shapely.contains_properly(piece, clear)
    if together.any():
        a, b = shapely.STRtree(clear).query(clear, predicate="intersects")
        inside[a[a != b]] = False  # shapes that meet in points can ring copper, which then is a piece of its own
    if inside.any():
        rings = [*shapely.get_rings(piece), *shapely.get_exterior_ring(clear[inside])]
        piece = shapely.polygons(rings[0], holes=rings[1:])
    rest: NDArray[np.object_] = clear[~inside]
    return shapely.difference(piece, shapely.union_all(rest)) if len(rest) else piece
