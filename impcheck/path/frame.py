"""All legs of all walks side by side. In: legs, mm; out: segments and windows as arrays that know their leg, mm."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from impcheck.artwork.image import Floats
from impcheck.path.edges import MAX_WINDOW, Windows
from impcheck.path.route import Leg


@dataclass(frozen=True)
class Frame:
    """Windows of l legs, sorted by leg and by place along the leg."""

    legs: Sequence[Leg]
    windows: Windows
    leg: NDArray[np.int64]  # (n,) leg of each window
    base: Floats  # (n,) distance from the start of the leg to the start of the window
    width: Floats  # (n,) drawn or mean width
    first: NDArray[np.int64]  # (l + 1,) windows of leg i are first[i]:first[i+1]
    length: Floats  # (l,) length of each leg

    def place(self, leg: NDArray[np.int64], s: Floats) -> tuple[NDArray[np.int64], Floats]:
        """Window and place in it of points `s` along legs; (leg, s) must be rising."""
        stride = float(self.length.max(initial=1.0)) + 2.0
        window = np.searchsorted(self.leg * stride + self.base, leg * stride + s + 1e-12, side="right") - 1
        window = np.maximum(window, self.first[leg])
        return window, np.clip(s - self.base[window], 0.0, self.windows.length[window])

    def reaching(self, reach: Floats) -> Frame:
        """The frame with another reach of its legs (l,)."""
        return replace(self, windows=replace(self.windows, reach=reach[self.leg]))


CURVE = np.radians(12.0)  # vertices that turn less, beside a short segment, belong to a chopped curve
CURVE_SEGMENT = 0.4  # mm


def corners(frame: Frame) -> tuple[NDArray[np.int64], NDArray[np.int64], Floats]:
    """Windows that begin at a vertex of their leg: at a corner, at a vertex of a chopped curve; and the turn at every corner, radians."""
    after = np.flatnonzero(frame.base > 1e-9)
    one, two = frame.windows.heading[after - 1], frame.windows.heading[after]
    turn = np.abs(np.arctan2(one[:, 0] * two[:, 1] - one[:, 1] * two[:, 0], np.einsum("ij,ij->i", one, two)))
    short = np.minimum(frame.windows.length[after], frame.windows.length[after - 1]) < CURVE_SEGMENT
    curve = (turn < CURVE) & short & (turn > 1e-6)
    corner = (turn > 1e-6) & ~curve
    return after[corner], after[curve], turn[corner]


def make_frame(legs: Sequence[Leg], reach: Floats, usual: Floats) -> Frame:
    """Chops legs into windows of equal length, at most MAX_WINDOW long, one or more for each segment; `reach` and `usual` width (l,)."""
    if not legs:
        empty = np.empty(0)
        nothing = np.empty(0, dtype=np.int64)
        return Frame(legs, Windows(np.empty((0, 2)), np.empty((0, 2)), empty, empty), nothing, empty, empty, np.zeros(1, np.int64), empty)
    start = np.concatenate([leg.line[:-1] for leg in legs])
    end = np.concatenate([leg.line[1:] for leg in legs])
    owner = np.repeat(np.arange(len(legs)), [len(leg.line) - 1 for leg in legs])
    drawn = np.concatenate([leg.width for leg in legs])
    # a link has no width of its own worth naming: it takes the usual width of its leg
    width = np.where(np.concatenate([leg.link for leg in legs]) > 0, usual[owner], drawn)
    size = np.hypot(*(end - start).T)
    before = np.cumsum(size) - size
    leg_first = np.searchsorted(owner, np.arange(len(legs)))
    before = before - before[leg_first][owner]
    parts = np.maximum(1, np.ceil(size / MAX_WINDOW - 1e-9).astype(np.int64))
    segment = np.repeat(np.arange(len(size)), parts)
    rank = np.arange(len(segment)) - np.repeat(np.cumsum(parts) - parts, parts)
    piece = (size / parts)[segment]
    heading = (end - start) / np.maximum(size, 1e-12)[:, None]
    origin = start[segment] + heading[segment] * (rank * piece)[:, None]
    leg_of = owner[segment]
    total = np.bincount(owner, size, len(legs)).astype(np.float64)
    first = np.searchsorted(leg_of, np.arange(len(legs) + 1)).astype(np.int64)
    windows = Windows(origin, heading[segment], piece, reach[leg_of])
    return Frame(legs, windows, leg_of, before[segment] + rank * piece, width[segment], first, total)


def usual_width(leg: Leg) -> float:
    """Width that at least half of the length of a leg has at least, mm."""
    size = np.hypot(*np.diff(leg.line, axis=0).T)
    size = np.where(leg.link > 0, size * 1e-6, size)
    return weighted_median(leg.width, size)


def weighted_median(values: Floats, weights: Floats) -> float:
    """Value at which half of the weight is reached; 0 where there is none."""
    if not len(values):
        return 0.0
    order = np.argsort(values, kind="stable")
    total = np.cumsum(weights[order])
    return float(values[order][min(int(np.searchsorted(total, total[-1] / 2)), len(values) - 1)])
