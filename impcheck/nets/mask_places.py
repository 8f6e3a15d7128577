"""Ends of nets that nothing names: where the solder mask leaves their copper open. In: labels; out: one place for each pad, in mm."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
import shapely
from numpy.typing import NDArray

from impcheck.copper.copper import Copper
from impcheck.nets.evidence import Finder, inner_points
from impcheck.nets.nets import BoardPin

SEAM = 0.005  # mm: openings nearer than twice this are one (strokes that paint one opening may only just meet)
SMALLEST = 1e-4  # mm2: a corner of copper that just shows under the edge of a foreign opening is no pad


def mask_places(finder: Finder, labels: Iterable[int]) -> list[BoardPin]:
    """Places where the solder mask lets the copper of some labels be soldered, from left to right.

    One place for each connected piece of bare copper, so an opening over a row of pads gives one for each pad, and an opening drawn in many
    strokes gives one in all. Places over a barrel count only where there are not two others (an open via is no end).
    """
    wanted = np.array(sorted(set(labels)), np.int32)
    plain: list[BoardPin] = []
    drilled: list[BoardPin] = []
    copper = finder.copper
    for openings, layer in zip(copper.mask_openings, (0, len(copper.layers) - 1), strict=True):
        for label in wanted.tolist():
            for x, y in _bare(finder, copper, openings, (layer, label)):
                barrel = int(finder.barrel_at(np.array([[x, y]]), 0.0)[0])
                through = barrel >= 0 and int(finder.barrel_label[barrel]) == label
                pin = BoardPin("", "", (x, y), None if through else layer, label, "")
                (drilled if through else plain).append(pin)
    found = plain if len(plain) > 1 else plain + drilled
    unique = {(pin.at, pin.layer): pin for pin in found}
    return sorted(unique.values(), key=lambda pin: (pin.at, -1 if pin.layer is None else pin.layer))


def _bare(finder: Finder, copper: Copper, openings: NDArray[np.object_], where: tuple[int, int]) -> list[tuple[float, float]]:
    """One point on each piece of bare copper: the middle of its opening where that lies on it (the pad's, the trace that leaves it left
    out of account), else a point inside."""
    layer, label = where
    pieces = copper.layers[layer].shape[finder.piece_label[layer] == label]
    if len(openings) == 0 or len(pieces) == 0:
        return []
    which, piece = shapely.STRtree(pieces).query(openings, predicate="intersects")
    if len(which) == 0:
        return []
    drawn, own = shapely.union_all(shapely.buffer(openings[np.unique(which)], SEAM)), shapely.union_all(pieces[np.unique(piece)])
    bare = shapely.get_parts(shapely.intersection(drawn, own))
    bare = bare[shapely.area(bare) > SMALLEST]
    places = inner_points(bare)
    whole = shapely.get_parts(drawn)
    home, part = shapely.STRtree(bare).query(whole, predicate="intersects")
    alone = np.isin(home, np.flatnonzero(np.bincount(home, minlength=len(whole)) == 1))
    middle = shapely.centroid(whole[home[alone]])
    inside = shapely.intersects(bare[part[alone]], middle)
    places[part[alone][inside]] = shapely.get_coordinates(middle[inside])
    return [(float(x), float(y)) for x, y in places]
