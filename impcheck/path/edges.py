"""Edges of the copper near centrelines. In: copper of a layer and windows along centrelines, mm; out: edges in window coordinates, mm.

A window is a straight piece of centreline with a half-width: s runs along it from 0 to its length, t across it, positive to the left.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import shapely
from numpy.typing import NDArray

from impcheck.artwork.image import Bools, Floats, Ints
from impcheck.copper.copper import LayerCopper

MAX_WINDOW = 1.0  # mm, longest window
CHUNK = 12  # edges that share one box of the spatial index
ROUNDING = 1e-9  # mm


@dataclass(frozen=True)
class Windows:
    """n straight pieces of centreline, each at most `MAX_WINDOW` long."""

    origin: Floats  # (n, 2)
    heading: Floats  # (n, 2) unit vectors
    length: Floats  # (n,)
    reach: Floats  # (n,) half-width

    def __len__(self) -> int:
        return len(self.length)

    def middle(self) -> Floats:
        """(n, 2) middles."""
        result: Floats = self.origin + self.heading * (self.length / 2)[:, None]
        return result

    def boxes(self, margin: float = 0.0) -> NDArray[np.object_]:
        """(n,) bounding boxes, as the lines from corner to corner that have them (for a spatial index, and made faster than polygons)."""
        normal = np.stack([-self.heading[:, 1], self.heading[:, 0]], axis=1)
        middle = self.middle()
        half = np.abs(self.heading) * (self.length / 2 + margin)[:, None] + np.abs(normal) * (self.reach + margin)[:, None]
        low, high = middle - half, middle + half
        return diagonals(low, high)

    def take(self, which: NDArray[np.int64] | NDArray[np.bool_]) -> Windows:
        """The windows at `which` (mask or indices)."""
        return Windows(self.origin[which], self.heading[which], self.length[which], self.reach[which])


def diagonals(low: Floats, high: Floats) -> NDArray[np.object_]:
    """(n,) lines between the corners (n, 2) of boxes."""
    return np.asarray(shapely.linestrings(np.stack([low, high], axis=1)), dtype=object)


@dataclass(frozen=True)
class LocalEdges:
    """m pairs of a window and an edge in its reach, sorted by window; copper lies to the left of the edge."""

    window: NDArray[np.int64]  # (m,)
    piece: NDArray[np.int64]  # (m,) piece of the layer
    s0: Floats
    t0: Floats
    s1: Floats
    t1: Floats
    turn: Floats  # (m,) angle by which the outline turns at the end of the edge, radians
    solid_window: NDArray[np.int64]  # windows that lie wholly inside a piece, none of its edges in reach
    solid_piece: NDArray[np.int64]

    def renumbered(self, windows: NDArray[np.int64]) -> LocalEdges:
        """Edges of a choice of windows with the numbers the windows have in the whole."""
        return replace(self, window=windows[self.window], solid_window=windows[self.solid_window])


class LayerEdges:
    """Index of the edges of one copper layer near given windows."""

    def __init__(self, layer: LayerCopper, labels: Ints, near: shapely.STRtree) -> None:
        """`labels` (pieces,) and `near`, an index of boxes outside which nothing will be asked."""
        self.shape = layer.shape
        self.labels = labels
        self.used = np.unique(near.query(layer.shape)[0]) if len(near) and len(layer.shape) else np.empty(0, dtype=np.int64)
        self.tree = shapely.STRtree(layer.shape[self.used])
        self._bounds = shapely.bounds(layer.shape[self.used]).reshape(-1, 4)
        shapely.prepare(layer.shape[self.used])
        points, ring, owner = _rings(layer.shape[self.used])
        last = np.ones(len(ring), dtype=np.bool_)
        last[:-1] = ring[1:] != ring[:-1]
        first = np.flatnonzero(~last)
        start, end = points[first], points[first + 1]
        ring_of = ring[first]
        moved = (start != end).any(axis=1)
        self.start, self.end, ring_of = start[moved], end[moved], ring_of[moved]
        self.piece = self.used[owner[ring_of]] if len(ring_of) else np.empty(0, dtype=np.int64)
        self.turn = self._turns(ring_of)
        self._build_chunks(ring_of)

    def _turns(self, ring_of: NDArray[np.int64]) -> Floats:
        heading = np.arctan2(self.end[:, 1] - self.start[:, 1], self.end[:, 0] - self.start[:, 0])
        count = len(heading)
        if not count:
            return np.empty(0)
        follow = np.arange(count) + 1
        closing = np.ones(count, dtype=np.bool_)
        closing[:-1] = ring_of[1:] != ring_of[:-1]
        begins = np.flatnonzero(np.concatenate([[True], closing[:-1]]))
        follow[closing] = begins
        turn: Floats = (heading[follow] - heading + np.pi) % (2 * np.pi) - np.pi
        return turn

    def _build_chunks(self, ring_of: NDArray[np.int64]) -> None:
        count = len(ring_of)
        if not count:
            self.chunk_first = np.zeros(1, dtype=np.int64)
            self.chunks = shapely.STRtree([])
            return
        fresh = np.concatenate([[True], ring_of[1:] != ring_of[:-1]])
        begins = np.flatnonzero(fresh)
        rank = np.arange(count) - np.repeat(begins, np.diff(np.append(begins, count)))
        first = np.flatnonzero(rank % CHUNK == 0)
        self.chunk_first = np.append(first, count)
        low = np.minimum.reduceat(np.minimum(self.start, self.end), first, axis=0)
        high = np.maximum.reduceat(np.maximum(self.start, self.end), first, axis=0)
        self.chunks = shapely.STRtree(diagonals(low, high))

    def local(self, windows: Windows) -> LocalEdges:
        """All edges within reach of each window, in its coordinates."""
        boxes = windows.boxes(2 * ROUNDING)  # a vertex on the border of two windows belongs to both
        nothing = np.empty(0, dtype=np.int64)
        window, chunk = self.chunks.query(boxes) if len(self.start) and len(windows) else (nothing, nothing)
        order = np.argsort(window, kind="stable")
        window, chunk = window[order], chunk[order]
        first, size = self.chunk_first[chunk], self.chunk_first[chunk + 1] - self.chunk_first[chunk]
        stop = np.cumsum(size)
        edge = np.repeat(first - (stop - size), size) + np.arange(int(size.sum()))
        s0, t0 = _project(windows, window, self.start[edge], size)
        last = stop - 1
        s_last, t_last = _project(windows, window, self.end[first + size - 1])
        # an edge is left out where both its ends lie beyond one side of the window
        beyond = _beyond(windows, np.repeat(window, size), s0, t0)
        beyond_next = np.concatenate([beyond[1:], beyond[:1]])  # within a chunk an edge ends where the next begins
        beyond_next[last] = _beyond(windows, window, s_last, t_last)
        kept = np.flatnonzero((beyond & beyond_next) == 0)
        s1, t1 = np.concatenate([s0[1:], s0[:1]]), np.concatenate([t0[1:], t0[:1]])
        s1[last], t1[last] = s_last, t_last
        window, edge = np.repeat(window, size)[kept], edge[kept]
        solid_window, solid_piece = self._solid(windows, boxes, window, self.piece[edge])
        return LocalEdges(window, self.piece[edge], s0[kept], t0[kept], s1[kept], t1[kept], self.turn[edge], solid_window, solid_piece)

    def distance(self, point: Floats, wanted: Bools, limit: float) -> Floats:
        """(n,) distance from points (n, 2) to copper of `wanted` labels, at most `limit`."""
        result = np.full(len(point), limit)
        if not len(self.start) or not len(point):
            return result
        at, chunk = self.chunks.query(diagonals(point - limit, point + limit))
        first, size = self.chunk_first[chunk], self.chunk_first[chunk + 1] - self.chunk_first[chunk]
        edge = np.repeat(first - (np.cumsum(size) - size), size) + np.arange(int(size.sum()))
        at = np.repeat(at, size)
        use = wanted[self.labels[self.piece[edge]]]
        at, edge = at[use], edge[use]
        along, offset = self.end[edge] - self.start[edge], point[at] - self.start[edge]
        share = np.clip(np.einsum("ij,ij->i", along, offset) / np.einsum("ij,ij->i", along, along), 0.0, 1.0)
        np.minimum.at(result, at, np.hypot(*(offset - share[:, None] * along).T))
        at, used = self.tree.query(shapely.points(point))
        piece = self.used[used]
        use = wanted[self.labels[piece]]
        at, piece = at[use], piece[use]
        result[at[shapely.intersects_xy(self.shape[piece], point[at, 0], point[at, 1])]] = 0.0
        return result

    def _solid(
        self, windows: Windows, boxes: NDArray[np.object_], window: NDArray[np.int64], piece: NDArray[np.int64]
    ) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
        if not len(self.used) or not len(windows):
            return np.empty(0, np.int64), np.empty(0, np.int64)
        middle = windows.middle()
        candidate, used = self.tree.query(boxes)
        low_x, low_y, high_x, high_y = self._bounds[used].T
        x, y = middle[candidate].T
        over = (low_x <= x) & (x <= high_x) & (low_y <= y) & (y <= high_y)
        candidate, candidate_piece = candidate[over], self.used[used[over]]
        count = len(self.shape)
        met = window * count + piece
        changes = np.ones(len(met), dtype=np.bool_)
        changes[1:] = met[1:] != met[:-1]
        touched = np.isin(candidate * count + candidate_piece, met[changes])
        candidate, candidate_piece = candidate[~touched], candidate_piece[~touched]
        inside = shapely.contains_xy(self.shape[candidate_piece], middle[candidate, 0], middle[candidate, 1])
        return candidate[inside], candidate_piece[inside]


def _project(windows: Windows, window: NDArray[np.int64], point: Floats, size: NDArray[np.int64] | None = None) -> tuple[Floats, Floats]:
    """s and t of points, one for each of `window`, or `size` of them in a row."""
    turned = np.column_stack([windows.origin, windows.heading])[window]
    if size is not None:
        turned = np.repeat(turned, size, axis=0)
    x, y = point[:, 0] - turned[:, 0], point[:, 1] - turned[:, 1]
    return x * turned[:, 2] + y * turned[:, 3], y * turned[:, 2] - x * turned[:, 3]


def _rings(shapes: NDArray[np.object_]) -> tuple[Floats, NDArray[np.int64], NDArray[np.int64]]:
    """Points of all rings of polygons, the number of the ring of each point, and the polygon of each ring."""
    holed = np.flatnonzero(shapely.get_num_interior_rings(shapes) > 0)
    plain = np.setdiff1d(np.arange(len(shapes)), holed, assume_unique=True)
    points, ring = shapely.get_coordinates(shapes[plain], return_index=True)  # polygons of one ring need no ring objects
    rings, owner = shapely.get_rings(shapes[holed], return_index=True)
    more, ring_of_more = shapely.get_coordinates(rings, return_index=True)
    return np.concatenate([points, more]), np.concatenate([ring, ring_of_more + len(plain)]), np.concatenate([plain, holed[owner]])


def _beyond(windows: Windows, window: NDArray[np.int64], s: Floats, t: Floats) -> NDArray[np.uint8]:
    """One bit for each side of the window that a point lies beyond. A vertex at the very end of a window may lie a rounding error outside
    it, and one of its two edges must stay."""
    reach = windows.reach[window]
    code = (t > reach).view(np.uint8)
    code |= (t < -reach).view(np.uint8) << 1
    code |= (s > windows.length[window] + ROUNDING).view(np.uint8) << 2
    code |= (s < -ROUNDING).view(np.uint8) << 3
    return code
