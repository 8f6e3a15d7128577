"""Edges of the copper near centrelines. In: copper of a layer and windows along centrelines, mm; out: edges in window coordinates, mm.

A window is a straight piece of centreline with a half-width: s runs along it from 0 to its length, t across it, positive to the left.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray

from impcheck.artwork.image import Floats, Ints
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

    def boxes(self, margin: float = 0.0) -> NDArray[np.object_]:
        """(n,) bounding boxes as shapely polygons."""
        normal = np.stack([-self.heading[:, 1], self.heading[:, 0]], axis=1)
        middle = self.origin + self.heading * (self.length / 2)[:, None]
        half = np.abs(self.heading) * (self.length / 2 + margin)[:, None] + np.abs(normal) * (self.reach + margin)[:, None]
        low, high = middle - half, middle + half
        return np.asarray(shapely.box(low[:, 0], low[:, 1], high[:, 0], high[:, 1]), dtype=object)

    def take(self, which: NDArray[np.int64] | NDArray[np.bool_]) -> Windows:
        """The windows at `which` (mask or indices)."""
        return Windows(self.origin[which], self.heading[which], self.length[which], self.reach[which])


def boxes_of(shapes: NDArray[np.object_]) -> NDArray[np.object_]:
    """(n,) bounding boxes of n shapes, as shapely polygons."""
    low_x, low_y, high_x, high_y = shapely.bounds(shapes).reshape(-1, 4).T
    return np.asarray(shapely.box(low_x, low_y, high_x, high_y), dtype=object)


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


class LayerEdges:
    """Index of the edges of one copper layer near given windows."""

    def __init__(self, layer: LayerCopper, labels: Ints, near: NDArray[np.object_]) -> None:
        """`labels` (pieces,) and `near`, boxes outside which nothing will be asked."""
        self.shape = layer.shape
        self.labels = labels
        self._pieces = shapely.STRtree(near)
        boxes = boxes_of(layer.shape)
        hit, _ = self._pieces.query(boxes, predicate="intersects") if len(near) and len(boxes) else (np.empty(0, dtype=np.int64), None)
        self.used = np.unique(hit)
        self.tree = shapely.STRtree(boxes[self.used])
        shapely.prepare(layer.shape[self.used])
        rings, owner = shapely.get_rings(layer.shape[self.used], return_index=True)
        points, ring = shapely.get_coordinates(rings, return_index=True)
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
        self.chunks = shapely.STRtree(shapely.box(low[:, 0], low[:, 1], high[:, 0], high[:, 1]))

    def local(self, windows: Windows) -> LocalEdges:
        """All edges within reach of each window, in its coordinates."""
        boxes = windows.boxes()
        nothing = np.empty(0, dtype=np.int64)
        window, chunk = self.chunks.query(boxes) if len(self.start) and len(windows) else (nothing, nothing)
        order = np.argsort(window, kind="stable")
        window, chunk = window[order], chunk[order]
        first, size = self.chunk_first[chunk], self.chunk_first[chunk + 1] - self.chunk_first[chunk]
        stop = np.cumsum(size)
        edge = np.repeat(first - (stop - size), size) + np.arange(int(size.sum()))
        s0, t0 = _project(windows, np.repeat(window, size), self.start[edge])
        s1, t1 = np.empty_like(s0), np.empty_like(t0)
        s1[:-1], t1[:-1] = s0[1:], t0[1:]  # within a chunk an edge ends where the next begins
        if len(stop):
            s1[stop - 1], t1[stop - 1] = _project(windows, window, self.end[first + size - 1])
        window = np.repeat(window, size)
        reach = windows.reach[window]
        keep = (np.minimum(t0, t1) <= reach) & (np.maximum(t0, t1) >= -reach)
        # A vertex at the very end of a window may lie a rounding error outside it, and one of its two edges must stay.
        keep &= (np.minimum(s0, s1) <= windows.length[window] + ROUNDING) & (np.maximum(s0, s1) >= -ROUNDING)
        window, edge = window[keep], edge[keep]
        solid_window, solid_piece = self._solid(windows, boxes, window, self.piece[edge])
        return LocalEdges(window, self.piece[edge], s0[keep], t0[keep], s1[keep], t1[keep], self.turn[edge], solid_window, solid_piece)

    def _solid(
        self, windows: Windows, boxes: NDArray[np.object_], window: NDArray[np.int64], piece: NDArray[np.int64]
    ) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
        if not len(self.used) or not len(windows):
            return np.empty(0, np.int64), np.empty(0, np.int64)
        middle = windows.origin + windows.heading * (windows.length / 2)[:, None]
        candidate, used = self.tree.query(shapely.points(middle))
        candidate_piece = self.used[used]
        count = len(self.shape)
        met = window * count + piece
        changes = np.ones(len(met), dtype=np.bool_)
        changes[1:] = met[1:] != met[:-1]
        touched = np.isin(candidate * count + candidate_piece, met[changes])
        candidate, candidate_piece = candidate[~touched], candidate_piece[~touched]
        inside = shapely.contains_xy(self.shape[candidate_piece], middle[candidate, 0], middle[candidate, 1])
        return candidate[inside], candidate_piece[inside]


def _project(windows: Windows, window: NDArray[np.int64], point: Floats) -> tuple[Floats, Floats]:
    offset = point - windows.origin[window]
    heading = windows.heading[window]
    return (
        offset[:, 0] * heading[:, 0] + offset[:, 1] * heading[:, 1],
        offset[:, 1] * heading[:, 0] - offset[:, 0] * heading[:, 1],
    )
