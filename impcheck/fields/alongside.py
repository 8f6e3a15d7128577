"""Foreign traces on the layers over and under a run. In: the cuts of a run; out: which of them run alongside for so long that they
belong into its section. Lengths in mm."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from impcheck.artwork.image import Bools, Floats
from impcheck.artwork.stackup import Stackup
from impcheck.path.walk import Run

NEAR = 2.0  # heights between the two layers: what stands farther beside the trace is no neighbour
STEEP = 0.5  # a trace that goes across more than this share of the way along crosses, and does not run alongside


def alongside(run: Run, stackup: Stackup, returns: Bools, own: Bools) -> dict[int, Bools]:
    """For each other layer of the run's cuts, which of its entries are foreign traces that run alongside for longer than they are away.

    `returns`, `own` (labels,): labels that carry return current, and those of the run's own net. What reaches beyond the cut is a plane
    or pour that the board does not call a return, and no trace.
    """
    return {layer: _of_layer(run, layer, stackup, returns, own) for layer in run.stations.cuts if layer != run.layer}


def _of_layer(run: Run, layer: int, stackup: Stackup, returns: Bools, own: Bools) -> Bools:
    s, cut = run.stations, run.stations.cuts[layer]
    kept = np.zeros(len(cut.low), bool)
    station = np.repeat(np.arange(len(s)), np.diff(cut.first))
    high, low = stackup.heights[min(layer, run.layer)], stackup.heights[max(layer, run.layer)]
    height = high[0] - low[1]
    half = s.width[station] / 2
    gap = np.maximum(np.maximum(cut.low - s.centre[station] - half, s.centre[station] - half - cut.high), 0.0)
    whole = (cut.low > -s.reach + 1e-6) & (cut.high < s.reach - 1e-6)
    found = np.flatnonzero(~returns[cut.label] & ~own[cut.label] & whole & (gap < NEAR * height))
    if not len(found):
        return kept
    lane = _lanes(station[found], cut.label[found], cut.low[found])
    order = np.lexsort((station[found], lane, cut.label[found]))
    found, lane = found[order], lane[order]
    label, at = cut.label[found], station[found]
    parted = (np.diff(label) != 0) | (np.diff(lane) != 0) | (np.diff(at) > 1)
    first = np.concatenate([[0], np.flatnonzero(parted) + 1])
    last = np.concatenate([first[1:], [len(found)]]) - 1
    middle = (cut.low[found] + cut.high[found]) / 2
    length = s.end[at[last]] - s.begin[at[first]]
    away = np.hypot(height, np.minimum.reduceat(gap[found], first))
    good = (length > away) & (np.abs(middle[last] - middle[first]) < STEEP * length)
    kept[found[np.repeat(good, last - first + 1)]] = True
    return kept


def _lanes(station: NDArray[np.int64], label: NDArray[np.int32], low: Floats) -> NDArray[np.int64]:
    """Which of a net's traces an entry belongs to: its place from the right among the entries of its net at its station."""
    order = np.lexsort((low, label, station))
    fresh = np.ones(len(order), bool)
    fresh[1:] = (np.diff(station[order]) != 0) | (np.diff(label[order]) != 0)
    begins = np.flatnonzero(fresh)
    lane = np.empty(len(order), np.int64)
    lane[order] = np.arange(len(order)) - np.repeat(begins, np.diff(np.append(begins, len(order))))
    return lane
