"""Cuts on the layers above and below the trace. In: the legs of a layer, places of cuts, edges of the layers, mm; out: intervals, mm."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from impcheck.artwork.image import Bools, Floats
from impcheck.path.cuts import HAIRLINE, cut
from impcheck.path.edges import LayerEdges
from impcheck.path.intervals import joined, spread
from impcheck.path.part import Part, Places
from impcheck.path.walk import Intervals

BEHIND = 0.25  # heights from the trace's edge: what stands behind an opening farther away changes the impedance by less than 0.1 %

Met = dict[int, tuple[Bools, Intervals]]  # layer -> stations that see it, intervals of all stations


def up_to_references(part: Part, edges: Callable[[int], LayerEdges], places: Places) -> Met:
    """Cuts of every station on the layers from its own to its references, those included; `part.kept` holds the edges there."""
    result: Met = {}
    for other, (_, local) in part.kept.items():
        asked = part.between(other)[places.leg]
        mine = np.flatnonzero(asked)
        reach = part.reach[places.leg[mine]]
        few = cut(edges(other), local, part.frame.windows, places.window[mine], places.s[mine], reach=reach, hairline=HAIRLINE)
        result[other] = (asked, spread(few, mine, len(places)))
    return result


def beyond(
    part: Part,
    edges: Callable[[int], LayerEdges],
    layers: int,
    places: Places,
    met: Met,
    *,
    trace: tuple[Floats, Floats],
    done: Bools,
    wanted: Bools,
) -> None:
    """Adds to `met` the cuts farther out at stations where no layer met so far has one piece of return copper all along the trace, from
    `trace[0]` to `trace[1]`, and BEHIND heights beyond: through an opening there the field reaches what lies behind.

    `done` (stations,) are asked for nothing more; `wanted` (labels,) is return copper. A station sees the layers up to the first one whose
    return copper closes its whole reach; the first that it sees and was not cut on is added without entries.
    """
    count, frame, reach = len(places), part.frame, part.reach[places.leg]
    margin = BEHIND * part.height[places.leg]
    low, high = np.maximum(trace[0] - margin, -reach), np.minimum(trace[1] + margin, reach)
    nothing = Intervals(np.zeros(count + 1, np.int32), np.empty(0), np.empty(0), np.empty(0, np.int32))
    for step in (-1, 1):
        closed, shut = done.copy(), np.zeros(count, dtype=np.bool_)
        other = part.layer + step
        while 0 <= other < layers:
            before, found = met.get(other, (np.zeros(count, np.bool_), nothing))
            mine = np.flatnonzero(~closed & ~before)
            if len(mine):
                needed = np.unique(places.window[mine])
                there = edges(other)
                windows, local = frame.windows, there.local(frame.windows.take(needed)).renumbered(needed)
                few = cut(there, local, windows, places.window[mine], places.s[mine], reach=reach[mine], hairline=HAIRLINE)
                found = joined(found, spread(few, mine, count))
            met[other] = (before | ~shut, found)
            if not before.any() and not len(mine):
                break
            station = _stations(found)
            whole = wanted[found.label] & (found.low <= low[station]) & (found.high >= high[station])
            closed[station[whole]] = True
            shut[station[whole & (found.low < HAIRLINE / 2 - reach[station]) & (found.high > reach[station] - HAIRLINE / 2)]] = True
            other += step


def _stations(cuts: Intervals) -> NDArray[np.int64]:
    return np.repeat(np.arange(len(cuts.first) - 1), np.diff(cuts.first))
