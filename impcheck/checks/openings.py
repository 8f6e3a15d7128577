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
    layer: LayerCopper,
    labels: Ints,
    returns: Set[int],
    at: tuple[float, float],
    normal: tuple[float, float],
    board: tuple[float, float, float, float],
) -> Opening | None:
    """The opening of a layer's return copper that holds a place; None where there is copper at the place."""
    mine = np.flatnonzero(np.isin(labels, sorted(returns)))
    tree = shapely.STRtree(layer.shape[mine])
    place = shapely.Point(at)
    for half in WINDOWS:
        window = shapely.box(at[0] - half, at[1] - half, at[0] + half, at[1] + half)
        near = mine[tree.query(window, predicate="intersects")]
        clipped = shapely.intersection(layer.shape[near], window)
        copper = shapely.buffer(shapely.union_all(clipped), HAIRLINE, join_style="mitre")
        free = shapely.get_parts(shapely.difference(window, copper))
        holder = [part for part in free if part.distance(place) < HAIRLINE * 2]
        if not holder:
            return None
        opening = min(holder, key=lambda part: part.distance(place))
        if shapely.disjoint(opening, shapely.get_exterior_ring(window)) or half == WINDOWS[-1]:
            break
        beyond = shapely.box(*board)
        if not shapely.covers(beyond, window) and shapely.disjoint(
            opening, shapely.intersection(shapely.get_exterior_ring(window), beyond)
        ):
            break
    points = shapely.get_coordinates(opening) - np.array(at)
    across = points @ np.array(normal)
    inside = shapely.box(*board)
    edge = shapely.get_coordinates(opening)
    out = ~shapely.contains_xy(shapely.buffer(inside, -HAIRLINE), edge[:, 0], edge[:, 1]) | (np.abs(points).max(axis=1) >= half - 1e-9)
    return Opening(
        left=float(max(across.max(), 0.0)),
        right=float(max(-across.min(), 0.0)),
        open_left=bool((out & (across > 0)).any()),
        open_right=bool((out & (across < 0)).any()),
    )
