"""Plated holes as barrels, and holes that are not plated. In: drills and a stackup; out: spans and heights in mm after back-drilling."""

from __future__ import annotations

import numpy as np
import shapely
from numpy.typing import NDArray

from impcheck.artwork.image import Floats
from impcheck.artwork.parts import Artwork, Drill
from impcheck.artwork.stackup import Stackup
from impcheck.copper.copper import Barrels
from impcheck.copper.shapes import Shapes, stadiums

SAME_PLACE = 0.05  # mm: a back-drill within this (or a quarter of its diameter) of a barrel drills that barrel


def barrels_of(artwork: Artwork) -> Barrels:
    """Every plated hole, shortened where a back-drill meets it.

    A back-drill takes the barrel away from the side it is drilled from. It keeps the named layer connected and is taken to stop halfway through
    the dielectric beyond that layer: fabrication files do not say the depth, and a stub of half a dielectric is what a careful fab leaves.
    """
    plated = [(drill, drill.holes.plated == 1) for drill in artwork.drills if drill.backdrill_from is None]
    start = _stack([d.holes.start[m] for d, m in plated], (0, 2))
    end = _stack([d.holes.end[m] for d, m in plated], (0, 2))
    diameter = _stack([d.holes.diameter[m] for d, m in plated], (0,))
    first = _stack([np.full(m.sum(), d.first, np.int32) for d, m in plated], (0,), np.int32)
    last = _stack([np.full(m.sum(), d.last, np.int32) for d, m in plated], (0,), np.int32)
    line = _stack([d.holes.line[m] for d, m in plated], (0,), np.int32)
    file = tuple(d.holes.file for d, m in plated for _ in range(int(m.sum())))
    heights = np.array(artwork.stackup.heights)
    top, bottom = heights[first, 1], heights[last, 0]
    for drill in artwork.drills:
        if drill.backdrill_from is not None and drill.backdrill_keep is not None:
            _shorten(drill, artwork.stackup, start, end, diameter, first, last, top, bottom)
    return Barrels(start, end, diameter, first, last, top, bottom, file, line)


def _shorten(drill: Drill, stackup: Stackup, start: Floats, end: Floats, diameter: Floats, first: NDArray[np.int32], last: NDArray[np.int32], top: Floats, bottom: Floats) -> None:
    keep = drill.backdrill_keep
    assert keep is not None
    heights = stackup.heights
    middle = (start + end) / 2
    for place, width in zip(drill.holes.start, drill.holes.diameter, strict=True):
        hit = np.hypot(*(middle - place).T) <= max(SAME_PLACE, width / 4)
        if drill.backdrill_from == 0:
            hit &= (first < keep) & (last >= keep)
            first[hit] = keep
            top[hit] = (heights[keep][1] + heights[keep - 1][0]) / 2
        else:
            hit &= (last > keep) & (first <= keep)
            last[hit] = keep
            bottom[hit] = (heights[keep][0] + heights[keep + 1][1]) / 2


def _stack(parts: list[NDArray[np.float64]], shape: tuple[int, ...], kind: type = np.float64) -> NDArray[np.float64]:
    return np.concatenate([np.empty(shape, kind), *parts]) if parts else np.empty(shape, kind)


def holes_through(artwork: Artwork, layer: int, chord_error: float) -> Shapes:
    """Polygons of the holes without plating, and of back-drills, that pass a copper layer."""
    found = [np.empty(0, object)]
    for drill in artwork.drills:
        if drill.backdrill_from is None:
            if not drill.first <= layer <= drill.last:
                continue
            mine = drill.holes.plated == 0
        else:
            keep = drill.backdrill_keep if drill.backdrill_keep is not None else layer
            if not (layer < keep if drill.backdrill_from == 0 else layer > keep):
                continue
            mine = np.ones(len(drill.holes.diameter), bool)
        for width in np.unique(drill.holes.diameter[mine]):
            same = mine & (drill.holes.diameter == width)
            found.append(stadiums(drill.holes.start[same], drill.holes.end[same], float(width), chord_error))
    return shapely.orient_polygons(np.concatenate(found)) if len(found) > 1 else found[0]
