"""Where a cross-section changes along a leg. In: edges in window coordinates, mm; out: places along legs (events), mm."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from impcheck.artwork.image import Bools, Floats
from impcheck.path.edges import ROUNDING, LocalEdges
from impcheck.path.frame import Frame, corners

SURE_MERGE = 0.004  # mm: two events that must be placed exactly become one when closer
LOOSE_MERGE = 0.02  # mm: changes of the own copper's outline are dropped this close to any
WEAK_MERGE = 0.05  # mm: and so are those of copper beside the trace
LONGEST = 1.0  # mm between events
TAPER = 0.03  # share of the width by which a tapered trace may change in one station
GAP_SHARE = 0.15  # share of the gap by which it may change in one station
BESIDE = (0.1, 0.2, 0.4, 0.8)  # mm from the trace's edge: lines on which outlines of neighbours are looked for
BESIDE_HEIGHTS = 3.0  # heights from the trace's edge: copper that comes no nearer makes no events (farther out it changes 0.1 to 0.2 %)
BESIDE_LEAST, BESIDE_MOST = 0.3, 1.0  # mm, bounds of that; copper of declared nets makes events out to the greater one, at any height
CURVE_STEP = 0.2  # mm between events on a curve
CORNER = np.radians(20.0)
PAD_FROM = 0.75  # widths from the centreline: own copper that reaches farther is a pad or teardrop, followed more coarsely
PAD_LINES = (0.75, 1.0, 1.4, 2.0)  # widths from the centreline

Places = list[tuple[NDArray[np.int64], Floats]]  # window, s


def _crossings(local: LocalEdges, keep: Bools, t: Floats, places: Places) -> None:
    """Adds where the edges at `keep` cross the line at `t` (windows,)."""
    line = t[local.window]
    low, high = local.t0 - line, local.t1 - line
    hit = np.flatnonzero(keep & ((low < 0) != (high < 0)))
    s = local.s0[hit] + low[hit] / (low[hit] - high[hit]) * (local.s1[hit] - local.s0[hit])
    places.append((local.window[hit], s))


def _extremes(local: LocalEdges) -> tuple[Bools, Bools]:
    """True where an edge ends in a vertex at which the outline turns back in s, or in t."""
    heading = np.arctan2(local.t1 - local.t0, local.s1 - local.s0)
    after = heading + local.turn
    return (np.cos(heading) > 0) != (np.cos(after) > 0), (np.sin(heading) > 0) != (np.sin(after) > 0)


def _slanted(local: LocalEdges, keep: Bools, step: Floats, places: Places) -> None:
    """Adds places along slanted edges so that t changes by at most `step` (edges,) between two of them."""
    rise, run = np.abs(local.t1 - local.t0), np.abs(local.s1 - local.s0)
    parts = np.minimum(np.ceil(rise / step), np.ceil(run / LOOSE_MERGE)).astype(np.int64)
    hit = np.flatnonzero(keep & (parts > 1))
    index = np.repeat(hit, parts[hit] - 1)
    rank = np.arange(len(index)) - np.repeat(np.cumsum(parts[hit] - 1) - (parts[hit] - 1), parts[hit] - 1) + 1
    places.append((local.window[index], local.s0[index] + rank / parts[index] * (local.s1[index] - local.s0[index])))


def own_layer(
    frame: Frame,
    local: LocalEdges,
    own: Bools,
    declared: Bools,
    stroke: Bools,
    hidden: Bools,
    *,
    height: Floats,
    sure: Places,
    loose: Places,
    weak: Places,
) -> None:
    """Events on the run's own layer. `own` (edges,): of the same net; `declared` (edges,): of any declared net; `stroke` (edges,): of a
    round stroke, whose ends lie hidden in the next one. `hidden` (edges,): the edge ends inside other copper of the net. `height`
    (windows,) over the reference."""
    width = frame.width[local.window]
    near, far = np.minimum(np.abs(local.t0), np.abs(local.t1)), np.maximum(np.abs(local.t0), np.abs(local.t1))
    rise, run = far - near, np.abs(local.s1 - local.s0)
    at_edge = own & (near < PAD_FROM * width)
    visible = at_edge & ~hidden & (~stroke | (np.abs(local.t1) > width / 2 - 0.002))
    hit = np.flatnonzero(visible & (np.abs(local.t1) < PAD_FROM * width) & ~((np.abs(local.turn) < CORNER) & (rise < 1e-4)))
    loose.append((local.window[hit], local.s1[hit]))
    _crossings(local, own & ~stroke, np.zeros(len(frame.windows)), sure)
    step = own & ~stroke & (rise > TAPER * width) & (run < rise / 4) & (near < PAD_FROM * width) & (far > width / 4)
    hit = np.flatnonzero(step & ~hidden)
    sure.append((local.window[hit], (local.s0[hit] + local.s1[hit]) / 2))
    _slanted(local, at_edge & (far < 2 * PAD_FROM * width) & (run >= rise / 4), np.maximum(TAPER / 2 * width, 1e-3), loose)
    for share in PAD_LINES:
        for side in (-1.0, 1.0):
            _crossings(local, own, side * share * frame.width, loose)
    back_s, back_t = _extremes(local)
    gap = np.maximum(near - width / 2, 0.0)
    limit = np.where(declared, BESIDE_MOST, np.clip(BESIDE_HEIGHTS * height, BESIDE_LEAST, BESIDE_MOST)[local.window])
    close = np.zeros(int(local.piece.max(initial=0)) + 1, dtype=np.bool_)
    close[local.piece[gap <= limit]] = True  # a piece that comes near somewhere is followed to its ends
    foreign = ~own & close[local.piece]
    beside = np.minimum(frame.windows.reach[local.window], width / 2 + BESIDE_MOST)
    corner = foreign & (np.abs(local.t1) < beside) & (back_s | back_t | (np.abs(local.turn) > CORNER))
    hit = np.flatnonzero(corner)
    weak.append((local.window[hit], local.s1[hit]))
    for distance in BESIDE:
        for side in (-1.0, 1.0):
            _crossings(local, foreign, side * (frame.width / 2 + distance), weak)
    _slanted(local, foreign & (gap < 0.8), GAP_SHARE * np.maximum(gap, 0.05), weak)


def plane_layer(frame: Frame, local: LocalEdges, wanted: Bools, height: Floats, *, sure: Places, weak: Places) -> None:
    """Events on a layer that may carry the return: `wanted` (edges,) are those of return copper, `height` (windows,)."""
    for share in (-0.4999, 0.0, 0.4999):
        _crossings(local, wanted, share * frame.width, sure)
    for share in (-0.25, 0.25):
        _crossings(local, wanted, share * frame.width, weak)
    for heights in (1.0, 2.0):
        for side in (-1.0, 1.0):
            _crossings(local, wanted, side * (frame.width / 2 + heights * height), weak)
    back_s, back_t = _extremes(local)
    width = frame.width[local.window]
    hit = np.flatnonzero(wanted & back_s & (np.abs(local.t1) < width / 2))
    sure.append((local.window[hit], local.s1[hit]))
    near = np.abs(local.t1) < width / 2 + 2 * height[local.window]
    hit = np.flatnonzero(wanted & near & (back_s | back_t | (np.abs(local.turn) > CORNER)))
    weak.append((local.window[hit], local.s1[hit]))


def boundaries(
    frame: Frame, sure: Places, loose: Places, weak: Places, exact: tuple[NDArray[np.int64], Floats]
) -> tuple[NDArray[np.int64], Floats, Floats]:
    """Leg, begin and end of every station. `exact` are (leg, s) of zone ends; ends of legs and vertices are added here."""
    stride = float(frame.length.max(initial=1.0)) + 2.0
    legs = np.arange(len(frame.legs))
    corner, curve, _ = corners(frame)

    def along(places: Places) -> tuple[NDArray[np.int64], Floats]:
        if not places:
            return np.empty(0, np.int64), np.empty(0)
        window = np.concatenate([p[0] for p in places])
        s = np.concatenate([p[1] for p in places])
        length = frame.windows.length[window]
        inside = (s >= -ROUNDING) & (s <= length + ROUNDING)  # what lies on the border of two windows must not fall between them
        return frame.leg[window[inside]], frame.base[window[inside]] + np.clip(s, 0.0, length)[inside]

    sure_leg, sure_s = along(sure)
    must = [legs, legs, frame.leg[corner]], [np.zeros(len(legs)), frame.length, frame.base[corner]]
    fixed = np.sort(np.concatenate([leg * stride + s for leg, s in zip(*must, strict=True)]))
    fixed = np.unique(fixed)
    firm = _thin(
        np.sort(np.concatenate([sure_leg * stride + sure_s, exact[0] * stride + np.clip(exact[1], 0, frame.length[exact[0]])])), SURE_MERGE
    )
    firm = _away(firm, fixed, SURE_MERGE)
    firm = np.sort(np.concatenate([fixed, firm]))
    curved = _away(_thin(frame.leg[curve] * stride + frame.base[curve], CURVE_STEP), firm, CURVE_STEP / 2)
    firm = np.sort(np.concatenate([firm, curved]))
    every = firm
    for places, distance in ((loose, LOOSE_MERGE), (weak, WEAK_MERGE)):
        extra_leg, extra_s = along(places)
        extra = _away(_thin(np.sort(extra_leg * stride + extra_s), distance), every, distance)
        every = np.sort(np.concatenate([every, extra]))
    leg = np.floor(every / stride + 1e-12).astype(np.int64)
    inner = leg[1:] == leg[:-1]
    begin, end, owner = every[:-1][inner], every[1:][inner], leg[:-1][inner]
    size = end - begin
    parts = np.maximum(1, np.ceil(size / LONGEST - 1e-9).astype(np.int64))
    index = np.repeat(np.arange(len(size)), parts)
    rank = np.arange(len(index)) - np.repeat(np.cumsum(parts) - parts, parts)
    step = (size / parts)[index]
    low = begin[index] + rank * step
    high = np.where(rank + 1 == parts[index], end[index], low + step)
    owner = owner[index]
    low, high = low - owner * stride, high - owner * stride
    keep = high - low > 1e-9
    return owner[keep], np.maximum(low[keep], 0.0), np.minimum(high[keep], frame.length[owner[keep]])


def _thin(places: Floats, distance: float) -> Floats:
    """Sorted places with those closer than `distance` to the one before left out (of a dense row about one in each distance stays)."""
    if not len(places):
        return places
    bins = np.floor(places / distance)
    first = np.concatenate([[True], bins[1:] != bins[:-1]])
    kept = places[first]
    for _ in range(2):
        near = np.concatenate([[False], np.diff(kept) < distance])
        near[1:] &= ~near[:-1]
        kept = kept[~near]
    thinned: Floats = kept
    return thinned


def _away(places: Floats, fixed: Floats, distance: float) -> Floats:
    """Places at least `distance` from every fixed one; both sorted."""
    if not len(places) or not len(fixed):
        return places
    index = np.searchsorted(fixed, places)
    before = places - fixed[np.maximum(index - 1, 0)]
    after = fixed[np.minimum(index, len(fixed) - 1)] - places
    kept: Floats = places[(np.abs(before) >= distance) & (np.abs(after) >= distance)]
    return kept
