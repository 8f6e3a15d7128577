"""Which plane a run refers to. In: windows of legs, copper, labels of return nets; out: layer indices above and below, reach in mm."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
import shapely
from numpy.typing import NDArray

from impcheck.artwork.image import Bools, Floats
from impcheck.artwork.stackup import Stackup
from impcheck.copper.copper import Copper
from impcheck.nets.nets import Nets
from impcheck.path.edges import ROUNDING
from impcheck.path.frame import Frame

REACH_HEIGHTS = 6.0  # heights beyond the trace's edge out to which copper matters to 0.1 %
REACH_LEAST = 1.0  # mm
REACH_MOST = 5.0  # mm
USUAL_SHARE = 0.5  # of the length that a plane must cover fully to be the usual reference
COVER_POINTS = (-0.45, 0.0, 0.45)  # widths across the trace where cover is looked up


def references(
    frame: Frame, stay: NDArray[np.int64], judged: Bools, copper: Copper, nets: Nets
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Layer of the usual reference above and below each leg, -1 none: the nearest layer outwards whose return copper covers the full
    width along at least half of the length.

    `stay` (l,) numbers the legs of one stay of a walk on a layer: they share their reference, so that a short run between two pads does not
    lose it to an opening. `judged` (windows,) are those outside pads; where a stay has none, all its windows count.
    """
    windows = frame.windows
    count = len(copper.layers)
    own = np.array([leg.layer for leg in frame.legs], dtype=np.int64)
    middle = windows.origin + windows.heading * (windows.length / 2)[:, None]
    normal = np.stack([-windows.heading[:, 1], windows.heading[:, 0]], axis=1)
    points = np.stack([middle + share * frame.width[:, None] * normal for share in COVER_POINTS], axis=1)
    boxes = replace(windows, reach=max(COVER_POINTS) * frame.width).boxes(ROUNDING)
    stay_of = stay[frame.leg]
    stays = int(stay.max()) + 1
    weight = np.where(judged, windows.length, 0.0)
    empty = np.bincount(stay_of, weight, stays) <= 0
    weight = np.where(empty[stay_of], windows.length, weight)
    total = np.bincount(stay_of, weight, stays)
    covered = np.zeros((count, stays))
    wanted = np.zeros(nets.count + 1, dtype=np.bool_)
    wanted[list(nets.returns)] = True
    for index, layer in enumerate(copper.layers):
        mine = np.flatnonzero(wanted[nets.piece_label[index]]) if len(layer.shape) else np.empty(0, np.int64)
        if not len(mine):
            continue
        shapely.prepare(layer.shape[mine])
        near, piece = shapely.STRtree(layer.shape[mine]).query(boxes)
        full = np.zeros((len(windows), len(COVER_POINTS)), dtype=np.bool_)
        for index_across in range(len(COVER_POINTS)):
            x, y = points[near, index_across].T
            full[near[shapely.intersects_xy(layer.shape[mine[piece]], x, y)], index_across] = True
        covered[index] = np.bincount(stay_of, weight * full.all(axis=1), stays)
    share = covered / np.maximum(total, 1e-12)
    above, below = np.full(len(own), -1), np.full(len(own), -1)
    for leg, layer in enumerate(own.tolist()):
        good = share[:, stay[leg]] >= USUAL_SHARE
        up, down = np.flatnonzero(good[:layer]), np.flatnonzero(good[layer + 1 :])
        above[leg] = up[-1] if len(up) else -1
        below[leg] = layer + 1 + down[0] if len(down) else -1
    return above, below


def height_between(stackup: Stackup, one: int, two: int) -> float:
    """Distance between the facing surfaces of two copper layers, mm."""
    high, low = stackup.heights[min(one, two)], stackup.heights[max(one, two)]
    return high[0] - low[1]


def reaches(
    layers: Sequence[int], above: NDArray[np.int64], below: NDArray[np.int64], width: Floats, stackup: Stackup
) -> tuple[Floats, Floats]:
    """Half-width of the cuts and height to the nearest reference of each leg, mm; the height is the greatest reach where there is none."""
    height = np.full(len(layers), REACH_MOST)
    for leg, layer in enumerate(layers):
        for other in (int(above[leg]), int(below[leg])):
            if other >= 0:
                height[leg] = min(height[leg], height_between(stackup, layer, other))
    return width / 2 + np.clip(REACH_HEIGHTS * height, REACH_LEAST, REACH_MOST), height
