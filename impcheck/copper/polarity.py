"""Dark and clear in drawing order. In: polygons with polarity; out: the dark pieces that are left, mm."""

from __future__ import annotations

import numpy as np
import shapely
from numpy.typing import NDArray

Shapes = NDArray[np.object_]


def apply_polarity(shape: Shapes, owner: NDArray[np.int32], dark: NDArray[np.bool_]) -> tuple[Shapes, NDArray[np.int32], NDArray[np.bool_]]:
    """Pieces in drawing order -> (pieces left, their owners, whether each is untouched). A clear shape removes only what stands before it."""
    if dark.all():
        return shape, owner, np.ones(len(shape), bool)
    change = np.flatnonzero(np.diff(dark.astype(np.int8))) + 1
    bounds = [0, *change.tolist(), len(shape)]
    left: list[Shapes] = []
    owners: list[NDArray[np.int32]] = []
    whole: list[NDArray[np.bool_]] = []
    for begin, end in zip(bounds, bounds[1:], strict=False):
        if dark[begin]:
            left.append(shape[begin:end])
            owners.append(owner[begin:end])
            whole.append(np.ones(end - begin, bool))
        elif left:
            pieces, own, untouched = np.concatenate(left), np.concatenate(owners), np.concatenate(whole)
            pieces, own, untouched = cut(pieces, own, untouched, shape[begin:end])
            left, owners, whole = [pieces], [own], [untouched]
    if not left:
        return shape[:0], owner[:0], np.ones(0, bool)
    return np.concatenate(left), np.concatenate(owners), np.concatenate(whole)


def cut(pieces: Shapes, owner: NDArray[np.int32], whole: NDArray[np.bool_], clear: Shapes) -> tuple[Shapes, NDArray[np.int32], NDArray[np.bool_]]:
    """Takes clear shapes out of pieces. Clears wholly inside a piece become its holes without an overlay; only the others are subtracted."""
    groups = disjoint(clear)
    tree = shapely.STRtree(pieces)
    which_clear, which_piece = tree.query(groups, predicate="intersects")
    if len(which_piece) == 0:
        return pieces, owner, whole
    order = np.argsort(which_piece, kind="stable")
    which_clear, which_piece = which_clear[order], which_piece[order]
    touched, first = np.unique(which_piece, return_index=True)
    first = np.append(first, len(which_piece))
    simple = shapely.get_num_interior_rings(groups) == 0
    results: list[Shapes] = []
    for position, index in enumerate(touched.tolist()):
        piece = pieces[index]
        mine = groups[which_clear[first[position] : first[position + 1]]]
        flat = simple[which_clear[first[position] : first[position + 1]]]
        shapely.prepare(piece)
        inside = flat & shapely.contains_properly(piece, mine)
        rings = [shapely.get_exterior_ring(g) for g in mine[inside]]
        if rings:
            holes = list(piece.interiors) + rings
            piece = shapely.polygons(shapely.get_exterior_ring(piece), holes=holes)
        rest = mine[~inside]
        if len(rest):
            piece = shapely.difference(piece, shapely.union_all(rest) if len(rest) > 1 else rest[0])
        parts = shapely.get_parts(piece)
        results.append(parts[(shapely.get_type_id(parts) == 3) & (shapely.area(parts) > 0)])
    keep = np.ones(len(pieces), bool)
    keep[touched] = False
    made = np.concatenate(results)
    counts = [len(r) for r in results]
    return (
        np.concatenate([pieces[keep], made]),
        np.concatenate([owner[keep], np.repeat(owner[touched], counts)]),
        np.concatenate([whole[keep], np.zeros(len(made), bool)]),
    )


def disjoint(shapes: Shapes) -> Shapes:
    """Overlapping shapes united; those that meet nothing stay as they are."""
    tree = shapely.STRtree(shapes)
    a, b = tree.query(shapes, predicate="intersects")
    alone = np.ones(len(shapes), bool)
    alone[a[a != b]] = False
    if alone.all():
        return shapes
    merged = shapely.get_parts(shapely.union_all(shapes[~alone]))
    return np.concatenate([shapes[alone], merged[shapely.get_type_id(merged) == 3]])
