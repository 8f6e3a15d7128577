"""Cuts across centrelines. In: edges in window coordinates and the places of cuts, mm; out: copper intervals per cut, mm."""

from __future__ import annotations

import numpy as np
import shapely
from numpy.typing import NDArray

from impcheck.artwork.image import Bools, Floats
from impcheck.path.edges import LayerEdges, LocalEdges, Windows
from impcheck.path.walk import Intervals

HAIRLINE = 0.015  # mm: gaps in a plane below this are slits between the cut-ins of a layout tool
TIE = 1e-12  # mm: where copper ends and begins at one place it begins first, so that touching pieces are one interval
_STRIDE = 4.0  # more than any window is long


def cut(
    edges: LayerEdges,
    local: LocalEdges,
    windows: Windows,
    window: NDArray[np.int64],
    s: Floats,
    *,
    reach: Floats,
    hairline: float = 0.0,
) -> Intervals:
    """Copper met by n cuts, cut i at `s[i]` of window `window[i]` out to `reach[i]` on both sides.

    (window, s) must be rising. Within one label intervals that overlap, touch, or leave a gap below `hairline` are merged. A cut through a
    vertex counts the edge that leads to larger s (half-open rule), so that no crossing is counted twice or lost.
    """
    count = len(s)
    station, t, sign, piece = _crossings(local, window, s)
    inside = np.abs(t) < reach[station]
    # pieces with no crossing within reach, or whose first crossing leaves them, hold the start of the cut
    station_in, t_in, sign_in, piece_in = station[inside], t[inside], sign[inside], piece[inside]
    pieces = np.int64(max(len(edges.shape), 1))
    key = station_in * pieces + piece_in
    order = np.lexsort((t_in - TIE * sign_in, key))
    station_in, t_in, sign_in, piece_in, key = station_in[order], t_in[order], sign_in[order], piece_in[order], key[order]
    fresh = np.ones(len(key), dtype=np.bool_)
    fresh[1:] = key[1:] != key[:-1]
    final = np.ones(len(key), dtype=np.bool_)
    final[:-1] = key[1:] != key[:-1]
    opened = fresh & (sign_in < 0)
    left_open = final & (sign_in > 0)
    full_station, full_piece = _whole_width(edges, local, windows, window, s, crossed=key, pieces=pieces)
    all_station = np.concatenate([station_in, station_in[opened], station_in[left_open], full_station, full_station])
    all_piece = np.concatenate([piece_in, piece_in[opened], piece_in[left_open], full_piece, full_piece])
    all_t = np.concatenate([t_in, -reach[station_in[opened]], reach[station_in[left_open]], -reach[full_station], reach[full_station]])
    all_sign = np.concatenate(
        [
            sign_in,
            np.ones(np.count_nonzero(opened), np.int64),
            -np.ones(np.count_nonzero(left_open), np.int64),
            np.ones(len(full_station), np.int64),
            -np.ones(len(full_station), np.int64),
        ]
    )
    label = edges.labels[all_piece].astype(np.int64)
    order = np.lexsort((all_t - TIE * all_sign, all_station * (np.int64(edges.labels.max(initial=0)) + 1) + label))
    depth = np.cumsum(all_sign[order])
    begins = np.flatnonzero((depth == 1) & (all_sign[order] == 1))
    finishes = np.flatnonzero(depth == 0)
    low, high = all_t[order][begins], all_t[order][finishes]
    where, whose = all_station[order][begins], label[order][begins]
    if hairline > 0 and len(low):
        close = (where[1:] == where[:-1]) & (whose[1:] == whose[:-1]) & (low[1:] - high[:-1] < hairline)
        low, where, whose = (
            low[np.concatenate([[True], ~close])],
            where[np.concatenate([[True], ~close])],
            whose[np.concatenate([[True], ~close])],
        )
        high = high[np.concatenate([~close, [True]])]
    thick = high - low > 1e-9
    low, high, where, whose = low[thick], high[thick], where[thick], whose[thick]
    order = np.lexsort((high, low, where))
    first = np.searchsorted(where[order], np.arange(count + 1)).astype(np.int32)
    return Intervals(first, low[order], high[order], whose[order].astype(np.int32))


