"""Openings in planes. In: the copper of a layer and a place; out: how far the opening there reaches across a trace, in mm."""

from __future__ import annotations

from collections.abc import Set
from dataclasses import dataclass

import numpy as np
import shapely

from impcheck.artwork.image import Ints
from impcheck.copper.copper import LayerCopper

WINDOWS = (3.0, 9.0, 27.0)  # mm, half-widths of the window looked at, until the opening ends inside it
HAIRLINE = 0.0075  # mm: slits of cut-ins narrower than twice this are no openings
ON_EDGE = 1e-6  # mm


@dataclass(frozen=True)
class Opening:
    """Where an opening reaches, from a place, along the normal of the trace."""

    left: float  # mm
    right: float
    open_left: bool  # it runs out of the plane on this side
    open_right: bool

    @property
    def endless(self) -> bool:
        """True where it runs out of the plane on either side."""
        return self.open_left or self.open_right


def opening_at(
    layer: LayerCopper, labels: Ints, returns: Set[int], at: tuple[float, float], normal: tuple[float, float], reach: float
) -> Opening | None:
    """The opening of a layer's return copper that holds a place, or the nearest one within `reach` mm of it; None where there is none.

    A plane is taken to reach as far as the convex hull of its copper: what is free inside is an opening, and runs out of the plane where
    it meets the hull; what is free outside is where the plane has ended.
    """
    mine = np.flatnonzero(np.isin(labels, sorted(returns)))
    tree = shapely.STRtree(layer.shape[mine])
    place = shapely.Point(at)
    for half in WINDOWS:
        window = shapely.box(at[0] - half, at[1] - half, at[0] + half, at[1] + half)
        near = mine[tree.query(window, predicate="intersects")]
        copper = shapely.union_all(shapely.intersection(layer.shape[near], window))
        hull = shapely.convex_hull(copper)
        closed = shapely.buffer(copper, HAIRLINE, join_style="mitre")
        parts = shapely.get_parts(shapely.difference(hull, closed))
        distances = shapely.distance(parts, place)
        if not (distances < max(reach, 2 * HAIRLINE)).any():
            if shapely.distance(closed, place) == 0 and not shapely.is_empty(closed):
                return None
            return Opening(half, half, True, True)
        opening = parts[int(np.argmin(distances))]
        if shapely.distance(opening, shapely.get_exterior_ring(window)) > ON_EDGE:
            break
    points = shapely.get_coordinates(opening)
    across = (points - np.array(at)) @ np.array(normal)
    out = shapely.distance(shapely.points(points), shapely.boundary(hull)) <= ON_EDGE
    return Opening(
        left=float(max(across.max(), 0.0)),
        right=float(max(-across.min(), 0.0)),
        open_left=bool((out & (across > 0)).any()),
        open_right=bool((out & (across < 0)).any()),
    )
