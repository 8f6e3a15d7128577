"""Intervals of cuts put to use. In: intervals of n stations; out: the trace's own width, and parts of the intervals, mm."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from impcheck.artwork.image import Bools, Floats
from impcheck.path.walk import Intervals, Zone


def own_interval(cuts: Intervals, owner: NDArray[np.int64], group: NDArray[np.int64]) -> tuple[Floats, Floats, NDArray[np.int64]]:
    """Width, middle and entry of the own copper on the centreline (the nearest own copper where none lies there; entry -1: none)."""
    count = len(group)
    station = np.repeat(np.arange(count), np.diff(cuts.first))
    own = np.flatnonzero(owner[cuts.label] == group[station])
    away = np.maximum(np.maximum(cuts.low[own], -cuts.high[own]), 0.0)
    order = own[np.lexsort((away, station[own]))]
    chosen, where = np.unique(station[order], return_index=True)
    entry = np.full(count, -1, dtype=np.int64)
    entry[chosen] = order[where]
    width, centre = np.zeros(count), np.zeros(count)
    width[chosen] = cuts.high[entry[chosen]] - cuts.low[entry[chosen]]
    centre[chosen] = (cuts.high[entry[chosen]] + cuts.low[entry[chosen]]) / 2
    far = np.zeros(count, dtype=np.bool_)
    far[chosen] = np.maximum(cuts.low[entry[chosen]], -cuts.high[entry[chosen]]) > width[chosen] + 0.05
    entry[far], width[far], centre[far] = -1, 0.0, 0.0
    return width, centre, entry


def clean_own(
    cuts: Intervals,
    entry: NDArray[np.int64],
    narrowed: Bools,
    width: Floats,
    centre: Floats,
    *,
    zone: NDArray[np.uint8],
    owner: NDArray[np.int64],
    group: NDArray[np.int64],
) -> Intervals:
    """At bends and junctions the own copper is given the trace's width, and other own copper that the cut meets there is left out."""
    low, high = cuts.low.copy(), cuts.high.copy()
    which = np.flatnonzero(narrowed & (entry >= 0))
    low[entry[which]], high[entry[which]] = centre[which] - width[which] / 2, centre[which] + width[which] / 2
    station = np.repeat(np.arange(len(group)), np.diff(cuts.first))
    bend = (zone[station] == Zone.BEND) | (zone[station] == Zone.JUNCTION)
    drop = bend & (owner[cuts.label] == group[station]) & (np.arange(len(low)) != entry[station])
    keep = ~drop
    first = np.concatenate([[0], np.cumsum(np.bincount(station[keep], minlength=len(group)))]).astype(np.int32)
    return Intervals(first, low[keep], high[keep], cuts.label[keep])


def spread(few: Intervals, mine: NDArray[np.int64], count: int) -> Intervals:
    """Intervals of some stations as intervals of all."""
    size = np.zeros(count, dtype=np.int64)
    size[mine] = np.diff(few.first)
    return Intervals(np.concatenate([[0], np.cumsum(size)]).astype(np.int32), few.low, few.high, few.label)


def joined(one: Intervals, two: Intervals) -> Intervals:
    """Intervals of two sets of the same stations, each station having entries in one of them at most."""
    if not len(one.low) or not len(two.low):
        return one if len(one.low) else two
    size_one, size_two = np.diff(one.first), np.diff(two.first)
    station = np.concatenate([np.repeat(np.arange(len(size)), size) for size in (size_one, size_two)])
    order = np.argsort(station, kind="stable")
    low, high, label = (np.concatenate([getattr(part, name) for part in (one, two)])[order] for name in ("low", "high", "label"))
    return Intervals(np.concatenate([[0], np.cumsum(size_one + size_two)]).astype(np.int32), low, high, label)


def part_of(cuts: Intervals, stations: slice) -> Intervals:
    """Intervals of a run of stations."""
    first = cuts.first[stations.start : stations.stop + 1]
    low, high = int(first[0]), int(first[-1])
    return Intervals(first - first[0], cuts.low[low:high], cuts.high[low:high], cuts.label[low:high])
