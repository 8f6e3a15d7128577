"""What each place of a leg belongs to. In: frames, pads, branch directions, widths and coverage, mm; out: zones per station."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray

from impcheck.artwork.image import Bools, Floats
from impcheck.path.edges import Windows
from impcheck.path.frame import Frame, corners, weighted_median
from impcheck.path.walk import Zone

BEND = np.radians(1.0)  # turns below this leave the cut's width alone
BEND_MARGIN = 0.005  # mm
SHARPEST = 4.0  # tan of half the turn above which a bend reaches no farther
WIDER = 1.005  # of the usual width: from here on copper is a teardrop (or what is left of a pad)
TEARDROP = 2.0  # mm, longest teardrop
BULGE = 1.0  # mm, half of the longest pad that is taken for one without anything else saying so
PLATEAU = 0.15  # mm, a stretch of one width longer than this is a trace, not a teardrop


@dataclass(frozen=True)
class PadShapes:
    """Pads and barrel discs of the walked nets on one layer."""

    shape: NDArray[np.object_]  # (k,)
    net: NDArray[np.int64]  # (k,) group
    via: Bools  # (k,) holds a barrel of its own net
    size: Floats  # (k,) diameter of the smallest circle around it


def bend_spans(frame: Frame) -> tuple[NDArray[np.int64], Floats, Floats]:
    """Leg, begin and end of the places near bends where a perpendicular cut reads too wide."""
    corner, _, turn = corners(frame)
    sharp = turn > BEND
    corner, turn = corner[sharp], turn[sharp]
    width = np.maximum(frame.width[corner], frame.width[corner - 1])
    half = width / 2 * np.minimum(np.tan(turn / 2), SHARPEST) + BEND_MARGIN
    return frame.leg[corner], frame.base[corner] - half, frame.base[corner] + half


def junction_spans(frame: Frame, leaving: Mapping[int, Sequence[tuple[float, float, float]]]) -> tuple[NDArray[np.int64], Floats, Floats]:
    """Leg, begin and end of the places beside copper that leaves the path at a leg's end.

    `leaving`: node -> (heading x, heading y, width) of each strand there, those of the path included.
    """
    legs: list[int] = []
    span: list[tuple[float, float]] = []
    for index, leg in enumerate(frame.legs):
        for side, node in ((0, leg.nodes[0]), (-1, leg.nodes[1])):
            strands = leaving.get(node, ())
            if len(strands) < 3:
                continue
            vector = leg.line[1] - leg.line[0] if side == 0 else leg.line[-2] - leg.line[-1]
            vector = vector / max(float(np.hypot(*vector)), 1e-12)
            width = float(leg.width[side])
            reach = width / 2
            for x, y, other in strands:
                cosine, sine = float(vector @ (x, y)), abs(vector[0] * y - vector[1] * x)
                if cosine > 1 - 1e-6 or sine < 1e-3:
                    continue
                reach = max(reach, min((other / 2 + width / 2 * max(cosine, 0.0)) / max(sine, 0.2), 2.0))
            reach += BEND_MARGIN
            legs.append(index)
            span.append((-1.0, reach) if side == 0 else (frame.length[index] - reach, frame.length[index] + 1.0))
    ends = np.array(span).reshape(-1, 2)
    return np.array(legs, dtype=np.int64), ends[:, 0], ends[:, 1]


def within(leg: NDArray[np.int64], middle: Floats, spans: tuple[NDArray[np.int64], Floats, Floats]) -> Bools:
    """(stations,) True where the middle of a station lies in one of the spans."""
    inside = np.zeros(len(leg), dtype=np.bool_)
    first, last = np.searchsorted(leg, spans[0], side="left"), np.searchsorted(leg, spans[0], side="right")
    for low, high, begin, end in zip(first.tolist(), last.tolist(), spans[1].tolist(), spans[2].tolist(), strict=True):
        a, b = np.searchsorted(middle[low:high], [begin, end])
        inside[low + a : low + b] = True
    return inside


def pad_zones(
    points: Floats, window: NDArray[np.int64], net: NDArray[np.int64], windows: Windows, pads: PadShapes
) -> tuple[NDArray[np.uint8], Floats]:
    """(stations,) Zone.PAD or Zone.VIA where the point (n, 2) lies in a pad of its own net, else Zone.TRACE; and the size of the largest
    pad there (infinite where there is none). `window` (stations,), rising, is the window each point lies in, `net` (windows,) its group."""
    zone = np.full(len(points), int(Zone.TRACE), dtype=np.uint8)
    if not len(pads.shape) or not len(points):
        return zone, np.full(len(points), np.inf)
    near, pad = shapely.STRtree(pads.shape).query(windows.boxes())
    mine = pads.net[pad] == net[near]
    near, pad = near[mine], pad[mine]
    first = np.searchsorted(window, near, side="left")
    size = np.searchsorted(window, near, side="right") - first
    pad = np.repeat(pad, size)
    station = np.arange(len(pad)) + np.repeat(first - (np.cumsum(size) - size), size)
    shapely.prepare(pads.shape)
    inside = shapely.intersects_xy(pads.shape[pad], points[station, 0], points[station, 1])
    station, pad = station[inside], pad[inside]
    zone[station] = int(Zone.PAD)
    zone[station[pads.via[pad]]] = int(Zone.VIA)
    largest = np.full(len(points), -np.inf)
    np.maximum.at(largest, station, pads.size[pad])
    return zone, np.where(largest > 0, largest, np.inf)


def spread_teardrops(
    zone: NDArray[np.uint8], begin: Floats, end: Floats, width: Floats, usual: float, *, open_ends: tuple[bool, bool]
) -> None:
    """Widens the zones at both ends of one leg over teardrops, in place: outwards while the copper is wider than usual and getting
    narrower. `open_ends`: a walk begins or ends there; where no pad is known the wide copper itself is the pad."""
    if not usual > 0:
        return
    count = len(zone)
    trace, bend, junction, pad = int(Zone.TRACE), int(Zone.BEND), int(Zone.JUNCTION), int(Zone.PAD)
    for side in (0, 1):
        order = range(count) if side == 0 else range(count - 1, -1, -1)
        free = np.flatnonzero(np.isin(zone[:: 1 - 2 * side], (trace, bend)))
        start = int(free[0]) if len(free) else count
        if start == 0 and not open_ends[side]:
            continue
        kind = int(zone[order[start - 1]]) if start else pad
        bulging = open_ends[side] and kind == pad
        previous, flat, spread = np.inf, 0.0, 0.0
        for k in range(start, count):
            index, size = order[k], end[order[k]] - begin[order[k]]
            if zone[index] not in (trace, bend) or width[index] <= WIDER * usual or spread > TEARDROP:
                break
            ahead = width[order[k + 1]] if k + 1 < count else width[index]
            flat = flat + size if width[index] > 0.99 * previous or ahead > 0.99 * width[index] else 0.0
            bulge = bulging and width[index] > 1.25 * usual and spread < BULGE
            if (width[index] > 1.001 * previous or flat > PLATEAU) and not bulge:
                break
            spread += size
            if zone[index] == trace or kind != junction:
                zone[index] = kind
            previous = width[index]


def spread_antipads(zone: NDArray[np.uint8], begin: Floats, end: Floats, missing: Bools, caps: tuple[float, float]) -> None:
    """Widens the via zone at both ends of one leg over the own antipad, in place: outwards while the reference is `missing`, at most to
    `caps` from each end (0: there is no barrel)."""
    count = len(zone)
    for side, cap in enumerate(caps):
        if cap <= 0 or not count:
            continue
        order = range(count) if side == 0 else range(count - 1, -1, -1)
        seen = False
        for index in order:
            distance = begin[index] if side == 0 else end[-1] - end[index]
            if distance >= cap:
                break
            if not missing[index] and (seen or zone[index] not in (Zone.PAD, Zone.VIA)):
                break
            seen = seen or bool(missing[index])
            zone[index] = int(Zone.VIA)


def carried_width(zone: NDArray[np.uint8], width: Floats, fallback: float) -> Floats:
    """Width with bends and junctions given the width of the trace beside them (never more than was measured there)."""
    good = (zone == Zone.TRACE) & (width > 0)
    poor = (zone == Zone.BEND) | (zone == Zone.JUNCTION)
    if not poor.any():
        return width
    result = width.copy()
    usable, index = np.flatnonzero(good), np.flatnonzero(poor)
    limit = np.full(len(index), fallback)
    if len(usable):
        after = np.searchsorted(usable, index)
        limit = np.maximum(width[usable[np.maximum(after - 1, 0)]], width[usable[np.minimum(after, len(usable) - 1)]])
    result[index] = np.where(width[index] > 0, np.minimum(width[index], limit), limit)
    return result


def usual_of(zone: NDArray[np.uint8], width: Floats, begin: Floats, end: Floats, fallback: float) -> float:
    """Width of a leg that at least half of its TRACE stations reach; `fallback` where it has none."""
    judged = (zone == Zone.TRACE) & (width > 0)
    return weighted_median(width[judged], (end - begin)[judged]) if judged.any() else fallback