def _crossings(
    local: LocalEdges, window: NDArray[np.int64], s: Floats
) -> tuple[NDArray[np.int64], Floats, NDArray[np.int64], NDArray[np.int64]]:
    """Station, t, +1 (entering copper towards larger t) or -1, and piece of every crossing of an edge with a cut."""
    key = window * _STRIDE + s
    low = np.clip(np.minimum(local.s0, local.s1), -0.5, _STRIDE - 1)
    high = np.clip(np.maximum(local.s0, local.s1), -0.5, _STRIDE - 1)
    first = np.searchsorted(key, local.window * _STRIDE + low, side="right")  # low < s <= high: half open
    last = np.searchsorted(key, local.window * _STRIDE + high, side="right")
    size = np.maximum(last - first, 0)
    edge = np.repeat(np.arange(len(size)), size)
    station = np.arange(len(edge)) - np.repeat(np.cumsum(size) - size, size) + first[edge]
    run = local.s1[edge] - local.s0[edge]
    share = (s[station] - local.s0[edge]) / run
    t = local.t0[edge] + share * (local.t1[edge] - local.t0[edge])
    return station, t, np.where(run > 0, 1, -1).astype(np.int64), local.piece[edge]


def _whole_width(
    edges: LayerEdges,
    local: LocalEdges,
    windows: Windows,
    window: NDArray[np.int64],
    s: Floats,
    *,
    crossed: NDArray[np.int64],
    pieces: np.int64,
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Pairs of a cut and a piece that covers all of it: pieces with no edge in the window, or with edges there that miss this cut.
    `crossed`, sorted: station * pieces + piece of the pairs that do meet."""
    first = np.searchsorted(window, local.solid_window, side="left")
    last = np.searchsorted(window, local.solid_window, side="right")
    size = last - first
    which = np.repeat(np.arange(len(size)), size)
    solid_station = np.arange(len(which)) - np.repeat(np.cumsum(size) - size, size) + first[which]
    solid_piece = local.solid_piece[which]
    met = local.window * pieces + local.piece
    changes = np.ones(len(met), dtype=np.bool_)
    changes[1:] = met[1:] != met[:-1]
    active = np.unique(met[changes])
    active_window, active_piece = active // pieces, active % pieces
    first = np.searchsorted(window, active_window, side="left")
    last = np.searchsorted(window, active_window, side="right")
    size = last - first
    which = np.repeat(np.arange(len(size)), size)
    station = np.arange(len(which)) - np.repeat(np.cumsum(size) - size, size) + first[which]
    piece = active_piece[which]
    pair = station * pieces + piece
    found = np.minimum(np.searchsorted(crossed, pair), max(len(crossed) - 1, 0))
    missed = crossed[found] != pair if len(crossed) else np.ones(len(pair), dtype=np.bool_)
    station, piece = station[missed], piece[missed]
    point = windows.origin[window[station]] + windows.heading[window[station]] * s[station][:, None]
    inside: Bools = shapely.contains_xy(edges.shape[piece], point[:, 0], point[:, 1])
    return np.concatenate([solid_station, station[inside]]), np.concatenate([solid_piece, piece[inside]])


def coverage(cuts: Intervals, low: Floats, high: Floats, wanted: Bools, where: Bools) -> Floats:
    """(n,) share of [low, high] that the intervals of wanted labels cover; `wanted` (labels,). Stations not `where` read 0."""
    station = np.repeat(np.arange(len(low)), np.diff(cuts.first))
    keep = wanted[cuts.label] & where[station]
    covered = union_length(
        station[keep], np.maximum(cuts.low[keep], low[station[keep]]), np.minimum(cuts.high[keep], high[station[keep]]), len(low)
    )
    share: Floats = np.minimum(covered / np.maximum(high - low, 1e-12), 1.0)
    share[share > 1 - 1e-9] = 1.0
    return share


def union_length(station: NDArray[np.int64], low: Floats, high: Floats, count: int) -> Floats:
    """(count,) length of the union of intervals of each station."""
    keep = high > low
    station, low, high = station[keep], low[keep], high[keep]
    if not len(station):
        return np.zeros(count)
    order = np.lexsort((low, station))
    station, low, high = station[order], low[order], high[order]
    span = float(high.max() - low.min()) + 1.0
    base = station * span - low.min()
    reached = np.maximum.accumulate(base + high)
    before = np.concatenate([[-np.inf], reached[:-1]])
    gain = np.maximum(base + high - np.maximum(base + low, before), 0.0)
    total: Floats = np.bincount(station, gain, count).astype(np.float64)
    return total
