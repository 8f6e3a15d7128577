"""Plated holes as barrels, and the holes that take copper away. In: drills and a stackup; out: spans, heights and polygons in mm."""

from __future__ import annotations

import numpy as np
import shapely

from impcheck.artwork.image import Floats, Ints
from impcheck.artwork.parts import Artwork, Drill
from impcheck.artwork.stackup import Stackup
from impcheck.copper.copper import Barrels
from impcheck.copper.shapes import Shapes, stadiums

SAME_PLACE = 0.05  # mm: a back-drill this near to a barrel (or within a quarter of its own diameter) drills that barrel


def barrels_of(artwork: Artwork) -> Barrels:
    """Every plated hole, shortened where a back-drill meets it.

    A back-drill takes the barrel away from the side it is drilled from and leaves the layer it names connected. Fabrication files do
    not say how deep it goes beyond that layer; it is taken to stop halfway through the dielectric that follows, so that a stub of half a
    dielectric is left.
    """
    plated = [
        (drill, np.flatnonzero((drill.holes.plated == 1) & (drill.holes.diameter > 0))) for drill in artwork.drills if not _is_back(drill)
    ]
    start = np.concatenate([np.empty((0, 2)), *(drill.holes.start[mine] for drill, mine in plated)])
    end = np.concatenate([np.empty((0, 2)), *(drill.holes.end[mine] for drill, mine in plated)])
    diameter = np.concatenate([np.empty(0), *(drill.holes.diameter[mine] for drill, mine in plated)])
    line = np.concatenate([np.empty(0, np.int32), *(drill.holes.line[mine] for drill, mine in plated)]).astype(np.int32)
    times = [len(mine) for _, mine in plated]
    first = np.repeat(np.array([drill.first for drill, _ in plated], np.int32), times)
    last = np.repeat(np.array([drill.last for drill, _ in plated], np.int32), times)
    heights = np.array(artwork.stackup.heights).reshape(-1, 2)
    span = _Span(first, last, heights[first, 1], heights[last, 0])
    middle = (start + end) / 2
    for drill in artwork.drills:
        if _is_back(drill):
            span = _shortened(span, drill, artwork.stackup, middle)
    file = tuple(drill.holes.file for drill, mine in plated for _ in mine)
    return Barrels(start, end, diameter, span.first, span.last, span.top, span.bottom, file, line)


class _Span:
    """First and last layer and the heights of both ends of each barrel."""

    def __init__(self, first: Ints, last: Ints, top: Floats, bottom: Floats) -> None:
        self.first, self.last, self.top, self.bottom = first, last, top, bottom


def _is_back(drill: Drill) -> bool:
    return drill.backdrill_from is not None


def _shortened(span: _Span, drill: Drill, stackup: Stackup, middle: Floats) -> _Span:
    keep, heights = drill.backdrill_keep, stackup.heights
    if keep is None or len(middle) == 0:
        return span
    places = (drill.holes.start + drill.holes.end) / 2
    reach = np.maximum(SAME_PLACE, drill.holes.diameter / 4)
    _, barrel = shapely.STRtree(np.asarray(shapely.points(middle), object)).query(
        shapely.points(places), predicate="dwithin", distance=reach
    )
    hit = np.zeros(len(middle), bool)
    hit[barrel] = True
    first, last, top, bottom = span.first.copy(), span.last.copy(), span.top.copy(), span.bottom.copy()
    if drill.backdrill_from == 0:
        hit &= (first < keep) & (last >= keep)
        if hit.any():
            first[hit], top[hit] = keep, (heights[keep][1] + heights[keep - 1][0]) / 2
    else:
        hit &= (last > keep) & (first <= keep)
        if hit.any():
            last[hit], bottom[hit] = keep, (heights[keep][0] + heights[keep + 1][1]) / 2
    return _Span(first, last, top, bottom)


def holes_through(artwork: Artwork, layer: int, chord_error: float) -> Shapes:
    """Polygons of what takes copper off a layer: holes without plating that pass it, and back-drills on the layers they clear."""
    found = [np.empty(0, object)]
    for drill in artwork.drills:
        holes = drill.holes
        if drill.backdrill_from is None:
            cuts = drill.first <= layer <= drill.last
            mine = holes.plated == 0
        else:
            keep = drill.backdrill_keep if drill.backdrill_keep is not None else layer
            cuts = layer < keep if drill.backdrill_from == 0 else layer > keep
            mine = np.ones(len(holes.diameter), bool)
        for width in np.unique(holes.diameter[mine & (holes.diameter > 0)]) if cuts else ():
            same = mine & (holes.diameter == width)
            found.append(stadiums(holes.start[same], holes.end[same], float(width), chord_error))
    return np.concatenate(found)
